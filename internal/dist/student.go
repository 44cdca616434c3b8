package dist

import "math"

// tArguments are the arguments of the incomplete beta function for |T| = x:
// df/(df + x²) and x²/(df + x²).
func tArguments(x, df float64) (u, v float64) {
	r := x / math.Sqrt(df)
	r *= r
	if r > 1 {
		return 1 / r / (1 + 1/r), 1 / (1 + 1/r)
	}
	return 1 / (1 + r), r / (1 + r)
}

// tTails are P(|T| > x) and P(|T| <= x) for x >= 0.
func tTails(x, df float64) (outer, inner float64) {
	switch {
	case !(df > 0) || math.IsNaN(x):
		return math.NaN(), math.NaN()
	case math.IsInf(x, 0):
		return 0, 1
	case math.IsInf(df, 1):
		return 2 * NormalUpper(x), math.Erf(x / math.Sqrt2)
	}
	u, v := tArguments(x, df)
	return betaTails(df/2, 0.5, u, v)
}

// TTwoSided is P(|T| > |x|) for Student's t with df degrees of freedom. An
// infinite df gives the normal distribution.
func TTwoSided(x, df float64) float64 {
	outer, _ := tTails(math.Abs(x), df)
	return outer
}

// TUpper is P(T > x).
func TUpper(x, df float64) float64 {
	outer, inner := tTails(math.Abs(x), df)
	if x >= 0 {
		return outer / 2
	}
	return 0.5 + inner/2
}

// TUpperQuantile is the x with P(T > x) = q.
func TUpperQuantile(q, df float64) float64 {
	switch {
	case !(df > 0) || !(q >= 0 && q <= 1):
		return math.NaN()
	case q > 0.5:
		return -TUpperQuantile(1-q, df)
	case q == 0.5:
		return 0
	case q == 0:
		return math.Inf(1)
	case math.IsInf(df, 1):
		return NormalUpperQuantile(q)
	}
	// x/2 times the density of |T| at x.
	density := func(x float64) float64 {
		u, v := tArguments(x, df)
		return betaDensity(df/2, 0.5, u, v)
	}
	if q > 0.25 {
		// Near 0 the inner part keeps digits that the tail has not: 1 - 2q is exact.
		return positiveQuantile(1-2*q, func(x float64) (float64, float64) {
			_, inner := tTails(x, df)
			return inner, 2 * density(x)
		}, 0.5, true)
	}
	return positiveQuantile(2*q, func(x float64) (float64, float64) {
		outer, _ := tTails(x, df)
		return outer, -2 * density(x)
	}, 1, true)
}

// TQuantile is the x with P(T <= x) = p.
func TQuantile(p, df float64) float64 { return -TUpperQuantile(p, df) }
