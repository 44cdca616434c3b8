package nlfit

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/internal/dd"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/handover"
	"example.com/trammel/internal/search"
)

// Options says how to fit. Nil means the zero value.
type Options struct {
	// SetAside leaves out incomplete rows and lists them in the result; by
	// default they are refused.
	SetAside bool

	// Seed chooses the starts that are tried where none are given. Every seed
	// gives the same result each time.
	Seed uint64

	// Budget is the number of evaluations of the equation over all rows that the
	// search may use; 0 stands for a default that grows with the number of
	// coefficients.
	Budget int

	// StayLocal keeps the search to the minimum reached from given starts. By
	// default a small problem is also searched for lower minima elsewhere.
	StayLocal bool

	// Workers is the number of goroutines; 0 means GOMAXPROCS. Results are the
	// same bit for bit for every number.
	Workers int
}

func (o *Options) check() *Error {
	for _, c := range []struct {
		name  string
		value int
	}{{"Budget", o.Budget}, {"Workers", o.Workers}} {
		if c.value < 0 {
			return &Error{Code: codeBadOption, Message: fmt.Sprintf("the option %s is %d", c.name, c.value), Hint: "give a number of at least 0; 0 is the default"}
		}
	}
	return nil
}

// Fit parses the text of an equation, compiles it against the table and fits it.
// A text or data that cannot be used are refused by a [*formula.Error], a
// [*design.Error] or an [*Error]. A search that ends early, its budget spent or
// the context ended, gives the partial result and an [*Error]. opts may be nil.
func Fit(ctx context.Context, text string, t *design.Table, opts *Options) (trammel.Result, error) {
	if opts == nil {
		opts = &Options{}
	}
	if err := opts.check(); err != nil {
		return nil, err
	}
	m, err := formula.Parse(text)
	if err != nil {
		return nil, err
	}
	if m.Equation == nil {
		what := "linfit fits it"
		if m.Errors != nil {
			what = "its errors have no fitter here yet"
		}
		return nil, &Error{Code: codeTerms, Text: text, Span: m.Terms.Span(), Message: "the model is made of terms, and nlfit fits equations",
			Hint: what + "; or write response = expression fitting its parameters"}
	}
	f, err := design.Prepare(m, t, &design.Options{SetAside: opts.SetAside})
	if err != nil {
		return nil, err
	}
	return FitFrame(ctx, f, opts)
}

// FitFrame fits the equation of a prepared frame; the errors are those of
// [Fit]. opts may be nil.
func FitFrame(ctx context.Context, f *design.Frame, opts *Options) (trammel.Result, error) {
	if opts == nil {
		opts = &Options{}
	}
	if err := opts.check(); err != nil {
		return nil, err
	}
	if f == nil || f.Plan.Equation() == nil {
		return nil, &Error{Code: codeTerms, Message: "the frame holds no equation", Hint: "prepare a model such as y = a*exp(-k*x) fitting a, k"}
	}
	r, err := fit(ctx, f, opts)
	if err != nil && r == nil {
		return nil, err
	}
	return trammel.NewResult(r), err
}

func fit(ctx context.Context, f *design.Frame, opts *Options) (*handover.Fit, error) {
	eq := f.Plan.Equation()
	m := newModel(eq, f.Matrix)
	root := roots(f)
	problem := &search.Problem{N: m.n, P: m.p, Y: f.Y, Root: root, Linear: make([]bool, m.p), Range: ranges(f), Eval: m.eval()}
	// A parameter's levels begin together; the coefficients of a model of its own
	// each by themselves.
	problem.Group = make([]int, m.p)
	for q, p := range eq.Params {
		for j := p.From; j < p.To; j++ {
			problem.Group[j] = q
			if p.Own {
				problem.Group[j] = len(eq.Params) + j
			}
		}
	}
	bounds(problem, eq)
	never := make([]bool, len(eq.Params))
	for q, p := range eq.Params {
		never[q] = p.Link != "" || !math.IsInf(p.Low, -1) || !math.IsInf(p.High, 1)
	}
	for q, affine := range eq.Program.Affine(never) {
		for j := eq.Params[q].From; j < eq.Params[q].To; j++ {
			problem.Linear[j] = affine
		}
	}
	if err := given(problem, f, m); err != nil {
		return nil, err
	}
	o := &search.Options{Seed: opts.Seed, Budget: opts.Budget, Workers: opts.Workers, Elsewhere: !opts.StayLocal && m.n*m.p <= 20_000,
		Step: func(search.Progress) error { return context.Cause(ctx) }}
	if few := sample(m); few != nil && problem.Start == nil {
		// Starts are sought on some of the rows; the walk over all of them begins
		// where that search ended.
		part := *problem
		sub := m.subset(few)
		part.N, part.Eval = len(few), sub.eval()
		part.Y, part.Root = make([]float64, len(few)), nil
		for i, r := range few {
			part.Y[i] = f.Y[r]
		}
		if root != nil {
			part.Root = make([]float64, len(few))
			for i, r := range few {
				part.Root[i] = root[r]
			}
		}
		first, err := search.Solve(&part, o)
		if err != nil {
			return nil, refusal(err, f)
		}
		problem.Start = first.Theta
	}
	found, err := search.Solve(problem, o)
	if found == nil {
		return nil, refusal(err, f)
	}
	out, singular := finish(f, m, found, problem)
	switch {
	case err != nil:
		return out, refusal(err, f)
	case singular != nil:
		return out, singular
	case found.End.Reason == "budget":
		return out, &Error{Code: codeBudget, Text: f.Plan.Model().Text, Message: fmt.Sprintf("the search used its %d evaluations before it converged", found.End.Evaluations),
			Hint: "raise Budget, give starts, or check that the data can tell the parameters apart"}
	}
	return out, nil
}

// eval gives the search its evaluations, each with scratch of its own.
func (m *model) eval() func(theta, out, jac, v, hess []float64) bool {
	pool := make(chan *evaluator, 64)
	return func(theta, out, jac, v, hess []float64) bool {
		var e *evaluator
		select {
		case e = <-pool:
		default:
			e = m.evaluator(true)
		}
		ok := e.evaluate(theta, out, jac, m.n, v, hess, 0, m.n)
		select {
		case pool <- e:
		default:
		}
		return ok
	}
}

// sample lists the rows on which starts are sought when there are very many: every
// so-manieth of them, in the golden ratio, at least a hundred for each coefficient.
// nil for all.
func sample(m *model) []int {
	want := max(2000, 100*m.p)
	if m.n <= 4*want {
		return nil
	}
	const golden = 0.6180339887498949
	var rows []int
	for i := range m.n {
		u := float64(i) * golden
		if u-math.Floor(u) < float64(want)/float64(m.n) {
			rows = append(rows, i)
		}
	}
	return rows
}

// roots are the square roots of weight times count; nil when all are 1.
func roots(f *design.Frame) []float64 {
	if f.Weights == nil && f.Counts == nil {
		return nil
	}
	out := make([]float64, len(f.Y))
	for i := range out {
		w := 1.0
		if f.Weights != nil {
			w = f.Weights[i]
		}
		if f.Counts != nil {
			w *= f.Counts[i]
		}
		out[i] = math.Sqrt(w)
	}
	return out
}

func bounds(p *search.Problem, eq *design.Equation) {
	low, high := make([]float64, p.P), make([]float64, p.P)
	some := false
	for _, q := range eq.Params {
		for j := q.From; j < q.To; j++ {
			low[j], high[j] = math.Inf(-1), math.Inf(1)
			if !q.Own {
				low[j], high[j] = q.Low, q.High
				some = some || !math.IsInf(q.Low, -1) || !math.IsInf(q.High, 1)
			}
		}
	}
	if some {
		p.Low, p.High = low, high
	}
}

// given takes the starts that the text gives. When every parameter has one, the
// search begins there; when some have, these are kept to theirs among the starts
// that are tried.
func given(p *search.Problem, f *design.Frame, m *model) *Error {
	eq := f.Plan.Equation()
	start := make([]float64, p.P)
	all := true
	for _, q := range eq.Params {
		if math.IsNaN(q.Start) {
			all = false
			continue
		}
		s := link(q.Link, q.Start)
		for j := q.From; j < q.To; j++ {
			v := s
			if q.Own && f.Plan.Columns()[q.From].Name != "" && !constantOrLevel(f, j, q) {
				v = 0
			}
			start[j] = v
		}
	}
	if !all {
		for _, q := range eq.Params {
			for j := q.From; j < q.To && !math.IsNaN(q.Start); j++ {
				p.Range[j] = search.Range{Low: start[j], High: start[j]}
			}
		}
		return nil
	}
	out := make([]float64, m.n)
	if !m.evaluator(false).evaluate(start, out, nil, 0, nil, nil, 0, m.n) {
		i := slices.IndexFunc(out, func(v float64) bool { return v-v != 0 })
		return &Error{Code: codeStart, Text: f.Plan.Model().Text, Span: f.Plan.Model().Equation.Span(),
			Message: fmt.Sprintf("the equation is not finite at the given start, in row %d first", f.Row(i)),
			Hint:    "give another start, or leave starts out: the search finds its own"}
	}
	p.Start = start
	return nil
}

// constantOrLevel tells that coefficient j carries a parameter's level: its
// intercept, or, without one, the full set of its first category.
func constantOrLevel(f *design.Frame, j int, q design.Parameter) bool {
	terms, columns := f.Plan.Terms(), f.Plan.Columns()
	first := terms[columns[q.From].Term]
	if first.Intercept {
		return j == q.From
	}
	return j < first.To
}

// refusal words what the search returned.
func refusal(err error, f *design.Frame) error {
	text := f.Plan.Model().Text
	span := f.Plan.Model().Equation.Span()
	switch {
	case err == nil:
		return nil
	case errors.Is(err, search.ErrNoFinite):
		return &Error{Code: codeNoFinite, Text: text, Span: span, Err: err,
			Message: "the equation is finite at none of the values that were tried for its parameters", Hint: "give starts, or bounds that keep its functions defined"}
	}
	return &Error{Code: codeCancelled, Text: "", Err: err, Message: "the search was ended before it was done: " + err.Error()}
}

// singularError names the coefficients that the data cannot tell apart.
func singularError(f *design.Frame, null [][]float64) *Error {
	e := &Error{Code: codeSingular, Text: f.Plan.Model().Text, Span: f.Plan.Model().Equation.Span()}
	var words []string
	for _, v := range null {
		big := 0.0
		for _, x := range v {
			big = math.Max(big, math.Abs(x))
		}
		var names []string
		for j, x := range v {
			if math.Abs(x) > 1e-6*big {
				names = append(names, f.Plan.Columns()[j].Name)
			}
		}
		e.Names = append(e.Names, names...)
		if len(names) == 0 {
			continue
		}
		if len(names) == 1 {
			words = append(words, names[0]+" is not determined by the data")
		} else {
			words = append(words, errtext.And(names)+" cannot be told apart: only a combination of them is determined")
		}
	}
	if words == nil {
		words = []string{"some coefficients are not determined by the data"}
	}
	e.Message = strings.Join(words, "; ")
	e.Hint = "hold one of them at a value, as in k = 1, or take it out of the equation"
	return e
}

// finish turns a search's end into a fit.
func finish(f *design.Frame, m *model, found *search.Result, problem *search.Problem) (*handover.Fit, error) {
	p, root := m.p, problem.Root
	bound := make([]bool, p)
	for _, j := range found.End.Bound {
		bound[j] = true
	}
	var free []int
	for j := range p {
		if !bound[j] {
			free = append(free, j)
		}
	}
	e, _ := newEngine(f, m, found.Theta, free, root)
	e.search = problem
	out := &handover.Fit{Fitter: "nlfit", Path: "variable projection and Newton", Plan: f.Plan, Frame: f, Estimates: found.Theta,
		DispersionEstimated: true, Corrected: true, Parameters: len(free) + 1, Engine: e,
		Deviance: math.NaN(), NullDeviance: math.NaN(), Pearson: math.NaN(), Dispersion: math.NaN(), LogLik: math.NaN(),
		End: handover.End{Reason: found.End.Reason, Iterations: found.End.Iterations, Measure: found.End.Measure, Tolerance: found.End.Tolerance}}
	cases := f.Cases()
	out.Freedom = int(cases) - len(free)
	var rss, sumW, sumWY dd.Num
	for i, r := range e.residual {
		w := weight(root, i)
		rss = rss.Add(dd.Of(r).MulF(r).MulF(w))
		sumW = sumW.AddF(w)
		sumWY = sumWY.Add(dd.Of(f.Y[i]).MulF(w))
	}
	mean := sumWY.Div(sumW)
	var tss, size dd.Num
	for i, y := range f.Y {
		w := weight(root, i)
		d := dd.Of(y).Sub(mean)
		tss = tss.Add(d.Mul(d).MulF(w))
		size = size.Add(dd.Of(y).MulF(y).MulF(w))
	}
	out.ResidualSS, out.TotalSS = rss.Float(), tss.Float()
	out.RSquared = tss.Sub(rss).Div(tss).Float()
	const unit = 0x1p-53
	out.ExactFit = math.Sqrt(out.ResidualSS) <= 4*unit*math.Sqrt(size.Float())
	if out.Freedom > 0 {
		out.Dispersion = out.ResidualSS / float64(out.Freedom)
		e.dispersion = out.Dispersion
		if !out.ExactFit {
			logs := 0.0
			for i := range f.Y {
				if f.Weights != nil {
					c := 1.0
					if f.Counts != nil {
						c = f.Counts[i]
					}
					logs += c * math.Log(f.Weights[i])
				}
			}
			out.LogLik = -cases/2*(math.Log(2*math.Pi*out.ResidualSS/cases)+1) + logs/2
		}
		out.StdErrors = make([]float64, p)
		for j := range out.StdErrors {
			out.StdErrors[j] = math.NaN()
		}
		if e.factor.Rank() == len(free) {
			roots := e.factor.InverseRootDiag(nil)
			for q, j := range free {
				out.StdErrors[j] = roots[q] * math.Sqrt(out.Dispersion)
			}
		}
	} else {
		e.dispersion = math.NaN()
		out.Notes = append(out.Notes, handover.Note{Code: "saturated", Text: "there are as many coefficients as cases: nothing is left to judge them by"})
	}
	notes(out, f, found, math.Sqrt(size.Float()))
	for _, min := range found.Minima {
		out.Minima = append(out.Minima, handover.Minimum{ResidualSS: min.RSS, Estimates: min.Theta, Starts: min.Starts})
	}
	if k := e.factor.Rank(); k < len(free) && found.End.Reason != "budget" {
		// A direction is judged by what each coefficient's move does to the fit.
		var null [][]float64
		for _, v := range e.factor.NullVectors() {
			all := make([]float64, p)
			for q, j := range free {
				norm := 0.0
				for _, x := range e.problem.X[q*m.n : (q+1)*m.n] {
					norm = math.Hypot(norm, x)
				}
				all[j] = v[q] * norm
			}
			if !(slices.Max(all) > 1e-290 || slices.Min(all) < -1e-290) {
				// The fit does not feel the coefficient at all.
				for q, j := range free {
					all[j] = v[q]
				}
			}
			null = append(null, all)
		}
		out.End.Reason = "singular"
		return out, singularError(f, null)
	}
	return out, nil
}

func weight(root []float64, i int) float64 {
	if root == nil {
		return 1
	}
	return root[i] * root[i]
}

// notes says what a user should know about the search.
func notes(out *handover.Fit, f *design.Frame, found *search.Result, size float64) {
	for _, n := range f.Notes {
		out.Notes = append(out.Notes, handover.Note(n))
	}
	columns := f.Plan.Columns()
	for _, j := range found.End.Bound {
		out.Notes = append(out.Notes, handover.Note{Code: "bound-active",
			Text: fmt.Sprintf("%s lies on its bound; it has no standard error, and the others' hold it there", columns[j].Name)})
	}
	if out.ExactFit {
		out.Notes = append(out.Notes, handover.Note{Code: "exact-fit", Text: "the fit is exact up to rounding"})
	} else if math.Sqrt(out.ResidualSS) < 1e-12*size {
		out.Notes = append(out.Notes, handover.Note{Code: "few-digits",
			Text: "the residuals are so near rounding that the residual standard deviation and the standard errors carry few digits"})
	}
	if len(found.Minima) > 1 && found.Minima[1].RSS < found.Minima[0].RSS {
		out.Notes = append(out.Notes, handover.Note{Code: "lower-minimum",
			Text: "the search found a lower minimum than the one reached from the given start; the estimates are those of the lowest"})
	}
}
