package lsq

import "gonum.org/v1/gonum/floats"

// Sandwich returns (X'X)⁻¹ M (X'X)⁻¹, p×p row-major and symmetric, in dst when
// that is long enough. M is the sum over groups of u u', u the sum of d[i] x_i
// over the group's rows; without a group list each row is a group of its own.
// It is formed in the orthonormal columns that span X, so that the condition of
// X enters once, with the inverse. Full rank is needed. It allocates, and is not
// safe for concurrent use.
func (f *Factor) Sandwich(dst, d []float64, group []int32, groups int) []float64 {
	p, k := f.p.P, f.rank
	w := f.whiten()
	meat := make([]float64, k*k)
	var sums []float64
	if group != nil {
		sums = make([]float64, groups*k)
	}
	for block := range f.blocks {
		b, m := f.orthoBlock(0, block)
		from := block * f.block
		for j := range k {
			bj := b[j*f.block : j*f.block+m]
			for i, v := range d[from : from+m] {
				bj[i] *= v
			}
			if group != nil {
				for i, g := range group[from : from+m] {
					sums[int(g)*k+j] += bj[i]
				}
				continue
			}
			for i := range j + 1 {
				meat[j*k+i] += floats.Dot(b[i*f.block:i*f.block+m], bj)
			}
		}
	}
	for g := range groups {
		if group == nil {
			break
		}
		u := sums[g*k : (g+1)*k]
		for j := range k {
			floats.AddScaled(meat[j*k:j*k+j+1], u[j], u[:j+1])
		}
	}
	return f.betweenInverse(dst, meat, p, w)
}

// betweenInverse returns V M V' in the columns' own scale and order; meat is the
// lower triangle of M.
func (f *Factor) betweenInverse(dst, meat []float64, p int, w *whitened) []float64 {
	k := f.rank
	dst = sized(dst, p*p)
	half := make([]float64, k*k) // V M
	for a := range k {
		for j := range k {
			s := 0.0
			for i := a; i < k; i++ {
				s += w.v[a*k+i] * meat[max(i, j)*k+min(i, j)]
			}
			half[a*k+j] = s
		}
	}
	for a := range k {
		i := f.perm[a]
		for b := a; b < k; b++ {
			j := f.perm[b]
			s := floats.Dot(half[a*k+b:(a+1)*k], w.v[b*k+b:(b+1)*k]) * f.scale[i] * f.scale[j]
			dst[i*p+j], dst[j*p+i] = s, s
		}
	}
	return dst
}

// orthoBlock returns the m rows of a block of X V, up to sign: orthonormal
// columns that span X, column j at j·f.block.
func (f *Factor) orthoBlock(worker, block int) (b []float64, m int) {
	w := &f.white
	b, m = f.whitenBlock(worker, block)
	if w.plain {
		return b, m
	}
	for j := range f.rank {
		bj := b[j*f.block : j*f.block+m]
		for i := range j {
			floats.AddScaled(bj, -w.l[j*f.rank+i], b[i*f.block:i*f.block+m])
		}
		floats.Scale(1/w.l[j*f.rank+j], bj)
	}
	return b, m
}

// SandwichOf is Sandwich with the lower triangle of M, row-major, given in the
// coordinates of WhitenTo.
func (f *Factor) SandwichOf(dst, meat []float64) []float64 {
	return f.betweenInverse(dst, meat, f.p.P, f.whiten())
}

// WhitenTo writes to dst the vector u with u'u = x'(X'X)⁻¹x, and so with the
// inner products of all rows, for a row x of length p. Full rank is needed.
// scratch has length QuadScratch.
func (f *Factor) WhitenTo(dst, x, scratch []float64) {
	f.QuadForm(x, nil, scratch)
	copy(dst, scratch[2*f.rank:3*f.rank])
}
