package factored

import (
	"example.com/trammel/internal/dd"
)

// MeanTo writes rows [from, from+len(mean)) of the matrix times b + blo to mean,
// plus known (of the same length; may be nil), accumulated in double-double:
// powers cancel by many digits. blo may be nil. When grad is not nil, the rows themselves are
// written to it, row by row. It does not allocate.
func (f *Form) MeanTo(mean, grad, b, blo, known []float64, from int) {
	p := len(f.Cols)
	var hi, lo, x, xlo [span]float64
	for at := 0; at < len(mean); at += span {
		m := min(span, len(mean)-at)
		for i := range m {
			hi[i], lo[i] = 0, 0
			if known != nil {
				hi[i] = known[at+i]
			}
		}
		for j := range p {
			f.ColumnTo(x[:m], xlo[:m], j, from+at)
			bl := 0.0
			if blo != nil {
				bl = blo[j]
			}
			c := dd.Num{Hi: b[j], Lo: bl}
			for i := range m {
				if x[i] != 0 {
					s := dd.Num{Hi: hi[i], Lo: lo[i]}.Add(dd.Num{Hi: x[i], Lo: xlo[i]}.Mul(c))
					hi[i], lo[i] = s.Hi, s.Lo
				}
				if grad != nil {
					grad[(at+i)*p+j] = x[i] + xlo[i]
				}
			}
		}
		for i := range m {
			mean[at+i] = hi[i] + lo[i]
		}
	}
}

// RowTo writes row i to hi and its low parts to lo, each of length
// len(f.Cols).
func (f *Form) RowTo(hi, lo []float64, i int) {
	for j := range f.Cols {
		v := f.At(i, j)
		hi[j], lo[j] = v.Hi, v.Lo
	}
}
