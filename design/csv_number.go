package design

import (
	"math"
	"strconv"
)

// A numeral says what a cell is, read as a number.
type numeral uint8

const (
	notNumeral   numeral = iota
	plainNumeral         // a number, or NaN or Inf
	codedNumeral         // digits with a leading zero, such as 007: a code, not an amount
)

const (
	maxExactPower = 22  // 10^22 is the largest power of ten that a float64 holds exactly
	manyDigits    = 700 // more than any sensible cell; see parseLong
)

// parseNumeral reads a cell as a number: an optional sign, decimal digits with
// or without a point among them, an optional exponent. Digits that begin with
// a superfluous zero (007, -01, 00.5) make it a codedNumeral. NaN and Inf in
// any case, with or without a sign, are numbers. Nothing else is: no
// hexadecimal, no underscores, no spaces, no digit grouping.
//
// The value is correctly rounded; beyond the largest float64 it is an
// infinity. Few digits with a small exponent are exact as integer and power of
// ten, so that one operation rounds once (W. D. Clinger, "How to read floating
// point numbers accurately", PLDI 1990, section 4, recalled); all others go to
// strconv.
func parseNumeral(cell []byte) (float64, numeral) {
	i, n := 0, len(cell)
	negative := false
	if n > 0 && (cell[0] == '+' || cell[0] == '-') {
		negative = cell[0] == '-'
		i++
	}
	if n-i == 3 && cell[i] > '9' {
		return nonFinite(cell, i, negative)
	}
	var mantissa uint64 // exact while digits <= 19
	first, digits, scale := i, 0, int64(0)
	for i < n && isDigit(cell[i]) {
		mantissa = mantissa*10 + uint64(cell[i]-'0')
		i++
	}
	digits = i - first
	class := plainNumeral
	if digits > 1 && cell[first] == '0' {
		class = codedNumeral
	}
	if i < n && cell[i] == '.' {
		i++
		point := i
		for i < n && isDigit(cell[i]) {
			mantissa = mantissa*10 + uint64(cell[i]-'0')
			i++
		}
		digits += i - point
		scale = int64(point - i)
	}
	if digits == 0 {
		return 0, notNumeral
	}
	end := i
	if i < n && cell[i]|0x20 == 'e' {
		i++
		minus := false
		if i < n && (cell[i] == '+' || cell[i] == '-') {
			minus = cell[i] == '-'
			i++
		}
		from, e := i, int64(0)
		for i < n && isDigit(cell[i]) {
			if e < 1<<40 { // beyond the digits that any cell can hold
				e = e*10 + int64(cell[i]-'0')
			}
			i++
		}
		if i == from {
			return 0, notNumeral
		}
		if minus {
			e = -e
		}
		scale += e
	}
	if i != n {
		return 0, notNumeral
	}
	if digits <= 19 && mantissa <= 1<<53 && scale >= -maxExactPower && scale <= maxExactPower {
		v := float64(mantissa)
		if scale < 0 {
			v /= exactPower(-scale)
		} else if scale > 0 {
			v *= exactPower(scale)
		}
		if negative {
			v = -v
		}
		return v, class
	}
	if digits > manyDigits {
		return parseLong(cell[first:end], negative, scale), class
	}
	// The syntax is decimal already; the only error left is overflow, for which
	// ParseFloat gives the infinity that is wanted.
	v, _ := strconv.ParseFloat(string(cell), 64)
	return v, class
}

// parseLong reads digits with or without a point among them, whose last digit
// counts 10^scale. It writes them anew with one digit before the point and the
// exponent that this takes, because strconv (go1.26) loses zeros past the
// 800th digit of a whole number, and exponents past five digits.
func parseLong(digits []byte, negative bool, scale int64) float64 {
	plain := make([]byte, 0, len(digits)+32)
	if negative {
		plain = append(plain, '-')
	}
	sign := len(plain)
	for _, b := range digits {
		if b == '.' || b == '0' && len(plain) == sign {
			continue
		}
		plain = append(plain, b)
		if len(plain) == sign+1 {
			plain = append(plain, '.')
		}
	}
	if len(plain) == sign {
		plain = append(plain, "0."...)
	}
	// With a first digit that is not 0, an exponent of ±1000 is as good as any
	// beyond: infinity and zero.
	exponent := scale + int64(len(plain)-sign-2)
	plain = append(plain, 'e')
	plain = strconv.AppendInt(plain, max(-1000, min(exponent, 1000)), 10)
	v, _ := strconv.ParseFloat(string(plain), 64)
	return v
}

// nonFinite reads the three letters from i as NaN or Inf in any case.
func nonFinite(cell []byte, i int, negative bool) (float64, numeral) {
	switch {
	case foldsTo(cell[i:], "nan"):
		return math.NaN(), plainNumeral
	case foldsTo(cell[i:], "inf") && negative:
		return math.Inf(-1), plainNumeral
	case foldsTo(cell[i:], "inf"):
		return math.Inf(1), plainNumeral
	}
	return 0, notNumeral
}

func isDigit(b byte) bool { return b-'0' <= 9 }

// exactPower is 10^k for 0 <= k <= maxExactPower, without rounding.
func exactPower(k int64) float64 {
	return [...]float64{
		1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
		1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
	}[k]
}

// parseTruth reads true or false in any case.
func parseTruth(cell []byte) (value, ok bool) {
	switch len(cell) {
	case 4:
		return true, foldsTo(cell, "true")
	case 5:
		return false, foldsTo(cell, "false")
	}
	return false, false
}

// foldsTo compares with a word of small ASCII letters of the same length,
// whatever the case.
func foldsTo(cell []byte, word string) bool {
	for i, b := range cell {
		if b|0x20 != word[i] {
			return false
		}
	}
	return true
}
