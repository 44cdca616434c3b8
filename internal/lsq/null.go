package lsq

import "math"

// noise is the size, relative to the largest addend of a dependency, below
// which an addend is taken for rounding.
const noise = 1e-12

// NullVectors returns, for each dependent column j in the order of Perm, the
// vector v of length p with X v = 0, v[j] = 1 and otherwise supported on the
// independent columns. Addends v[i]·column i below 1e-12 of the largest are
// left out. It is empty at full rank.
func (f *Factor) NullVectors() [][]float64 {
	p, n := f.p.P, f.p.N
	out := make([][]float64, 0, p-f.rank)
	var s Solution
	for _, j := range f.perm[f.rank:] {
		hi, lo := f.p.X[j*n:(j+1)*n], []float64(nil)
		if f.p.XLo != nil {
			lo = f.p.XLo[j*n : (j+1)*n]
		}
		f.Solve(hi, lo, &s)
		v := make([]float64, p)
		largest := f.largestAddend(s.B)
		for i, b := range s.B {
			if f.addend(b, i) > noise*largest {
				v[i] = -b
			}
		}
		v[j] = 1
		out = append(out, v)
	}
	return out
}

// addend returns the norm of b·column i; largestAddend the largest of them.
func (f *Factor) addend(b float64, i int) float64 {
	return math.Abs(b) / f.scale[i] * f.norm[i]
}

func (f *Factor) largestAddend(b []float64) float64 {
	var largest float64
	for i, v := range b {
		largest = max(largest, f.addend(v, i))
	}
	return largest
}
