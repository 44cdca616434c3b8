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

// streamed is the engine of the path for tall tables of categories: moments by
// cell stand for the rows, and each cell becomes as many rows of a small problem
// as it has numeric columns, and one. Least squares over these condensed rows
// has the estimates, the inverse and the differences of sums of squares of the
// whole.
type streamed struct {
	frame      *design.Frame
	form       *factored.Form
	cells      *factored.Cells
	moments    *factored.Moments
	y, ylo     []float64 // response less known terms
	b, blo     []float64
	dispersion float64
	kind       Robust
	clusters   *clusters
	score      scoring

	mu     sync.Mutex // guards what follows
	small  *factored.Condensed
	factor *lsq.Factor
	rows   *handover.RowStats
	cov    []float64
}

// streamable reports whether the streamed path suits a form: the condensed
// problem must be small.
func streamable(form *factored.Form) bool {
	p, v := len(form.Cols), len(form.Nums)+1
	limit := pathElements / (v * p)
	return len(form.Nums) <= 32 && limit > 0 && form.CountCells(limit) <= limit
}

// solveStreamed returns nil, nil when the numbers do not suit the path.
func solveStreamed(r *run, c *clusters) (*solved, error) {
	f := r.frame
	e := &streamed{frame: f, form: r.form, kind: r.opts.Robust, clusters: c}
	stage := "summing"
	e.cells = &factored.Cells{Form: r.form, Count: r.form.CountCells(pathElements), Weights: f.Weights, Counts: f.Counts,
		Workers: r.workers, Step: func(done int) error { return r.step(stage, done) }}
	e.y, e.ylo = leftSide(f, nil, nil)
	var err error
	if e.moments, err = e.cells.Sum(e.y); err != nil {
		return nil, err
	}
	if e.small = factored.Condense(e.moments); e.small == nil {
		return nil, nil
	}
	e.factor = lsq.Factorize(e.small.Problem(r.form), nil)
	if e.factor.Rank() < len(r.form.Cols) {
		return nil, deficient(f)
	}
	var sol lsq.Solution
	side, sideLo := e.small.Response(e.moments)
	e.factor.Solve(side, sideLo, &sol)
	e.b, e.blo = slices.Clone(sol.B), slices.Clone(sol.BLo)
	stage = "refining"
	s := &solved{path: "streamed cell sums"}
	var rss float64
	for {
		lines := e.cells.Lines(e.moments, e.form, e.b, e.blo)
		g, sum, err := e.cells.Gradient(e.moments, lines, e.y, e.ylo)
		if err != nil {
			return nil, err
		}
		s.passes++
		side := e.small.Gradient(g)
		e.factor.Solve(side, nil, &sol)
		for j := range e.b {
			v := dd.Num{Hi: e.b[j], Lo: e.blo[j]}.AddF(sol.B[j])
			e.b[j], e.blo[j] = v.Hi, v.Lo
		}
		// The correction takes from the sum what of the gradient's side it explains.
		gained := dot(side, side) - sol.RSS.Float()
		rss = max(sum-gained, 0)
		if gained <= 1e-16*sum || s.passes == 4 {
			break
		}
	}
	s.b, s.rss, s.engine = slices.Clone(e.b), dd.Of(rss), e
	s.corrected = hasIntercept(r.form)
	if !s.corrected {
		// The side of the constant 1: mass with the constant, nothing with the rest.
		one := e.small.Side(func(k int) float64 { return e.moments.Mass[k] }, func(int, int) float64 { return 0 })
		e.factor.Solve(one, nil, &sol)
		s.corrected = math.Sqrt(sol.RSS.Hi) < lsq.Tolerance*norm(one)
	}
	if f.Known == nil && f.YLo == nil && s.corrected {
		s.tss = dd.Of(e.totalSS())
	} else {
		s.tss = totals(f, s.corrected)
	}
	s.size = e.size(s)
	s.rootDiag = e.factor.InverseRootDiag(nil)
	return s, nil
}

// totalSS is the sum of squares of the response about its mean, from the
// moments.
func (e *streamed) totalSS() float64 {
	m := e.moments
	z, t := m.V-1, m.V*(m.V+1)/2
	var mass, sum dd.Num
	for k, w := range m.Mass {
		mass, sum = mass.AddF(w), sum.Add(m.MeanOf(k, z).MulF(w))
	}
	grand := sum.Div(mass)
	var tss dd.Num
	for k, w := range m.Mass {
		d := m.MeanOf(k, z).Sub(grand).Float()
		tss = tss.AddF(m.M2[k*t+t-1]).AddF(w * d * d)
	}
	return tss.Float()
}

// size is the norm that the exactness of the fit is measured by.
func (e *streamed) size(s *solved) float64 {
	if e.frame.Known != nil {
		return sizeOf(e.frame)
	}
	m := e.moments
	z, t := m.V-1, m.V*(m.V+1)/2
	sum := 0.0
	for k, w := range m.Mass {
		y := m.MeanOf(k, z).Hi
		sum += m.M2[k*t+t-1] + w*y*y
	}
	return math.Sqrt(sum)
}

func (e *streamed) setDispersion(v float64) { e.dispersion = v }

func (e *streamed) UnscaledCovariance() []float64 {
	e.mu.Lock()
	defer e.mu.Unlock()
	return e.factor.Inverse(nil)
}

func (e *streamed) Covariance() []float64 {
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

// white writes the whitened rows of a cell's constant at the means and of each
// centred numeric column: (z+1)×p.
func (e *streamed) white(dst []float64, f *lsq.Factor, form *factored.Form, cell int, s *whiteScratch) {
	z, p := e.moments.V-1, len(form.Cols)
	form.EntriesTo(s.entries, cell, s.levels)
	for a := -1; a < z; a++ {
		for j, en := range s.entries {
			s.x[j] = 0
			switch k := form.Cols[j].Num; {
			case a < 0 && k < 0:
				s.x[j] = float64(en)
			case a < 0:
				s.x[j] = float64(en) * e.moments.MeanOf(cell, k).Hi
			case a == k:
				s.x[j] = float64(en)
			}
		}
		f.WhitenTo(dst[(a+1)*p:(a+2)*p], s.x, s.quad)
	}
}

type whiteScratch struct {
	entries []int8
	levels  []int32
	x, quad []float64
}

func newWhiteScratch(f *lsq.Factor, form *factored.Form) *whiteScratch {
	p := len(form.Cols)
	return &whiteScratch{make([]int8, p), make([]int32, len(form.Cats)), make([]float64, p), make([]float64, f.QuadScratch())}
}

// forms returns, by cell, the V×V matrix whose quadratic form at (1, centred
// numeric columns) of a row is x'(X'WX)^-1 x.
func (e *streamed) forms(f *lsq.Factor, form *factored.Form) []float64 {
	v, p := e.moments.V, len(form.Cols)
	out := make([]float64, e.cells.Count*v*v)
	u, s := make([]float64, v*p), newWhiteScratch(f, form)
	for _, cell := range e.small.Cells {
		e.white(u, f, form, cell, s)
		for a := range v {
			for b := range v {
				out[cell*v*v+a*v+b] = dot(u[a*p:(a+1)*p], u[b*p:(b+1)*p])
			}
		}
	}
	return out
}

// quad is the quadratic form q at (1, z).
func quad(q, z []float64) float64 {
	v := len(z) + 1
	sum := q[0]
	for a, za := range z {
		row := q[(a+1)*v : (a+2)*v]
		s := 2 * row[0]
		for b, zb := range z {
			s += row[1+b] * zb
		}
		sum += za * s
	}
	return sum
}

func (e *streamed) Rows() (*handover.RowStats, bool) {
	e.mu.Lock()
	defer e.mu.Unlock()
	if e.rows != nil {
		return e.rows, true
	}
	n, v := len(e.y), e.moments.V
	all := make([]float64, 3*n)
	st := &handover.RowStats{Fitted: all[:n:n], Residual: all[n : 2*n : 2*n], Leverage: all[2*n:]}
	forms := e.forms(e.factor, e.form)
	lines := e.cells.Lines(e.moments, e.form, e.b, e.blo)
	e.cells.Residuals(e.moments, lines, e.y, e.ylo, func(i, cell int, r float64, z []float64) {
		st.Residual[i] = r
		st.Fitted[i] = responseOf(e.frame, i).AddF(-r).Float()
		w := 1.0
		if e.frame.Weights != nil {
			w = e.frame.Weights[i]
		}
		st.Leverage[i] = min(w*quad(forms[cell*v*v:(cell+1)*v*v], z), 1)
	})
	e.rows = st
	return st, true
}

func (e *streamed) robust() ([]float64, *Error) {
	e.mu.Lock()
	defer e.mu.Unlock()
	if e.cov == nil {
		v, refusal := e.sandwich(e.factor, e.form, e.b, e.blo)
		if refusal != nil {
			return nil, refusal
		}
		e.cov = v
	}
	return e.cov, nil
}

// sandwich is the robust covariance of a solution for form's columns; f is the
// factor of its condensed rows.
func (e *streamed) sandwich(f *lsq.Factor, form *factored.Form, b, blo []float64) ([]float64, *Error) {
	v, p := e.moments.V, len(form.Cols)
	lines := e.cells.Lines(e.moments, form, b, blo)
	var meat []float64
	if e.clusters != nil {
		meat = e.clusterMeat(f, form, lines)
	} else {
		var refusal *Error
		if meat, refusal = e.rowMeat(f, form, lines, v); refusal != nil {
			return nil, refusal
		}
	}
	out := f.SandwichOf(nil, meat)
	c := robustFactor(e.kind, e.clusters, e.frame.Cases(), p)
	for i := range out {
		out[i] *= c
	}
	return out, nil
}

// rowMeat sums the squared scores of rows, by cell first.
func (e *streamed) rowMeat(f *lsq.Factor, form *factored.Form, lines *factored.Lines, v int) ([]float64, *Error) {
	p := len(form.Cols)
	var forms []float64
	if e.kind == HC2 || e.kind == HC3 {
		forms = e.forms(f, form)
	}
	sums := make([]float64, e.cells.Count*v*v)
	var refusal *Error
	var d, h [1]float64
	e.cells.Residuals(e.moments, lines, e.y, e.ylo, func(i, cell int, r float64, z []float64) {
		if refusal != nil {
			return
		}
		mass := massOf(e.frame, i).Hi
		root := math.Sqrt(mass)
		d[0] = root * r
		if forms != nil {
			h[0] = mass * quad(forms[cell*v*v:(cell+1)*v*v], z)
		}
		if refusal = e.kind.adjust(d[:], h[:], e.frame, i); refusal != nil {
			return
		}
		q := d[0] * d[0] * mass
		s := sums[cell*v*v : (cell+1)*v*v]
		s[0] += q
		for a, za := range z {
			s[(a+1)*v] += q * za
			for b, zb := range z[:a+1] {
				s[(a+1)*v+1+b] += q * za * zb
			}
		}
	})
	if refusal != nil {
		return nil, refusal
	}
	meat := make([]float64, p*p)
	u, s := make([]float64, v*p), newWhiteScratch(f, form)
	for _, cell := range e.small.Cells {
		e.white(u, f, form, cell, s)
		for a := range v {
			for b := range v {
				q := sums[cell*v*v+max(a, b)*v+min(a, b)]
				if q == 0 {
					continue
				}
				for i := range p {
					g := q * u[a*p+i]
					if g == 0 {
						continue
					}
					for j := range i + 1 {
						meat[i*p+j] += g * u[b*p+j]
					}
				}
			}
		}
	}
	return meat, nil
}

// clusterMeat sums the scores of clusters, by cluster and cell first.
func (e *streamed) clusterMeat(f *lsq.Factor, form *factored.Form, lines *factored.Lines) []float64 {
	v, p := e.moments.V, len(form.Cols)
	type pair struct{ cluster, cell int32 }
	place := make(map[pair]int)
	var pairs []pair
	var sums []float64
	e.cells.Residuals(e.moments, lines, e.y, e.ylo, func(i, cell int, r float64, z []float64) {
		k := pair{e.clusters.codes[i], int32(cell)}
		at, ok := place[k]
		if !ok {
			at = len(pairs)
			place[k] = at
			pairs = append(pairs, k)
			sums = append(sums, make([]float64, v)...)
		}
		r *= massOf(e.frame, i).Hi
		s := sums[at*v : (at+1)*v]
		s[0] += r
		for a, za := range z {
			s[1+a] += r * za
		}
	})
	scores := make([]float64, e.clusters.count*p)
	u, s := make([]float64, v*p), newWhiteScratch(f, form)
	byCell := make(map[int32][]int)
	for at, k := range pairs {
		byCell[k.cell] = append(byCell[k.cell], at)
	}
	for _, cell := range e.small.Cells {
		e.white(u, f, form, cell, s)
		for _, at := range byCell[int32(cell)] {
			t := scores[int(pairs[at].cluster)*p:][:p]
			for a, g := range sums[at*v : (at+1)*v] {
				for j := range t {
					t[j] += g * u[a*p+j]
				}
			}
		}
	}
	meat := make([]float64, p*p)
	for g := range e.clusters.count {
		t := scores[g*p : (g+1)*p]
		for i, ti := range t {
			for j, tj := range t[:i+1] {
				meat[i*p+j] += ti * tj
			}
		}
	}
	return meat
}

func (e *streamed) Nested(with []int) (handover.NestedTest, error) {
	form, from := e.frame.Submodel(with)
	t := handover.NestedTest{DF: len(form.Cols) - from, SS: math.NaN(), Stat: math.NaN()}
	if t.DF == 0 {
		return t, nil
	}
	p := e.small.Problem(form)
	side, sideLo := e.small.Response(e.moments)
	large := lsq.Factorize(p, nil)
	if large.Rank() < p.P {
		return t, errDependent
	}
	var l, s lsq.Solution
	large.Solve(side, sideLo, &l)
	if e.kind != Ordinary || e.clusters != nil {
		v, refusal := e.sandwich(large, form, l.B, l.BLo)
		if refusal != nil {
			return t, refusal
		}
		t.Stat = wald(l.B[from:], v, p.P, from)
		return t, nil
	}
	q := *p
	q.P, q.X, q.XLo = from, p.X[:from*p.N], p.XLo[:from*p.N]
	lsq.Factorize(&q, nil).Solve(side, sideLo, &s)
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

func (e *streamed) ExtraSS(columns [][]float64) (df int, ss float64, err error) {
	st, _ := e.Rows()
	e.mu.Lock()
	defer e.mu.Unlock()
	n := len(e.y)
	quiet := *e.cells
	quiet.Step = nil
	own := make([]float64, n)
	for i, r := range st.Residual {
		own[i] = r * math.Sqrt(massOf(e.frame, i).Hi)
	}
	var kept [][]float64
	var sol lsq.Solution
	for _, c := range columns {
		m, err := quiet.Sum(c)
		if err != nil {
			return 0, 0, err
		}
		side, sideLo := e.small.Response(m)
		e.factor.Solve(side, sideLo, &sol)
		left := make([]float64, n)
		size := 0.0
		quiet.Residuals(m, quiet.Lines(m, e.form, sol.B, sol.BLo), c, nil, func(i, _ int, r float64, _ []float64) {
			root := math.Sqrt(massOf(e.frame, i).Hi)
			left[i] = r * root
			size = math.Hypot(size, c[i]*root)
		})
		if u, ok := beyond(left, size, kept); ok {
			kept = append(kept, u)
			g := dot(u, own)
			ss += g * g
		}
	}
	return len(kept), ss, nil
}

func (e *streamed) MeanTo(mean, grad []float64, m *design.Matrix, known []float64, from, to int) {
	e.score.meanTo(mean, grad, e.b, e.blo, m, known, from, to)
}

func (e *streamed) LeverageTo(dst []float64, m *design.Matrix, from, to int) {
	leveragesTo(dst, e.factor, &e.mu, m, from, to)
}
