package trammel

import (
	"math"

	"example.com/trammel/internal/dist"
	"example.com/trammel/internal/handover"
)

// An Interval is a confidence interval; an end may be infinite, and is NaN when
// not defined.
type Interval struct{ Low, High float64 }

// ProfileIntervals gives an interval of the given level, in (0, 1), for every
// coefficient from its profile: the values at which the least sum of squares, over
// all other coefficients, rises by no more than t² times the dispersion (D. M.
// Bates and D. G. Watts, Nonlinear Regression Analysis and Its Applications, Wiley
// 1988, ch. 6). Unlike those of [Coefficients] these follow the curve of the
// model: they are lopsided where it is, and infinite where the data set no limit.
// For a model that is linear in its coefficients both agree. Level 0 stands for
// 0.95. The cost is some dozens of fits for each coefficient.
func ProfileIntervals(r Result, level float64) ([]Interval, error) {
	f, level, err := fitAndLevel(r, level)
	if err != nil {
		return nil, err
	}
	out := make([]Interval, len(f.Estimates))
	profiler, curved := f.Engine.(handover.Profiler)
	if !curved {
		list, err := Coefficients(r, level)
		if err != nil {
			return nil, err
		}
		for j, c := range list {
			out[j] = Interval{c.Low, c.High}
		}
		return out, nil
	}
	q := referenceOf(f).factor(level)
	for j := range out {
		out[j] = Interval{math.NaN(), math.NaN()}
		if !f.ExactFit && q > 0 {
			out[j].Low, out[j].High = profiler.Profile(j, q)
		}
	}
	return out, nil
}

// A Curvature says how far an equation's fit is from a linear one, as root mean
// squares relative to the radius of the data (D. M. Bates and D. G. Watts,
// "Relative curvature measures of nonlinearity", J. R. Statist. Soc. B 42 (1980)
// 1-25).
type Curvature struct {
	// Intrinsic curvature is of the set of fitted values itself, the same for
	// every way of writing the equation's parameters.
	Intrinsic float64

	// ParameterEffects is what the choice of parameters adds. Where it is large,
	// intervals from standard errors are rough and [ProfileIntervals] should be
	// used.
	ParameterEffects float64

	// Limit is half of 1/√F, with F the 95 % point for p and Freedom degrees of
	// freedom: below it the curves bend by less than a seventh over the confidence
	// region (the authors' rule).
	Limit float64
}

// CurvatureOf gives the curvature of an equation's fit; zero for a model that is
// linear in its coefficients. It is refused when there is no residual freedom.
func CurvatureOf(r Result) (*Curvature, error) {
	f, err := fitOf(r)
	if err != nil {
		return nil, err
	}
	if f.Freedom <= 0 {
		return nil, &Error{Code: codeNoFreedom, Message: "curvature is not defined: there are as many coefficients as cases", Hint: "fit more rows, or take parameters out"}
	}
	p := f.Parameters - 1
	c := &Curvature{Limit: 0.5 / math.Sqrt(dist.FUpperQuantile(0.05, float64(p), float64(f.Freedom)))}
	if bent, ok := f.Engine.(handover.Curved); ok {
		var known bool
		if c.Intrinsic, c.ParameterEffects, known = bent.Curvature(); !known {
			c.Intrinsic, c.ParameterEffects = math.NaN(), math.NaN()
		}
	}
	return c, nil
}
