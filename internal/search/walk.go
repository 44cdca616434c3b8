package search

import (
	"math"
	"slices"
)

// A walk is one refinement from a start to where it ended.
type walk struct {
	theta      []float64
	rss        float64
	offset     float64
	iterations int
	spent      bool // the budget ended it
	given      bool // it began at the start that was given
}

// work is the scratch of one walk.
type work struct {
	f, r, jac, scratch []float64
}

func (s *solver) newWork() *work {
	n, p := s.p.N, s.p.P
	return &work{f: make([]float64, n), r: make([]float64, n), jac: make([]float64, n*p), scratch: make([]float64, n*p)}
}

// evaluate fills residuals and, weighted, the Jacobian at theta.
func (s *solver) evaluate(w *work, theta []float64, derivatives bool) float64 {
	s.count()
	jac := w.jac
	if !derivatives {
		jac = nil
	}
	if !s.p.Eval(theta, w.f, jac, nil, nil) {
		return math.Inf(1)
	}
	if derivatives && s.p.Root != nil {
		n := s.p.N
		for j := range s.p.P {
			for i := range n {
				w.jac[j*n+i] *= s.p.Root[i]
			}
		}
	}
	return s.residual(w)
}

// refine walks downhill from theta by Levenberg-Marquardt steps; with project the
// linear parameters are found afresh after each. nil when the start is not finite.
func (s *solver) refine(from []float64, budget int, project bool) *walk {
	p, n := s.p.P, s.p.N
	w := s.newWork()
	theta := slices.Clone(from)
	s.clip(theta)
	rss := s.evaluate(w, theta, true)
	if math.IsInf(rss, 0) || math.IsNaN(rss) {
		return nil
	}
	projecting := project && slices.Contains(s.p.Linear, true)
	scale := make([]float64, p)
	gradient := make([]float64, p)
	trial, delta := make([]float64, p), make([]float64, p)
	out := &walk{offset: math.Inf(1)}
	lambda, grow := 1e-3, 2.0
	small := 0
	evals := 1
	for out.iterations = 0; ; out.iterations++ {
		if evals >= budget {
			out.spent = true
			break
		}
		bad := false
		for j := range p {
			c := w.jac[j*n : (j+1)*n]
			sum, g := 0.0, 0.0
			for i, v := range c {
				sum += v * v
				g += v * w.r[i]
			}
			scale[j] = math.Max(scale[j], math.Sqrt(sum))
			gradient[j] = g
			bad = bad || sum-sum != 0
		}
		if bad {
			break
		}
		free := s.freeOf(theta, gradient)
		var normal *gram
		if s.tall() && len(free) > 0 {
			normal = s.gramOf(w, free)
		}
		if out.offset = s.offset(w, free, rss, normal); out.offset < 1e-9 || len(free) == 0 {
			break
		}
		accepted := false
		var moved float64
		for try := 0; try < 60; try++ {
			if normal == nil || !normal.step(free, scale, lambda, delta) {
				marquardt(w, n, free, scale, lambda, delta)
			}
			copy(trial, theta)
			for k, j := range free {
				trial[j] += delta[k]
			}
			s.clip(trial)
			moved = 0
			predicted := 0.0
			for _, j := range free {
				d := trial[j] - theta[j]
				moved = math.Max(moved, math.Abs(d)/(math.Abs(theta[j])+1e-300))
				predicted += d * (lambda*scale[j]*scale[j]*d + gradient[j])
			}
			if moved < 0x1p-53 {
				break
			}
			t := s.newTrial(w)
			evals++
			next := s.evaluate(t, trial, false)
			if projecting && next < math.Inf(1) {
				again := slices.Clone(trial)
				evals++
				if v := s.project(t, again); v < next {
					copy(trial, again)
					next = v
				}
			}
			if next < rss {
				ratio := (rss - next) / math.Max(predicted, 1e-300)
				lambda *= math.Max(1.0/3, 1-math.Pow(2*ratio-1, 3))
				lambda = math.Max(lambda, 1e-15)
				grow = 2
				accepted = true
				break
			}
			lambda *= grow
			grow *= 2
			if lambda > 1e20 {
				break
			}
		}
		if !accepted {
			break
		}
		before := rss
		copy(theta, trial)
		evals++
		rss = s.evaluate(w, theta, true)
		if before-rss <= 1e-14*before {
			if small++; small >= 4 {
				break
			}
		} else {
			small = 0
		}
		if rss == 0 {
			break
		}
	}
	out.theta, out.rss = theta, rss
	return out
}

// newTrial is scratch for a point that may be refused.
func (s *solver) newTrial(w *work) *work {
	return &work{f: make([]float64, s.p.N), r: make([]float64, s.p.N), jac: make([]float64, len(w.jac)), scratch: w.scratch}
}

// freeOf lists the parameters that are not held at a bound by the slope there.
func (s *solver) freeOf(theta, gradient []float64) []int {
	var free []int
	for j := range theta {
		if s.p.Low != nil {
			if theta[j] <= s.p.Low[j] && gradient[j] <= 0 || theta[j] >= s.p.High[j] && gradient[j] >= 0 {
				continue
			}
		}
		free = append(free, j)
	}
	return free
}

// offset is the relative offset: the length of the residual vector's part in the
// tangent plane over that of the rest, each by its degrees of freedom.
func (s *solver) offset(w *work, free []int, rss float64, normal *gram) float64 {
	n, k := s.p.N, len(free)
	if k == 0 {
		return 0
	}
	var in, left float64
	if normal != nil {
		in = math.Min(normal.inTangent(), rss)
		left = rss - in
	} else {
		a := w.scratch[:n*k]
		for q, j := range free {
			copy(a[q*n:(q+1)*n], w.jac[j*n:(j+1)*n])
		}
		left = leastSquares(a, n, k, w.r, make([]float64, k))
		in = math.Max(0, rss-left)
	}
	if n <= k {
		return math.Sqrt(in) / math.Sqrt(s.size()+1e-300)
	}
	return math.Sqrt(in/float64(k)) / math.Sqrt(math.Max(left, 1e-300)/float64(n-k))
}

// marquardt solves min ‖J δ - r‖² + λ‖D δ‖² for the free parameters.
func marquardt(w *work, n int, free []int, scale []float64, lambda float64, delta []float64) {
	k := len(free)
	rows := n + k
	a, b := make([]float64, rows*k), make([]float64, rows)
	for q, j := range free {
		copy(a[q*rows:], w.jac[j*n:(j+1)*n])
		a[q*rows+n+q] = math.Sqrt(lambda) * scale[j]
		if scale[j] == 0 {
			a[q*rows+n+q] = 1
		}
	}
	copy(b, w.r)
	leastSquares(a, rows, k, b, delta[:k])
}

// leastSquares overwrites a (n×k, column-major) and solves min ‖a x - b‖ by
// Householder QR on columns of unit norm with pivoting; columns that depend on
// others get 0. It returns the sum of squares left. b is not changed.
func leastSquares(a []float64, n, k int, b, x []float64) float64 {
	r := slices.Clone(b)
	norm := make([]float64, k)
	perm := make([]int, k)
	for j := range k {
		perm[j] = j
		big := 0.0
		c := a[j*n : (j+1)*n]
		for _, v := range c {
			big = math.Max(big, math.Abs(v))
		}
		if big == 0 || big-big != 0 {
			continue
		}
		sum := 0.0
		for _, v := range c {
			sum += (v / big) * (v / big)
		}
		norm[j] = big * math.Sqrt(sum)
		for i := range c {
			c[i] /= norm[j]
		}
	}
	diag := make([]float64, k)
	rank := 0
	for ; rank < min(n, k); rank++ {
		best, most := -1, 1e-24
		for q := rank; q < k; q++ {
			sum := 0.0
			for _, v := range a[perm[q]*n+rank : (perm[q]+1)*n] {
				sum += v * v
			}
			if norm[perm[q]] > 0 && sum > most {
				best, most = q, sum
			}
		}
		if best < 0 {
			break
		}
		perm[rank], perm[best] = perm[best], perm[rank]
		c := a[perm[rank]*n : (perm[rank]+1)*n]
		length := math.Sqrt(most)
		alpha := -math.Copysign(length, c[rank])
		c[rank] -= alpha
		vv := 0.0
		for _, v := range c[rank:] {
			vv += v * v
		}
		reflect := func(y []float64) {
			s := 0.0
			for i := rank; i < n; i++ {
				s += c[i] * y[i]
			}
			s *= 2 / vv
			for i := rank; i < n; i++ {
				y[i] -= s * c[i]
			}
		}
		if vv > 0 {
			for q := rank + 1; q < k; q++ {
				reflect(a[perm[q]*n : (perm[q]+1)*n])
			}
			reflect(r)
		}
		diag[rank] = alpha
	}
	clear(x)
	for q := rank - 1; q >= 0; q-- {
		v := r[q]
		for t := q + 1; t < rank; t++ {
			v -= a[perm[t]*n+q] * x[perm[t]]
		}
		x[perm[q]] = v / diag[q]
	}
	for j := range x {
		if norm[j] > 0 {
			x[j] /= norm[j]
		}
	}
	left := 0.0
	for _, v := range r[min(rank, n):] {
		left += v * v
	}
	return left
}
