package lsq

import (
	"math"

	"example.com/trammel/internal/dd"
	"gonum.org/v1/gonum/floats"
)

// maxPasses bounds the refinement; 6 were needed at condition 2e13.
const maxPasses = 10

// Solve finds the b that minimises ‖y + ylo - X b‖₂ over the independent
// columns (dependent columns get 0) and stores it in s with its residuals.
// y has length n; ylo may be nil. b and r end correct to about 1e-16
// relative, components included as far as the condition allows; a problem
// that an exact float64 b solves without residual ends with that b.
func (f *Factor) Solve(y, ylo []float64, s *Solution) {
	n, p, k := f.p.N, f.p.P, f.rank
	s.resize(n, p)
	s.Passes = 0
	sy, ynorm := powerScale(y)
	r, rlo := s.R, s.RLo
	f.side = side{y, ylo, sy, r, rlo}
	x, xlo := f.x[:k], f.xlo[:k]
	clear(x)
	clear(xlo)
	clear(r)
	clear(rlo)

	clear(f.g[:k])
	scaleTo(f.f, y, sy)
	var lastX, lastR float64 // the largest elements of the last correction
	for {
		ex, er := f.correct()
		if s.Passes > 0 {
			// Corrections shrink by a constant factor until they reach the
			// rounding of double-double, where they stall.
			rate := min(1, max(quotient(ex, lastX), quotient(er, lastR)))
			stalled := s.Passes > 1 && ex > lastX/2 && er > lastR/2
			if stalled || f.settled(rate*ex, rate*er, r, ynorm) {
				break
			}
		}
		if s.Passes == maxPasses || ynorm == 0 {
			break
		}
		lastX, lastR = ex, er
		f.augmented()
		s.Passes++
	}

	f.store(sy, s)
	if floats.Norm(r, math.Inf(1)) <= 0x1p-40*ynorm {
		f.tryExact(s)
	}
	// Σ (r + rlo)²; the square of rlo is below the last digit kept.
	hi, lo := dot2(r, r, rlo)
	hi, lo = dd.TwoSum(hi, lo+floats.Dot(r, rlo))
	back := 1 / sy
	s.RSS = dd.Num{Hi: hi * back * back, Lo: lo * back * back}
	for i, v := range r {
		r[i] = v * back
		rlo[i] *= back
	}
	f.side = side{} // keep none of the caller's slices
}

// quotient is a/b, and 0 for 0/0.
func quotient(a, b float64) float64 {
	if a == 0 {
		return 0
	}
	return a / b
}

// settled reports whether a next correction, predicted as (ex, er) in the
// largest element, would be below rounding.
func (f *Factor) settled(ex, er float64, r []float64, ynorm float64) bool {
	// Either far below the last bit of the smallest element, or not to be had
	// in double-double beside the largest.
	const fine, floor = 0x1p-57, 0x1p-96
	var largest, smallest float64 = 0, math.Inf(1)
	for _, v := range f.x[:f.rank] {
		a := math.Abs(v)
		largest, smallest = max(largest, a), min(smallest, a)
	}
	if ex > fine*smallest && ex > floor*largest {
		return false
	}
	return er <= floor*ynorm || er <= fine*floats.Norm(r, math.Inf(1))
}

// augmented evaluates both residuals of the augmented system into f.f and f.g.
func (f *Factor) augmented() {
	f.each(f.blocks, (*Factor).augmentedBlock)
	k := f.rank
	for q := range k {
		var sum dd.Num
		for b := range f.blocks {
			at := 2*k*b + 2*q
			s, e := dd.TwoSum(f.sums[at], f.sums[at+1])
			sum = sum.Add(dd.Num{Hi: s, Lo: e})
		}
		f.g[q] = -sum.Float()
	}
}

// correct solves the augmented system for the residuals in f.f and f.g, adds
// the correction to x and r, and returns its largest elements.
func (f *Factor) correct() (ex, er float64) {
	k := f.rank
	r, rlo := f.side.r, f.side.rlo
	h := f.h[:k]
	copy(h, f.g[:k])
	solveRT(f.root, f.m, k, h)
	top := f.rotate()
	dx := f.dx[:k]
	for q := range dx {
		dx[q] = top[q] - h[q]
		top[q] = h[q]
	}
	solveR(f.root, f.m, k, dx)
	f.rotateBack()
	for q, v := range dx {
		ex = max(ex, math.Abs(v))
		f.x[q], f.xlo[q] = add3(f.x[q], f.xlo[q], v)
	}
	for i, v := range f.f {
		er = max(er, math.Abs(v))
		r[i], rlo[i] = add3(r[i], rlo[i], v)
	}
	return ex, er
}

// add3 returns hi + lo + v as a hi and lo part.
func add3(hi, lo, v float64) (float64, float64) {
	s, e := dd.TwoSum(hi, v)
	return dd.TwoSum(s, e+lo) // s may be the smaller after cancellation
}

// store writes the solution in the columns' own scale.
func (f *Factor) store(sy float64, s *Solution) {
	clear(s.B)
	clear(s.BLo)
	back := 1 / sy
	for q := range f.rank {
		j := f.perm[q]
		s.B[j] = f.x[q] * back * f.scale[j]
		s.BLo[j] = f.xlo[q] * back * f.scale[j]
	}
}

// tryExact looks whether the estimates rounded to float64, with those that
// are nothing but rounding set to zero, leave no residual at all. A zero
// residual proves them.
func (f *Factor) tryExact(s *Solution) {
	k := f.rank
	var largest float64
	for _, v := range f.x[:k] {
		largest = max(largest, math.Abs(v))
	}
	for q := range k {
		f.xlo[q] = 0
		if math.Abs(f.x[q]) < 0x1p-60*largest {
			f.x[q] = 0
		}
	}
	n := f.p.N
	zero := f.ws.zeros(n)
	f.side.r, f.side.rlo = zero, zero
	f.augmented()
	for _, v := range f.f {
		if v != 0 {
			return
		}
	}
	clear(s.R)
	clear(s.RLo)
	f.store(f.side.sy, s)
}

func (ws *Workspace) zeros(n int) []float64 {
	ws.zero = sized(ws.zero, n)
	clear(ws.zero)
	return ws.zero
}

// resize gives s its lengths, in one allocation if any.
func (s *Solution) resize(n, p int) {
	if cap(s.B) < p || cap(s.BLo) < p || cap(s.R) < n || cap(s.RLo) < n {
		a := arena{make([]float64, 2*n+2*p)}
		s.B, s.BLo, s.R, s.RLo = a.take(p), a.take(p), a.take(n), a.take(n)
		return
	}
	s.B, s.BLo, s.R, s.RLo = s.B[:p], s.BLo[:p], s.R[:n], s.RLo[:n]
}
