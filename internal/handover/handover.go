// Package handover is what a fitter hands to the root package: one value from
// which every question about a result is answered, whatever the fitter. It is
// internal so that results can only be made by this module's fitters.
package handover

import (
	"example.com/trammel/design"
)

// A Fit is one finished (or early-ended) fit. Slices are owned by the Fit and
// must not be modified. Numbers that are not defined are NaN, never a
// plausible value.
//
// n is the number of fitted rows of the table, N the sum of their counts, p
// the number of coefficients.
type Fit struct {
	Fitter string // "linfit", "glm", "nlfit"
	Path   string // the numeric path, such as "refined QR"

	Plan  *design.Plan
	Frame *design.Frame // fitted rows; nil for a model read from a file

	Estimates []float64 // p
	StdErrors []float64 // p; nil when freedom is 0 or they are otherwise undefined

	Freedom             int     // residual degrees of freedom, N - p
	Dispersion          float64 // σ²: residual SS / freedom for normal errors
	DispersionEstimated bool    // intervals and p use Student's t, else the normal
	Robust              string  // "" or the name of the robust covariance in use, "HC3", "clustered by furnace"
	ExactFit            bool    // residuals are zero up to rounding: p and F are null

	ResidualSS float64 // Σ count·weight·residual²
	TotalSS    float64 // about the mean when Corrected, else about 0
	Corrected  bool    // the columns span the constant
	RSquared   float64 // ratio formed in double-double
	LogLik     float64
	Parameters int // all estimated parameters, dispersion included (for AIC, AICc, BIC)

	Deviance, NullDeviance, Pearson float64 // generalized linear models, else NaN

	End    End
	Notes  []Note
	Minima []Minimum // of a search: the one reached from given starts first, else by ResidualSS; else nil

	Engine Engine
}

// End says how the fit ended.
type End struct {
	Reason     string  // "solved" for a direct solution
	Iterations int     // refinement passes for a direct solution
	Measure    float64 // the measured value the reason rests on; NaN when none
	Tolerance  float64 // what it was compared with; NaN when none
}

// A Note is one plain sentence about the fit, with a code for programs.
type Note struct{ Code, Text string }

// A Minimum is one distinct minimum that a search found.
type Minimum struct {
	ResidualSS float64
	Estimates  []float64 // p
	Starts     int       // how many starts reached it
}

// An Engine answers the numeric questions about a fit that need its data. All
// methods are safe for concurrent use.
type Engine interface {
	// Covariance returns the p×p covariance of the estimates, row-major,
	// dispersion included and robust when that was asked for; nil when not
	// defined. A copy.
	Covariance() []float64

	// UnscaledCovariance is (X'WX)^-1, row-major, without dispersion. A copy.
	UnscaledCovariance() []float64

	// Rows returns the residuals and leverages of the fitted rows (length n),
	// computed on the first call; nil, and false, when the data are not at hand.
	Rows() (*RowStats, bool)

	// Nested compares two submodels of the fit, given by their terms (indices
	// into Plan.Terms(), the intercept included where it belongs): all of
	// with, and with but for its last term. Order in with is the coding order.
	// It is used for term tests.
	Nested(with []int) (NestedTest, error)

	// ExtraSS returns the sum of squares (df 1 per column) that extra columns
	// (each of length n, over the fitted rows) explain beyond the model, and
	// how many of them are independent of it. It serves the checks for
	// curvature left in the residuals.
	ExtraSS(columns [][]float64) (df int, ss float64, err error)

	// MeanTo computes, for rows [from, to) of m (made by Plan.Matrix), the mean
	// response and, when grad is not nil, its gradient with respect to the
	// coefficients (row-major, (to-from)×p). known holds the value of the
	// known terms (nil when there are none), length of m's rows. It does not
	// allocate.
	MeanTo(mean, grad []float64, m *design.Matrix, known []float64, from, to int)
}

// A Leverager is an Engine that also computes the leverage of rows that were
// not fitted. The root package asks for it before it falls back on the
// covariance matrix, whose rounded elements cancel when columns are nearly
// dependent, as powers are.
type Leverager interface {
	// LeverageTo writes x'(X'WX)^-1 x for rows [from, to) of m (made by
	// Plan.Matrix) to dst, of length to-from. It does not allocate per row.
	LeverageTo(dst []float64, m *design.Matrix, from, to int)
}

// A Profiler is an Engine whose model is not linear in its coefficients: it
// follows the profile of coefficient j to where the square root of the rise of the
// least sum of squares, over the residual standard deviation, is q. An end may be
// infinite.
type Profiler interface {
	Profile(j int, q float64) (low, high float64)
}

// A Curved is an Engine that knows its model's curvature (Bates and Watts 1980).
type Curved interface {
	Curvature() (intrinsic, parameter float64, ok bool)
}

// RowStats holds one number per fitted row. Leverage is that of one of the
// count copies a row stands for: Σ count·leverage = p.
type RowStats struct {
	Fitted   []float64 // on the scale of the modelled response, known terms included
	Residual []float64 // response - fitted
	Leverage []float64 // weight·x'(X'WX)^-1 x
}

// A NestedTest is the comparison of two nested submodels. SS is the difference
// of residual sums of squares (or deviances); Stat is F (df, freedom) when the
// dispersion is estimated, else chi-square (df). With a robust covariance SS is
// NaN and Stat is the Wald statistic divided by df.
type NestedTest struct {
	DF   int
	SS   float64
	Stat float64
}
