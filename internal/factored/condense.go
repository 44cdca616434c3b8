package factored

import (
	"math"

	"example.com/trammel/internal/dd"
	"example.com/trammel/internal/lsq"
)

// A Condensed holds few rows whose columns stand to each other as those of a
// form with many: the triangles of its cells. Cell k has the rows
// rootMass·(1, means) and, for each numeric column, a row of triangle.
type Condensed struct {
	Cells    []int // those with rows of the table
	rootMass []float64
	mean     []dd.Num  // per cell z
	triangle []float64 // per cell z×z, lower L row-major, L L' = moments about the mean
	z        int
}

// leastPivot is the share of a numeric column's square that must be left, within
// a cell, beside the columns before it. Moments carry about 15 digits and lose
// those of its inverse, which leaves the 12 that the paths agree to.
const leastPivot = 1e-3

// Condense makes the triangles of moments. It returns nil when a cell's numeric columns are so nearly dependent
// within it that moments would lose too many digits.
func Condense(m *Moments) *Condensed {
	z := m.V - 1
	t := m.V * (m.V + 1) / 2
	c := &Condensed{z: z}
	for k, mass := range m.Mass {
		if mass == 0 {
			continue
		}
		l := make([]float64, z*z)
		m2 := m.M2[k*t:]
		for i := range z {
			diag := m2[i*(i+1)/2+i]
			offset := 0x1p-50 * m.MeanOf(k, i).Hi
			for j := range i + 1 {
				s := m2[i*(i+1)/2+j] - dot(l[i*z:i*z+j], l[j*z:j*z+j])
				if j < i {
					if l[j*z+j] > 0 {
						l[i*z+j] = s / l[j*z+j]
					}
					continue
				}
				switch {
				case diag <= mass*offset*offset || s <= 1e-13*diag:
					// A constant of the cell, or a combination of the columns before it.
				case s < leastPivot*diag:
					return nil
				default:
					l[i*z+i] = math.Sqrt(s)
				}
			}
		}
		c.Cells = append(c.Cells, k)
		c.rootMass = append(c.rootMass, math.Sqrt(mass))
		for a := range z {
			c.mean = append(c.mean, m.MeanOf(k, a))
		}
		c.triangle = append(c.triangle, l...)
	}
	return c
}

// Problem is the condensed matrix of form.
func (c *Condensed) Problem(form *Form) *lsq.Problem {
	rows := c.z + 1
	p := &lsq.Problem{N: rows * len(c.Cells), P: len(form.Cols)}
	p.X, p.XLo = make([]float64, p.N*p.P), make([]float64, p.N*p.P)
	entries, scratch := make([]int8, p.P), make([]int32, len(form.Cats))
	for i, cell := range c.Cells {
		form.EntriesTo(entries, cell, scratch)
		for j, e := range entries {
			if e == 0 {
				continue
			}
			x := p.X[j*p.N+i*rows : j*p.N+(i+1)*rows]
			a := form.Cols[j].Num
			if a < 0 {
				x[0] = float64(e) * c.rootMass[i]
				continue
			}
			first := c.mean[i*c.z+a].MulF(float64(e) * c.rootMass[i])
			x[0], p.XLo[j*p.N+i*rows] = first.Hi, first.Lo
			for q := range a + 1 {
				x[1+q] = float64(e) * c.triangle[(i*c.z+a)*c.z+q]
			}
		}
	}
	return p
}

// Side is the condensed right-hand side whose products with the columns are
// first[cell] with the constant and others[cell][a] with numeric column a about
// its mean.
func (c *Condensed) Side(first func(cell int) float64, other func(cell, a int) float64) []float64 {
	rows := c.z + 1
	y := make([]float64, rows*len(c.Cells))
	for i, cell := range c.Cells {
		u := y[i*rows : (i+1)*rows]
		u[0] = first(cell) / c.rootMass[i]
		for a := range c.z {
			l := c.triangle[(i*c.z+a)*c.z : (i*c.z+a)*c.z+a+1]
			if l[a] > 0 {
				u[1+a] = (other(cell, a) - dot(l[:a], u[1:1+a])) / l[a]
			}
		}
	}
	return y
}

// Response is the side of the response the moments were formed with, hi + lo.
func (c *Condensed) Response(m *Moments) (hi, lo []float64) {
	z, t := c.z, m.V*(m.V+1)/2
	hi = c.Side(func(int) float64 { return 0 }, func(k, a int) float64 { return m.M2[k*t+z*(z+1)/2+a] })
	lo = make([]float64, len(hi))
	for i, k := range c.Cells {
		v := m.MeanOf(k, z).MulF(c.rootMass[i])
		hi[i*(z+1)], lo[i*(z+1)] = v.Hi, v.Lo
	}
	return hi, lo
}

// Gradient is the side of a gradient by cell, as Cells.Gradient gives it.
func (c *Condensed) Gradient(g []float64) []float64 {
	v := c.z + 1
	return c.Side(func(k int) float64 { return g[k*v] }, func(k, a int) float64 { return g[k*v+1+a] })
}

func dot(a, b []float64) float64 {
	s := 0.0
	for i, v := range a {
		s += v * b[i]
	}
	return s
}
