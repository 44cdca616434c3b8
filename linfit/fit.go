package linfit

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"
	"slices"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/internal/dd"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/factored"
	"example.com/trammel/internal/handover"
)

// Fit parses the model text, compiles it against the table and fits it. A
// refusal is a *formula.Error, a *design.Error or an [*Error]. A nil ctx never
// ends; when ctx ends before the fit, the error wraps context.Cause(ctx).
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
	if err := suited(m); err != nil {
		return nil, err
	}
	frame, err := design.Prepare(m, t, &design.Options{SetAside: opts.SetAside, NoRankCheck: true})
	if err != nil {
		return nil, err
	}
	var c *clusters
	if opts.ClusterBy != "" {
		var refusal *Error
		if c, refusal = clustersOf(opts.ClusterBy, t, frame); refusal != nil {
			return nil, refusal
		}
	}
	return fit(ctx, frame, c, opts)
}

// FitFrame fits the model of a prepared frame to its rows, as Fit does.
func FitFrame(ctx context.Context, f *design.Frame, opts *Options) (trammel.Result, error) {
	if opts == nil {
		opts = &Options{} // stays on the stack
	}
	if err := opts.check(); err != nil {
		return nil, err
	}
	if opts.ClusterBy != "" {
		return nil, &Error{Code: codeBadOption,
			Message: "the option ClusterBy names columns of a table, and a frame has none",
			Hint:    "call linfit.Fit with the table"}
	}
	if err := suited(f.Plan.Model()); err != nil {
		return nil, err
	}
	return fit(ctx, f, nil, opts)
}

// suited refuses the models of other packages.
func suited(m *formula.Model) error {
	if m.Equation != nil {
		return &Error{Code: codeEquation, Text: m.Text, Span: m.Equation.Span(),
			Message: "the model is an equation, and linfit fits terms", Hint: "package nlfit fits it; or write the terms after ~"}
	}
	e := m.Errors
	if e == nil || e.Family == "normal" && !e.Overdispersed && (e.Link == "" || e.Link == "identity") {
		return nil
	}
	return &Error{Code: codeErrors, Text: m.Text, Span: e.Pos,
		Message: fmt.Sprintf("%q is not normal errors with identity link, the one kind that linfit fits", e.String()),
		Hint:    "generalized linear models have no fitter here yet; leave the clause out for a least-squares fit, or model log(y)"}
}

// A run is what the parts of one fit share.
type run struct {
	ctx     context.Context
	opts    Options
	frame   *design.Frame
	form    *factored.Form
	workers int
}

// step reports progress and asks whether to go on.
func (r *run) step(stage string, done int) error {
	if r.ctx != nil && r.ctx.Err() != nil {
		return cancelled(context.Cause(r.ctx))
	}
	if r.opts.Progress == nil {
		return nil
	}
	if err := r.opts.Progress(Progress{Stage: stage, Done: done, Rows: r.form.N}); err != nil {
		return cancelled(err)
	}
	return nil
}

func cancelled(cause error) error {
	return &Error{Code: codeCancelled, Message: "the fit was ended before it was done: " + cause.Error(), Err: cause}
}

func fit(ctx context.Context, f *design.Frame, c *clusters, opts *Options) (trammel.Result, error) {
	r := &run{ctx: ctx, opts: *opts, frame: f, form: f.Matrix.Form(), workers: opts.Workers}
	if r.workers == 0 {
		r.workers = runtime.GOMAXPROCS(0)
	}
	n, p := r.form.N, len(r.form.Cols)
	if n < p {
		return nil, &Error{Code: codeTooFewRows,
			Message: fmt.Sprintf("the model has %s and the frame %s", errtext.Count(p, "column"), errtext.Count(n, "row")),
			Hint:    "give at least as many rows as columns"}
	}
	cases := f.Cases()
	if cases > 1<<53 || cases > math.MaxInt {
		return nil, &Error{Code: codeOutOfRange, Message: "the counts sum to more cases than can be counted", Hint: "write weighted instead of counted"}
	}
	freedom := int(int64(cases) - int64(p))
	if freedom == 0 && (opts.Robust != Ordinary || c != nil) {
		return nil, &Error{Code: codeNoFreedom,
			Message: fmt.Sprintf("a robust covariance needs residuals with freedom, and %s leave none to %s",
				errtext.Count(p, "column"), errtext.Count(n, "row")),
			Hint: "fit without it, or with more rows"}
	}
	if err := r.step("prepared", 0); err != nil {
		return nil, err
	}
	out := &handover.Fit{
		Fitter: "linfit", Plan: f.Plan, Frame: f,
		Freedom: freedom, Dispersion: math.NaN(), DispersionEstimated: true,
		Parameters: p + 1,
		Deviance:   math.NaN(), NullDeviance: math.NaN(), Pearson: math.NaN(),
		End: handover.End{Reason: "solved", Measure: math.NaN(), Tolerance: math.NaN()},
	}
	for _, note := range f.Notes {
		out.Notes = append(out.Notes, handover.Note(note))
	}
	s, err := solve(r, c)
	if err != nil {
		return nil, err
	}
	if err := finish(out, r, s, c); err != nil {
		return nil, err
	}
	return trammel.NewResult(out), nil
}

// A solved is what a numeric path found; its engine answers later questions.
type solved struct {
	path      string
	passes    int
	b         []float64
	rootDiag  []float64 // square roots of the diagonal of (X'WX)^-1
	rss, tss  dd.Num
	size      float64 // norm of the weighted response and of the known terms
	corrected bool
	engine    engine
}

// An engine is handover.Engine with what the fit itself needs of it.
type engine interface {
	handover.Engine
	setDispersion(v float64)
	robust() ([]float64, *Error) // the robust covariance; computed once
}

// pathElements is the size of the expanded matrix up to which it is formed.
const pathElements = 4_000_000

// solve chooses the numeric path.
func solve(r *run, c *clusters) (*solved, error) {
	if n, p := r.form.N, len(r.form.Cols); n > pathElements/max(p, 1) && streamable(r.form) {
		if s, err := solveStreamed(r, c); s != nil || err != nil {
			return s, err
		}
	}
	return solveDirect(r, c)
}

// deficient is the refusal of dependent columns.
func deficient(f *design.Frame) error {
	if err := f.CheckRank(); err != nil {
		return err
	}
	if w := f.Weights; w != nil {
		if low, high := slices.Min(w), slices.Max(w); low < 0x1p-80*high {
			return &Error{Code: codeOutOfRange,
				Message: fmt.Sprintf("weights range from %.3g to %.3g, so far apart that only the rows of the largest count, and they do not tell the columns apart", low, high),
				Hint:    "bring the weights closer together; a row that should not count has weight 0"}
		}
	}
	return &Error{Code: codeOutOfRange, Message: "the columns are linearly dependent as far as float64 can tell",
		Hint: "bring the columns to comparable scale, or take a term out"}
}

// finish fills in the figures that all paths form alike.
func finish(out *handover.Fit, r *run, s *solved, c *clusters) error {
	f := r.frame
	rss, tss := s.rss.Float(), s.tss.Float()
	if !(rss <= math.MaxFloat64 && tss <= math.MaxFloat64) {
		return &Error{Code: codeOutOfRange, Message: "the sum of squares of the response is beyond the range of float64",
			Hint: "give the response, and its weights, in a larger unit"}
	}
	if s.size > 0 && s.size < 0x1p-480 {
		return &Error{Code: codeOutOfRange, Message: "the response is so small that its squares are below the range of float64",
			Hint: "give the response in a smaller unit"}
	}
	for _, b := range s.b {
		if math.IsInf(b, 0) || math.IsNaN(b) {
			return &Error{Code: codeOutOfRange, Message: "a coefficient is beyond the range of float64",
				Hint: "give the columns in other units"}
		}
	}
	out.Path, out.End.Iterations, out.Engine, out.Estimates = s.path, s.passes, s.engine, s.b
	out.ResidualSS, out.TotalSS, out.Corrected = rss, tss, s.corrected
	out.RSquared = math.NaN()
	if tss > 0 {
		out.RSquared = s.tss.Sub(s.rss).Div(s.tss).Float()
	}
	cases := f.Cases()
	out.LogLik = -cases / 2 * (math.Log(2*math.Pi*rss/cases) + 1)
	if f.Weights != nil {
		logs := 0.0
		for i, w := range f.Weights {
			m := 1.0
			if f.Counts != nil {
				m = f.Counts[i]
			}
			logs += m * math.Log(w)
		}
		out.LogLik += logs / 2
	}
	if out.Freedom == 0 {
		out.Notes = append(out.Notes, handover.Note{Code: "saturated",
			Text: "The model has as many coefficients as cases: the residuals have 0 degrees of freedom and there are no standard errors."})
		s.engine.setDispersion(math.NaN())
		return nil
	}
	// A response rounded to float64, made by an operation or two, is off by at
	// most exactRounding units of 2^-53 of itself.
	const exactRounding = 4
	out.ExactFit = math.Sqrt(rss) <= exactRounding*0x1p-53*s.size
	if out.ExactFit {
		out.Notes = append(out.Notes, handover.Note{Code: "exact-fit",
			Text: "The fit is exact up to rounding: the residuals say nothing about the scatter."})
	}
	out.Dispersion = s.rss.Div(dd.Of(float64(out.Freedom))).Float()
	s.engine.setDispersion(out.Dispersion)
	out.StdErrors = s.rootDiag
	if r.opts.Robust == Ordinary && c == nil {
		sd := math.Sqrt(out.Dispersion)
		for j := range out.StdErrors {
			out.StdErrors[j] *= sd
		}
		return nil
	}
	out.Robust = string(r.opts.Robust)
	if c != nil {
		out.Robust = "clustered by " + c.text
	}
	v, refusal := s.engine.robust()
	if refusal != nil {
		return refusal
	}
	p := len(s.b)
	for j := range out.StdErrors {
		out.StdErrors[j] = math.Sqrt(v[j*p+j])
	}
	return nil
}

var errDependent = errors.New("the columns of the submodel are linearly dependent")
