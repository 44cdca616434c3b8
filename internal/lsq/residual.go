package lsq

import (
	"math"

	"example.com/trammel/internal/dd"
	"gonum.org/v1/gonum/floats"
)

// The kernels below accumulate products as in T. Ogita, S. M. Rump and
// S. Oishi, "Accurate sum and dot product", SIAM J. Sci. Comput. 26 (2005)
// 1955-1988: the high part by error-free sums, the errors in the low part.
// The result is as good as one computed in twice the working precision.

// subtractColumn subtracts (x+xlo)·a from hi + lo.
func subtractColumn(hi, lo, a []float64, x, xlo float64) {
	hi, lo = hi[:len(a)], lo[:len(a)]
	for i, v := range a {
		p := float64(v * x)
		e := math.FMA(v, x, -p)
		h := hi[i]
		s := h - p
		t := s - h
		err := (h - (s - t)) - (p + t)
		hi[i] = s
		lo[i] += math.FMA(-v, xlo, err-e)
	}
}

// subtractColumns2 is subtractColumn for two columns at once.
func subtractColumns2(hi, lo, a, b []float64, xa, xalo, xb, xblo float64) {
	n := len(a)
	hi, lo, b = hi[:n], lo[:n], b[:n]
	for i, v := range a {
		h, l := hi[i], lo[i]
		p := float64(v * xa)
		e := math.FMA(v, xa, -p)
		s := h - p
		t := s - h
		l += math.FMA(-v, xalo, ((h-(s-t))-(p+t))-e)
		w := b[i]
		p = float64(w * xb)
		e = math.FMA(w, xb, -p)
		h = s - p
		t = h - s
		l += math.FMA(-w, xblo, ((s-(h-t))-(p+t))-e)
		hi[i], lo[i] = h, l
	}
}

// dot2 returns a·(r+rlo) as hi + lo.
func dot2(a, r, rlo []float64) (hi, lo float64) {
	r, rlo = r[:len(a)], rlo[:len(a)]
	for i, v := range a {
		p := float64(v * r[i])
		e := math.FMA(v, r[i], -p)
		s := hi + p
		t := s - hi
		lo += math.FMA(v, rlo[i], ((hi-(s-t))+(p-t))+e)
		hi = s
	}
	return hi, lo
}

// dots2 is dot2 for two columns at once.
func dots2(a, b, r, rlo []float64) (ahi, alo, bhi, blo float64) {
	n := len(a)
	b, r, rlo = b[:n], r[:n], rlo[:n]
	for i, v := range a {
		x, xlo := r[i], rlo[i]
		p := float64(v * x)
		e := math.FMA(v, x, -p)
		s := ahi + p
		t := s - ahi
		alo += math.FMA(v, xlo, ((ahi-(s-t))+(p-t))+e)
		ahi = s
		w := b[i]
		p = float64(w * x)
		e = math.FMA(w, x, -p)
		s = bhi + p
		t = s - bhi
		blo += math.FMA(w, xlo, ((bhi-(s-t))+(p-t))+e)
		bhi = s
	}
	return ahi, alo, bhi, blo
}

// side is the state of a refinement: the right-hand side, the power of two
// applied to it, and the residuals so far.
type side struct {
	y, ylo []float64
	sy     float64
	r, rlo []float64
}

// augmentedBlock computes, for the rows of a block, f = sy·y - r - A x into
// f.f and the block's part of A'r into f.sums (hi and lo by position). A is
// the scaled matrix; x is scaled accordingly.
func (f *Factor) augmentedBlock(worker, block int) {
	from := block * f.block
	to := min(from+f.block, f.p.N)
	m := to - from
	work := f.work[2*f.block*worker:]
	hi, lo := work[:m], work[f.block:f.block+m]
	sums := f.sums[2*f.rank*block : 2*f.rank*(block+1)]
	y, ylo, sy := f.side.y, f.side.ylo, f.side.sy
	rb, rl := f.side.r[from:to], f.side.rlo[from:to]
	yb := y[from:to]
	for i := range hi {
		s, e := dd.TwoSum(yb[i]*sy, -rb[i])
		hi[i], lo[i] = s, e-rl[i]
	}
	if ylo != nil {
		floats.AddScaled(lo, sy, ylo[from:to])
	}
	q := 0
	for ; q+1 < f.rank; q += 2 {
		a, al, sa := f.column(f.perm[q])
		b, bl, sb := f.column(f.perm[q+1])
		a, b = a[from:to], b[from:to]
		subtractColumns2(hi, lo, a, b, f.x[q]*sa, f.xlo[q]*sa, f.x[q+1]*sb, f.xlo[q+1]*sb)
		ah, alw, bh, blw := dots2(a, b, rb, rl)
		if al != nil {
			floats.AddScaled(lo, -f.x[q]*sa, al[from:to])
			floats.AddScaled(lo, -f.x[q+1]*sb, bl[from:to])
			alw += floats.Dot(al[from:to], rb)
			blw += floats.Dot(bl[from:to], rb)
		}
		sums[2*q], sums[2*q+1] = ah*sa, alw*sa
		sums[2*q+2], sums[2*q+3] = bh*sb, blw*sb
	}
	if q < f.rank {
		a, al, sa := f.column(f.perm[q])
		a = a[from:to]
		subtractColumn(hi, lo, a, f.x[q]*sa, f.xlo[q]*sa)
		ah, alw := dot2(a, rb, rl)
		if al != nil {
			floats.AddScaled(lo, -f.x[q]*sa, al[from:to])
			alw += floats.Dot(al[from:to], rb)
		}
		sums[2*q], sums[2*q+1] = ah*sa, alw*sa
	}
	out := f.f[from:to]
	for i := range out {
		out[i] = hi[i] + lo[i]
	}
}
