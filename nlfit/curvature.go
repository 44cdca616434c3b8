package nlfit

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"example.com/trammel/internal/tape"
)

// maxCurvature bounds the second derivatives that are formed for curvature.
const maxCurvature = 20_000_000

// Curvature gives the root mean square intrinsic and parameter-effects curvature of
// D. M. Bates and D. G. Watts, "Relative curvature measures of nonlinearity", J. R.
// Statist. Soc. B 42 (1980) 1-25, in units of the standard radius s√p; ok is false
// when they are not defined or would take too much room.
func (e *engine) Curvature() (intrinsic, parameter float64, ok bool) {
	n, p, k := e.model.n, e.model.p, len(e.free)
	if math.IsNaN(e.dispersion) || k == 0 || n <= k || n*k*k > maxCurvature {
		return 0, 0, false
	}
	x := mat.NewDense(n, k, nil)
	for q := range k {
		x.SetCol(q, e.problem.X[q*n:(q+1)*n])
	}
	var qr mat.QR
	qr.Factorize(x)
	var r mat.Dense
	qr.RTo(&r)
	l := mat.NewDense(k, k, nil)
	if err := l.Inverse(r.Slice(0, k, 0, k)); err != nil {
		if _, near := err.(mat.Condition); !near {
			return 0, 0, false
		}
	}
	second := e.secondDerivatives()
	// C[a][b] = Σ second[i][j] l[i][a] l[j][b], a vector of n for each a, b.
	c := make([][]float64, k*k)
	half := make([][]float64, p*k)
	for i := range e.free {
		for b := range k {
			v := make([]float64, n)
			for j := range e.free {
				if w := l.At(j, b); w != 0 {
					d := second[e.free[i]*p+e.free[j]]
					for t := range v {
						v[t] += w * d[t]
					}
				}
			}
			half[i*k+b] = v
		}
	}
	for a := range k {
		for b := range a + 1 {
			v := make([]float64, n)
			for i := range e.free {
				if w := l.At(i, a); w != 0 {
					for t, h := range half[i*k+b] {
						v[t] += w * h
					}
				}
			}
			c[a*k+b], c[b*k+a] = v, v
		}
	}
	// Split each vector into its parts in the tangent plane and beside it: the first
	// k rows of Q'v and the rest.
	var q mat.Dense
	qr.QTo(&q)
	tangent := q.Slice(0, n, 0, k)
	square := func(v []float64) (in, all float64) {
		var t mat.VecDense
		t.MulVec(tangent.T(), mat.NewVecDense(n, v))
		for i := range k {
			in += t.AtVec(i) * t.AtVec(i)
		}
		for _, x := range v {
			all += x * x
		}
		return in, all
	}
	var in, beside float64
	trace := make([]float64, n)
	for a := range k {
		for b := range k {
			i, all := square(c[a*k+b])
			in += 2 * i
			beside += 2 * math.Max(0, all-i)
		}
		for t, v := range c[a*k+a] {
			trace[t] += v
		}
	}
	i, all := square(trace)
	in += i
	beside += math.Max(0, all-i)
	scale := math.Sqrt(e.dispersion * float64(k) / float64(k*(k+2)))
	return scale * math.Sqrt(beside), scale * math.Sqrt(in), true
}

// secondDerivatives are the weighted second derivatives of every row: entry a·p+b
// holds those with respect to coefficients a and b.
func (e *engine) secondDerivatives() [][]float64 {
	m := e.model
	n, p := m.n, m.p
	out := make([][]float64, p*p)
	for a := range p {
		for b := range a + 1 {
			v := make([]float64, n)
			out[a*p+b], out[b*p+a] = v, v
		}
	}
	ev := m.evaluator(true)
	for start := 0; start < n; start += tape.Block {
		rows := min(tape.Block, n-start)
		for k, part := range m.parts {
			ev.parts[k] = part[start : start+rows]
		}
		for q := range m.eq.Params {
			ev.predict(q, e.theta, start, rows)
		}
		ev.s.Eval(ev.parts, ev.params, rows, 2)
		for q, pq := range m.eq.Params {
			first := ev.s.First(q)
			for r := range q + 1 {
				pr := m.eq.Params[r]
				second := ev.s.Second(q, r)
				for a := pq.From; a < pq.To; a++ {
					for b := pr.From; b < pr.To; b++ {
						v := out[a*p+b][start : start+rows]
						x, z := m.columns[a], m.columns[b]
						for i := range v {
							d := 0.0
							if second != nil {
								d = second[i] * ev.d[q][i] * ev.d[r][i]
							}
							if q == r && first != nil {
								d += first[i] * ev.dd[q][i]
							}
							if x != nil {
								d *= x[start+i]
							}
							if z != nil {
								d *= z[start+i]
							}
							if e.root != nil {
								d *= e.root[start+i]
							}
							v[i] = d
						}
					}
				}
			}
		}
	}
	return out
}
