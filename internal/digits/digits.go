// Package digits scores computed numbers: to how many decimal digits does a
// result agree with the value it should have? It serves the tests of all
// packages, so that tolerances are stated in one unit.
package digits

import (
	"math"
	"math/big"
)

// Most is the highest score: a float64 holds just under 16 decimal digits, so
// a higher figure would say nothing.
const Most = 16

// Agree returns -log10(|got-want|/|want|), at most Most; when want is 0 it
// returns -log10|got|, at most Most.
//
// The score is negative when the difference exceeds want. Equal values score
// Most, equal infinities and two NaNs included; a NaN or an infinity that is
// not matched scores -Inf. The difference is formed in higher precision, so
// it neither overflows nor underflows.
func Agree(got, want float64) float64 {
	switch {
	case got == want || math.IsNaN(got) && math.IsNaN(want):
		return Most
	case math.IsNaN(want) || math.IsInf(want, 0):
		return math.Inf(-1)
	}
	return score(got, big.NewFloat(want))
}

// AgreeString is Agree for a want given as a decimal string, such as
// "1.2345678901234567890e-05", which keeps the digits a float64 would lose.
// "inf", "+inf" and "-inf" are the infinities. A string that is no number
// scores NaN, which no comparison with a bound accepts.
func AgreeString(got float64, want string) float64 {
	w, _, err := big.ParseFloat(want, 10, precision, big.ToNearestEven)
	if err != nil {
		return math.NaN()
	}
	if w.IsInf() {
		f, _ := w.Float64()
		return Agree(got, f)
	}
	return score(got, w)
}

// precision in bits of the differences: 20-digit strings need 67 bits, and a
// difference of two such numbers should keep a few digits of its own.
const precision = 256

// score is the common part; want is finite.
func score(got float64, want *big.Float) float64 {
	if math.IsNaN(got) || math.IsInf(got, 0) {
		return math.Inf(-1)
	}
	d := new(big.Float).SetPrec(precision).SetFloat64(got)
	if want.Sign() != 0 {
		d.Sub(d, want)
		d.Quo(d, want)
	}
	d.Abs(d)
	if d.Sign() == 0 {
		return Most
	}
	// The ratio may lie outside the float64 range, so its binary exponent is
	// taken apart first.
	m := new(big.Float)
	e := d.MantExp(m)
	f, _ := m.Float64()
	return math.Min(Most, -(math.Log10(f) + float64(e)*math.Log10(2)))
}
