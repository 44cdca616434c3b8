package lsq

import (
	"math"

	"example.com/trammel/internal/dd"
	"gonum.org/v1/gonum/floats"
)

// whitened is the inverse of A'A (A the scaled X) in factored form: with
// S = R⁻¹ rounded to float64 and from then on taken as exact, and
// G = (A S)'(A S) = L L', the inverse is V V' with V = S L⁻ᵀ. The rows of A S
// are formed in double-double and rounded once; G is the identity up to about
// the condition times 1e-16, so neither G, L nor the norms of V's rows lose
// digits to the condition of A.
type whitened struct {
	ready bool
	plain bool      // G = I is near enough
	s     []float64 // k×k upper triangle, column-major
	l     []float64 // k×k lower triangle, row-major
	v     []float64 // k×k upper triangle, row-major
	b     []float64 // k·block per worker: one block of A S, column-major
	g     []float64 // k×k per chunk: sums for G; then G in the first k×k
	lo    []float64 // k×k: errors of the merging
	h     []float64 // where LeveragesTo writes
}

// plainBound is the condition up to which S S' itself serves as the inverse:
// its relative error is about the condition times 1e-16.
const plainBound = 16

// invert fills w.s with R⁻¹ and lays out the rest of w.
func (f *Factor) invert() *whitened {
	w := &f.white
	if w.s != nil || f.rank == 0 {
		return w
	}
	k := f.rank
	chunks := f.chunks()
	f.ws.white = sized(f.ws.white, (4+chunks)*k*k+k*f.block*f.workers)
	a := arena{f.ws.white}
	w.s, w.l, w.v = a.take(k*k), a.take(k*k), a.take(k*k)
	w.g, w.lo = a.take(chunks*k*k), a.take(k*k)
	w.b = a.take(k * f.block * f.workers)
	for j := range k {
		c := w.s[j*k : (j+1)*k]
		clear(c)
		c[j] = 1
		solveR(f.root, f.m, j+1, c[:j+1])
	}
	return w
}

// whiten fills f.white on first use.
func (f *Factor) whiten() *whitened {
	w := f.invert()
	if w.ready {
		return w
	}
	w.ready = true
	k := f.rank
	// The closer estimate of the condition costs as much as G does when there
	// are few rows; it is asked for only where it may spare many.
	w.plain = f.conditionBound() <= plainBound || f.p.N > 64*f.rank && 2*f.Condition() <= plainBound
	if !w.plain {
		f.gram()
		w.plain = !choleskyTo(w.l, w.g, k)
	}
	for i := range k {
		row := w.v[i*k : (i+1)*k]
		clear(row)
		for j := i; j < k; j++ {
			row[j] = w.s[j*k+i]
			if !w.plain {
				row[j] = (row[j] - floats.Dot(w.l[j*k+i:j*k+j], row[i:j])) / w.l[j*k+j]
			}
		}
	}
	return w
}

// chunkBlocks is the number of blocks whose contributions to G are summed
// before the chunks are merged.
const chunkBlocks = 16

func (f *Factor) chunks() int { return max(1, (f.blocks+chunkBlocks-1)/chunkBlocks) }

// gram forms G = (A S)'(A S), its lower triangle, in w.g, summed in the order
// of the blocks.
func (f *Factor) gram() {
	w, k := &f.white, f.rank
	f.each(f.chunks(), (*Factor).gramChunk)
	clear(w.lo)
	for c := 1; c < f.chunks(); c++ {
		for i := range k * k {
			s, e := dd.TwoSum(w.g[i], w.g[c*k*k+i])
			w.g[i] = s
			w.lo[i] += e
		}
	}
	floats.Add(w.g[:k*k], w.lo)
}

func (f *Factor) gramChunk(worker, chunk int) {
	w, k := &f.white, f.rank
	g := w.g[chunk*k*k : (chunk+1)*k*k]
	clear(g)
	for block := chunk * chunkBlocks; block < min((chunk+1)*chunkBlocks, f.blocks); block++ {
		b, m := f.whitenBlock(worker, block)
		for j := range k {
			bj := b[j*f.block : j*f.block+m]
			for i := 0; i <= j; i++ {
				g[j*k+i] += floats.Dot(b[i*f.block:i*f.block+m], bj)
			}
		}
	}
}

// whitenBlock returns the m rows of a block of -A S (the sign is of no
// consequence to its users), column j at j·f.block.
func (f *Factor) whitenBlock(worker, block int) (out []float64, m int) {
	w, k := &f.white, f.rank
	from := block * f.block
	to := min(from+f.block, f.p.N)
	m = to - from
	work := f.work[2*f.block*worker:]
	hi, lo := work[:m], work[f.block:f.block+m]
	all := w.b[k*f.block*worker : k*f.block*(worker+1)]
	for j := range k {
		s := w.s[j*k : j*k+j+1]
		out := all[j*f.block : j*f.block+m]
		if w.plain {
			clear(out)
			for i, v := range s {
				a, _, sa := f.column(f.perm[i])
				floats.AddScaled(out, -v*sa, a[from:to])
			}
			continue
		}
		clear(hi)
		clear(lo)
		i := 0
		for ; i+1 < len(s); i += 2 {
			a, al, sa := f.column(f.perm[i])
			b, bl, sb := f.column(f.perm[i+1])
			subtractColumns2(hi, lo, a[from:to], b[from:to], s[i]*sa, 0, s[i+1]*sb, 0)
			if al != nil {
				floats.AddScaled(lo, -s[i]*sa, al[from:to])
				floats.AddScaled(lo, -s[i+1]*sb, bl[from:to])
			}
		}
		if i < len(s) {
			a, al, sa := f.column(f.perm[i])
			subtractColumn(hi, lo, a[from:to], s[i]*sa, 0)
			if al != nil {
				floats.AddScaled(lo, -s[i]*sa, al[from:to])
			}
		}
		floats.AddTo(out, hi, lo)
	}
	return all, m
}

// choleskyTo writes the lower triangle L, L L' = g, both row-major k×k. It
// reports false when g is not positive definite.
func choleskyTo(l, g []float64, k int) bool {
	for i := range k {
		for j := 0; j <= i; j++ {
			s := g[i*k+j] - floats.Dot(l[i*k:i*k+j], l[j*k:j*k+j])
			if j < i {
				l[i*k+j] = s / l[j*k+j]
				continue
			}
			if !(s > 0) {
				return false
			}
			l[i*k+i] = math.Sqrt(s)
		}
	}
	return true
}

// Inverse returns (X'X)⁻¹, p×p row-major and symmetric, in dst when that is
// long enough. An element is correct to about 1e-15 times the geometric mean
// of its two diagonal elements, whatever the condition. At deficient rank it
// is the inverse for the independent columns, with NaN for the others.
func (f *Factor) Inverse(dst []float64) []float64 {
	p, k := f.p.P, f.rank
	w := f.whiten()
	dst = sized(dst, p*p)
	if k < p {
		for i := range dst {
			dst[i] = math.NaN()
		}
	}
	for a := range k {
		i := f.perm[a]
		for b := a; b < k; b++ {
			j := f.perm[b]
			s := floats.Dot(w.v[a*k+b:(a+1)*k], w.v[b*k+b:(b+1)*k])
			s = s * f.scale[i] * f.scale[j]
			dst[i*p+j], dst[j*p+i] = s, s
		}
	}
	return dst
}

// InverseDiag returns the p diagonal elements of (X'X)⁻¹, in dst when that
// is long enough, each correct to about 1e-15 relative; NaN for dependent
// columns.
func (f *Factor) InverseDiag(dst []float64) []float64 {
	dst = f.InverseRootDiag(dst)
	for i, v := range dst {
		dst[i] = v * v
	}
	return dst
}

// InverseRootDiag returns the square roots of InverseDiag: the standard
// errors in units of the residual standard deviation. They are representable
// for columns so small or large that their squares are not.
func (f *Factor) InverseRootDiag(dst []float64) []float64 {
	p, k := f.p.P, f.rank
	w := f.whiten()
	dst = sized(dst, p)
	if k < p {
		for i := range dst {
			dst[i] = math.NaN()
		}
	}
	for a := range k {
		row := w.v[a*k+a : (a+1)*k]
		dst[f.perm[a]] = math.Sqrt(floats.Dot(row, row)) * f.scale[f.perm[a]]
	}
	return dst
}

// LeveragesTo writes the n leverages h_i = x_i'(X'X)⁻¹x_i, in [0, 1], into
// dst, each correct to about 1e-14 relative to itself.
func (f *Factor) LeveragesTo(dst []float64) {
	f.whiten()
	f.white.h = dst[:f.p.N]
	f.each(f.blocks, (*Factor).leverageBlock)
	f.white.h = nil
}

func (f *Factor) leverageBlock(worker, block int) {
	w, k := &f.white, f.rank
	b, m := f.whitenBlock(worker, block)
	out := w.h[block*f.block : block*f.block+m]
	clear(out)
	for j := range k {
		bj := b[j*f.block : j*f.block+m]
		if !w.plain {
			for i := range j {
				floats.AddScaled(bj, -w.l[j*k+i], b[i*f.block:i*f.block+m])
			}
			floats.Scale(1/w.l[j*k+j], bj)
		}
		for i, v := range bj {
			out[i] += v * v
		}
	}
	for i, v := range out {
		out[i] = min(v, 1)
	}
}

// QuadScratch is the length of the scratch that QuadForm needs.
func (f *Factor) QuadScratch() int { return 3 * f.rank }

// Prepare computes what QuadForm needs; after it, QuadForm may be called from
// several goroutines, each with its own scratch.
func (f *Factor) Prepare() { f.whiten() }

// QuadForm returns x'(X'X)⁻¹x for a row x of length p; xlo, its low parts,
// may be nil. With a scratch of length QuadScratch it does not allocate.
// Elements of x in dependent columns are ignored.
func (f *Factor) QuadForm(x, xlo, scratch []float64) float64 {
	k := f.rank
	w := f.whiten()
	scratch = sized(scratch, 3*k)
	a, al, b := scratch[:k], scratch[k:2*k], scratch[2*k:3*k]
	for q := range k {
		j := f.perm[q]
		a[q], al[q] = x[j]*f.scale[j], 0
		if xlo != nil {
			al[q] = xlo[j] * f.scale[j]
		}
	}
	var sum float64
	for j := range k {
		hi, lo := dot2(w.s[j*k:j*k+j+1], a, al)
		v := hi + lo
		if !w.plain {
			v = (v - floats.Dot(w.l[j*k:j*k+j], b[:j])) / w.l[j*k+j]
		}
		b[j] = v
		sum += v * v
	}
	return sum
}
