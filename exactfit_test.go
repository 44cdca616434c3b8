package trammel_test

import (
	"errors"
	"math"
	"math/big"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/internal/factored"
	"example.com/trammel/internal/handover"
)

// exactFit is a fitter for tests: least squares in rational numbers, rounded
// once at the end. It shares no numerics with the fitters of the module.
func exactFit(text string, t *design.Table, setAside bool) (trammel.Result, error) {
	f, err := exactHandover(text, t, setAside)
	if err != nil {
		return nil, err
	}
	return trammel.NewResult(f), nil
}

func exactHandover(text string, t *design.Table, setAside bool) (*handover.Fit, error) {
	m, err := formula.Parse(text)
	if err != nil {
		return nil, err
	}
	frame, err := design.Prepare(m, t, &design.Options{SetAside: setAside})
	if err != nil {
		return nil, err
	}
	return newExact(frame), nil
}

// exactEngine holds the problem and its solution in rational numbers.
type exactEngine struct {
	frame *design.Frame
	p     *problem
	s     *solution
	b     []float64
	disp  *big.Rat // nil without freedom
}

func newExact(frame *design.Frame) *handover.Fit {
	n, p := frame.Matrix.Dims()
	e := &exactEngine{frame: frame, p: &problem{x: formRows(frame.Matrix.Form())}}
	e.p.w, e.p.y = make([]*big.Rat, n), make([]*big.Rat, n)
	known := make([]*big.Rat, n)
	for i := range n {
		e.p.w[i] = new(big.Rat).Mul(at(frame.Weights, i, 1), at(frame.Counts, i, 1))
		known[i] = new(big.Rat).Add(at(frame.Known, i, 0), at(frame.KnownLo, i, 0))
		e.p.y[i] = new(big.Rat).Add(at(frame.Y, i, 0), at(frame.YLo, i, 0))
		e.p.y[i].Sub(e.p.y[i], known[i])
	}
	e.s = e.p.solve()
	e.b = floats(e.s.b)
	cases := int(frame.Cases())
	f := &handover.Fit{
		Fitter: "exact", Path: "rational normal equations", Plan: frame.Plan, Frame: frame,
		Estimates: e.b, Freedom: cases - p, DispersionEstimated: true,
		Dispersion: math.NaN(), Parameters: p + 1,
		ResidualSS: float(e.s.rss), ExactFit: e.s.rss.Sign() == 0 && cases > p,
		Deviance: math.NaN(), NullDeviance: math.NaN(), Pearson: math.NaN(),
		End:    handover.End{Reason: "solved", Measure: math.NaN(), Tolerance: math.NaN()},
		Engine: e,
	}
	ones := &problem{x: e.p.x, w: e.p.w, y: make([]*big.Rat, n)}
	full := make([]*big.Rat, n)
	for i := range n {
		ones.y[i] = big.NewRat(1, 1)
		full[i] = new(big.Rat).Add(e.p.y[i], known[i])
	}
	f.Corrected = ones.solve().rss.Sign() == 0
	about := &problem{x: make([][]*big.Rat, n), w: e.p.w, y: full}
	for i := range n {
		if f.Corrected {
			about.x[i] = []*big.Rat{big.NewRat(1, 1)}
		}
	}
	tss := about.solve().rss
	f.TotalSS = float(tss)
	f.RSquared = math.NaN()
	if tss.Sign() > 0 {
		f.RSquared = float(new(big.Rat).Sub(big.NewRat(1, 1), new(big.Rat).Quo(e.s.rss, tss)))
	}
	logWeights := 0.0
	for i := range frame.Weights {
		logWeights += float(at(frame.Counts, i, 1)) * math.Log(frame.Weights[i])
	}
	nn := float64(cases)
	f.LogLik = -nn/2*(math.Log(2*math.Pi*f.ResidualSS/nn)+1) + logWeights/2
	if f.Freedom > 0 {
		e.disp = new(big.Rat).Quo(e.s.rss, big.NewRat(int64(f.Freedom), 1))
		f.Dispersion = float(e.disp)
		v := e.Covariance()
		for j := range p {
			f.StdErrors = append(f.StdErrors, math.Sqrt(v[j*p+j]))
		}
	}
	for _, note := range frame.Notes {
		f.Notes = append(f.Notes, handover.Note(note))
	}
	return f
}

// at is v[i] as a rational, otherwise when v is nil.
func at(v []float64, i int, otherwise int64) *big.Rat {
	if v == nil {
		return big.NewRat(otherwise, 1)
	}
	return new(big.Rat).SetFloat64(v[i])
}

func formRows(form *factored.Form) [][]*big.Rat {
	x := make([][]*big.Rat, form.N)
	for i := range x {
		x[i] = make([]*big.Rat, len(form.Cols))
		for j := range x[i] {
			v := form.At(i, j)
			x[i][j] = new(big.Rat).Add(new(big.Rat).SetFloat64(v.Hi), new(big.Rat).SetFloat64(v.Lo))
		}
	}
	return x
}

func (e *exactEngine) scaled(scale *big.Rat) []float64 {
	p := len(e.s.b)
	out := make([]float64, 0, p*p)
	for _, row := range e.s.inverse {
		for _, v := range row {
			out = append(out, float(new(big.Rat).Mul(v, scale)))
		}
	}
	return out
}

func (e *exactEngine) Covariance() []float64 {
	if e.disp == nil {
		return nil
	}
	return e.scaled(e.disp)
}

func (e *exactEngine) UnscaledCovariance() []float64 { return e.scaled(big.NewRat(1, 1)) }

func (e *exactEngine) Rows() (*handover.RowStats, bool) {
	st := &handover.RowStats{}
	for i := range e.p.y {
		r := e.s.residual[i]
		y := new(big.Rat).Add(at(e.frame.Y, i, 0), at(e.frame.YLo, i, 0))
		st.Residual = append(st.Residual, float(r))
		st.Fitted = append(st.Fitted, float(new(big.Rat).Sub(y, r)))
		st.Leverage = append(st.Leverage, float(new(big.Rat).Mul(at(e.frame.Weights, i, 1), quad(e.p.x[i], e.s.inverse))))
	}
	return st, true
}

func (e *exactEngine) Nested(with []int) (handover.NestedTest, error) {
	form, from := e.frame.Submodel(with)
	large := &problem{x: formRows(form), w: e.p.w, y: e.p.y}
	small := &problem{w: e.p.w, y: e.p.y}
	for _, row := range large.x {
		small.x = append(small.x, row[:from])
	}
	l := large.solve()
	if l == nil {
		return handover.NestedTest{}, errors.New("the submodel is rank deficient")
	}
	t := handover.NestedTest{DF: len(form.Cols) - from, Stat: math.NaN()}
	ss := new(big.Rat).Sub(small.solve().rss, l.rss)
	t.SS = float(ss)
	if e.disp != nil && e.disp.Sign() > 0 && t.DF > 0 {
		t.Stat = float(ss.Quo(ss, new(big.Rat).Mul(e.disp, big.NewRat(int64(t.DF), 1))))
	}
	return t, nil
}

// ExtraSS adds the columns one by one; a column that is a combination of those
// before it up to rounding adds nothing.
func (e *exactEngine) ExtraSS(columns [][]float64) (df int, ss float64, err error) {
	x := &problem{w: e.p.w, y: e.p.y}
	for _, row := range e.p.x {
		x.x = append(x.x, append([]*big.Rat(nil), row...))
	}
	for _, c := range columns {
		own := &problem{x: x.x, w: e.p.w}
		size := new(big.Rat)
		for i, v := range c {
			own.y = append(own.y, new(big.Rat).SetFloat64(v))
			size.Add(size, new(big.Rat).Mul(e.p.w[i], new(big.Rat).Mul(own.y[i], own.y[i])))
		}
		left := own.solve().rss
		if left.Sign() == 0 || float(new(big.Rat).Quo(left, size)) < 1e-26 {
			continue
		}
		df++
		for i := range x.x {
			x.x[i] = append(x.x[i], own.y[i])
		}
	}
	if df == 0 {
		return 0, 0, nil
	}
	return df, float(new(big.Rat).Sub(e.s.rss, x.solve().rss)), nil
}

func (e *exactEngine) MeanTo(mean, grad []float64, m *design.Matrix, known []float64, from, to int) {
	p := len(e.b)
	for i := from; i < to; i++ {
		sum := 0.0
		for j := range p {
			x := m.At(i, j)
			sum += x * e.b[j]
			if grad != nil {
				grad[(i-from)*p+j] = x
			}
		}
		if known != nil {
			sum += known[i]
		}
		mean[i-from] = sum
	}
}

// LeverageTo makes the engine a handover.Leverager.
func (e *exactEngine) LeverageTo(dst []float64, m *design.Matrix, from, to int) {
	form := m.Form()
	x := make([]*big.Rat, len(e.b))
	for i := from; i < to; i++ {
		for j := range x {
			v := form.At(i, j)
			x[j] = new(big.Rat).Add(new(big.Rat).SetFloat64(v.Hi), new(big.Rat).SetFloat64(v.Lo))
		}
		dst[i-from] = float(quad(x, e.s.inverse))
	}
}

// plainEngine hides what an engine can do beside the contract.
type plainEngine struct{ handover.Engine }

// plainFit is exactFit with predictions through the covariance matrix.
func plainFit(text string, t *design.Table, setAside bool) (trammel.Result, error) {
	f, err := exactHandover(text, t, setAside)
	if err != nil {
		return nil, err
	}
	f.Engine = plainEngine{f.Engine}
	return trammel.NewResult(f), nil
}
