package lsq

import (
	"math"

	"gonum.org/v1/gonum/floats"
)

// Condition returns an estimate of the 2-norm condition number of the
// independent columns, each scaled to unit norm: the largest singular values
// of R and of R⁻¹ by a few steps of the power method, so it is a lower bound,
// seldom below half the true number. It is 1 when there are no columns.
func (f *Factor) Condition() float64 {
	k := f.rank
	if k == 0 {
		return 1
	}
	if f.cond == 0 {
		w := f.invert()
		u, t, d := w.g[:k], w.lo[:k], w.b[:k]
		// R and R⁻¹ belong to columns of norm f.norm, not 1.
		for q := range d {
			d[q] = 1 / f.norm[f.perm[q]]
		}
		r := upperNorm(f.root, f.m, nil, d, u, t)
		for q := range d {
			d[q] = f.norm[f.perm[q]]
		}
		f.cond = max(1, r*upperNorm(w.s, k, d, nil, u, t))
	}
	return f.cond
}

// upperNorm estimates the 2-norm of the leading upper triangle of a, rows and
// columns multiplied by the elements of row and col when these are given. u
// and t are scratch of the order.
func upperNorm(a []float64, ld int, row, col, u, t []float64) float64 {
	const steps = 12
	for i := range u {
		u[i] = 1 + float64(i%3)/4 // not orthogonal to anything by symmetry
	}
	var norm float64
	for range steps {
		floats.Scale(1/floats.Norm(u, 2), u)
		clear(t)
		for j, v := range u {
			if col != nil {
				v *= col[j]
			}
			floats.AddScaled(t[:j+1], v, a[j*ld:j*ld+j+1])
		}
		if row != nil {
			floats.Mul(t, row)
		}
		norm = floats.Norm(t, 2)
		if norm == 0 {
			return 0
		}
		if row != nil {
			floats.Mul(t, row)
		}
		for j := range u {
			u[j] = floats.Dot(a[j*ld:j*ld+j+1], t[:j+1])
			if col != nil {
				u[j] *= col[j]
			}
		}
	}
	return norm
}

// conditionBound returns an upper bound of the condition number that
// Condition estimates, from ‖A‖₂² ≤ ‖A‖₁ ‖A‖_∞ for R and R⁻¹.
func (f *Factor) conditionBound() float64 {
	k := f.rank
	w := &f.white
	if k == 0 {
		return 1
	}
	rowsR, rowsS := w.g[:k], w.lo[:k]
	clear(rowsR)
	clear(rowsS)
	var oneR, oneS float64
	for j := range k {
		r, s := f.root[j*f.m:j*f.m+j+1], w.s[j*k:j*k+j+1]
		d := 1 / f.norm[f.perm[j]]
		var sumR, sumS float64
		for i := range r {
			v := math.Abs(r[i]) * d
			sumR += v
			rowsR[i] += v
			v = math.Abs(s[i]) * f.norm[f.perm[i]]
			sumS += v
			rowsS[i] += v
		}
		oneR, oneS = max(oneR, sumR), max(oneS, sumS)
	}
	return math.Sqrt(oneR * floats.Max(rowsR) * oneS * floats.Max(rowsS))
}
