package trammel_test

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"math/big"
	"slices"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/internal/digits"
)

// A fitFunc fits a text to a table; a fitter joins the conformance suite by
// calling conform with one.
type fitFunc func(text string, t *design.Table, setAside bool) (trammel.Result, error)

// TestConformance runs the suite on the rational fitter of exactfit_test.go, which
// leaves the questions themselves as the only source of error.
func TestConformance(t *testing.T) {
	t.Run("by leverage", func(t *testing.T) { conform(t, exactFit, 12.5) })
	t.Run("by covariance", func(t *testing.T) { conform(t, plainFit, 12.5) })
}

// A cell is one scenario answered by one fitter.
type cell struct {
	*testing.T
	*oracle
	r     trammel.Result
	floor float64 // digits to which numbers must agree with the oracle
}

// A question is asked in every scenario. Where undefined gives a reason, refused
// checks that the answer is not a number; elsewhere check compares numbers with
// the oracle.
type question struct {
	name      string
	check     func(c *cell)
	undefined func(sc *scenario) string
	refused   func(c *cell)
}

func never(*scenario) string { return "" }

var questions = []question{
	{"coefficients", coefficientsAgree, judged, coefficientsUnjudged},
	{"derived effects", derivedAgree, func(sc *scenario) string {
		if len(sc.derived) == 0 {
			return "the model has no derived effects"
		}
		return judged(sc)
	}, derivedUnjudged},
	{"covariance and correlation", covarianceAgrees, func(sc *scenario) string {
		switch {
		case sc.saturated:
			return "no degrees of freedom"
		case sc.exact:
			return "all variances are 0 up to rounding"
		}
		return ""
	}, covarianceAbsent},
	{"terms", func(c *cell) { termsAgree(c, trammel.Terms, false) }, judged, func(c *cell) { termsUnjudged(c, trammel.Terms, false) }},
	{"sequential terms", func(c *cell) { termsAgree(c, trammel.SequentialTerms, true) }, judged,
		func(c *cell) { termsUnjudged(c, trammel.SequentialTerms, true) }},
	{"goodness", goodnessAgrees, judged, goodnessUnjudged},
	{"prediction", predictionAgrees, judged, predictionUnjudged},
	{"prediction on the original scale", originalAgrees, func(sc *scenario) string {
		if !sc.log {
			return "the response is a plain column"
		}
		return ""
	}, originalRefused},
	{"scoring", scoringAgrees, never, nil},
	{"diagnostics", diagnosticsAgree, judged, diagnosticsUnjudged},
	{"lack of fit", lackOfFitAgrees, judged, lackOfFitRefused},
	{"rows", rowsAgree, never, nil},
	{"summary as JSON", jsonAgrees, never, nil},
	{"report", reportSays, never, nil},
}

// judged gives the reason why a fit has no tests.
func judged(sc *scenario) string {
	switch {
	case sc.saturated:
		return "no degrees of freedom"
	case sc.exact:
		return "the fit is exact up to rounding"
	}
	return ""
}

// conform asks every question in every scenario of the results of fit. Numbers
// must agree with the oracle to floor digits.
func conform(t *testing.T, fit fitFunc, floor float64) {
	for _, sc := range scenarios {
		r, err := fit(sc.model, tableOf(t, sc.data, true), sc.setAside)
		if err != nil {
			t.Errorf("%s: %v", sc.name, err)
			continue
		}
		o := newOracle(sc)
		for _, q := range questions {
			t.Run(sc.name+"/"+q.name, func(t *testing.T) {
				c := &cell{t, o, r, floor}
				if why := q.undefined(&sc); why != "" {
					t.Logf("not defined: %s", why)
					q.refused(c)
					return
				}
				q.check(c)
			})
		}
	}
}

// agree compares a number with the oracle's. Numbers that ought to be 0 are
// compared on the scale of the response.
func (c *cell) agree(what string, got, want float64) {
	c.Helper()
	if want == 0 && math.Abs(got) < 1e-13*40 {
		return
	}
	if d := digits.Agree(got, want); !(d >= c.floor) {
		c.Errorf("%s: got %v, want %v (%.1f digits)", what, got, want, d)
	}
}

func (c *cell) undefinedNumber(what string, got float64) {
	c.Helper()
	if !math.IsNaN(got) {
		c.Errorf("%s: got %v, which is not defined", what, got)
	}
}

func (c *cell) must(err error) {
	c.Helper()
	if err != nil {
		c.Fatal(err)
	}
}

func (c *cell) code(err error, want string) {
	c.Helper()
	var e *trammel.Error
	if !errors.As(err, &e) || !errors.Is(err, trammel.Code(want)) || e.Hint == "" {
		c.Errorf("got %v, want a refusal %s with a hint", err, want)
	}
}

const level = 0.9

// judge compares one coefficient with an estimate and a variance.
func (c *cell) judge(got trammel.Coefficient, estimate, variance *big.Rat) {
	c.Helper()
	b, se := float(estimate), root(variance)
	q := tFactor(level, c.df)
	c.agree(got.Name+" estimate", got.Estimate, b)
	c.agree(got.Name+" std error", got.StdError, se)
	c.agree(got.Name+" low", got.Low, b-q*se)
	c.agree(got.Name+" high", got.High, b+q*se)
	c.agree(got.Name+" t", got.Stat, b/se)
	c.agree(got.Name+" p", got.P, tTwoSided(math.Abs(b/se), c.df))
}

// unjudged checks an estimate without a test; an exact fit still has standard
// errors, of rounding size.
func (c *cell) unjudged(got trammel.Coefficient, estimate *big.Rat) {
	c.Helper()
	c.agree(got.Name+" estimate", got.Estimate, float(estimate))
	c.undefinedNumber(got.Name+" t", got.Stat)
	c.undefinedNumber(got.Name+" p", got.P)
	if c.saturated {
		c.undefinedNumber(got.Name+" std error", got.StdError)
		c.undefinedNumber(got.Name+" low", got.Low)
		c.undefinedNumber(got.Name+" high", got.High)
	} else if !(got.StdError >= 0 && got.StdError <= 1e-13 && got.Low <= got.Estimate && got.Estimate <= got.High) {
		c.Errorf("%s: std error %v, interval %v to %v", got.Name, got.StdError, got.Low, got.High)
	}
}

func (c *cell) coefficients() []trammel.Coefficient {
	got, err := trammel.Coefficients(c.r, level)
	c.must(err)
	if len(got) != len(c.names) {
		c.Fatalf("%d coefficients, want %d", len(got), len(c.names))
	}
	for j, name := range c.names {
		if got[j].Name != name || got[j].Meaning == "" || got[j].Term == "" {
			c.Errorf("coefficient %d is %+v, want name %s, a meaning and a term", j, got[j], name)
		}
	}
	if !slices.Equal(c.r.Estimates(), column(got, func(x trammel.Coefficient) float64 { return x.Estimate })) {
		c.Errorf("Estimates differ from Coefficients")
	}
	return got
}

func column[T any](rows []T, f func(T) float64) []float64 {
	out := make([]float64, len(rows))
	for i, r := range rows {
		out[i] = f(r)
	}
	return out
}

func coefficientsAgree(c *cell) {
	for j, got := range c.coefficients() {
		c.judge(got, c.s.b[j], mul(c.dispersion(), c.s.inverse[j][j]))
	}
}

func coefficientsUnjudged(c *cell) {
	for j, got := range c.coefficients() {
		c.unjudged(got, c.s.b[j])
	}
	if (c.r.StdErrors() == nil) != c.saturated {
		c.Errorf("standard errors are %v", c.r.StdErrors())
	}
}

func (c *cell) derivedEffects() []trammel.Coefficient {
	got, err := trammel.Derived(c.r, level)
	c.must(err)
	if len(got) != len(c.derived) {
		c.Fatalf("%d derived effects, want %d", len(got), len(c.derived))
	}
	for i, d := range c.derived {
		if got[i].Name != d.name || got[i].Meaning == "" {
			c.Errorf("derived effect %d is %+v, want name %s and a meaning", i, got[i], d.name)
		}
	}
	return got
}

func derivedAgree(c *cell) {
	for i, got := range c.derivedEffects() {
		w := rats(c.derived[i].weights)
		c.judge(got, dot(w, c.s.b), mul(c.dispersion(), quad(w, c.s.inverse)))
	}
}

func derivedUnjudged(c *cell) {
	for i, got := range c.derivedEffects() {
		c.unjudged(got, dot(rats(c.derived[i].weights), c.s.b))
	}
}

func covarianceAgrees(c *cell) {
	v := c.r.Covariance()
	cor, err := trammel.Correlation(c.r)
	c.must(err)
	for i := range c.names {
		for j := range c.names {
			c.agree(fmt.Sprintf("covariance %d %d", i, j), v.At(i, j), float(mul(c.dispersion(), c.s.inverse[i][j])))
			r := float(c.s.inverse[i][j]) / (root(c.s.inverse[i][i]) * root(c.s.inverse[j][j]))
			c.agree(fmt.Sprintf("correlation %d %d", i, j), cor.At(i, j), r)
		}
	}
}

func covarianceAbsent(c *cell) {
	if c.exact {
		for i := range c.names {
			if v := c.r.Covariance().At(i, i); !(v >= 0 && v < 1e-26) {
				c.Errorf("variance %v", v)
			}
		}
		return
	}
	if v := c.r.Covariance(); v != nil {
		c.Errorf("covariance %v", v)
	}
	_, err := trammel.Correlation(c.r)
	c.code(err, "no-freedom")
}

// eachTerm pairs the tests with the sums of squares of the oracle.
func eachTerm(c *cell, ask func(trammel.Result) ([]trammel.TermTest, error), sequential bool, f func(got trammel.TermTest, df int, ss *big.Rat)) {
	got, err := ask(c.r)
	c.must(err)
	if len(got) != len(c.terms) {
		c.Fatalf("%d terms, want %d", len(got), len(c.terms))
	}
	for i, h := range c.terms {
		given := h.given
		if sequential {
			given = h.sequence
		}
		with := append(slices.Clone(given), h.columns...)
		ss := new(big.Rat).Sub(c.rssOf(given), c.rssOf(with))
		if got[i].Term != h.text || got[i].DF != len(h.columns) || got[i].Chi2 {
			c.Errorf("term %d is %+v, want %s with %d columns", i, got[i], h.text, len(h.columns))
		}
		f(got[i], len(h.columns), ss)
	}
}

func termsAgree(c *cell, ask func(trammel.Result) ([]trammel.TermTest, error), sequential bool) {
	sum := 0.0
	eachTerm(c, ask, sequential, func(got trammel.TermTest, df int, ss *big.Rat) {
		f := float(new(big.Rat).Quo(ss, mul(c.dispersion(), big.NewRat(int64(df), 1))))
		c.agree(got.Term+" ss", got.SS, float(ss))
		c.agree(got.Term+" F", got.Stat, f)
		c.agree(got.Term+" p", got.P, fUpper(f, df, c.df))
		sum += got.SS
	})
	if sequential && c.known == nil {
		g := c.r.Goodness()
		c.agree("sum of sequential sums of squares", sum, g.TotalSS-g.ResidualSS)
	}
}

func termsUnjudged(c *cell, ask func(trammel.Result) ([]trammel.TermTest, error), sequential bool) {
	eachTerm(c, ask, sequential, func(got trammel.TermTest, _ int, ss *big.Rat) {
		c.agree(got.Term+" ss", got.SS, float(ss))
		c.undefinedNumber(got.Term+" F", got.Stat)
		c.undefinedNumber(got.Term+" p", got.P)
	})
}

// total is the sum of squares of the response, known terms included.
func (o *oracle) total() *big.Rat {
	q := &problem{w: o.p.w, y: o.y}
	for range o.y {
		if o.corrected {
			q.x = append(q.x, []*big.Rat{big.NewRat(1, 1)})
		} else {
			q.x = append(q.x, nil)
		}
	}
	return q.solve().rss
}

func goodnessAgrees(c *cell) {
	g := c.r.Goodness()
	one, n, df := big.NewRat(1, 1), int64(c.cases), int64(c.df)
	about := n
	if c.corrected {
		about--
	}
	ratio := new(big.Rat).Quo(c.s.rss, c.total())
	c.agree("R²", g.RSquared, float(new(big.Rat).Sub(one, ratio)))
	c.agree("adjusted R²", g.AdjustedRSquared, float(new(big.Rat).Sub(one, mul(ratio, big.NewRat(about, df)))))
	c.agree("residual SS", g.ResidualSS, float(c.s.rss))
	c.agree("residual SD", g.ResidualSD, root(c.dispersion()))
	c.agree("total SS", g.TotalSS, float(c.total()))
	c.agree("dispersion", g.Dispersion, float(c.dispersion()))
	// The density of each case at the maximum, one by one, with σ² = RSS/N.
	variance := float(c.s.rss) / float64(n)
	log := 0.0
	for i, d := range c.used {
		w, e := float(c.weight(d)), float(c.s.residual[i])
		log += float(c.count(d)) * (-0.5*math.Log(2*math.Pi*variance/w) - w*e*e/(2*variance))
	}
	k := float64(len(c.names) + 1)
	c.agree("log-likelihood", g.LogLikelihood, log)
	c.agree("AIC", g.AIC, 2*k-2*log)
	c.agree("AICc", g.AICc, 2*k*float64(n)/(float64(n)-k-1)-2*log)
	c.agree("BIC", g.BIC, k*math.Log(float64(n))-2*log)
	if g.Parameters != len(c.names)+1 || g.Corrected != c.corrected || c.r.Freedom() != c.df {
		c.Errorf("%d parameters, corrected %v, freedom %d", g.Parameters, g.Corrected, c.r.Freedom())
	}
}

func goodnessUnjudged(c *cell) {
	g := c.r.Goodness()
	for what, v := range map[string]float64{"log-likelihood": g.LogLikelihood, "AIC": g.AIC, "AICc": g.AICc, "BIC": g.BIC} {
		c.undefinedNumber(what, v)
	}
	c.agree("R²", g.RSquared, 1)
	c.agree("residual SS", g.ResidualSS, 0)
	if c.saturated {
		c.undefinedNumber("residual SD", g.ResidualSD)
		c.undefinedNumber("adjusted R²", g.AdjustedRSquared)
		c.undefinedNumber("dispersion", g.Dispersion)
		if c.r.Freedom() != 0 {
			c.Errorf("freedom %d", c.r.Freedom())
		}
	} else {
		c.agree("adjusted R²", g.AdjustedRSquared, 1)
		c.agree("residual SD", g.ResidualSD, 0)
	}
}

// ahead are rows to predict; two are outside the fitted range.
var ahead = []disc{
	{"F1", "25", "1.5", "1", "1", ""}, {"F3", "50", "2.5", "1", "1", ""}, {"F2", "0", "3.5", "1", "1", ""}, {"F1", "17.25", "2", "1", "1", ""},
}

var aheadWeights = []float64{1, 4, 0.25, 2}

// predicted is the mean at a row and its variance over the dispersion.
func (o *oracle) predicted(d disc) (mean, variance *big.Rat) {
	x := rats(o.row(d))
	return new(big.Rat).Add(dot(x, o.s.b), o.knownAt(d)), quad(x, o.s.inverse)
}

func predictionAgrees(c *cell) {
	table := tableOf(c.T, ahead, false)
	q := tFactor(level, c.df)
	for _, weights := range [][]float64{nil, aheadWeights} {
		got, err := trammel.Predict(c.r, table, &trammel.PredictOptions{Level: level, Weights: weights})
		c.must(err)
		if want := "mean of " + c.r.Plan().Response(); got.Quantity != want || got.Level != level || len(got.Rows) != len(ahead) {
			c.Fatalf("predictions %+v, want %s", got, want)
		}
		for i, d := range ahead {
			mean, v := c.predicted(d)
			y, se := float(mean), root(mul(c.dispersion(), v))
			w := big.NewRat(1, 1)
			if weights != nil {
				w.SetFloat64(weights[i])
			}
			scatter := root(mul(c.dispersion(), new(big.Rat).Add(v, w.Inv(w))))
			p := got.Rows[i]
			c.agree("mean", p.Mean, y)
			c.agree("std error", p.StdError, se)
			c.agree("low", p.Low, y-q*se)
			c.agree("high", p.High, y+q*se)
			c.agree("new low", p.NewLow, y-q*scatter)
			c.agree("new high", p.NewHigh, y+q*scatter)
		}
	}
}

func predictionUnjudged(c *cell) {
	got, err := trammel.Predict(c.r, tableOf(c.T, ahead, false), nil)
	c.must(err)
	for i, d := range ahead {
		mean, _ := c.predicted(d)
		p := got.Rows[i]
		c.agree("mean", p.Mean, float(mean))
		for what, v := range map[string]float64{"std error": p.StdError, "low": p.Low - p.Mean, "high": p.High - p.Mean,
			"new low": p.NewLow - p.Mean, "new high": p.NewHigh - p.Mean} {
			if c.saturated {
				c.undefinedNumber(what, v)
			} else if !(math.Abs(v) < 1e-11) {
				c.Errorf("%s is %v off the mean", what, v)
			}
		}
	}
}

func originalAgrees(c *cell) {
	table := tableOf(c.T, ahead, false)
	q := tFactor(level, c.df)
	got, err := trammel.Predict(c.r, table, &trammel.PredictOptions{Level: level, Original: true, Weights: aheadWeights})
	c.must(err)
	smear, err := trammel.Predict(c.r, table, &trammel.PredictOptions{Level: level, Smearing: true, Weights: aheadWeights})
	c.must(err)
	if got.Quantity != "median of porosity, mapped back from log(porosity)" ||
		smear.Quantity != "mean of porosity (smearing estimate), from log(porosity)" {
		c.Errorf("labels %q and %q", got.Quantity, smear.Quantity)
	}
	for i, d := range ahead {
		mean, v := c.predicted(d)
		y, se := float(mean), root(mul(c.dispersion(), v))
		scatter := math.Sqrt(se*se + float(c.dispersion())/aheadWeights[i])
		p, s := got.Rows[i], smear.Rows[i]
		c.agree("median", p.Mean, math.Exp(y))
		c.agree("low", p.Low, math.Exp(y-q*se))
		c.agree("high", p.High, math.Exp(y+q*se))
		c.agree("new low", p.NewLow, math.Exp(y-q*scatter))
		c.agree("new high", p.NewHigh, math.Exp(y+q*scatter))
		c.undefinedNumber("std error", p.StdError)
		// For the logarithm the smearing estimate is a factor on the median.
		factor := 0.0
		for _, e := range floats(c.s.residual) {
			factor += math.Exp(e/math.Sqrt(aheadWeights[i])) / float64(c.cases)
		}
		c.agree("smearing mean", s.Mean, math.Exp(y)*factor)
		c.agree("smearing new low", s.NewLow, p.NewLow)
		c.agree("smearing new high", s.NewHigh, p.NewHigh)
		c.undefinedNumber("smearing std error", s.StdError)
		c.undefinedNumber("smearing low", s.Low)
		c.undefinedNumber("smearing high", s.High)
	}
}

func originalRefused(c *cell) {
	table := tableOf(c.T, ahead, false)
	for _, opts := range []trammel.PredictOptions{{Original: true}, {Smearing: true}} {
		_, err := trammel.Predict(c.r, table, &opts)
		c.code(err, "no-way-back")
	}
}

func scoringAgrees(c *cell) {
	table := tableOf(c.T, ahead, false)
	dst := make([]float64, len(ahead))
	c.must(trammel.PredictTo(dst, c.r, table))
	m, err := c.r.Plan().Matrix(table)
	c.must(err)
	known, _, err := c.r.Plan().Known(table)
	c.must(err)
	p := len(c.names)
	mean, grad := make([]float64, len(ahead)), make([]float64, len(ahead)*p)
	c.r.MeanTo(mean, grad, m, known)
	for i, d := range ahead {
		want, _ := c.predicted(d)
		c.agree("mean", dst[i], float(want))
		c.agree("mean with gradient", mean[i], float(want))
		if !slices.Equal(grad[i*p:(i+1)*p], c.row(d)) {
			c.Errorf("gradient %v, want %v", grad[i*p:(i+1)*p], c.row(d))
		}
	}
}

func diagnosticsAgree(c *cell) {
	d, err := trammel.Diagnose(c.r)
	c.must(err)
	if !slices.Equal(d.Row, c.oracle.rows) {
		c.Fatalf("rows %v, want %v", d.Row, c.oracle.rows)
	}
	p := big.NewRat(int64(len(c.names)), 1)
	for i := range d.Row {
		w, e := c.weight(c.used[i]), c.s.residual[i]
		h := mul(w, quad(c.p.x[i], c.s.inverse))
		left := new(big.Rat).Sub(big.NewRat(1, 1), h)
		sign := float64(e.Sign())
		row := fmt.Sprintf("row %d ", d.Row[i])
		c.agree(row+"fitted", d.Fitted[i], float(new(big.Rat).Sub(c.y[i], e)))
		c.agree(row+"residual", d.Residual[i], float(e))
		c.agree(row+"leverage", d.Leverage[i], float(h))
		c.agree(row+"standardized", d.Standardized[i],
			sign*root(new(big.Rat).Quo(mul(w, e, e), mul(c.dispersion(), left))))
		// The rest by fitting again with one case left out.
		out := c.without(i)
		dispersion := new(big.Rat).Quo(out.rss, big.NewRat(int64(c.df-1), 1))
		c.agree(row+"studentized", d.Studentized[i], sign*root(new(big.Rat).Quo(mul(w, e, e), mul(dispersion, left))))
		moved := new(big.Rat)
		for k := range c.used {
			shift := new(big.Rat).Sub(dot(c.p.x[k], c.s.b), dot(c.p.x[k], out.b))
			moved.Add(moved, mul(c.p.w[k], shift, shift))
		}
		c.agree(row+"Cook", d.Cook[i], float(moved.Quo(moved, mul(p, c.dispersion()))))
	}
}

func diagnosticsUnjudged(c *cell) {
	d, err := trammel.Diagnose(c.r)
	c.must(err)
	for i := range d.Row {
		c.agree("fitted", d.Fitted[i], float(c.y[i]))
		c.agree("residual", d.Residual[i], 0)
		c.agree("leverage", d.Leverage[i], float(mul(c.weight(c.used[i]), quad(c.p.x[i], c.s.inverse))))
		c.undefinedNumber("standardized", d.Standardized[i])
		c.undefinedNumber("studentized", d.Studentized[i])
		c.undefinedNumber("Cook", d.Cook[i])
	}
}

// pure is the scatter of equal rows about their means, by definition.
func (o *oracle) pure() (groups int, ss *big.Rat) {
	ss = new(big.Rat)
	done := map[string]bool{}
	for _, d := range o.used {
		key := fmt.Sprint(o.row(d), o.knownAt(d))
		if done[key] {
			continue
		}
		done[key] = true
		q := &problem{}
		for i, other := range o.used {
			if fmt.Sprint(o.row(other), o.knownAt(other)) == key {
				q.x = append(q.x, []*big.Rat{big.NewRat(1, 1)})
				q.y = append(q.y, o.y[i])
				q.w = append(q.w, o.p.w[i])
			}
		}
		groups++
		ss.Add(ss, q.solve().rss)
	}
	return groups, ss
}

func lackOfFitAgrees(c *cell) {
	got, err := trammel.LackOfFit(c.r)
	c.must(err)
	groups, ss := c.pure()
	df, pureDF := groups-len(c.names), c.cases-groups
	if got.Groups != groups || got.DF != df || got.PureDF != pureDF {
		c.Fatalf("got %+v, want %d groups, %d and %d degrees of freedom", got, groups, df, pureDF)
	}
	lack := new(big.Rat).Sub(c.s.rss, ss)
	f := float(new(big.Rat).Quo(mul(lack, big.NewRat(int64(pureDF), 1)), mul(ss, big.NewRat(int64(df), 1))))
	c.agree("lack SS", got.SS, float(lack))
	c.agree("pure SS", got.PureSS, float(ss))
	c.agree("F", got.F, f)
	c.agree("p", got.P, fUpper(f, df, pureDF))
}

func lackOfFitRefused(c *cell) {
	_, err := trammel.LackOfFit(c.r)
	if c.saturated {
		c.code(err, "no-repeats")
	} else {
		c.code(err, "exact-repeats")
	}
}

func rowsAgree(c *cell) {
	got := c.r.Rows()
	if got.Given != len(c.data) || got.Used != len(c.used) || got.Cases != float64(c.cases) {
		c.Errorf("got %+v, want %d given, %d used, %d cases", got, len(c.data), len(c.used), c.cases)
	}
	var out []int
	for i := range c.data {
		if !slices.Contains(c.oracle.rows, i+1) {
			out = append(out, i+1)
		}
	}
	aside, zero := out, []int(nil)
	if !c.setAside {
		aside, zero = nil, out
	}
	if !slices.Equal(got.SetAside, aside) || !slices.Equal(got.Zero, zero) {
		c.Errorf("set aside %v and of weight 0 %v, want %v and %v", got.SetAside, got.Zero, aside, zero)
	}
}

// jsonAgrees reads the JSON back and compares every number bit for bit with the
// answer to the question it stands for, which the other cells have checked.
func jsonAgrees(c *cell) {
	s, err := trammel.Summarize(c.r, &trammel.SummaryOptions{Level: level})
	c.must(err)
	var b bytes.Buffer
	c.must(s.WriteJSON(&b))
	var doc map[string]any
	c.must(json.Unmarshal(b.Bytes(), &doc))
	keys(c, "", doc, "model fitter path rows coefficients derived freedom residual_sd residual_ss r_squared adjusted_r_squared "+
		"log_likelihood aic aicc bic terms deviance null_deviance pearson dispersion end notes")
	g := c.r.Goodness()
	for key, want := range map[string]float64{"freedom": float64(c.df), "residual_sd": g.ResidualSD, "residual_ss": g.ResidualSS,
		"r_squared": g.RSquared, "adjusted_r_squared": g.AdjustedRSquared, "log_likelihood": g.LogLikelihood, "aic": g.AIC, "aicc": g.AICc,
		"bic": g.BIC, "deviance": g.Deviance, "null_deviance": g.NullDeviance, "pearson": g.Pearson, "dispersion": g.Dispersion} {
		same(c, key, doc[key], want)
	}
	if doc["model"] != c.r.Model().String() || doc["fitter"] != c.r.Fitter() || doc["path"] != c.r.Path() {
		c.Errorf("model %v, fitter %v, path %v", doc["model"], doc["fitter"], doc["path"])
	}
	rows := doc["rows"].(map[string]any)
	keys(c, "rows ", rows, "given used set_aside")
	same(c, "given", rows["given"], float64(len(c.data)))
	same(c, "used", rows["used"], float64(len(c.used)))
	if len(rows["set_aside"].([]any)) != len(c.r.Rows().SetAside) {
		c.Errorf("set_aside %v", rows["set_aside"])
	}
	list := func(key string, want []trammel.Coefficient) {
		got := doc[key].([]any)
		if len(got) != len(want) {
			c.Fatalf("%d %s, want %d", len(got), key, len(want))
		}
		for i, x := range want {
			e := got[i].(map[string]any)
			keys(c, key+" ", e, "name meaning estimate std_error low high p")
			if e["name"] != x.Name || e["meaning"] != x.Meaning {
				c.Errorf("%s %v", key, e)
			}
			for k, v := range map[string]float64{"estimate": x.Estimate, "std_error": x.StdError, "low": x.Low, "high": x.High, "p": x.P} {
				same(c, key+" "+k, e[k], v)
			}
		}
	}
	list("coefficients", c.coefficients())
	list("derived", c.derivedEffects())
	tests, err := trammel.Terms(c.r)
	c.must(err)
	terms := doc["terms"].([]any)
	if len(terms) != len(tests) {
		c.Fatalf("%d terms, want %d", len(terms), len(tests))
	}
	for i, x := range tests {
		e := terms[i].(map[string]any)
		keys(c, "terms ", e, "term df ss f chi2 p")
		if e["term"] != x.Term {
			c.Errorf("term %v", e)
		}
		for k, v := range map[string]float64{"df": float64(x.DF), "ss": x.SS, "f": x.Stat, "chi2": math.NaN(), "p": x.P} {
			same(c, "terms "+k, e[k], v)
		}
	}
	end := doc["end"].(map[string]any)
	keys(c, "end ", end, "reason iterations measure tolerance")
	if end["reason"] != c.r.End().Reason || end["reason"] == "" {
		c.Errorf("end %v", end)
	}
	var want []any
	for _, n := range append(slices.Clone(s.Notes), s.Findings...) {
		want = append(want, n.Text)
	}
	if notes := doc["notes"].([]any); !slices.Equal(notes, want) {
		c.Errorf("notes %v, want %v", notes, want)
	}
	for sentence, due := range map[string]bool{
		"R² is uncorrected":                         !c.corrected,
		"Not fitted, for weight or count 0: row 1.": c.name == "weight 0",
	} {
		if strings.Contains(fmt.Sprint(want), sentence) != due {
			c.Errorf("%q is said: %v", sentence, !due)
		}
	}
}

func keys(c *cell, where string, got map[string]any, want string) {
	c.Helper()
	names := strings.Fields(want)
	for _, k := range names {
		if _, ok := got[k]; !ok {
			c.Errorf("%skey %s is absent", where, k)
		}
	}
	if len(got) != len(names) {
		c.Errorf("%s%d keys, want %d", where, len(got), len(names))
	}
}

// same tells that a decoded number is exactly want, and null where want is NaN.
func same(c *cell, what string, got any, want float64) {
	c.Helper()
	v, ok := got.(float64)
	if math.IsNaN(want) && got == nil || ok && v == want {
		return
	}
	c.Errorf("%s: JSON has %v, want %v", what, got, want)
}

// reportSays checks what the words of a report must say in each scenario; the
// whole text of some is in testdata.
func reportSays(c *cell) {
	s, err := trammel.Summarize(c.r, nil)
	c.must(err)
	var b strings.Builder
	c.must(s.WriteReport(&b))
	text := b.String()
	want := append([]string{"Model    " + c.r.Model().String(), "95 % interval", "What to look at"}, c.names...)
	switch {
	case c.saturated:
		want = append(want, "as many coefficients as cases", "0 degrees of freedom")
	case c.exact:
		want = append(want, "exact up to rounding")
	default:
		want = append(want, "adjusted 0.", "Lack of fit, against the scatter of repeated rows")
	}
	if !c.corrected {
		want = append(want, "uncorrected")
	}
	if c.setAside {
		want = append(want, "set aside as incomplete: rows 1 and 16")
	}
	if c.name == "weight 0" {
		want = append(want, "not fitted for weight or count 0: row 1")
	}
	if c.counted {
		want = append(want, fmt.Sprintf("standing for %d cases", c.cases))
	}
	for _, w := range want {
		if !strings.Contains(strings.Join(strings.Fields(text), " "), strings.Join(strings.Fields(w), " ")) {
			c.Errorf("the report does not say %q:\n%s", w, text)
		}
	}
	for _, line := range strings.Split(text, "\n") {
		if n := len([]rune(line)); n > 100 {
			c.Errorf("a line has %d characters: %s", n, line)
		}
	}
	if strings.Contains(text, "NaN") || strings.Contains(text, "Inf") {
		c.Errorf("the report shows a number that is none:\n%s", text)
	}
}
