package dist

import "math"

// fArguments are the arguments of the incomplete beta function for F = x:
// d1·x/(d2 + d1·x) and its complement, without overflow.
func fArguments(x, d1, d2 float64) (u, v float64) {
	r := d1 / d2 * x
	if r > 1 {
		return 1 / (1 + 1/r), 1 / r / (1 + 1/r)
	}
	return r / (1 + r), 1 / (1 + r)
}

// FCDF is P(X <= x) for F with d1 and d2 degrees of freedom. An infinite d2
// gives chi-square over d1.
func FCDF(x, d1, d2 float64) float64 {
	switch {
	case !(d1 > 0) || !(d2 > 0) || math.IsNaN(x):
		return math.NaN()
	case x <= 0:
		return 0
	case math.IsInf(d2, 1):
		return ChiCDF(x*d1, d1)
	}
	u, v := fArguments(x, d1, d2)
	lower, _ := betaTails(d1/2, d2/2, u, v)
	return lower
}

// FUpper is P(X > x) for F with d1 and d2 degrees of freedom. An infinite d2
// gives chi-square over d1.
func FUpper(x, d1, d2 float64) float64 {
	switch {
	case !(d1 > 0) || !(d2 > 0) || math.IsNaN(x):
		return math.NaN()
	case x <= 0:
		return 1
	case math.IsInf(x, 1):
		return 0
	case math.IsInf(d2, 1):
		return ChiUpper(x*d1, d1)
	}
	u, v := fArguments(x, d1, d2)
	_, upper := betaTails(d1/2, d2/2, u, v)
	return upper
}

// fDensity is x times the density of F at x.
func fDensity(x, d1, d2 float64) float64 {
	if math.IsInf(d2, 1) {
		return gammaDensity(d1/2, x*d1/2)
	}
	u, v := fArguments(x, d1, d2)
	return betaDensity(d1/2, d2/2, u, v)
}

// FQuantile is the x with P(X <= x) = p.
func FQuantile(p, d1, d2 float64) float64 {
	if p > 0.5 {
		return FUpperQuantile(1-p, d1, d2)
	}
	return positiveQuantile(p, func(x float64) (float64, float64) {
		return FCDF(x, d1, d2), fDensity(x, d1, d2)
	}, 1, d1 > 0 && d2 > 0)
}

// FUpperQuantile is the x with P(X > x) = q.
func FUpperQuantile(q, d1, d2 float64) float64 {
	if q > 0.5 {
		return FQuantile(1-q, d1, d2)
	}
	return positiveQuantile(q, func(x float64) (float64, float64) {
		return FUpper(x, d1, d2), -fDensity(x, d1, d2)
	}, 1, d1 > 0 && d2 > 0)
}
