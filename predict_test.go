package trammel_test

import (
	"errors"
	"math"
	"math/big"
	"sync"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/internal/digits"
)

// TestPredictDecreasing maps back from a decreasing function: ends of intervals
// change places.
func TestPredictDecreasing(t *testing.T) {
	table := tableOf(t, plain, true)
	r, err := exactFit("1/porosity ~ hold", table, false)
	if err != nil {
		t.Fatal(err)
	}
	there, err := trammel.Predict(r, table, nil)
	if err != nil {
		t.Fatal(err)
	}
	back, err := trammel.Predict(r, table, &trammel.PredictOptions{Original: true})
	if err != nil {
		t.Fatal(err)
	}
	if back.Quantity != "median of porosity, mapped back from 1/porosity" || back.Level != 0.95 {
		t.Errorf("%q at level %v", back.Quantity, back.Level)
	}
	for i, b := range back.Rows {
		a := there.Rows[i]
		for _, pair := range [][2]float64{{b.Mean, 1 / a.Mean}, {b.Low, 1 / a.High}, {b.High, 1 / a.Low}, {b.NewLow, 1 / a.NewHigh}, {b.NewHigh, 1 / a.NewLow}} {
			if digits.Agree(pair[0], pair[1]) < 15 {
				t.Errorf("row %d: got %v, want %v", i, pair[0], pair[1])
			}
		}
		if !(b.NewLow < b.Low && b.Low < b.Mean && b.Mean < b.High && b.High < b.NewHigh) {
			t.Errorf("row %d is out of order: %+v", i, b)
		}
	}
}

// TestSmearingWeighted compares with the definition written out: the average over
// cases of the mapped prediction plus residual, scaled to the new row's weight.
func TestSmearingWeighted(t *testing.T) {
	sc := scenario{}
	for _, s := range scenarios {
		if s.name == "weighted, counted and known" {
			sc = s
		}
	}
	sc.model = "log(porosity) ~ " + furnaceTerms + " + known(temp/8) weighted w counted m"
	sc.response = func(d disc) float64 { return math.Log(value(d.porosity)) }
	o := newOracle(sc)
	r, err := exactFit(sc.model, tableOf(t, sc.data, true), false)
	if err != nil {
		t.Fatal(err)
	}
	got, err := trammel.Predict(r, tableOf(t, ahead, false), &trammel.PredictOptions{Smearing: true, Weights: aheadWeights})
	if err != nil {
		t.Fatal(err)
	}
	for i, d := range ahead {
		mean, _ := o.predicted(d)
		want := 0.0
		for k, row := range o.used {
			e := float(o.s.residual[k]) * math.Sqrt(value(row.w)/aheadWeights[i])
			want += value(row.m) * math.Exp(float(mean)+e) / float64(o.cases)
		}
		if digits.Agree(got.Rows[i].Mean, want) < 13 {
			t.Errorf("row %d: got %v, want %v", i+1, got.Rows[i].Mean, want)
		}
	}
}

// TestPredictRefuses passes on what the plan refuses, typed.
func TestPredictRefuses(t *testing.T) {
	r, err := exactFit("porosity ~ hold * cat(furnace)", tableOf(t, plain, true), false)
	if err != nil {
		t.Fatal(err)
	}
	unseen := tableOf(t, []disc{{"F9", "10", "1", "1", "1", ""}}, false)
	for name, ask := range map[string]func() error{
		"predict": func() error { _, err := trammel.Predict(r, unseen, nil); return err },
		"score":   func() error { return trammel.PredictTo(make([]float64, 1), r, unseen) },
	} {
		var refusal *design.Error
		if err := ask(); !errors.As(err, &refusal) || !errors.Is(err, design.Code("unseen-level")) {
			t.Errorf("%s: got %v", name, err)
		}
	}
	for _, w := range [][]float64{{1, 2}, {-1}, {math.NaN()}, {math.Inf(1)}} {
		one := tableOf(t, ahead[:1], false)
		if _, err := trammel.Predict(r, one, &trammel.PredictOptions{Weights: w}); !errors.Is(err, trammel.Code("bad-weight")) {
			t.Errorf("weights %v: %v", w, err)
		}
	}
	for _, level := range []float64{-0.5, 1, 1.5, math.NaN(), math.Inf(1)} {
		if _, err := trammel.Predict(r, unseen, &trammel.PredictOptions{Level: level}); !errors.Is(err, trammel.Code("bad-level")) {
			t.Errorf("level %v: %v", level, err)
		}
	}
}

// TestPredictIllConditioned predicts from powers that are nearly dependent. By
// leverage the standard errors are right; through the covariance matrix, whose
// addends cancel, they must be right too or not given.
func TestPredictIllConditioned(t *testing.T) {
	n, k := 20, 9
	x, y := make([]float64, n), scatter(n, 0.1)
	q := &problem{}
	for i := range x {
		x[i] = -9 + float64(i)/4
		y[i] += math.Sin(x[i])
		q.w = append(q.w, big.NewRat(1, 1))
		q.x = append(q.x, powersOf(x[i], k))
	}
	q.y = rats(y)
	s := q.solve()
	table, err := design.NewTable(design.Numbers("x", x), design.Numbers("y", y))
	if err != nil {
		t.Fatal(err)
	}
	given := 0
	for _, fit := range []fitFunc{exactFit, plainFit} {
		r, err := fit("y ~ powers(x, 9)", table, false)
		if err != nil {
			t.Fatal(err)
		}
		got, err := trammel.Predict(r, table, nil)
		if err != nil {
			t.Fatal(err)
		}
		for i, p := range got.Rows {
			want := root(mul(s.rss, big.NewRat(1, int64(n-k-1)), quad(powersOf(x[i], k), s.inverse)))
			switch {
			case digits.Agree(p.StdError, want) > 4:
				given++
			case !math.IsNaN(p.StdError) || !math.IsNaN(p.Low) || !math.IsNaN(p.NewHigh):
				t.Errorf("row %d: standard error %v, want %v; %+v", i+1, p.StdError, want, p)
			}
		}
	}
	if given < n {
		t.Errorf("%d standard errors are given, want at least the %d by leverage", given, n)
	}
}

func powersOf(x float64, k int) []*big.Rat {
	out := []*big.Rat{big.NewRat(1, 1)}
	for range k {
		out = append(out, mul(out[len(out)-1], new(big.Rat).SetFloat64(x)))
	}
	return out
}

// TestPredictNothing predicts a table without rows.
func TestPredictNothing(t *testing.T) {
	r, err := exactFit("porosity ~ hold", tableOf(t, plain, true), false)
	if err != nil {
		t.Fatal(err)
	}
	none, err := design.NewTable(design.Numbers("hold", nil))
	if err != nil {
		t.Fatal(err)
	}
	got, err := trammel.Predict(r, none, nil)
	if err != nil || len(got.Rows) != 0 {
		t.Errorf("got %+v, %v", got, err)
	}
	if err := trammel.PredictTo(nil, r, none); err != nil {
		t.Error(err)
	}
}

// grid repeats settings to a table of n rows.
func gridTable(t *testing.T, n int) *design.Table {
	t.Helper()
	hold, furnace := make([]float64, n), make([]string, n)
	for i := range n {
		hold[i] = float64(i % 37)
		furnace[i] = []string{"F1", "F2", "F3"}[i%3]
	}
	table, err := design.NewTable(design.Numbers("hold", hold), design.Texts("furnace", furnace))
	if err != nil {
		t.Fatal(err)
	}
	return table
}

// TestAllocations holds that predicting does not allocate per row.
func TestAllocations(t *testing.T) {
	r, err := plainFit("porosity ~ hold * cat(furnace)", tableOf(t, plain, true), false)
	if err != nil {
		t.Fatal(err)
	}
	allocations := func(n int, f func(table *design.Table)) float64 {
		table := gridTable(t, n)
		return testing.AllocsPerRun(5, func() { f(table) })
	}
	score := func(table *design.Table) {
		if err := trammel.PredictTo(make([]float64, table.Rows()), r, table); err != nil {
			t.Fatal(err)
		}
	}
	// The race detector adds a few of its own.
	const slack = 10
	if few, many := allocations(10, score), allocations(10_000, score); many > few+slack {
		t.Errorf("scoring 10 rows takes %v allocations and 10,000 rows take %v", few, many)
	}
	predict := func(table *design.Table) {
		if _, err := trammel.Predict(r, table, nil); err != nil {
			t.Fatal(err)
		}
	}
	if few, many := allocations(10, predict), allocations(10_000, predict); many > few+slack {
		t.Errorf("predicting 10 rows takes %v allocations and 10,000 rows take %v", few, many)
	}
}

// TestShared asks one result from several goroutines, for the race detector,
// and expects equal answers.
func TestShared(t *testing.T) {
	table := tableOf(t, plain, true)
	r, err := exactFit("porosity ~ hold * cat(furnace)", table, false)
	if err != nil {
		t.Fatal(err)
	}
	var wait sync.WaitGroup
	means := make([][]trammel.Prediction, 4)
	for g := range means {
		wait.Go(func() {
			if _, err := trammel.Summarize(r, nil); err != nil {
				t.Error(err)
			}
			p, err := trammel.Predict(r, table, nil)
			if err != nil {
				t.Error(err)
				return
			}
			means[g] = p.Rows
		})
	}
	wait.Wait()
	for g := range means {
		for i := range means[g] {
			if means[g][i] != means[0][i] {
				t.Errorf("goroutine %d, row %d: %+v, want %+v", g, i, means[g][i], means[0][i])
			}
		}
	}
}

// TestCopies changes what a result returned and asks again.
func TestCopies(t *testing.T) {
	r, err := exactFit("porosity ~ hold", tableOf(t, plain, true), false)
	if err != nil {
		t.Fatal(err)
	}
	estimate, se := r.Estimates()[0], r.StdErrors()[0]
	r.Estimates()[0], r.StdErrors()[0] = 99, 99
	variance := r.Covariance().At(0, 0)
	r.Covariance().SetSym(0, 0, 99)
	d, err := trammel.Diagnose(r)
	if err != nil {
		t.Fatal(err)
	}
	residual := d.Residual[0]
	d.Residual[0], d.Leverage[0], d.Fitted[0] = 99, 99, 99
	if d, err = trammel.Diagnose(r); err != nil {
		t.Fatal(err)
	}
	if r.Estimates()[0] != estimate || r.StdErrors()[0] != se || r.Covariance().At(0, 0) != variance || d.Residual[0] != residual {
		t.Error("the result lends its own slices")
	}
}
