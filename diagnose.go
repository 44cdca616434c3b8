package trammel

import (
	"math"

	"example.com/trammel/internal/handover"
)

// Diagnostics holds one number per fitted row in each slice, all of length n.
// With e the residual, w the row's weight, h its leverage, p the number of
// coefficients, ν the degrees of freedom and s² the dispersion:
type Diagnostics struct {
	Row          []int     // row number in the table, from 1
	Fitted       []float64 // on the scale of the modelled response, known terms included
	Residual     []float64 // response - Fitted
	Standardized []float64 // t = √w·e/(s√(1-h))
	Studentized  []float64 // t√((ν-1)/(ν-t²)): the scale is estimated without the row
	Leverage     []float64 // h = w·x'(X'WX)⁻¹x
	Cook         []float64 // t²·h/(p(1-h)): how far the estimates move when the row is left out
}

// Diagnose gives residuals and influence measures of the fitted rows. Where a
// row stands for several cases (counted), leverage, Studentized and Cook are
// those of one of them, the others staying in.
//
// Standardized, Studentized and Cook are NaN where they are not defined:
// without degrees of freedom, for an exact fit, and for a row that determines
// a coefficient by itself (h = 1). Studentized is also NaN with one degree of
// freedom; it is infinite when all other rows are fitted exactly. They use the
// ordinary covariance also when the fit asked for a robust one. A result without
// its data is refused.
//
// Sources: R. D. Cook, "Detection of influential observation in linear
// regression", Technometrics 19 (1977) 15-18; R. D. Cook and S. Weisberg,
// Residuals and Influence in Regression, Chapman and Hall 1982, ch. 2.
func Diagnose(r Result) (*Diagnostics, error) {
	f, err := fitOf(r)
	if err != nil {
		return nil, err
	}
	stats, err := rowsOf(f)
	if err != nil {
		return nil, err
	}
	n := len(stats.Residual)
	d := &Diagnostics{
		Row:          make([]int, n),
		Fitted:       append([]float64(nil), stats.Fitted...),
		Residual:     append([]float64(nil), stats.Residual...),
		Standardized: make([]float64, n),
		Studentized:  make([]float64, n),
		Leverage:     append([]float64(nil), stats.Leverage...),
		Cook:         make([]float64, n),
	}
	in := newInfluence(f)
	for i := range n {
		d.Row[i] = f.Frame.Row(i)
		d.Standardized[i], d.Studentized[i], d.Cook[i] = in.of(stats, i)
	}
	return d, nil
}

func rowsOf(f *handover.Fit) (*handover.RowStats, error) {
	if f.Frame != nil {
		if stats, ok := f.Engine.Rows(); ok {
			return stats, nil
		}
	}
	return nil, noData("rows cannot be judged")
}

// An influence computes the measures of one row after the other.
type influence struct {
	weights []float64
	p, df   float64
	scale   float64 // s; NaN when rows cannot be judged
}

func newInfluence(f *handover.Fit) influence {
	in := influence{weights: f.Frame.Weights, p: float64(len(f.Estimates)), df: float64(f.Freedom), scale: math.NaN()}
	if f.Freedom > 0 && !f.ExactFit {
		in.scale = math.Sqrt(f.Dispersion)
	}
	return in
}

// alone is how near to 1 a leverage counts as 1: some roundings of the sum of
// p squares that it is.
const alone = 1e-13

func (in *influence) of(stats *handover.RowStats, i int) (standardized, studentized, cook float64) {
	nan := math.NaN()
	left := 1 - stats.Leverage[i]
	if left <= alone || math.IsNaN(in.scale) {
		return nan, nan, nan
	}
	w := 1.0
	if in.weights != nil {
		w = in.weights[i]
	}
	t := math.Sqrt(w) * stats.Residual[i] / (in.scale * math.Sqrt(left))
	cook = t * t * stats.Leverage[i] / (in.p * left)
	// t² = df exactly when the residuals of all other rows vanish without this one.
	switch rest := in.df - t*t; {
	case in.df == 1:
		studentized = nan
	case rest <= 1e-12*in.df:
		studentized = math.Copysign(math.Inf(1), t)
	default:
		studentized = t * math.Sqrt((in.df-1)/rest)
	}
	return t, studentized, cook
}
