package trammel

import (
	"fmt"
	"math"

	"example.com/trammel/design"
	"example.com/trammel/internal/handover"
)

// PredictOptions says what to predict. Nil means the zero value.
type PredictOptions struct {
	// Level of both intervals, in (0, 1); 0 stands for 0.95.
	Level float64

	// Weights are the weights of the new observations, one per row, all positive:
	// the variance of a new observation is the dispersion over its weight. Nil
	// stands for 1 everywhere, also when the model is weighted.
	Weights []float64

	// Original maps a transformed response, such as log(porosity), back to its
	// column. Mean is then the median of the column under normal errors, and the
	// ends of the intervals are mapped ends.
	Original bool

	// Smearing, with Original, gives the mean of the column in place of its median:
	// the average over the fitted rows of the mapped sum of prediction and
	// residual (N. Duan, "Smearing estimate: a nonparametric retransformation
	// method", J. Amer. Statist. Assoc. 78 (1983) 605-610). Residuals are scaled by
	// the roots of their rows' weights and of the new ones. Its confidence interval
	// is not defined. The work is rows to predict times rows fitted.
	Smearing bool
}

// Predictions are predicted rows, in the order of the table.
type Predictions struct {
	Quantity string  // what is predicted, in words: "mean of porosity", "median of porosity, mapped back from log(porosity)"
	Level    float64 // of both intervals
	Rows     []Prediction
}

// A Prediction is the answer for one row. What is not defined is NaN.
type Prediction struct {
	Mean     float64 // see Predictions.Quantity
	StdError float64 // of Mean; NaN on the original scale
	Low      float64 // confidence interval of Mean
	High     float64
	NewLow   float64 // interval that holds one new observation, with its own scatter
	NewHigh  float64
}

// Predict gives the mean response at the rows of t, with a confidence interval
// for the mean and an interval for a new observation. t needs the columns on the
// right side of the model only. A table that the plan cannot take (a level never
// seen, a missing column) is refused by a [*design.Error], bad options by an
// [*Error].
//
// With x the row's columns, V the covariance and σ² the dispersion, the
// standard error of the mean is √(x'Vx); the intervals are Mean ± q·√(x'Vx)
// and Mean ± q·√(x'Vx + σ²/weight), q as in [Coefficients]. With a robust
// covariance V is robust and σ² the same as without. Where columns are so nearly
// dependent that V cannot tell x'Vx, the intervals are NaN. A prediction outside the
// range of the fitted rows rests on the model alone.
func Predict(r Result, t *design.Table, opts *PredictOptions) (*Predictions, error) {
	if opts == nil {
		opts = &PredictOptions{}
	}
	f, level, err := fitAndLevel(r, opts.Level)
	if err != nil {
		return nil, err
	}
	var back design.BackMap
	if opts.Original || opts.Smearing {
		if back, err = wayBack(f, opts); err != nil {
			return nil, err
		}
	}
	m, known, err := matrixAt(f, t)
	if err != nil {
		return nil, err
	}
	n, _ := m.Dims()
	if err := checkWeights(opts.Weights, n); err != nil {
		return nil, err
	}
	out := &Predictions{Quantity: quantity(f, back.Column, opts), Level: level, Rows: make([]Prediction, n)}
	out.fill(f, m, known, opts.Weights, level)
	switch {
	case opts.Smearing:
		return out, out.smear(f, back, opts.Weights)
	case opts.Original:
		for i := range out.Rows {
			out.Rows[i].mapBack(back)
		}
	}
	return out, nil
}

// PredictTo writes the mean response at the rows of t to dst, one place per row,
// on the scale of the modelled response. What it allocates does not grow with
// the number of rows, unless terms are computed from several columns. A dst of
// another length is refused.
func PredictTo(dst []float64, r Result, t *design.Table) error {
	f, err := fitOf(r)
	if err != nil {
		return err
	}
	m, known, err := matrixAt(f, t)
	if err != nil {
		return err
	}
	n, _ := m.Dims()
	if len(dst) != n {
		return &Error{Code: codeShortDestination,
			Message: fmt.Sprintf("the slice to fill has %d places and the table has %d rows", len(dst), n),
			Hint:    "give one place per row"}
	}
	f.Engine.MeanTo(dst, nil, m, known, 0, n)
	return nil
}

func matrixAt(f *handover.Fit, t *design.Table) (*design.Matrix, []float64, error) {
	m, err := f.Plan.Matrix(t)
	if err != nil {
		return nil, nil, err
	}
	known, lo, err := f.Plan.Known(t)
	if err != nil {
		return nil, nil, err
	}
	if lo != nil {
		sum := make([]float64, len(known))
		for i := range sum {
			sum[i] = known[i] + lo[i]
		}
		known = sum
	}
	return m, known, nil
}

func wayBack(f *handover.Fit, opts *PredictOptions) (design.BackMap, error) {
	back, ok := f.Plan.BackMap()
	if !ok || !normalErrors(f) {
		e := &Error{Code: codeNoWayBack,
			Message: f.Plan.Response() + " is not a one-to-one function of one column, so predictions cannot be mapped back",
			Hint:    "predict " + f.Plan.Response() + " itself, without Original"}
		if !ok && isColumn(f) {
			e.Message = f.Plan.Response() + " is modelled as it is, so there is nothing to map back"
			e.Hint = "leave out Original and Smearing"
		}
		return back, e
	}
	if opts.Smearing && f.Frame == nil {
		return back, noData("the smearing estimate cannot be formed")
	}
	return back, nil
}

// quantity says what Mean is.
func quantity(f *handover.Fit, column string, opts *PredictOptions) string {
	response := f.Plan.Response()
	switch {
	case opts.Smearing:
		return fmt.Sprintf("mean of %s (smearing estimate), from %s", column, response)
	case opts.Original:
		return fmt.Sprintf("median of %s, mapped back from %s", column, response)
	}
	return "mean of " + response
}

func checkWeights(w []float64, n int) error {
	if w == nil {
		return nil
	}
	if len(w) != n {
		return &Error{Code: codeBadWeight,
			Message: fmt.Sprintf("there are %d weights for %d rows to predict", len(w), n), Hint: "give one weight per row, or none"}
	}
	for i, x := range w {
		if !(x > 0) || math.IsInf(x, 1) {
			return &Error{Code: codeBadWeight, Rows: []int{i + 1},
				Message: fmt.Sprintf("the weight of row %d to predict is %v", i+1, x), Hint: "give a positive number"}
		}
	}
	return nil
}

// fill computes means and intervals in blocks of rows, so that what it needs
// beside the answer does not grow with the number of rows.
func (out *Predictions) fill(f *handover.Fit, m *design.Matrix, known, weights []float64, level float64) {
	n, p := m.Dims()
	block := max(1, min(n, 256, 1<<16/max(p, 1)))
	mean := make([]float64, block)
	v := newVariance(f, block)
	q := referenceOf(f).factor(level)
	scatter := f.Dispersion
	if !normalErrors(f) {
		scatter = math.NaN()
	}
	for from := 0; from < n; from += block {
		to := min(from+block, n)
		f.Engine.MeanTo(mean[:to-from], v.gradient(to-from), m, known, from, to)
		v.block(m, from, to)
		for i := from; i < to; i++ {
			row := &out.Rows[i]
			row.Mean = mean[i-from]
			variance := v.of[i-from]
			w := 1.0
			if weights != nil {
				w = weights[i]
			}
			row.StdError = math.Sqrt(variance)
			half := q * row.StdError
			row.Low, row.High = row.Mean-half, row.Mean+half
			half = q * math.Sqrt(variance+scatter/w)
			row.NewLow, row.NewHigh = row.Mean-half, row.Mean+half
		}
	}
}

// A variance computes the variances of the means of a block of rows: from their
// leverage where the engine knows it and the covariance is the ordinary one,
// else from the gradient and the covariance matrix.
type variance struct {
	of         []float64 // one per row of the block
	leverager  handover.Leverager
	dispersion float64
	covariance []float64 // p×p
	grad       []float64 // rows of the block × p
	p          int
}

func newVariance(f *handover.Fit, rows int) *variance {
	v := &variance{of: make([]float64, rows), dispersion: f.Dispersion, p: len(f.Estimates)}
	if l, ok := f.Engine.(handover.Leverager); ok && f.Robust == "" && normalErrors(f) {
		v.leverager = l
		return v
	}
	if v.covariance = f.Engine.Covariance(); v.covariance != nil {
		v.grad = make([]float64, rows*v.p)
	}
	return v
}

// gradient is where the gradient of the block's rows belongs; nil when it is not
// needed.
func (v *variance) gradient(rows int) []float64 {
	if v.grad == nil {
		return nil
	}
	return v.grad[:rows*v.p]
}

// block fills of for the rows [from, to) of m, whose gradient is in place.
func (v *variance) block(m *design.Matrix, from, to int) {
	rows := to - from
	if v.leverager == nil {
		for i := range rows {
			v.of[i] = math.NaN()
			if v.grad != nil {
				v.of[i] = quadratic(v.grad[i*v.p:(i+1)*v.p], v.covariance)
			}
		}
		return
	}
	v.leverager.LeverageTo(v.of[:rows], m, from, to)
	for i := range rows {
		v.of[i] *= v.dispersion
	}
}

func (p *Prediction) mapBack(back design.BackMap) {
	p.StdError = math.NaN()
	for _, v := range []*float64{&p.Mean, &p.Low, &p.High, &p.NewLow, &p.NewHigh} {
		*v = back.Map(*v)
	}
	if !back.Increasing {
		p.Low, p.High = p.High, p.Low
		p.NewLow, p.NewHigh = p.NewHigh, p.NewLow
	}
}

func (out *Predictions) smear(f *handover.Fit, back design.BackMap, weights []float64) error {
	stats, ok := f.Engine.Rows()
	if !ok {
		return noData("the smearing estimate cannot be formed")
	}
	residual := stats.Residual
	if w := f.Frame.Weights; w != nil {
		residual = make([]float64, len(stats.Residual))
		for i, e := range stats.Residual {
			residual[i] = e * math.Sqrt(w[i])
		}
	}
	cases := f.Frame.Cases()
	for i := range out.Rows {
		row := &out.Rows[i]
		mean, scale := row.Mean, 1.0
		if weights != nil {
			scale = 1 / math.Sqrt(weights[i])
		}
		row.mapBack(back)
		row.Low, row.High = math.NaN(), math.NaN()
		sum := 0.0
		for k, e := range residual {
			v := back.Map(mean + e*scale)
			if f.Frame.Counts != nil {
				v *= f.Frame.Counts[k]
			}
			sum += v
		}
		row.Mean = sum / cases
	}
	return nil
}
