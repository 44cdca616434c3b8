package nlfit

import (
	"math"
	"sync"

	"example.com/trammel/design"
	"example.com/trammel/internal/handover"
	"example.com/trammel/internal/lsq"
	"example.com/trammel/internal/search"
)

// An engine answers the numeric questions about a finished search from the
// Jacobian at the estimates.
type engine struct {
	frame      *design.Frame
	model      *model
	theta      []float64
	free       []int // coefficients not held by a bound
	root       []float64
	fitted     []float64
	residual   []float64
	dispersion float64
	factor     *lsq.Factor // of the weighted Jacobian's free columns
	problem    *lsq.Problem
	search     *search.Problem

	mu   sync.Mutex // guards what follows, and factor's scratch
	last *model     // of the matrix asked about last
}

func newEngine(f *design.Frame, m *model, theta []float64, free []int, root []float64) (*engine, bool) {
	n := len(f.Y)
	e := &engine{frame: f, model: m, theta: theta, free: free, root: root, fitted: make([]float64, n), residual: make([]float64, n)}
	jac := make([]float64, n*m.p)
	ok := m.evaluator(false).evaluate(theta, e.fitted, jac, n, nil, nil, 0, n)
	for i := range n {
		e.residual[i] = f.Y[i] - e.fitted[i]
		if f.YLo != nil {
			e.residual[i] += f.YLo[i]
		}
	}
	e.problem = &lsq.Problem{N: n, P: len(free), X: make([]float64, n*len(free))}
	for q, j := range free {
		copy(e.problem.X[q*n:(q+1)*n], jac[j*n:(j+1)*n])
		for i := range n {
			if root != nil {
				e.problem.X[q*n+i] *= root[i]
			}
		}
	}
	e.factor = lsq.Factorize(e.problem, nil)
	return e, ok
}

// spread puts a matrix of the free coefficients into one of all, NaN for those
// held by a bound.
func (e *engine) spread(v []float64, scale float64) []float64 {
	p, k := e.model.p, len(e.free)
	out := make([]float64, p*p)
	for i := range out {
		out[i] = math.NaN()
	}
	for a, i := range e.free {
		for b, j := range e.free {
			out[i*p+j] = scale * v[a*k+b]
		}
	}
	return out
}

func (e *engine) UnscaledCovariance() []float64 {
	e.mu.Lock()
	defer e.mu.Unlock()
	return e.spread(e.factor.Inverse(nil), 1)
}

func (e *engine) Covariance() []float64 {
	if math.IsNaN(e.dispersion) {
		return nil
	}
	e.mu.Lock()
	defer e.mu.Unlock()
	return e.spread(e.factor.Inverse(nil), e.dispersion)
}

func (e *engine) Rows() (*handover.RowStats, bool) {
	n := len(e.fitted)
	s := &handover.RowStats{Fitted: e.fitted, Residual: e.residual, Leverage: make([]float64, n)}
	e.mu.Lock()
	e.factor.LeveragesTo(s.Leverage)
	e.mu.Unlock()
	if c := e.frame.Counts; c != nil {
		for i := range s.Leverage {
			s.Leverage[i] /= c[i]
		}
	}
	return s, true
}

// Nested tests the last term's coefficients together against 0 by the Wald
// statistic over df, when no other term contains it; else it is not defined.
func (e *engine) Nested(with []int) (handover.NestedTest, error) {
	t := e.frame.Plan.Terms()[with[len(with)-1]]
	out := handover.NestedTest{DF: t.To - t.From, SS: math.NaN(), Stat: math.NaN()}
	if len(t.Within) > 0 || out.DF == 0 || math.IsNaN(e.dispersion) {
		return out, nil
	}
	v := e.Covariance()
	p, k := e.model.p, out.DF
	// Solve V w = b by elimination without pivoting: V is positive definite.
	a := make([]float64, k*(k+1))
	for i := range k {
		for j := range k {
			a[i*(k+1)+j] = v[(t.From+i)*p+t.From+j]
		}
		a[i*(k+1)+k] = e.theta[t.From+i]
	}
	for j := range k {
		for i := j + 1; i < k; i++ {
			c := a[i*(k+1)+j] / a[j*(k+1)+j]
			for q := j; q <= k; q++ {
				a[i*(k+1)+q] -= c * a[j*(k+1)+q]
			}
		}
	}
	stat := 0.0
	for j := range k {
		stat += a[j*(k+1)+k] * a[j*(k+1)+k] / a[j*(k+1)+j]
	}
	out.Stat = stat / float64(k)
	return out, nil
}

// ExtraSS is the sum of squares that columns explain beyond the equation's
// tangent plane at the estimates.
func (e *engine) ExtraSS(columns [][]float64) (df int, ss float64, err error) {
	n, k := len(e.residual), len(e.free)
	q := &lsq.Problem{N: n, P: k + len(columns), X: make([]float64, n*(k+len(columns)))}
	copy(q.X, e.problem.X)
	r := make([]float64, n)
	for i := range n {
		w := 1.0
		if e.root != nil {
			w = e.root[i]
		}
		r[i] = w * e.residual[i]
		for c := range columns {
			q.X[(k+c)*n+i] = w * columns[c][i]
		}
	}
	f := lsq.Factorize(q, nil)
	var with, without lsq.Solution
	f.Solve(r, nil, &with)
	e.mu.Lock()
	e.factor.Solve(r, nil, &without)
	e.mu.Unlock()
	return f.Rank() - e.factor.Rank(), without.RSS.Sub(with.RSS).Float(), nil
}

// MeanTo evaluates the equation at rows of a matrix.
func (e *engine) MeanTo(mean, grad []float64, m *design.Matrix, _ []float64, from, to int) {
	e.mu.Lock()
	if e.last == nil || e.last.matrix != m {
		e.last = newModel(e.model.eq, m)
	}
	model := e.last
	e.mu.Unlock()
	ev := model.evaluator(false)
	if grad == nil {
		ev.evaluate(e.theta, mean, nil, 0, nil, nil, from, to)
		return
	}
	rows, p := to-from, model.p
	jac := make([]float64, rows*p)
	ev.evaluate(e.theta, mean, jac, rows, nil, nil, from, to)
	for j := range p {
		for i := range rows {
			grad[i*p+j] = jac[j*rows+i]
		}
	}
}
