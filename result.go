package trammel

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/internal/handover"
)

// A Result is one fitted model, whichever fitter made it. It is made by the
// fitters of this module only, is immutable, and may be shared between
// goroutines. n is the number of fitted rows, N the sum of their counts (n when
// the model has none), p the number of coefficients.
type Result interface {
	// Fitter is the package that made the fit, such as "linfit".
	Fitter() string

	// Path is the numeric path the fit took, such as "refined QR".
	Path() string

	// Model is the parsed text. Shared, do not modify.
	Model() *formula.Model

	// Plan is the compiled model: the names and meanings of the coefficients, and
	// the way from other rows to their columns. Shared.
	Plan() *design.Plan

	// Estimates are the p coefficients in the order of Plan().Columns(). A copy.
	Estimates() []float64

	// StdErrors are the p standard errors. A copy; nil when they are not defined.
	StdErrors() []float64

	// Covariance is the p×p covariance matrix of the estimates. A copy; nil when
	// it is not defined.
	Covariance() *mat.SymDense

	// Freedom is the residual degrees of freedom, N - p.
	Freedom() int

	// Robust names the robust covariance behind the standard errors, such as
	// "HC3"; "" for the ordinary one.
	Robust() string

	// Rows tells which rows of the table were fitted.
	Rows() Rows

	// Goodness says how well the model describes the fitted rows.
	Goodness() Goodness

	// Notes are plain remarks about the fit. A copy.
	Notes() []Note

	// End says how the fit ended.
	End() End

	// MeanTo writes the mean response at the rows of m, which Plan().Matrix made,
	// to mean, and, when grad is not nil, its derivatives with respect to the
	// coefficients to grad, row by row (rows × p). known holds the values of the
	// known terms from Plan().Known; nil when there are none. It does not allocate.
	MeanTo(mean, grad []float64, m *design.Matrix, known []float64)

	fit() *handover.Fit
}

// Rows tells which rows of the table were fitted. Row numbers count from 1.
type Rows struct {
	Given    int     // rows of the table
	Used     int     // n, rows fitted
	Cases    float64 // N, the sum of the fitted rows' counts
	SetAside []int   // rows set aside as incomplete; a copy
	Zero     []int   // rows not fitted because their weight or count is 0; a copy
}

// A Note is one plain sentence about a fit, with a code for programs.
type Note struct{ Code, Text string }

// An End says how a fit ended.
type End struct {
	Reason     string  // "solved" for a direct solution
	Iterations int     // refinement passes for a direct solution
	Measure    float64 // what the reason rests on; NaN when there is no such measure
	Tolerance  float64 // what Measure was compared with; NaN likewise
}

// NewResult makes the Result of a fit. It serves the fitters of this module:
// the type of its argument is internal.
func NewResult(f *handover.Fit) Result { return &result{f} }

// result is the only Result.
type result struct{ f *handover.Fit }

func (r *result) fit() *handover.Fit { return r.f }

func (r *result) Fitter() string        { return r.f.Fitter }
func (r *result) Path() string          { return r.f.Path }
func (r *result) Model() *formula.Model { return r.f.Plan.Model() }
func (r *result) Plan() *design.Plan    { return r.f.Plan }
func (r *result) Estimates() []float64  { return slices.Clone(r.f.Estimates) }
func (r *result) StdErrors() []float64  { return slices.Clone(r.f.StdErrors) }
func (r *result) Freedom() int          { return r.f.Freedom }
func (r *result) Robust() string        { return r.f.Robust }

func (r *result) Covariance() *mat.SymDense {
	if v := r.f.Engine.Covariance(); v != nil {
		return mat.NewSymDense(len(r.f.Estimates), v)
	}
	return nil
}

func (r *result) Rows() Rows {
	f := r.f.Frame
	if f == nil {
		return Rows{Cases: math.NaN()}
	}
	return Rows{
		Given:    f.Given,
		Used:     len(f.Y),
		Cases:    f.Cases(),
		SetAside: slices.Clone(f.SetAside),
		Zero:     slices.Clone(f.Zero),
	}
}

func (r *result) Notes() []Note {
	out := make([]Note, len(r.f.Notes))
	for i, n := range r.f.Notes {
		out[i] = Note(n)
	}
	return out
}

func (r *result) End() End { return End(r.f.End) }

func (r *result) MeanTo(mean, grad []float64, m *design.Matrix, known []float64) {
	n, _ := m.Dims()
	r.f.Engine.MeanTo(mean, grad, m, known, 0, n)
}

// fitOf refuses a nil Result.
func fitOf(r Result) (*handover.Fit, error) {
	if r == nil || r.fit() == nil {
		return nil, &Error{Code: codeNoResult, Message: "the result is nil",
			Hint: "check the error that the fitter returned"}
	}
	return r.fit(), nil
}
