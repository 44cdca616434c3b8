package lsq

import "math"

// blockRows is the number of rows of a block in passes over the rows: two
// accumulators and two columns of it fit the first cache.
const blockRows = 256

// Factorize returns the pivoted QR factorisation of p.X scaled by columns.
// Rank is the number of pivots whose relative remaining norm is at least
// Tolerance; a zero column is dependent. n < p, n = 0 and p = 0 are allowed.
// ws may be nil.
func Factorize(p *Problem, ws *Workspace) *Factor {
	if ws == nil {
		ws = new(Workspace)
	}
	n, c := p.N, p.P
	f := &ws.factor
	*f = Factor{p: p, ws: ws}
	r := min(n, c)
	leafRows, leaves := leafPlan(n, c)
	m := n
	if leaves > 0 {
		m = leaves * c
	}
	f.block = max(1, min(n, blockRows))
	f.blocks = (n + f.block - 1) / f.block
	f.workers = workersFor(p)

	need := n*c + 5*c + n + 5*r + 2*f.block*f.workers + 2*r*f.blocks + 2*c
	if leaves > 0 {
		need += m*c + m + leaves*c // root, t, the taus of the leaves
	}
	ws.floats = sized(ws.floats, need)
	ws.ints = sizedInts(ws.ints, c)
	a := arena{ws.floats}
	body := a.take(n * c)
	f.scale, f.norm = a.take(c), a.take(c)
	f.tau, f.pivot = a.take(c), a.take(c)[:0]
	f.f = a.take(n)
	f.x, f.xlo, f.g, f.h, f.dx = a.take(r), a.take(r), a.take(r), a.take(r), a.take(r)
	f.work = a.take(2 * f.block * f.workers)
	f.sums = a.take(2 * r * f.blocks)
	remaining := a.take(c)
	reference := a.take(c)
	f.perm = ws.ints[:c]

	for j := range f.perm {
		f.perm[j] = j
	}
	f.each(c, (*Factor).scaleColumn)
	for j, s := range f.scale {
		if s > farScale || s < 1/farScale {
			f.keepScaled(j)
		}
	}
	if leaves == 0 {
		f.root, f.m = body, n
		for j := range c {
			scaleTo(body[j*n:(j+1)*n], p.X[j*n:(j+1)*n], f.scale[j])
		}
	} else {
		f.leaves = leafBlocks{rows: leafRows, count: leaves, a: body, tau: a.take(leaves * c)}
		f.root, f.m = a.take(m*c), m
		f.t = a.take(m)
		f.each(leaves, (*Factor).factorizeLeaf)
	}
	f.pivotRoot(remaining, reference)
	return f
}

func (f *Factor) scaleColumn(_, j int) {
	n := f.p.N
	f.scale[j], f.norm[j] = powerScale(f.p.X[j*n : (j+1)*n])
}

// keepScaled stores a scaled copy of column j.
func (f *Factor) keepScaled(j int) {
	n := f.p.N
	if f.far == nil {
		f.far = make([][]float64, f.p.P)
		f.farLo = make([][]float64, f.p.P)
	}
	f.far[j] = make([]float64, n)
	scaleTo(f.far[j], f.p.X[j*n:(j+1)*n], f.scale[j])
	if f.p.XLo != nil {
		f.farLo[j] = make([]float64, n)
		scaleTo(f.farLo[j], f.p.XLo[j*n:(j+1)*n], f.scale[j])
	}
}

// column returns the hi and lo parts of column j and the scale still to be
// applied to them; lo is nil when it is zero.
func (f *Factor) column(j int) (hi, lo []float64, scale float64) {
	if f.far != nil && f.far[j] != nil {
		return f.far[j], f.farLo[j], 1
	}
	n := f.p.N
	if f.p.XLo != nil {
		lo = f.p.XLo[j*n : (j+1)*n]
	}
	return f.p.X[j*n : (j+1)*n], lo, f.scale[j]
}

// pivotRoot factorises the root with column pivoting on relative remaining
// norms. Norms are downdated and recomputed when cancellation would spoil
// them (Z. Drmač and Z. Bujanović, "On the failure of rank-revealing QR
// factorization software", ACM TOMS 35 (2008) 12).
func (f *Factor) pivotRoot(remaining, reference []float64) {
	const recompute = 1.5e-8 // √ of the unit roundoff
	m, p := f.m, f.p.P
	for j := range p {
		remaining[j] = f.norm[j]
		reference[j] = f.norm[j]
	}
	// remaining and reference go by column, not by position.
	for k := 0; k < min(m, p); k++ {
		best, at := -1.0, k
		for q := k; q < p; q++ {
			j := f.perm[q]
			if f.norm[j] == 0 {
				continue
			}
			if v := remaining[j] / f.norm[j]; v > best {
				best, at = v, q
			}
		}
		if best < 0 {
			return // only zero columns are left
		}
		if at != k {
			swapColumns(f.root[k*m:(k+1)*m], f.root[at*m:(at+1)*m])
			f.perm[k], f.perm[at] = f.perm[at], f.perm[k]
		}
		v := f.root[k*m+k : (k+1)*m]
		tau := makeReflector(v)
		rel := math.Abs(v[0]) / f.norm[f.perm[k]]
		f.pivot = append(f.pivot, rel)
		if !(rel >= Tolerance) {
			// The reflection is kept out of tau: R12 of the dependent columns
			// lies above row k and is complete.
			return
		}
		f.tau[k] = tau
		f.rank = k + 1
		for q := k + 1; q < p; q++ {
			c := f.root[q*m+k : (q+1)*m]
			applyReflection(v, tau, c)
			j := f.perm[q]
			if remaining[j] == 0 {
				continue
			}
			t := math.Abs(c[0]) / remaining[j]
			t = max(0, (1-t)*(1+t))
			u := remaining[j] / reference[j]
			if t*u*u > recompute {
				remaining[j] *= math.Sqrt(t)
				continue
			}
			s, e := norm2(c[1:])
			remaining[j] = math.Ldexp(s, e)
			reference[j] = remaining[j]
		}
	}
}

func swapColumns(a, b []float64) {
	for i, v := range a {
		a[i], b[i] = b[i], v
	}
}

// An arena hands out parts of one allocation.
type arena struct{ rest []float64 }

func (a *arena) take(k int) []float64 {
	s := a.rest[:k:k]
	a.rest = a.rest[k:]
	return s
}

func sized(s []float64, n int) []float64 {
	if cap(s) < n {
		return make([]float64, n)
	}
	return s[:n]
}

func sizedInts(s []int, n int) []int {
	if cap(s) < n {
		return make([]int, n)
	}
	return s[:n]
}
