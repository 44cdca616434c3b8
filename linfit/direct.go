package linfit

import (
	"math"
	"slices"
	"sync"

	"example.com/trammel/design"
	"example.com/trammel/internal/dd"
	"example.com/trammel/internal/factored"
	"example.com/trammel/internal/handover"
	"example.com/trammel/internal/lsq"
)

// direct is the engine of the refined QR path: the expanded matrix, its
// factorisation and the refined solution.
type direct struct {
	frame          *design.Frame
	form           *factored.Form
	roots, rootsLo []float64
	y, ylo         []float64
	dispersion     float64
	kind           Robust
	clusters       *clusters
	workers        int
	found          solved
	score          scoring

	mu      sync.Mutex // guards what follows: a Factor uses its own scratch
	problem lsq.Problem
	ws      lsq.Workspace
	factor  *lsq.Factor
	sol     lsq.Solution
	rows    *handover.RowStats
	cov     []float64
}

func solveDirect(r *run, c *clusters) (*solved, error) {
	e := &direct{frame: r.frame, form: r.form, kind: r.opts.Robust, clusters: c, workers: r.workers}
	e.roots, e.rootsLo = rootsOf(r.frame)
	e.y, e.ylo = leftSide(r.frame, e.roots, e.rootsLo)
	expand(&e.problem, r.form, e.roots, e.rootsLo)
	e.problem.Workers = r.workers
	e.factor = lsq.Factorize(&e.problem, &e.ws)
	n, p := r.form.N, len(r.form.Cols)
	if e.factor.Rank() < p {
		return nil, deficient(r.frame)
	}
	if err := r.step("factorised", n); err != nil {
		return nil, err
	}
	e.factor.Solve(e.y, e.ylo, &e.sol)
	if n == p {
		// As many rows as columns, all independent: there is no residual.
		clear(e.sol.R)
		clear(e.sol.RLo)
		e.sol.RSS = dd.Num{}
	}
	if err := r.step("solved", n); err != nil {
		return nil, err
	}
	s := &e.found
	*s = solved{path: "refined QR", passes: e.sol.Passes, b: e.sol.B, rss: e.sol.RSS, engine: e}
	s.corrected = hasIntercept(r.form) || spansConstant(e.factor, n, e.roots, e.rootsLo)
	s.tss = totals(r.frame, s.corrected)
	s.size = sizeOf(r.frame)
	s.rootDiag = e.factor.InverseRootDiag(nil)
	return s, nil
}

// sizeOf is the norm of the weighted response plus that of the known terms.
func sizeOf(f *design.Frame) float64 {
	var largest float64
	for _, y := range f.Y {
		largest = max(largest, math.Abs(y))
	}
	for _, k := range f.Known {
		largest = max(largest, math.Abs(k))
	}
	if largest == 0 {
		return 0
	}
	var y2, k2 float64
	for i, v := range f.Y {
		w := massOf(f, i).Hi
		y2 += w * (v / largest) * (v / largest)
		k := knownOf(f, i).Hi / largest
		k2 += w * k * k
	}
	return largest * (math.Sqrt(y2) + math.Sqrt(k2))
}

func (e *direct) setDispersion(v float64) { e.dispersion = v }

func (e *direct) UnscaledCovariance() []float64 {
	e.mu.Lock()
	defer e.mu.Unlock()
	return e.factor.Inverse(nil)
}

func (e *direct) Covariance() []float64 {
	if math.IsNaN(e.dispersion) {
		return nil
	}
	if e.kind != Ordinary || e.clusters != nil {
		v, _ := e.robust()
		return slices.Clone(v)
	}
	v := e.UnscaledCovariance()
	for i := range v {
		v[i] *= e.dispersion
	}
	return v
}

func (e *direct) robust() ([]float64, *Error) {
	e.mu.Lock()
	defer e.mu.Unlock()
	if e.cov == nil {
		v, refusal := e.sandwich(e.factor, &e.sol)
		if refusal != nil {
			return nil, refusal
		}
		e.cov = v
	}
	return e.cov, nil
}

// sandwich is the robust covariance of a solution over the frame's rows.
func (e *direct) sandwich(f *lsq.Factor, s *lsq.Solution) ([]float64, *Error) {
	var h []float64
	if e.kind == HC2 || e.kind == HC3 {
		h = make([]float64, len(s.R))
		f.LeveragesTo(h)
	}
	d := slices.Clone(s.R)
	if refusal := e.kind.adjust(d, h, e.frame, 0); refusal != nil {
		return nil, refusal
	}
	var group []int32
	groups := 0
	if e.clusters != nil {
		group, groups = e.clusters.codes, e.clusters.count
	}
	v := f.Sandwich(nil, d, group, groups)
	c := robustFactor(e.kind, e.clusters, e.frame.Cases(), len(s.B))
	for i := range v {
		v[i] *= c
	}
	return v, nil
}

func (e *direct) Rows() (*handover.RowStats, bool) {
	e.mu.Lock()
	defer e.mu.Unlock()
	if e.rows != nil {
		return e.rows, true
	}
	n := len(e.y)
	all := make([]float64, 3*n)
	st := &handover.RowStats{Fitted: all[:n:n], Residual: all[n : 2*n : 2*n], Leverage: all[2*n:]}
	e.factor.LeveragesTo(st.Leverage)
	for i := range n {
		r := dd.Num{Hi: e.sol.R[i], Lo: e.sol.RLo[i]}
		if e.roots != nil {
			r = r.Div(dd.Num{Hi: e.roots[i], Lo: e.rootsLo[i]})
		}
		st.Residual[i] = r.Float()
		st.Fitted[i] = responseOf(e.frame, i).Sub(r).Float()
		if e.frame.Counts != nil {
			st.Leverage[i] /= e.frame.Counts[i]
		}
	}
	e.rows = st
	return st, true
}

func (e *direct) Nested(with []int) (handover.NestedTest, error) {
	form, from := e.frame.Submodel(with)
	t := handover.NestedTest{DF: len(form.Cols) - from, SS: math.NaN(), Stat: math.NaN()}
	if t.DF == 0 {
		return t, nil
	}
	p := lsq.Problem{Workers: e.workers}
	expand(&p, form, e.roots, e.rootsLo)
	large := lsq.Factorize(&p, nil)
	if large.Rank() < p.P {
		return t, errDependent
	}
	var l, s lsq.Solution
	large.Solve(e.y, e.ylo, &l)
	if e.kind != Ordinary || e.clusters != nil {
		v, refusal := e.sandwich(large, &l)
		if refusal != nil {
			return t, refusal
		}
		t.Stat = wald(l.B[from:], v, p.P, from)
		return t, nil
	}
	q := p
	q.P, q.X = from, p.X[:from*p.N]
	if p.XLo != nil {
		q.XLo = p.XLo[:from*p.N]
	}
	lsq.Factorize(&q, nil).Solve(e.y, e.ylo, &s)
	var sum dd.Num
	for i := range l.R {
		d := dd.Num{Hi: s.R[i], Lo: s.RLo[i]}.Sub(dd.Num{Hi: l.R[i], Lo: l.RLo[i]})
		sum = sum.Add(d.Mul(d))
	}
	t.SS = sum.Float()
	if e.dispersion > 0 {
		t.Stat = t.SS / float64(t.DF) / e.dispersion
	}
	return t, nil
}

func (e *direct) ExtraSS(columns [][]float64) (df int, ss float64, err error) {
	e.mu.Lock()
	defer e.mu.Unlock()
	var kept [][]float64
	var s lsq.Solution
	for _, c := range columns {
		hi := slices.Clone(c)
		lo := make([]float64, len(c))
		if e.roots != nil {
			timesRoots(hi, lo, e.roots, e.rootsLo)
		}
		e.factor.Solve(hi, lo, &s)
		if u, ok := beyond(s.R, norm(hi), kept); ok {
			kept = append(kept, u)
			g := dot(u, e.sol.R)
			ss += g * g
		}
	}
	return len(kept), ss, nil
}

// beyond makes r orthogonal to the unit vectors kept and of unit length; ok is
// false when what is left of it is rounding beside size.
func beyond(r []float64, size float64, kept [][]float64) (u []float64, ok bool) {
	u = slices.Clone(r)
	for range 2 {
		for _, k := range kept {
			g := dot(u, k)
			for i, v := range k {
				u[i] -= g * v
			}
		}
	}
	left := norm(u)
	if !(left > lsq.Tolerance*size) {
		return nil, false
	}
	for i := range u {
		u[i] /= left
	}
	return u, true
}

func dot(a, b []float64) float64 {
	s := 0.0
	for i, v := range a {
		s += v * b[i]
	}
	return s
}

func norm(a []float64) float64 {
	s := 0.0
	for _, v := range a {
		s = math.Hypot(s, v)
	}
	return s
}

func (e *direct) MeanTo(mean, grad []float64, m *design.Matrix, known []float64, from, to int) {
	e.score.meanTo(mean, grad, e.sol.B, e.sol.BLo, m, known, from, to)
}

func (e *direct) LeverageTo(dst []float64, m *design.Matrix, from, to int) {
	leveragesTo(dst, e.factor, &e.mu, m, from, to)
}

// leveragesTo writes x'(X'WX)^-1 x for rows [from, to) of m.
func leveragesTo(dst []float64, f *lsq.Factor, mu *sync.Mutex, m *design.Matrix, from, to int) {
	mu.Lock()
	f.Prepare()
	mu.Unlock()
	_, p := m.Dims()
	scratch := make([]float64, 2*p+f.QuadScratch())
	x, lo := scratch[:p], scratch[p:2*p]
	for i := from; i < to; i++ {
		m.Form().RowTo(x, lo, i)
		dst[i-from] = f.QuadForm(x, lo, scratch[2*p:])
	}
}
