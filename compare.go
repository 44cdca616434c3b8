package trammel

import (
	"fmt"
	"math"

	"example.com/trammel/internal/dist"
	"example.com/trammel/internal/handover"
)

// A Comparison is the F test of a model against a smaller one that it contains.
type Comparison struct {
	DF   int     // coefficients the larger model has more
	SS   float64 // residual sum of squares it has less
	Stat float64 // (SS/DF) over the larger model's dispersion; NaN for an exact fit
	P    float64 // P(F > Stat) with DF and the larger model's freedom; NaN likewise
}

// Compare tests whether larger describes the rows better than smaller, which must
// be a special case of it fitted to the same rows: one rate for all against a rate
// for each furnace, say. Both need normal errors and ordinary covariances. That
// the one contains the other is for the caller to know; what can be seen to be
// wrong (other rows, a different response, no fewer coefficients, a larger residual
// sum of squares) is refused by an [*Error]. For equations the F distribution is
// an approximation (D. M. Bates and D. G. Watts, Nonlinear Regression Analysis and
// Its Applications, Wiley 1988, sec. 3.10).
func Compare(smaller, larger Result) (*Comparison, error) {
	s, err := fitOf(smaller)
	if err != nil {
		return nil, err
	}
	l, err := fitOf(larger)
	if err != nil {
		return nil, err
	}
	refuse := func(message, hint string) (*Comparison, error) {
		return nil, &Error{Code: codeNotNested, Message: "the fits cannot be compared: " + message, Hint: hint}
	}
	switch {
	case s.Frame == nil || l.Frame == nil:
		return nil, noData("fits cannot be compared")
	case len(s.Frame.Y) != len(l.Frame.Y) || s.Frame.Cases() != l.Frame.Cases():
		return refuse(fmt.Sprintf("one has %d rows and the other %d", len(s.Frame.Y), len(l.Frame.Y)), "fit both to the same rows")
	case s.Plan.Response() != l.Plan.Response():
		return refuse(fmt.Sprintf("one describes %s and the other %s", s.Plan.Response(), l.Plan.Response()), "fit both to the same response")
	case !normalErrors(s) || !normalErrors(l):
		return refuse("they have no normal errors", "compare their likelihoods")
	}
	for i, y := range s.Frame.Y {
		if y != l.Frame.Y[i] || weightOf(s, i) != weightOf(l, i) {
			return refuse(fmt.Sprintf("responses or weights differ, first in row %d", s.Frame.Row(i)), "fit both to the same rows")
		}
	}
	c := &Comparison{DF: s.Freedom - l.Freedom, SS: s.ResidualSS - l.ResidualSS, Stat: math.NaN(), P: math.NaN()}
	switch {
	case c.DF <= 0:
		return refuse(fmt.Sprintf("the first has %d degrees of freedom left and the second %d", s.Freedom, l.Freedom), "give the smaller model first")
	case c.SS < -1e-10*s.ResidualSS:
		return refuse("the second has the larger residual sum of squares", "give a model that contains the other; for equations, check that the search found the lowest minimum")
	case l.Freedom <= 0 || l.ExactFit:
		return c, nil
	}
	c.SS = math.Max(c.SS, 0)
	c.Stat = c.SS / float64(c.DF) / (l.ResidualSS / float64(l.Freedom))
	c.P = dist.FUpper(c.Stat, float64(c.DF), float64(l.Freedom))
	return c, nil
}

// weightOf is weight times count of a fitted row.
func weightOf(f *handover.Fit, i int) float64 {
	w := 1.0
	if f.Frame.Weights != nil {
		w = f.Frame.Weights[i]
	}
	if f.Frame.Counts != nil {
		w *= f.Frame.Counts[i]
	}
	return w
}
