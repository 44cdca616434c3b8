package search

import (
	"math"

	"example.com/trammel/internal/dd"
)

// polish takes Newton steps with exact second derivatives from the end of a walk
// until a step is below 4 units in the last place of every parameter, or has not
// shrunk for 3 steps.
func (s *solver) polish(w *walk) {
	p, n := s.p.P, s.p.N
	k := s.newWork()
	hess := make([]float64, p*p)
	v := make([]float64, n)
	gradient := make([]float64, p)
	theta := append([]float64(nil), w.theta...)
	last, stalls := math.Inf(1), 0
	for range 100 {
		s.count()
		clear(hess)
		// v = -Root²·r makes the second-order part of the Hessian of half the sum.
		if math.IsInf(s.evaluate(k, theta, true), 0) {
			return
		}
		for i := range n {
			v[i] = -k.r[i]
			if s.p.Root != nil {
				v[i] *= s.p.Root[i]
			}
		}
		f := make([]float64, n)
		if !s.p.Eval(theta, f, make([]float64, n*p), v, hess) {
			return
		}
		s.addGram(k, hess, gradient)
		free := s.freeOf(theta, gradient)
		step, ok := newton(hess, gradient, p, free)
		if !ok {
			return
		}
		worst := 0.0
		next := append([]float64(nil), theta...)
		for q, j := range free {
			next[j] += step[q]
			worst = math.Max(worst, math.Abs(step[q])/math.Max(math.Abs(theta[j]), 1e-300))
		}
		s.clip(next)
		t := s.newTrial(k)
		rss := s.evaluate(t, next, false)
		// Near the minimum the sum of squares is flat to rounding; a step is taken
		// unless it clearly goes uphill.
		if !(rss <= w.rss*(1+1e-9)+1e-300) {
			return
		}
		theta = next
		w.theta, w.rss = theta, rss
		w.iterations++
		if worst <= 4*0x1p-52 {
			break
		}
		if worst >= last {
			if stalls++; stalls >= 3 {
				break
			}
		} else {
			stalls = 0
			last = worst
		}
	}
	w.rss = s.evaluate(k, w.theta, true)
	for j := range p {
		g := 0.0
		for i, x := range k.jac[j*n : (j+1)*n] {
			g += x * k.r[i]
		}
		gradient[j] = g
	}
	free := s.freeOf(w.theta, gradient)
	var normal *gram
	if s.tall() && len(free) > 0 {
		normal = s.gramOf(k, free)
	}
	w.offset = s.offset(k, free, w.rss, normal)
}

// newton solves H δ = g for the free parameters by Cholesky's method on
// variables scaled to a unit diagonal; ok is false when H is not positive
// definite. One step of refinement follows.
func newton(hess, gradient []float64, p int, free []int) ([]float64, bool) {
	k := len(free)
	d := make([]float64, k)
	for q, j := range free {
		if !(hess[j*p+j] > 0) {
			return nil, false
		}
		d[q] = 1 / math.Sqrt(hess[j*p+j])
	}
	a, l := make([]float64, k*k), make([]float64, k*k)
	g := make([]float64, k)
	for q, i := range free {
		for t, j := range free {
			a[q*k+t] = hess[i*p+j] * d[q] * d[t]
		}
		g[q] = gradient[i] * d[q]
	}
	for i := range k {
		for j := range i + 1 {
			sum := dd.Of(a[i*k+j])
			for t := range j {
				hi, lo := dd.TwoProd(l[i*k+t], l[j*k+t])
				sum = sum.Sub(dd.Num{Hi: hi, Lo: lo})
			}
			if i == j {
				if !(sum.Hi > 1e-15) {
					return nil, false
				}
				l[i*k+i] = math.Sqrt(sum.Float())
			} else {
				l[i*k+j] = sum.Float() / l[j*k+j]
			}
		}
	}
	solve := func(b []float64) []float64 {
		x := append([]float64(nil), b...)
		for i := range k {
			for t := range i {
				x[i] -= l[i*k+t] * x[t]
			}
			x[i] /= l[i*k+i]
		}
		for i := k - 1; i >= 0; i-- {
			for t := i + 1; t < k; t++ {
				x[i] -= l[t*k+i] * x[t]
			}
			x[i] /= l[i*k+i]
		}
		return x
	}
	x := solve(g)
	r := make([]float64, k)
	for i := range k {
		sum := dd.Of(g[i])
		for t := range k {
			hi, lo := dd.TwoProd(a[i*k+t], x[t])
			sum = sum.Sub(dd.Num{Hi: hi, Lo: lo})
		}
		r[i] = sum.Float()
	}
	for i, v := range solve(r) {
		x[i] = (x[i] + v) * d[i]
	}
	return x, true
}
