package trammel

import (
	"errors"
	"fmt"
	"math"

	"example.com/trammel/internal/errtext"
)

// SummaryOptions says how to summarize. Nil means the zero value.
type SummaryOptions struct {
	// Level of the intervals, in (0, 1); 0 stands for 0.95.
	Level float64

	// SkipChecks leaves out the checks for influential rows, near-dependencies,
	// curvature, unequal spread and lack of fit, whose cost is a few times that of
	// the fit.
	SkipChecks bool
}

// A Minimum is one distinct minimum of the residual sum of squares that a search
// found.
type Minimum struct {
	ResidualSS float64
	Estimates  []float64 // in the order of the coefficients
	Starts     int       // how many starts reached it
}

// A Summary is the answer to the usual questions about a result. WriteReport
// and WriteJSON are both made from it.
type Summary struct {
	Model    string // canonical text
	Response string // what the model describes: "log(porosity)"
	Fitter   string
	Path     string
	Robust   string // name of the robust covariance; "" for the ordinary one
	Exact    bool   // the fit is exact up to rounding: p-values are not given
	Level    float64

	Rows         Rows
	Coefficients []Coefficient
	Derived      []Coefficient
	Freedom      int
	Goodness     Goodness
	Terms        []TermTest
	LackOfFit    *LackOfFitTest // nil when not defined or not asked for

	End      End
	Minima   []Minimum // the distinct minima of a search, the one reached from given starts first; nil for a direct solution
	Notes    []Note    // remarks about the fit
	Findings []Note    // what to look at; codes such as "influential-rows" and "near-dependency"
	Checked  bool      // the checks behind Findings were made

	weighted bool // the standard deviation is that of weight 1
}

// Summarize answers the usual questions about a result. A result without its
// data has no term tests and no findings. Bad options are refused.
//
// What the checks name: rows with Cook's distance beyond the median of F with p
// and Freedom degrees of freedom, rows with a residual (scale estimated without
// them) beyond Bonferroni's 5 % bound, and rows with leverage above three times
// the mean; columns with two or more variance proportions above 0.5 on a
// condition index above 30; curvature, by the F test of squared columns or
// squared fitted values at 1 %; spread that changes with the fitted value, by
// Koenker's studentized form of the score test of Breusch and Pagan at 1 %; lack
// of fit where rows repeat, at 1 %.
func Summarize(r Result, opts *SummaryOptions) (*Summary, error) {
	if opts == nil {
		opts = &SummaryOptions{}
	}
	f, level, err := fitAndLevel(r, opts.Level)
	if err != nil {
		return nil, err
	}
	s := &Summary{
		Model: r.Model().String(), Response: f.Plan.Response(), Fitter: f.Fitter, Path: f.Path, Robust: f.Robust, Exact: f.ExactFit,
		Level: level, weighted: r.Model().Weighted != nil, Rows: r.Rows(), Freedom: f.Freedom, Goodness: r.Goodness(), End: r.End(), Notes: r.Notes(),
	}
	for _, m := range f.Minima {
		s.Minima = append(s.Minima, Minimum{m.ResidualSS, append([]float64(nil), m.Estimates...), m.Starts})
	}
	s.Notes = append(s.Notes, s.remarks()...)
	if s.Coefficients, err = Coefficients(r, level); err != nil {
		return nil, err
	}
	if s.Derived, err = Derived(r, level); err != nil {
		return nil, err
	}
	if f.Frame == nil {
		return s, nil
	}
	if s.Terms, err = Terms(r); err != nil {
		return nil, err
	}
	if opts.SkipChecks {
		return s, nil
	}
	s.Checked = true
	s.Findings = findings(f)
	switch {
	case !normalErrors(f):
	case len(f.Frame.Y) > mostRows:
		s.Findings = append(s.Findings, Note{"not-checked", fmt.Sprintf(
			"Lack of fit was not tested: there are more than %d rows to compare with each other.", mostRows)})
	default:
		test, err := LackOfFit(r)
		var refusal *Error
		switch {
		case err == nil:
			s.LackOfFit = test
			if test.P < doubt {
				s.Findings = append(s.Findings, Note{"lack-of-fit", fmt.Sprintf(
					"The model misses something: the means of %s lie further from it than the scatter of repeats explains (p %s).",
					errtext.Count(test.Groups, "distinct setting"), probabilityText(test.P))})
			}
		case !errors.As(err, &refusal):
			return nil, err
		}
	}
	return s, nil
}

// remarks are the notes that follow from the result itself.
func (s *Summary) remarks() []Note {
	var out []Note
	if s.Robust != "" {
		out = append(out, Note{noteRobust, "Standard errors, intervals and p-values use a robust covariance: " + s.Robust + "."})
	}
	if n := len(s.Rows.Zero); n > 0 {
		out = append(out, Note{noteZero, "Not fitted, for weight or count 0: " + errtext.Rows(s.Rows.Zero, n) + "."})
	}
	if !s.Goodness.Corrected && !math.IsNaN(s.Goodness.RSquared) {
		out = append(out, Note{noteUncorrected, "R² is uncorrected, about 0, because the columns do not span a constant: do not compare it with one about the mean."})
	}
	return out
}

// Codes of notes whose matter the report has a place for. The last two are
// written by the fitters.
const (
	noteRobust      = "robust-errors"
	noteZero        = "zero-rows"
	noteUncorrected = "uncorrected-r-squared"
	noteExact       = "exact-fit"
	noteSaturated   = "saturated"
)
