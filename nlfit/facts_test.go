package nlfit_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/internal/digits"
	"example.com/trammel/linfit"
	"example.com/trammel/nlfit"
)

type discs struct {
	furnace       []string
	hold, z, y, w []float64
	m             []float64
}

// shrinking discs: an approach to a limit, its rate the furnace's own.
func shrinking(n int) *discs {
	rng := rand.New(rand.NewPCG(6, 2))
	d := &discs{}
	for i := range n {
		k := i % 3
		hold := 2 + 28*rng.Float64()
		d.furnace = append(d.furnace, fmt.Sprintf("F%d", k+1))
		d.hold = append(d.hold, hold)
		d.z = append(d.z, rng.NormFloat64())
		d.y = append(d.y, 18*(1-math.Exp(-[]float64{0.08, 0.12, 0.2}[k]*hold))+0.2*rng.NormFloat64())
		d.w = append(d.w, 0.5+rng.Float64())
		d.m = append(d.m, float64(1+rng.IntN(3)))
	}
	return d
}

func (d *discs) table(t testing.TB, rows []int, scale float64) *design.Table {
	t.Helper()
	if rows == nil {
		for i := range d.y {
			rows = append(rows, i)
		}
	}
	pick := func(v []float64, by float64) []float64 {
		out := make([]float64, len(rows))
		for i, r := range rows {
			out[i] = by * v[r]
		}
		return out
	}
	furnace := make([]string, len(rows))
	for i, r := range rows {
		furnace[i] = d.furnace[r]
	}
	table, err := design.NewTable(design.Texts("furnace", furnace), design.Numbers("hold", pick(d.hold, 1)), design.Numbers("z", pick(d.z, 1)),
		design.Numbers("y", pick(d.y, scale)), design.Numbers("w", pick(d.w, 1)), design.Numbers("m", pick(d.m, 1)))
	if err != nil {
		t.Fatal(err)
	}
	return table
}

func mustFit(t testing.TB, text string, table *design.Table) trammel.Result {
	t.Helper()
	r, err := nlfit.Fit(context.Background(), text, table, nil)
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	return r
}

func values(t testing.TB, r trammel.Result) map[string]trammel.Coefficient {
	t.Helper()
	list, err := trammel.Coefficients(r, 0.95)
	if err != nil {
		t.Fatal(err)
	}
	out := make(map[string]trammel.Coefficient)
	for _, c := range list {
		out[c.Name] = c
	}
	return out
}

// TestOwnLaws: every parameter by category is the separate fit of each level.
func TestOwnLaws(t *testing.T) {
	d := shrinking(90)
	all := mustFit(t, "y = limit*(1 - exp(-k*hold)) fitting limit by cat(furnace), k by cat(furnace)", d.table(t, nil, 1))
	together := values(t, all)
	rss := 0.0
	for f := range 3 {
		var rows []int
		for i := range d.y {
			if i%3 == f {
				rows = append(rows, i)
			}
		}
		r := mustFit(t, "y = limit*(1 - exp(-k*hold)) fitting limit, k", d.table(t, rows, 1))
		rss += r.Goodness().ResidualSS
		for name, c := range values(t, r) {
			if got := together[fmt.Sprintf("%s[furnace='F%d']", name, f+1)].Estimate; digits.Agree(got, c.Estimate) < 11 {
				t.Errorf("F%d: %s is %.15g together, %.15g apart", f+1, name, got, c.Estimate)
			}
		}
	}
	if d := digits.Agree(all.Goodness().ResidualSS, rss); d < 12 {
		t.Errorf("residual SS %g together, %g apart", all.Goodness().ResidualSS, rss)
	}
	// A model of a parameter's own spans the same laws.
	own := mustFit(t, "y = limit*(1 - exp(-k*hold)) fitting limit ~ cat(furnace), log(k) ~ cat(furnace)", d.table(t, nil, 1))
	if d := digits.Agree(own.Goodness().ResidualSS, rss); d < 12 {
		t.Errorf("residual SS %g with models of the parameters, %g apart", own.Goodness().ResidualSS, rss)
	}
	if got, want := values(t, own)["log(k)[intercept]"].Estimate, math.Log(together["k[furnace='F1']"].Estimate); digits.Agree(got, want) < 10 {
		t.Errorf("log(k)[intercept] is %g, want %g", got, want)
	}
}

// TestLinearEquation: an equation linear in its parameters is linfit's answer.
func TestLinearEquation(t *testing.T) {
	d := shrinking(60)
	table := d.table(t, nil, 1)
	for _, clauses := range []string{"", " weighted w", " counted m", " weighted w counted m"} {
		a := mustFit(t, "y = a + b*hold + c*z + d*hold*z"+clauses+" fitting a, b, c, d", table)
		b, err := linfit.Fit(context.Background(), "y ~ hold*z"+clauses, table, nil)
		if err != nil {
			t.Fatal(err)
		}
		ea, eb, sa, sb := a.Estimates(), b.Estimates(), a.StdErrors(), b.StdErrors()
		for j := range ea {
			if digits.Agree(ea[j], eb[j]) < 12 || digits.Agree(sa[j], sb[j]) < 12 {
				t.Errorf("%q: coefficient %d is %.16g ± %.16g, linfit has %.16g ± %.16g", clauses, j, ea[j], sa[j], eb[j], sb[j])
			}
		}
		ga, gb := a.Goodness(), b.Goodness()
		if a.Freedom() != b.Freedom() || digits.Agree(ga.LogLikelihood, gb.LogLikelihood) < 12 || digits.Agree(ga.RSquared, gb.RSquared) < 12 {
			t.Errorf("%q: freedom %d and %d, log-likelihood %g and %g, R² %g and %g", clauses, a.Freedom(), b.Freedom(), ga.LogLikelihood, gb.LogLikelihood, ga.RSquared, gb.RSquared)
		}
		da, err := trammel.Diagnose(a)
		if err != nil {
			t.Fatal(err)
		}
		db, err := trammel.Diagnose(b)
		if err != nil {
			t.Fatal(err)
		}
		for i := range da.Leverage {
			if digits.Agree(da.Leverage[i], db.Leverage[i]) < 11 || math.Abs(da.Fitted[i]-db.Fitted[i]) > 1e-11 {
				t.Fatalf("%q: row %d: leverage %g and %g", clauses, i, da.Leverage[i], db.Leverage[i])
			}
		}
		rows := d.table(t, []int{3, 1, 4}, 1)
		pa, err := trammel.Predict(a, rows, nil)
		if err != nil {
			t.Fatal(err)
		}
		pb, err := trammel.Predict(b, rows, nil)
		if err != nil {
			t.Fatal(err)
		}
		for i := range pa.Rows {
			if digits.Agree(pa.Rows[i].NewLow, pb.Rows[i].NewLow) < 11 || digits.Agree(pa.Rows[i].High, pb.Rows[i].High) < 11 {
				t.Errorf("%q: predictions %v and %v", clauses, pa.Rows[i], pb.Rows[i])
			}
		}
	}
}

// TestIndifferent: reordered rows, another seed, other numbers of workers and
// rescaled data change nothing but the units.
func TestIndifferent(t *testing.T) {
	d := shrinking(60)
	const text = "y = limit*(1 - exp(-k*hold)) fitting limit, k by cat(furnace)"
	base := mustFit(t, text, d.table(t, nil, 1))
	e := base.Estimates()
	for name, r := range map[string]trammel.Result{
		"reordered": mustFit(t, text, d.table(t, rand.New(rand.NewPCG(1, 1)).Perm(60), 1)),
		"rescaled":  mustFit(t, text, d.table(t, nil, 1024)),
	} {
		got := r.Estimates()
		if name == "rescaled" {
			got[0] /= 1024
		}
		for j := range e {
			if digits.Agree(got[j], e[j]) < 12 {
				t.Errorf("%s: coefficient %d is %.16g, want %.16g", name, j, got[j], e[j])
			}
		}
	}
	for _, o := range []nlfit.Options{{Workers: 1}, {Workers: 2}, {Workers: 5}} {
		r, err := nlfit.Fit(context.Background(), text, d.table(t, nil, 1), &o)
		if err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(r.Estimates(), e) {
			t.Errorf("%d workers: %v, want %v", o.Workers, r.Estimates(), e)
		}
	}
	r, err := nlfit.Fit(context.Background(), text, d.table(t, nil, 1), &nlfit.Options{Seed: 99})
	if err != nil {
		t.Fatal(err)
	}
	for j, v := range r.Estimates() {
		if digits.Agree(v, e[j]) < 12 {
			t.Errorf("another seed: coefficient %d is %.16g, want %.16g", j, v, e[j])
		}
	}
}

// TestTraps: situations with the ending each must have.
func TestTraps(t *testing.T) {
	for _, c := range []struct {
		name, csv, model string
		code             string // of the error; "" for none
		reason           string
		check            func(r trammel.Result) string
	}{
		{"two minima, the lower far from the start", sine(), "y = a*sin(w*x) fitting a start 1, w start 0.9", "", "converged", func(r trammel.Result) string {
			if w := math.Abs(r.Estimates()[1]); math.Abs(w-3) > 0.05 {
				return fmt.Sprint("w is ", w)
			}
			if !slices.ContainsFunc(r.Notes(), func(n trammel.Note) bool { return n.Code == "lower-minimum" }) {
				return "no note of the lower minimum"
			}
			return ""
		}},
		{"redundant parameters", "x,y\n1,2\n2,3\n3,5\n4,9\n", "y = a*b*exp(k*x) fitting a, b, k", "singular", "singular", nil},
		{"a bound active", "x,y\n1,2.1\n2,3.9\n3,6.2\n4,7.8\n", "y = a + b*x fitting a > 1, b", "", "bound active", func(r trammel.Result) string {
			if r.Estimates()[0] != 1 || !math.IsNaN(r.StdErrors()[0]) || math.IsNaN(r.StdErrors()[1]) {
				return fmt.Sprint(r.Estimates(), r.StdErrors())
			}
			return ""
		}},
		{"a flat valley", "x,y\n1,1.01\n2,2.02\n3,2.98\n4,4.01\n5,4.99\n", "y = a*(1 - exp(-k*x))/k fitting a, k in (1e-9, 5)", "", "", nil},
		{"no information on a parameter", "x,y\n1,2\n2,3\n3,5\n4,9\n", "y = a + b*x + 0*k fitting a, b, k", "singular", "singular", nil},
		{"a lag beyond the data", "x,y\n1,2\n2,2.1\n3,1.9\n4,2\n", "y = a + b*max(0, x - lag) fitting a, b, lag in (5, 9)", "singular", "singular", nil},
		{"overflow at the start", "x,y\n1,2.7\n2,7.3\n3,20.2\n4,54.5\n", "y = a*exp(b*x) fitting a start 1, b start 900", "start", "", nil},
		{"overflow one step on", "x,y\n1,2.7\n2,7.3\n3,20.2\n4,54.5\n", "y = a*exp(b*x) fitting a start 1, b start 170", "", "converged", nil},
		{"two rows for three parameters", "x,y\n1,2\n2,3\n", "y = a + b*exp(k*x) fitting a, b, k", "too-few-rows", "", nil},
		{"exact data", "x,y\n0,3\n1,6\n2,12\n3,24\n4,48\n", "y = a*2^(b*x) fitting a, b", "", "converged", func(r trammel.Result) string {
			e := r.Estimates()
			if math.Abs(e[0]-3) > 1e-13 || math.Abs(e[1]-1) > 1e-13 || !slices.ContainsFunc(r.Notes(), func(n trammel.Note) bool { return n.Code == "exact-fit" || n.Code == "few-digits" }) {
				return fmt.Sprint(e, r.Notes())
			}
			return ""
		}},
		{"a constant response", "x,y\n1,2\n2,2\n3,2\n4,2\n", "y = a + b*x fitting a, b", "", "converged", func(r trammel.Result) string {
			if e := r.Estimates(); math.Abs(e[0]-2) > 1e-13 || math.Abs(e[1]) > 1e-13 {
				return fmt.Sprint(e)
			}
			return ""
		}},
		{"as many rows as parameters", "x,y\n1,2\n2,5\n", "y = a + b*x fitting a, b", "", "converged", func(r trammel.Result) string {
			if r.Freedom() != 0 || r.StdErrors() != nil {
				return fmt.Sprint(r.Freedom(), r.StdErrors())
			}
			return ""
		}},
		{"log on both sides", "x,y\n1,2.7\n2,7.3\n3,20.2\n4,54.5\n", "log(y) = log(a) + b*x fitting a > 0, b", "", "converged", nil},
		{"held", "x,y\n1,2.7\n2,7.3\n3,20.2\n4,54.5\n", "y = a*exp(b*x) fitting a, b = 1", "", "converged", nil},
	} {
		table, err := design.ReadCSV(strings.NewReader(c.csv), nil)
		if err != nil {
			t.Fatal(err)
		}
		r, err := nlfit.Fit(context.Background(), c.model, table, nil)
		code := ""
		var own *nlfit.Error
		var other *design.Error
		switch {
		case errors.As(err, &own):
			code = string(own.Code)
		case errors.As(err, &other):
			code = string(other.Code)
		case err != nil:
			code = err.Error()
		}
		if code != c.code {
			t.Errorf("%s: error %v, want code %q", c.name, err, c.code)
			continue
		}
		if r == nil {
			if c.reason != "" {
				t.Errorf("%s: no result", c.name)
			}
			continue
		}
		if c.reason != "" && r.End().Reason != c.reason {
			t.Errorf("%s: ended %q, want %q", c.name, r.End().Reason, c.reason)
		}
		if c.check != nil {
			if fault := c.check(r); fault != "" {
				t.Errorf("%s: %s", c.name, fault)
			}
		}
	}
}

func sine() string {
	rng := rand.New(rand.NewPCG(3, 3))
	var b strings.Builder
	b.WriteString("x,y\n")
	for i := range 60 {
		x := float64(i) / 10
		fmt.Fprintf(&b, "%g,%g\n", x, 2*math.Sin(3*x)+0.1*rng.NormFloat64())
	}
	return b.String()
}
