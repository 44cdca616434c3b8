package trammel

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"example.com/trammel/internal/handover"
)

// A Coefficient is one estimated effect with its uncertainty.
type Coefficient struct {
	Name     string  // in the model language: "hold by furnace='F2'"
	Meaning  string  // in words: "change in the slope of hold, F2 against F1"
	Term     string  // canonical text of the term it belongs to
	Estimate float64 // in units of the response per unit of the column
	StdError float64 // NaN when not defined
	Low      float64 // lower end of the confidence interval; NaN when not defined
	High     float64 // upper end
	Stat     float64 // Estimate/StdError; NaN when not defined, and for an exact fit
	P        float64 // two-sided, of Stat, for the hypothesis that the effect is 0; NaN likewise
}

// Coefficients gives every coefficient in the order of the columns, with
// intervals of the given level, in (0, 1); 0 stands for 0.95. The ends are
// Estimate ± q·StdError with q the quantile of Student's t with r.Freedom()
// degrees of freedom where the dispersion is estimated, else of the normal
// distribution. A bad level is refused by an [*Error].
func Coefficients(r Result, level float64) ([]Coefficient, error) {
	f, level, err := fitAndLevel(r, level)
	if err != nil {
		return nil, err
	}
	ref := referenceOf(f)
	q := ref.factor(level)
	terms := f.Plan.Terms()
	out := make([]Coefficient, len(f.Estimates))
	for j, c := range f.Plan.Columns() {
		out[j] = Coefficient{Name: c.Name, Meaning: c.Meaning, Term: terms[c.Term].Text}
		se := math.NaN()
		if f.StdErrors != nil {
			se = f.StdErrors[j]
		}
		out[j].judge(f.Estimates[j], se, q, ref)
	}
	return out, nil
}

// Derived gives the effects that have no column of their own because they are
// combinations of coefficients, such as that of the reference level under
// "against mean"; nil when there are none. Level as in [Coefficients]. The
// standard error comes from the covariance matrix, and is NaN when the columns
// are too nearly dependent for it.
func Derived(r Result, level float64) ([]Coefficient, error) {
	f, level, err := fitAndLevel(r, level)
	if err != nil {
		return nil, err
	}
	derived := f.Plan.Derived()
	if len(derived) == 0 {
		return nil, nil
	}
	ref := referenceOf(f)
	q := ref.factor(level)
	terms := f.Plan.Terms()
	cov := f.Engine.Covariance()
	out := make([]Coefficient, len(derived))
	for i, d := range derived {
		out[i] = Coefficient{Name: d.Name, Meaning: d.Meaning, Term: terms[d.Term].Text}
		estimate := 0.0
		for j, w := range d.Weights {
			if w != 0 {
				estimate += w * f.Estimates[j]
			}
		}
		out[i].judge(estimate, math.Sqrt(quadratic(d.Weights, cov)), q, ref)
	}
	return out, nil
}

func (c *Coefficient) judge(estimate, se, q float64, ref reference) {
	c.Estimate, c.StdError = estimate, se
	c.Low, c.High = estimate-q*se, estimate+q*se
	c.Stat, c.P = math.NaN(), math.NaN()
	if !ref.mute && se > 0 {
		c.Stat = estimate / se
		c.P = ref.twoSided(c.Stat)
	}
}

// quadratic is w'Vw with V p×p row-major, a variance. It is NaN when V is nil,
// and when rounding may have left fewer than about four of its digits: the
// addends of nearly dependent columns cancel, and each is known to about 1e-16 of
// itself.
func quadratic(w, v []float64) float64 {
	if v == nil {
		return math.NaN()
	}
	p := len(w)
	sum, size := 0.0, 0.0
	for i, wi := range w {
		if wi == 0 {
			continue
		}
		row := v[i*p : (i+1)*p]
		half := 0.0
		for j, wj := range w[:i] {
			half += row[j] * wj
		}
		sum += wi * (2*half + row[i]*wi)
		// Since V is a covariance, its diagonal bounds all other addends.
		size += math.Abs(wi) * math.Sqrt(row[i])
	}
	if sum < 1e-11*size*size {
		return math.NaN()
	}
	return sum
}

// Correlation is the p×p matrix of correlations between the estimates:
// covariance over the product of the standard errors. Without degrees of
// freedom there is none, and the question is refused. A copy.
func Correlation(r Result) (*mat.SymDense, error) {
	f, err := fitOf(r)
	if err != nil {
		return nil, err
	}
	v := r.Covariance()
	if v == nil {
		return nil, noFreedom(f, "there is no covariance of the estimates")
	}
	p := len(f.Estimates)
	out := mat.NewSymDense(p, nil)
	for i := range p {
		out.SetSym(i, i, 1)
		for j := range i {
			out.SetSym(i, j, v.At(i, j)/(math.Sqrt(v.At(i, i))*math.Sqrt(v.At(j, j))))
		}
	}
	return out, nil
}

func noFreedom(f *handover.Fit, what string) *Error {
	e := &Error{Code: codeNoFreedom, Message: what, Hint: "fit more rows, or take terms out"}
	if f.Freedom == 0 {
		e.Message += ": there are as many coefficients as cases, and nothing is left to judge them by"
	}
	return e
}

func fitAndLevel(r Result, level float64) (*handover.Fit, float64, error) {
	f, err := fitOf(r)
	if err != nil {
		return nil, 0, err
	}
	level, err = checkLevel(level)
	return f, level, err
}
