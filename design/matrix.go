package design

import (
	"gonum.org/v1/gonum/mat"

	"example.com/trammel/internal/factored"
)

// A Matrix is the design matrix of some rows, n×p, held as numeric columns and
// level numbers. It satisfies gonum's mat.Matrix; Expand makes it dense. It is
// immutable; goroutines may share it.
type Matrix struct {
	form  *factored.Form
	parts [][]float64 // of an equation, see Parts
}

var _ mat.Matrix = (*Matrix)(nil)

// Form is the matrix as it is held, for the fitters of this module. Shared, do
// not modify.
func (m *Matrix) Form() *factored.Form { return m.form }

// Dims gives the number of rows and of columns.
func (m *Matrix) Dims() (r, c int) { return m.form.N, len(m.form.Cols) }

// At is the value in row i and column j, both from 0, rounded to float64. Like
// every mat.Matrix it panics when i or j is out of range.
func (m *Matrix) At(i, j int) float64 {
	if i < 0 || i >= m.form.N {
		panic(mat.ErrRowAccess)
	}
	if j < 0 || j >= len(m.form.Cols) {
		panic(mat.ErrColAccess)
	}
	return m.form.At(i, j).Float()
}

// T is the transpose, as a view.
func (m *Matrix) T() mat.Matrix { return mat.Transpose{Matrix: m} }

// ColumnTo writes column j into hi and its low parts into lo, each of length
// n; lo may be nil when they are not wanted.
func (m *Matrix) ColumnTo(hi, lo []float64, j int) {
	col := &m.form.Cols[j]
	n := m.form.N
	hi = hi[:n]
	if col.Num < 0 {
		for i := range hi {
			hi[i] = 1
		}
		clear(lo)
	} else {
		num := &m.form.Nums[col.Num]
		copy(hi, num.Hi)
		if lo != nil {
			if num.Lo != nil {
				copy(lo, num.Lo)
			} else {
				clear(lo)
			}
		}
	}
	var levels [1024]int32
	for _, c := range col.Cells {
		for from := 0; from < n; from += len(levels) {
			part := levels[:min(len(levels), n-from)]
			m.form.Cats[c.Cat].LevelsTo(part, from)
			for i, l := range part {
				switch c.Entry[l] {
				case 0:
					hi[from+i] = 0
					if lo != nil {
						lo[from+i] = 0
					}
				case -1:
					hi[from+i] = -hi[from+i]
					if lo != nil {
						lo[from+i] = -lo[from+i]
					}
				}
			}
		}
	}
}

// RowTo writes row i into dst, of length p.
func (m *Matrix) RowTo(dst []float64, i int) {
	for j := range m.form.Cols {
		dst[j] = m.form.At(i, j).Float()
	}
}

// Expand makes the matrix dense, n×p. The caller owns it.
func (m *Matrix) Expand() *mat.Dense {
	n, p := m.Dims()
	out := mat.NewDense(n, p, nil)
	col := make([]float64, n)
	for j := range p {
		m.ColumnTo(col, nil, j)
		out.SetCol(j, col)
	}
	return out
}
