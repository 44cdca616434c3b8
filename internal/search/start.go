package search

import (
	"math"
	"slices"
)

// A start is a point with its sum of squares after the linear parameters are
// found.
type start struct {
	theta []float64
	rss   float64
}

// starts draws points from an additive recurrence on the powers of the
// generalised golden ratio (H. Weyl; the constants after M. Roberts, recalled),
// shifted by the seed.
func (s *solver) starts(most int) [][]float64 {
	p := s.p
	// sought holds one coefficient of each group, leader the place of each
	// coefficient's group in it.
	var sought []int
	leader := make([]int, p.P)
	places := make(map[int]int)
	for j := range p.P {
		leader[j] = -1
		if p.Linear[j] || p.Range[j].Low >= p.Range[j].High {
			continue
		}
		group := -1 - j
		if p.Group != nil {
			group = p.Group[j]
		}
		k, ok := places[group]
		if !ok {
			k = len(sought)
			places[group] = k
			sought = append(sought, j)
		}
		leader[j] = k
	}
	d := 2 * len(sought) // a second coordinate gives each its sign
	n := min(mostStarts, startsPerParameter*max(1, len(sought)))
	if len(sought) == 0 {
		n = 1
	}
	n = min(n, max(1, most))
	phi := 2.0
	for range 40 {
		phi = math.Pow(1+phi, 1/float64(d+1))
	}
	shift := float64(s.o.Seed%1_000_003) / 1_000_003
	out := make([][]float64, n)
	for i := range out {
		theta := make([]float64, p.P)
		for j := range theta {
			if !p.Linear[j] {
				theta[j] = p.Range[j].Low
			}
		}
		for j, k := range leader {
			if k < 0 {
				continue
			}
			u := fraction(0.5 + shift + float64(i+1)*math.Pow(1/phi, float64(k+1)))
			v := fraction(0.5 + shift + float64(i+1)*math.Pow(1/phi, float64(len(sought)+k+1)))
			theta[j] = p.Range[j].at(u, v)
		}
		s.clip(theta)
		out[i] = theta
	}
	return out
}

func fraction(x float64) float64 { return x - math.Floor(x) }

// at is the point u of the way through a range; v chooses the sign of a log range
// on both sides of 0.
func (r Range) at(u, v float64) float64 {
	if !r.Log {
		return r.Low + u*(r.High-r.Low)
	}
	low, high, sign := r.Low, r.High, 1.0
	switch {
	case r.High <= 0:
		low, high, sign = -r.High, -r.Low, -1
	case r.Low < 0:
		if v < 0.25 {
			sign, high = -1, -r.Low
		}
		low = high * 1e-5
	}
	if low <= 0 {
		low = high * 1e-5
	}
	return sign * math.Exp(math.Log(low)+u*(math.Log(high)-math.Log(low)))
}

// rank finds the linear parameters of every start and sorts by sum of squares.
func (s *solver) rank(points [][]float64) []start {
	all := make([]start, len(points))
	s.parallel(len(points), func(i int) {
		w := s.newWork()
		theta := slices.Clone(points[i])
		all[i] = start{theta, s.project(w, theta)}
	})
	var out []start
	for _, a := range all {
		if a.rss-a.rss == 0 {
			out = append(out, a)
		}
	}
	sortStarts(out)
	return out
}

func sortStarts(list []start) {
	slices.SortStableFunc(list, func(a, b start) int {
		switch {
		case a.rss < b.rss:
			return -1
		case a.rss > b.rss:
			return 1
		}
		return 0
	})
}

// project puts the best values of the linear parameters into theta and returns
// the sum of squares; +Inf when the model is not finite there.
func (s *solver) project(w *work, theta []float64) float64 {
	p := s.p
	var linear []int
	for j, l := range p.Linear {
		if l {
			linear = append(linear, j)
			theta[j] = 0
		}
	}
	s.count()
	if len(linear) == 0 {
		if !p.Eval(theta, w.f, nil, nil, nil) {
			return math.Inf(1)
		}
		return s.residual(w)
	}
	if !p.Eval(theta, w.f, w.jac, nil, nil) {
		return math.Inf(1)
	}
	s.residual(w)
	// f is affine: columns of the Jacobian times the parameters, and f at 0.
	n := p.N
	a := w.scratch[:n*len(linear)]
	for k, j := range linear {
		copy(a[k*n:(k+1)*n], w.jac[j*n:(j+1)*n])
		for i := range n {
			if p.Root != nil {
				a[k*n+i] *= p.Root[i]
			}
			if v := a[k*n+i]; v-v != 0 {
				return math.Inf(1)
			}
		}
	}
	x := make([]float64, len(linear))
	var rss float64
	if s.tall() {
		// The weighted columns stand in a; the Gram matrix is formed from there.
		m := (&solver{p: &Problem{N: n, P: len(linear)}}).gramOf(&work{jac: a, r: w.r}, all(len(linear)))
		y, ok := newton(m.a, m.g, len(linear), all(len(linear)))
		if !ok {
			return math.Inf(1)
		}
		copy(x, y)
		rss = s.residual(w)
		for k, v := range x {
			rss -= v * m.g[k]
		}
		rss = math.Max(rss, 0)
	} else {
		rss = leastSquares(a, n, len(linear), w.r, x)
	}
	for k, j := range linear {
		theta[j] = x[k]
	}
	if p.Low != nil {
		before := slices.Clone(theta)
		s.clip(theta)
		if !slices.Equal(before, theta) {
			s.count()
			if !p.Eval(theta, w.f, nil, nil, nil) {
				return math.Inf(1)
			}
			return s.residual(w)
		}
	}
	return rss
}

// all lists 0 … n-1.
func all(n int) []int {
	out := make([]int, n)
	for i := range out {
		out[i] = i
	}
	return out
}

// residual fills w.r from w.f and returns its sum of squares.
func (s *solver) residual(w *work) float64 {
	sum := 0.0
	for i, y := range s.p.Y {
		r := y - w.f[i]
		if s.p.Root != nil {
			r *= s.p.Root[i]
		}
		w.r[i] = r
		sum += r * r
	}
	return sum
}
