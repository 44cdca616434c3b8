package search

import (
	"math"

	"example.com/trammel/internal/dd"
)

// tallElements is the size of the Jacobian above which steps come from its Gram
// matrix, formed over the elements that are not zero: with a parameter for each of
// many levels most are. Newton's polish, whose Gram matrix is formed in
// double-double, gives back the digits.
const tallElements = 50_000

func (s *solver) tall() bool { return s.p.N*s.p.P > tallElements }

// A gram is J'J and J'r over the free parameters.
type gram struct {
	a, g []float64
	k    int
}

// gramOf forms the Gram matrix column by column, each over the rows where it is
// not zero.
func (s *solver) gramOf(w *work, free []int) *gram {
	n, k := s.p.N, len(free)
	m := &gram{a: make([]float64, k*k), g: make([]float64, k), k: k}
	rows := make([]int32, 0, n)
	x := make([]float64, 0, n)
	for q, j := range free {
		rows, x = rows[:0], x[:0]
		sum := 0.0
		for i, v := range w.jac[j*n : (j+1)*n] {
			if v != 0 {
				rows, x = append(rows, int32(i)), append(x, v)
				sum += v * w.r[i]
			}
		}
		m.g[q] = sum
		for t := range q + 1 {
			z := w.jac[free[t]*n : (free[t]+1)*n]
			sum := 0.0
			for c, i := range rows {
				sum += x[c] * z[i]
			}
			m.a[q*k+t], m.a[t*k+q] = sum, sum
		}
	}
	return m
}

// step solves (J'J + λ D²) δ = J'r; ok is false when that is not positive definite.
func (m *gram) step(free []int, scale []float64, lambda float64, delta []float64) bool {
	a := append([]float64(nil), m.a...)
	index := make([]int, m.k)
	for q, j := range free {
		index[q] = q
		d := lambda * scale[j] * scale[j]
		if scale[j] == 0 {
			d = 1
		}
		a[q*m.k+q] += d
	}
	x, ok := newton(a, m.g, m.k, index)
	copy(delta, x)
	return ok
}

// inTangent is the squared length of the residual's part in the tangent plane.
func (m *gram) inTangent() float64 {
	index := make([]int, m.k)
	for q := range index {
		index[q] = q
	}
	x, ok := newton(m.a, m.g, m.k, index)
	if !ok {
		return math.Inf(1)
	}
	sum := 0.0
	for q, v := range x {
		sum += v * m.g[q]
	}
	return math.Max(sum, 0)
}

// addGram adds J'J, in double-double, to hess and writes J'r to gradient, over the
// elements that are not zero.
func (s *solver) addGram(w *work, hess, gradient []float64) {
	n, p := s.p.N, s.p.P
	rows := make([]int32, 0, n)
	x := make([]float64, 0, n)
	for j := range p {
		rows, x = rows[:0], x[:0]
		g := dd.Num{}
		for i, v := range w.jac[j*n : (j+1)*n] {
			if v != 0 {
				rows, x = append(rows, int32(i)), append(x, v)
				hi, lo := dd.TwoProd(v, w.r[i])
				g = g.Add(dd.Num{Hi: hi, Lo: lo})
			}
		}
		gradient[j] = g.Float()
		for q := range j + 1 {
			z := w.jac[q*n : (q+1)*n]
			sum := dd.Num{}
			for c, i := range rows {
				if v := z[i]; v != 0 {
					hi, lo := dd.TwoProd(x[c], v)
					sum = sum.Add(dd.Num{Hi: hi, Lo: lo})
				}
			}
			hess[j*p+q] += sum.Float()
			if q != j {
				hess[q*p+j] += sum.Float()
			}
		}
	}
}
