package trammel

import (
	"math"
	"strconv"
	"strings"
)

// undefined stands in a report for a number that is not defined.
const undefined = "–"

// lastPlace is the power of ten of the given significant digit of x, such as
// -2 for the third digit of 1.2345. ok is false when x is 0 or not finite.
func lastPlace(x float64, digits int) (place int, ok bool) {
	if x == 0 || math.IsNaN(x) || math.IsInf(x, 0) {
		return 0, false
	}
	// The exponent after rounding: 9.996 to three digits is 1.00e+01.
	text := strconv.FormatFloat(x, 'e', digits-1, 64)
	exponent, err := strconv.Atoi(text[strings.IndexByte(text, 'e')+1:])
	return exponent - digits + 1, err == nil
}

// fixed shows x rounded to the place, a power of ten: as a decimal while that is
// at most 9 places after the point and 9 digits before it, else with an
// exponent.
func fixed(x float64, place int) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return undefined
	}
	size := 0
	if x != 0 {
		size = int(math.Floor(math.Log10(math.Abs(x))))
	}
	if place >= -9 && size < 9 {
		if place > 0 {
			unit := math.Pow10(place)
			x = math.Round(x/unit) * unit
		}
		return unsignedZero(strconv.FormatFloat(x, 'f', max(0, -place), 64))
	}
	return unsignedZero(strconv.FormatFloat(x, 'e', max(0, min(size-place, 16)), 64))
}

// unsignedZero drops the sign of a number that rounding made 0.
func unsignedZero(s string) string {
	if t, ok := strings.CutPrefix(s, "-"); ok && strings.Trim(t, "0.") == "" {
		return t
	}
	return s
}

// figure shows x to so many significant digits.
func figure(x float64, digits int) string {
	place, ok := lastPlace(x, digits)
	if !ok {
		if x == 0 {
			return "0"
		}
		return undefined
	}
	return fixed(x, place)
}

// smallest is the least p-value shown as a number.
const smallest = 1e-16

// probability shows a p-value in a table: to three decimals, or two digits when
// it is below 0.001.
func probability(p float64) string {
	switch {
	case math.IsNaN(p):
		return undefined
	case p < smallest:
		return "< 1e-16"
	case p < 0.00095:
		return strconv.FormatFloat(p, 'e', 1, 64)
	}
	return strconv.FormatFloat(p, 'f', 3, 64)
}

// probabilityText shows a p-value in a sentence: "= 0.012", "< 1e-16".
func probabilityText(p float64) string {
	s := probability(p)
	if strings.HasPrefix(s, "<") {
		return s
	}
	return "= " + s
}

// percent shows a share as a percentage with one decimal, or as many as it takes
// to tell a share near 1 from 1.
func percent(share float64) string {
	if math.IsNaN(share) || math.IsInf(share, 0) {
		return undefined
	}
	decimals := 1
	if left := 1 - share; left > 0 && left < 0.01 {
		decimals = min(int(math.Ceil(-math.Log10(left)))-2, 10)
	}
	return unsignedZero(strconv.FormatFloat(100*share, 'f', decimals, 64)) + " %"
}
