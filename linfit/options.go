package linfit

import "fmt"

// Options says how to fit. Nil means the zero value.
type Options struct {
	// Robust chooses the covariance of the estimates; the zero value is the
	// ordinary one, dispersion times (X'WX)^-1.
	Robust Robust

	// ClusterBy is a column, or a category such as "cat(site, machine)" of
	// columns, whose values name clusters of rows; the covariance is then robust
	// against any dependence within a cluster. It excludes Robust, and needs the
	// table, so FitFrame refuses it.
	ClusterBy string

	// SetAside leaves out incomplete rows and lists them in the result; by
	// default they are refused. FitFrame ignores it.
	SetAside bool

	// Workers is the number of goroutines; 0 means GOMAXPROCS. Results are the
	// same bit for bit for every number.
	Workers int

	// Progress is called between the passes of a fit, from the caller's own
	// goroutine; an error it returns ends the fit. Nil means no calls.
	Progress func(Progress) error
}

// A Progress says how far a fit has come.
type Progress struct {
	Stage string // "prepared", "factorised", "solved"; while rows stream "summing" and "refining"
	Done  int    // rows done in this stage
	Rows  int    // rows of the fit
}

// Robust names a covariance that is right when the spread differs from row to
// row: H. White, "A heteroskedasticity-consistent covariance matrix estimator",
// Econometrica 48 (1980) 817-838; J. G. MacKinnon and H. White, "Some
// heteroskedasticity-consistent covariance matrix estimators with improved
// finite sample properties", J. Econometrics 29 (1985) 305-325. A count m
// stands for m rows. N is the sum of counts, p the number of columns, r a
// residual and h its leverage.
type Robust string

// The robust covariances.
const (
	Ordinary Robust = ""    // constant spread
	HC0      Robust = "HC0" // r²
	HC1      Robust = "HC1" // r²·N/(N-p)
	HC2      Robust = "HC2" // r²/(1-h)
	HC3      Robust = "HC3" // r²/(1-h)²
)

func (o *Options) check() *Error {
	switch o.Robust {
	case Ordinary, HC0, HC1, HC2, HC3:
	default:
		return &Error{Code: codeBadOption,
			Message: fmt.Sprintf("the option Robust is %q, which is no robust covariance", string(o.Robust)),
			Hint:    "use linfit.HC0, HC1, HC2 or HC3, or leave it empty"}
	}
	if o.Workers < 0 {
		return &Error{Code: codeBadOption,
			Message: fmt.Sprintf("the option Workers is %d, which is below 0", o.Workers),
			Hint:    "use 0 for as many as the program may use"}
	}
	if o.Robust != Ordinary && o.ClusterBy != "" {
		return &Error{Code: codeBadOption,
			Message: "the options Robust and ClusterBy are both set, and only one covariance can be in use",
			Hint:    "leave one of them empty"}
	}
	return nil
}
