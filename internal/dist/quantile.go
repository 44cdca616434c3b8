package dist

import "math"

// positiveQuantile solves tail(x) = p for x > 0, where eval gives the tail,
// monotone in x, and x times its derivative. The search runs in log x on
// log tail, where all these tails are nearly straight far out: Newton steps
// kept inside a bracket that shrinks by halving whenever a step leaves it.
func positiveQuantile(p float64, eval func(x float64) (tail, slope float64), start float64, ok bool) float64 {
	if !ok || !(p >= 0 && p <= 1) {
		return math.NaN()
	}
	_, s := eval(start)
	rising := s > 0
	if p == 0 {
		if rising {
			return 0
		}
		return math.Inf(1)
	}
	lo, hi := math.Log(math.SmallestNonzeroFloat64), math.Log(math.MaxFloat64)
	z := math.Log(start)
	x := start
	want := math.Log(p)
	for k := range 400 {
		tail, slope := eval(x)
		below := tail < p == rising // the solution lies above x
		if tail == p {
			return x
		}
		if below {
			lo = z
		} else {
			hi = z
		}
		// d log(tail)/d log(x) = slope/tail.
		next := math.NaN()
		if tail > 0 && slope != 0 {
			if math.Abs(tail-p) < 0.1*p {
				next = z + math.Log1p((p-tail)/tail)*tail/slope
			} else {
				next = z + (want-math.Log(tail))*tail/slope
			}
		}
		// So near, the bracket in log x has no digits left to judge the step by.
		if near := math.Abs(next-z) < 1e-10; !(near || next > lo && next < hi) || k > 60 {
			next = lo + (hi-lo)/2
		}
		step := next - z
		if math.Abs(step) < 1e-8 {
			// x·e^step, kept accurate: log x itself has no digits to spare.
			was := x
			x += x * math.Expm1(step)
			z = next
			if math.Abs(step) < 3e-16 || x == was {
				return x
			}
			continue
		}
		z = next
		x = math.Exp(z)
	}
	return x
}
