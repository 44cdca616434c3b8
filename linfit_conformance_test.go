package trammel_test

import (
	"context"
	"math/big"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/internal/digits"
	"example.com/trammel/linfit"
)

// TestConformanceLinfit runs the suite on the results of package linfit.
func TestConformanceLinfit(t *testing.T) {
	conform(t, func(text string, t *design.Table, setAside bool) (trammel.Result, error) {
		return linfit.Fit(context.Background(), text, t, &linfit.Options{SetAside: setAside})
	}, 12.5)
}

// TestPredictIllConditionedLinfit predicts from nearly dependent powers: the
// standard errors must agree with the rational ones.
func TestPredictIllConditionedLinfit(t *testing.T) {
	x, y := line()
	table, err := design.NewTable(design.Numbers("x", x), design.Numbers("y", y))
	if err != nil {
		t.Fatal(err)
	}
	const model = "y ~ powers(x, 8)"
	r, err := linfit.Fit(context.Background(), model, table, nil)
	if err != nil {
		t.Fatal(err)
	}
	exact, err := exactFit(model, table, false)
	if err != nil {
		t.Fatal(err)
	}
	got, err := trammel.Predict(r, table, nil)
	if err != nil {
		t.Fatal(err)
	}
	want, err := trammel.Predict(exact, table, nil)
	if err != nil {
		t.Fatal(err)
	}
	for i, g := range got.Rows {
		w := want.Rows[i]
		if digits.Agree(g.Mean, w.Mean) < 12 || digits.Agree(g.StdError, w.StdError) < 12 || digits.Agree(g.NewLow, w.NewLow) < 12 {
			t.Errorf("row %d: got %+v, want %+v", i+1, g, w)
		}
	}
}

// TestRobustAnswers compares predictions and derived effects under HC0 with
// the sandwich (X'WX)⁻¹ (Σ count·weight²·residual²·xx') (X'WX)⁻¹ in rationals (White
// 1980); the scatter of a new observation stays the ordinary one.
func TestRobustAnswers(t *testing.T) {
	for _, sc := range scenarios {
		if sc.name != "plain" && sc.name != "weighted" && sc.name != "counted" {
			continue
		}
		o := newOracle(sc)
		r, err := linfit.Fit(context.Background(), sc.model, tableOf(t, sc.data, true), &linfit.Options{Robust: linfit.HC0})
		if err != nil {
			t.Fatal(err)
		}
		// A row x has variance Σ count·(weight·residual·x'(X'WX)⁻¹x_i)².
		variance := func(x []*big.Rat) *big.Rat {
			sum := new(big.Rat)
			for i, d := range o.used {
				across := new(big.Rat)
				for j := range x {
					across.Add(across, mul(x[j], dot(o.s.inverse[j], o.p.x[i])))
				}
				s := mul(o.weight(d), o.s.residual[i], across)
				sum.Add(sum, mul(o.count(d), s, s))
			}
			return sum
		}
		got, err := trammel.Predict(r, tableOf(t, ahead, false), &trammel.PredictOptions{Level: level})
		if err != nil {
			t.Fatal(err)
		}
		q := tFactor(level, o.df)
		for i, d := range ahead {
			v := variance(rats(o.row(d)))
			mean, _ := o.predicted(d)
			p, high := got.Rows[i], float(mean)+q*root(new(big.Rat).Add(v, o.dispersion()))
			if digits.Agree(p.StdError, root(v)) < 12 || digits.Agree(p.NewHigh, high) < 12 {
				t.Errorf("%s, row %d: %+v, want standard error %v and new high %v", sc.name, i+1, p, root(v), high)
			}
		}
		derived, err := trammel.Derived(r, level)
		if err != nil {
			t.Fatal(err)
		}
		for i, d := range o.derived {
			if want := root(variance(rats(d.weights))); digits.Agree(derived[i].StdError, want) < 12 {
				t.Errorf("%s, %s: standard error %v, want %v", sc.name, d.name, derived[i].StdError, want)
			}
		}
	}
}

// TestRobustIsSaid names the robust covariance wherever results are read.
func TestRobustIsSaid(t *testing.T) {
	r, err := linfit.Fit(context.Background(), "porosity ~ hold * cat(furnace)", tableOf(t, plain, true), &linfit.Options{Robust: "HC3"})
	if err != nil {
		t.Fatal(err)
	}
	s, err := trammel.Summarize(r, nil)
	if err != nil {
		t.Fatal(err)
	}
	var report, doc strings.Builder
	if err := s.WriteReport(&report); err != nil {
		t.Fatal(err)
	}
	if err := s.WriteJSON(&doc); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(report.String(), "robust standard errors, HC3") || !strings.Contains(report.String(), "robust F") ||
		!strings.Contains(doc.String(), "a robust covariance: HC3.") {
		t.Errorf("the robust covariance is not named in\n%s\n%s", report.String(), doc.String())
	}
}
