// Package dist computes the distributions behind intervals and p-values:
// normal, Student t, F and chi-square. Tails are computed as tails, by
// complementary functions and arguments, with small relative error down to
// 1e-300; no tail is ever 1 minus something near 1.
//
// A NaN among the arguments, or degrees of freedom that are not above 0, give
// NaN. Degrees of freedom need not be whole.
package dist

import "math"

// log1pmx is log(1+u) - u for u > -1, without cancellation for small u: with
// r = u/(2+u), log(1+u) = 2(r + r³/3 + r⁵/5 + …).
func log1pmx(u float64) float64 {
	if u < -0.4 || u > 0.6 {
		return math.Log1p(u) - u
	}
	r := u / (2 + u)
	y := r * r
	// r·(2y·(1/3 + y/5 + y²/7 + …) - u)
	sum, power := 0.0, 1.0
	for k := 3.0; ; k += 2 {
		term := power / k
		if sum+term == sum {
			break
		}
		sum += term
		power *= y
	}
	return r * (2*y*sum - u)
}

// stirling is log Γ(a) - ((a - 1/2) log a - a + log(2π)/2) for a > 0: what
// Stirling's formula leaves out (C. Loader, Fast and accurate computation of
// binomial probabilities, 2000; the series is that of M. Abramowitz and I. A.
// Stegun, Handbook of Mathematical Functions, 6.1.41).
func stirling(a float64) float64 {
	if a < 10 {
		// δ(a) = δ(a+1) + (a + 1/2) log(1 + 1/a) - 1, applied until a >= 10.
		s := 0.0
		for a < 10 {
			s += (a+0.5)*math.Log1p(1/a) - 1
			a++
		}
		return s + stirling(a)
	}
	b := 1 / (a * a)
	return (1.0/12 - b*(1.0/360-b*(1.0/1260-b*(1.0/1680-b*(1.0/1188-b*(691.0/360360-b*(1.0/156-b*3617.0/122400))))))) / a
}

// gammaDensity is x^a e^-x / Γ(a), x times the density of the gamma
// distribution, by Loader's saddle-point form.
func gammaDensity(a, x float64) float64 {
	return math.Sqrt(a/(2*math.Pi)) * math.Exp(deviance(a, x)-stirling(a))
}

// deviance is a log(x/a) - (x - a), at most 0.
func deviance(a, x float64) float64 {
	u := (x - a) / a
	if u < -0.4 || u > 0.6 {
		return a*math.Log(x/a) - (x - a)
	}
	return a * log1pmx(u)
}

// gammaTails are the regularised incomplete gamma functions P(a, x) and
// Q(a, x) = 1 - P, a > 0, x >= 0: the series below the mean, the continued
// fraction above it (W. J. Cody and others' usual division; Abramowitz and
// Stegun 6.5.29 and 6.5.31). One of the two is computed as itself; the other,
// which is then at least about 1/2 in the wide sense, as its complement.
func gammaTails(a, x float64) (p, q float64) {
	switch {
	case !(a > 0) || !(x >= 0):
		return math.NaN(), math.NaN()
	case x == 0:
		return 0, 1
	case math.IsInf(x, 1):
		return 1, 0
	}
	if x < a+1 {
		// P = x^a e^-x / Γ(a+1) · (1 + x/(a+1) + x²/((a+1)(a+2)) + …)
		sum, term := 1.0, 1.0
		for k := 1.0; term > sum*1e-18; k++ {
			term *= x / (a + k)
			sum += term
		}
		p = gammaDensity(a, x) / a * sum
		p = math.Min(p, 1)
		return p, 1 - p
	}
	// Q = x^a e^-x / Γ(a) · 1/(x+1-a- 1(1-a)/(x+3-a- 2(2-a)/(x+5-a- …))), by
	// the method of Lentz as modified by Thompson and Barnett (1986).
	const tiny = 1e-300
	b := x + 1 - a
	c, d := 1/tiny, 1/b
	h := d
	for k := 1.0; k < 1e7; k++ {
		an := -k * (k - a)
		b += 2
		d = an*d + b
		if math.Abs(d) < tiny {
			d = tiny
		}
		c = b + an/c
		if math.Abs(c) < tiny {
			c = tiny
		}
		d = 1 / d
		step := d * c
		h *= step
		if math.Abs(step-1) < 1e-16 {
			break
		}
	}
	q = math.Min(gammaDensity(a, x)*h, 1)
	return 1 - q, q
}

// ChiCDF is P(X <= x) for chi-square with df degrees of freedom.
func ChiCDF(x, df float64) float64 {
	if x <= 0 && df > 0 {
		return 0
	}
	p, _ := gammaTails(df/2, x/2)
	return p
}

// ChiUpper is P(X > x) for chi-square with df degrees of freedom.
func ChiUpper(x, df float64) float64 {
	if x <= 0 && df > 0 {
		return 1
	}
	_, q := gammaTails(df/2, x/2)
	return q
}

// ChiQuantile is the x with P(X <= x) = p.
func ChiQuantile(p, df float64) float64 {
	if p > 0.5 {
		return ChiUpperQuantile(1-p, df)
	}
	return positiveQuantile(p, func(x float64) (float64, float64) {
		return ChiCDF(x, df), gammaDensity(df/2, x/2)
	}, df, df > 0)
}

// ChiUpperQuantile is the x with P(X > x) = q.
func ChiUpperQuantile(q, df float64) float64 {
	if q > 0.5 {
		return ChiQuantile(1-q, df)
	}
	return positiveQuantile(q, func(x float64) (float64, float64) {
		return ChiUpper(x, df), -gammaDensity(df/2, x/2)
	}, df, df > 0)
}
