package lsq

import (
	"math"

	"gonum.org/v1/gonum/floats"
)

// Exponents of column scales stay within these bounds, so that a scale and
// its reciprocal are normal numbers.
const maxScaleExp = 1000

// Columns whose scale or its reciprocal exceeds farScale are copied in scaled
// form: the error terms of their products could underflow otherwise.
const farScale = 0x1p400

// norm2 returns the Euclidean norm of x without overflow or harmful
// underflow, as m·2^e.
func norm2(x []float64) (m float64, e int) {
	s := floats.Dot(x, x)
	// Within these bounds neither overflow nor the loss of small squares can
	// matter to the last digits.
	if s > 1e-270 && s < 1e300 {
		return math.Sqrt(s), 0
	}
	var largest float64
	for _, v := range x {
		if a := math.Abs(v); a > largest {
			largest = a
		}
	}
	if largest == 0 {
		return 0, 0
	}
	// Scaled by a power of two and summed in the same order, so that the norm
	// of a rescaled column has the same digits.
	_, e = math.Frexp(largest)
	scaled := make([]float64, len(x))
	for i, v := range x {
		scaled[i] = math.Ldexp(v, -e)
	}
	return math.Sqrt(floats.Dot(scaled, scaled)), e
}

// powerScale returns the power of two that brings x to a norm in [1, 2), and
// that norm; 1 and 0 for x = 0. Beyond 2^±maxScaleExp the norm stays outside
// [1, 2), which harms nothing but is reported as it is.
func powerScale(x []float64) (scale, norm float64) {
	m, e := norm2(x)
	if m == 0 {
		return 1, 0
	}
	_, e2 := math.Frexp(m) // m in [½, 1)·2^e2
	k := 1 - e2 - e
	k = min(max(k, -maxScaleExp), maxScaleExp)
	return math.Ldexp(1, k), math.Ldexp(m, k+e)
}

// scaleTo writes s·x into dst.
func scaleTo(dst, x []float64, s float64) {
	dst = dst[:len(x)]
	for i, v := range x {
		dst[i] = v * s
	}
}
