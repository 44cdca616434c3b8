package dist

import "math"

// betaDensity is x^a y^b / B(a, b) with y = 1 - x, both given, in Loader's
// saddle-point form: no logarithm of a large gamma function is taken.
func betaDensity(a, b, x, y float64) float64 {
	n := a + b
	// a log(nx/a) + b log(ny/b); the linear parts cancel.
	d := x*b - y*a
	u, v := d/a, -d/b
	var e float64
	if u > -0.4 && u < 0.6 && v > -0.4 && v < 0.6 {
		e = a*log1pmx(u) + b*log1pmx(v)
	} else {
		e = a*logRatio(x, a, n, u) + b*logRatio(y, b, n, v)
	}
	return math.Sqrt(a/n*b/(2*math.Pi)) * math.Exp(e+stirling(n)-stirling(a)-stirling(b))
}

// logRatio is log(x n/a) for u = xn/a - 1.
func logRatio(x, a, n, u float64) float64 {
	if u > -0.4 && u < 0.6 {
		return math.Log1p(u)
	}
	return math.Log(x / (a / n))
}

// betaTails are the regularised incomplete beta functions I_x(a, b) and
// 1 - I_x(a, b) = I_y(b, a), with y = 1 - x given beside x so that neither
// loses digits. The continued fraction is taken, by the modified method of
// Lentz, on the side where it converges fast.
func betaTails(a, b, x, y float64) (lower, upper float64) {
	switch {
	case !(a > 0) || !(b > 0) || !(x >= 0) || !(y >= 0):
		return math.NaN(), math.NaN()
	case x == 0:
		return 0, 1
	case y == 0:
		return 1, 0
	}
	// On the side of the mean a/(a+b) that x is on, all parts are positive.
	if a*y-b*x >= 0 || x*(a+b+2) < a+1 {
		lower = math.Min(betaDensity(a, b, x, y)*betaFraction(a, b, x, y), 1)
		return lower, 1 - lower
	}
	upper = math.Min(betaDensity(a, b, x, y)*betaFraction(b, a, y, x), 1)
	return 1 - upper, upper
}

// betaFraction is I_x(a, b) over x^a y^b / B(a, b): 1/(β1 + α1/(β2 + α2/(β3 +
// …))) in the form of A. R. DiDonato and A. H. Morris, "Significant digit
// computation of the incomplete beta function ratios", ACM TOMS 18 (1992)
// 360-373, eq. 9, which does not cancel for large a or b.
func betaFraction(a, b, x, y float64) float64 {
	const tiny = 1e-300
	clear := func(v float64) float64 {
		if math.Abs(v) < tiny {
			return tiny
		}
		return v
	}
	lambda := a*y - b*x // a - (a+b)x
	beta := a / (a + 1) * (lambda + 1)
	c, d := clear(beta), 0.0
	f := c
	for n := 1.0; n < 1e7; n++ {
		s := a + 2*n - 1
		alpha := (a + n - 1) / s * ((a + b + n - 1) / s) * n * (b - n) * x * x
		beta = n + n*(b-n)*x/s + (a+n)/(a+2*n+1)*(lambda+1+n*(1+y))
		d = 1 / clear(beta+alpha*d)
		c = clear(beta + alpha/c)
		step := c * d
		f *= step
		if math.Abs(step-1) < 1e-16 {
			break
		}
	}
	return 1 / f
}
