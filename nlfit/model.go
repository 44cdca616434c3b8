package nlfit

import (
	"math"

	"example.com/trammel/design"
	"example.com/trammel/internal/factored"
	"example.com/trammel/internal/tape"
)

// A model is an equation over rows, ready for the search: values and derivatives
// with respect to all p coefficients. It is immutable.
type model struct {
	eq     *design.Equation
	matrix *design.Matrix
	n, p   int
	parts  [][]float64 // the equation's parts without parameters
	// columns[j] are the values of coefficient j's column; nil for the constant 1.
	columns [][]float64
}

func newModel(eq *design.Equation, m *design.Matrix) *model {
	n, p := m.Dims()
	out := &model{eq: eq, matrix: m, n: n, p: p, parts: m.Parts(), columns: make([][]float64, p)}
	form := m.Form()
	for j := range p {
		if col := &form.Cols[j]; col.Num < 0 && len(col.Cells) == 0 {
			continue
		}
		out.columns[j] = make([]float64, n)
		if hasLow(form, j) {
			lo := make([]float64, n)
			m.ColumnTo(out.columns[j], lo, j)
			for i := range lo {
				out.columns[j][i] += lo[i]
			}
			continue
		}
		m.ColumnTo(out.columns[j], nil, j)
	}
	return out
}

// subset is the model over some of its rows.
func (m *model) subset(rows []int) *model {
	pick := func(v []float64) []float64 {
		if v == nil {
			return nil
		}
		out := make([]float64, len(rows))
		for i, r := range rows {
			out[i] = v[r]
		}
		return out
	}
	out := &model{eq: m.eq, n: len(rows), p: m.p}
	for _, v := range m.parts {
		out.parts = append(out.parts, pick(v))
	}
	for _, v := range m.columns {
		out.columns = append(out.columns, pick(v))
	}
	return out
}

func hasLow(f *factored.Form, j int) bool {
	k := f.Cols[j].Num
	return k >= 0 && f.Nums[k].Lo != nil
}

// inverse is the inverse of a parameter's link at eta with two derivatives.
func inverse(link string, eta float64) (k, d, dd float64) {
	switch link {
	case "log":
		k = math.Exp(eta)
		return k, k, k
	case "logit":
		k = 1 / (1 + math.Exp(-eta))
		d = k * (1 - k)
		return k, d, d * (1 - 2*k)
	case "reciprocal":
		k = 1 / eta
		return k, -k * k, 2 * k * k * k
	}
	return eta, 1, 0
}

// link is the link of a parameter at the value k.
func link(name string, k float64) float64 {
	switch name {
	case "log":
		return math.Log(k)
	case "logit":
		return math.Log(k / (1 - k))
	case "reciprocal":
		return 1 / k
	}
	return k
}

// An evaluator is the scratch of one goroutine.
type evaluator struct {
	m      *model
	s      *tape.Scratch
	second bool
	parts  [][]float64
	params [][]float64
	d, dd  [][]float64 // of each parameter by its linear predictor
}

func (m *model) evaluator(second bool) *evaluator {
	q := len(m.eq.Params)
	e := &evaluator{m: m, s: m.eq.Program.NewScratch(second), second: second, parts: make([][]float64, len(m.parts))}
	for range q {
		e.params = append(e.params, make([]float64, tape.Block))
		e.d = append(e.d, make([]float64, tape.Block))
		e.dd = append(e.dd, make([]float64, tape.Block))
	}
	return e
}

// evaluate computes f (n) at theta for rows [from, to); jac, when not nil, gets
// the derivatives, column-major with ld rows; hess, when not nil, has
// Σ v[i]·∂²f_i/∂θ∂θ' added. It reports whether every value is finite.
func (e *evaluator) evaluate(theta, f, jac []float64, ld int, v, hess []float64, from, to int) bool {
	order := 0
	if jac != nil {
		order = 1
	}
	if hess != nil {
		order = 2
	}
	finite := true
	for start := from; start < to; start += tape.Block {
		m := min(tape.Block, to-start)
		for k, part := range e.m.parts {
			e.parts[k] = part[start : start+m]
		}
		for q := range e.m.eq.Params {
			e.predict(q, theta, start, m)
		}
		out := e.s.Eval(e.parts, e.params, m, order)
		copy(f[start-from:], out)
		for _, y := range out {
			if y-y != 0 {
				finite = false
			}
		}
		if jac != nil {
			e.jacobian(jac, ld, start-from, start, m)
		}
		if hess != nil {
			e.hessian(hess, v[start-from:start-from+m], start, m)
		}
	}
	return finite
}

// predict fills the values of parameter q at m rows, and their derivatives.
func (e *evaluator) predict(q int, theta []float64, start, m int) {
	p := &e.m.eq.Params[q]
	out, d, dd := e.params[q][:m], e.d[q], e.dd[q]
	clear(out)
	for j := p.From; j < p.To; j++ {
		x := e.m.columns[j]
		if x == nil {
			for i := range out {
				out[i] += theta[j]
			}
			continue
		}
		for i, v := range x[start : start+m] {
			out[i] += v * theta[j]
		}
	}
	if p.Link == "" {
		for i := range out {
			d[i], dd[i] = 1, 0
		}
		return
	}
	for i, eta := range out {
		out[i], d[i], dd[i] = inverse(p.Link, eta)
	}
}

func (e *evaluator) jacobian(jac []float64, ld, at, start, m int) {
	for q := range e.m.eq.Params {
		p := &e.m.eq.Params[q]
		first := e.s.First(q)
		for j := p.From; j < p.To; j++ {
			out := jac[j*ld+at : j*ld+at+m]
			if first == nil {
				clear(out)
				continue
			}
			x := e.m.columns[j]
			for i := range out {
				out[i] = first[i] * e.d[q][i]
				if x != nil {
					out[i] *= x[start+i]
				}
			}
		}
	}
}

func (e *evaluator) hessian(hess, v []float64, start, m int) {
	w := make([]float64, m)
	for q := range e.m.eq.Params {
		pq := &e.m.eq.Params[q]
		first := e.s.First(q)
		for r := range q + 1 {
			pr := &e.m.eq.Params[r]
			second := e.s.Second(q, r)
			some := false
			for i := range w {
				w[i] = 0
				if second != nil {
					w[i] = second[i] * e.d[q][i] * e.d[r][i]
				}
				if q == r && first != nil {
					w[i] += first[i] * e.dd[q][i]
				}
				w[i] *= v[i]
				some = some || w[i] != 0
			}
			if !some {
				continue
			}
			for a := pq.From; a < pq.To; a++ {
				for b := pr.From; b < pr.To; b++ {
					if q == r && b > a {
						break
					}
					sum := 0.0
					x, z := e.m.columns[a], e.m.columns[b]
					for i := range w {
						t := w[i]
						if x != nil {
							t *= x[start+i]
						}
						if z != nil {
							t *= z[start+i]
						}
						sum += t
					}
					hess[a*e.m.p+b] += sum
					if a != b {
						hess[b*e.m.p+a] += sum
					}
				}
			}
		}
	}
}
