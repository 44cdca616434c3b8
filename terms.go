package trammel

import (
	"fmt"
	"math"
	"slices"

	"example.com/trammel/internal/dist"
	"example.com/trammel/internal/handover"
)

// A TermTest says whether a whole term matters: all its columns at once.
type TermTest struct {
	Term string  // canonical text
	DF   int     // columns the term adds; 0 when the other terms express it all
	SS   float64 // sum of squares (or deviance) it explains; NaN with a robust covariance
	Stat float64 // F with DF and the residual degrees of freedom; chi-square with DF when Chi2
	Chi2 bool    // the dispersion is not estimated
	P    float64 // probability of at least Stat when the term does not matter
}

// Terms tests each term given all others that do not contain it: cat(furnace)
// given hold, but not given hold by cat(furnace), which would leave no sense to
// it. There is one row per term but the intercept, in the order written. F is
// (SS/DF) over the dispersion of the full model; with a robust covariance it is
// the Wald statistic over DF. Stat and P are NaN for an exact fit, without
// degrees of freedom, and when DF is 0. A result without its data is refused by
// an [*Error].
//
// The principle is that of J. A. Nelder, "A reformulation of linear models",
// J. R. Statist. Soc. A 140 (1977) 48-77: an effect is not tested in the presence
// of interactions that contain it.
func Terms(r Result) ([]TermTest, error) {
	return termTests(r, func(f *handover.Fit, _ []int, k int) []int {
		terms := f.Plan.Terms()
		var with []int
		for l := range terms {
			if l != k && !slices.Contains(terms[k].Within, l) {
				with = append(with, l)
			}
		}
		return append(with, k)
	})
}

// SequentialTerms tests each term given those written before it (and the
// intercept). The sums of squares add up to what the whole model explains; they
// depend on the order of writing. Everything else is as for [Terms].
func SequentialTerms(r Result) ([]TermTest, error) {
	return termTests(r, func(f *handover.Fit, order []int, k int) []int {
		var with []int
		if terms := f.Plan.Terms(); terms[0].Intercept {
			with = append(with, 0)
		}
		return append(with, order[:slices.Index(order, k)+1]...)
	})
}

// termTests tests every term but the intercept as the last of the terms that
// with gives.
func termTests(r Result, with func(f *handover.Fit, order []int, k int) []int) ([]TermTest, error) {
	f, err := fitOf(r)
	if err != nil {
		return nil, err
	}
	if f.Frame == nil {
		return nil, noData("terms cannot be tested")
	}
	terms := f.Plan.Terms()
	order := writtenOrder(f)
	tests := make([]TermTest, 0, len(order))
	for _, k := range order {
		nested, err := f.Engine.Nested(with(f, order, k))
		if err != nil {
			return nil, fmt.Errorf("trammel: the test of term %s: %w", terms[k].Text, err)
		}
		tests = append(tests, newTermTest(f, terms[k].Text, nested))
	}
	return tests, nil
}

// writtenOrder lists the terms but the intercept as the model has them.
func writtenOrder(f *handover.Fit) []int {
	terms := f.Plan.Terms()
	var order []int
	for k, t := range terms {
		if !t.Intercept {
			order = append(order, k)
		}
	}
	slices.SortStableFunc(order, func(a, b int) int { return terms[a].Written - terms[b].Written })
	return order
}

func newTermTest(f *handover.Fit, term string, nested handover.NestedTest) TermTest {
	t := TermTest{Term: term, DF: nested.DF, SS: nested.SS, Stat: math.NaN(), Chi2: !f.DispersionEstimated, P: math.NaN()}
	if f.ExactFit || f.Freedom <= 0 || nested.DF <= 0 {
		return t
	}
	t.Stat = nested.Stat
	if t.Chi2 {
		t.P = dist.ChiUpper(t.Stat, float64(t.DF))
	} else {
		t.P = dist.FUpper(t.Stat, float64(t.DF), float64(f.Freedom))
	}
	return t
}

func noData(what string) *Error {
	return &Error{Code: codeNoData, Message: what + ": the result does not hold the rows it was fitted to",
		Hint: "ask the result that the fitter returned"}
}
