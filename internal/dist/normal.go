package dist

import (
	"math"

	"example.com/trammel/internal/dd"
)

// rootHalf is 1/√2 to 106 bits.
var rootHalf = dd.Of(0.5).Sqrt()

// NormalUpper is P(Z > x) for the standard normal distribution.
func NormalUpper(x float64) float64 {
	if math.IsInf(x, 0) || math.IsNaN(x) {
		return math.Erfc(x) / 2
	}
	// erfc(x/√2)/2; the rounding of x/√2, which far out would cost x² units,
	// is put back to first order.
	t := rootHalf.MulF(x)
	q := math.Erfc(t.Hi) / 2
	if q == 0 {
		return 0
	}
	return q - t.Lo*math.Exp(-t.Hi*t.Hi)/math.SqrtPi
}

// NormalCDF is P(Z <= x).
func NormalCDF(x float64) float64 { return NormalUpper(-x) }

// NormalUpperQuantile is the x with P(Z > x) = q.
func NormalUpperQuantile(q float64) float64 {
	switch {
	case !(q >= 0 && q <= 1):
		return math.NaN()
	case q == 0:
		return math.Inf(1)
	case q > 0.5:
		return -NormalUpperQuantile(1 - q)
	case q == 0.5:
		return 0
	case q > 0.25:
		// Near 0 the inner part keeps the digits: 1 - 2q is exact.
		return positiveQuantile(1-2*q, func(x float64) (float64, float64) {
			return math.Erf(x / math.Sqrt2), 2 * x * math.Exp(-x*x/2) / math.Sqrt(2*math.Pi)
		}, 0.5, true)
	}
	return positiveQuantile(q, func(x float64) (float64, float64) {
		return NormalUpper(x), -x * math.Exp(-x*x/2) / math.Sqrt(2*math.Pi)
	}, 1, true)
}

// NormalQuantile is the x with P(Z <= x) = p.
func NormalQuantile(p float64) float64 { return -NormalUpperQuantile(p) }
