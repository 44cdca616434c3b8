package linfit_test

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/internal/digits"
	"example.com/trammel/linfit"
)

// certifiedSet is one set of testdata/strd/certified.json (NIST Statistical
// Reference Datasets; float64_input: 20-digit answers by exact rational
// arithmetic for the data as float64 numbers).
type certifiedSet struct {
	Name    string
	Kind    string
	File    string
	Columns []string
	Design  []string
	N, DF   int
	Exact   struct {
		Estimates  []string
		Deviations []string `json:"standard_deviations"`
		ResidualSD string   `json:"residual_sd"`
		RSquared   string   `json:"r_squared"`
		F          string
	} `json:"float64_input"`
}

func certifiedSets(t *testing.T, kind string) []certifiedSet {
	t.Helper()
	text, err := os.ReadFile("../testdata/strd/certified.json")
	if err != nil {
		t.Fatal(err)
	}
	var all struct{ Datasets []certifiedSet }
	if err := json.Unmarshal(text, &all); err != nil {
		t.Fatal(err)
	}
	sets := slices.DeleteFunc(all.Datasets, func(s certifiedSet) bool { return s.Kind != kind })
	if len(sets) != 8 {
		t.Fatalf("%d %s sets, want 8", len(sets), kind)
	}
	return sets
}

func readCSV(t testing.TB, path string) *design.Table {
	t.Helper()
	file, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	table, err := design.ReadCSV(file, nil)
	if err != nil {
		t.Fatal(err)
	}
	return table
}

func mustFit(t testing.TB, text string, table *design.Table, opts *linfit.Options) trammel.Result {
	t.Helper()
	r, err := linfit.Fit(context.Background(), text, table, opts)
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	return r
}

// TestCertifiedLinear: estimates, standard errors and R² of the eight linear
// sets to 14 digits of the exact answer for the float64 input.
func TestCertifiedLinear(t *testing.T) {
	for _, s := range certifiedSets(t, "linear") {
		t.Run(s.Name, func(t *testing.T) {
			table := readCSV(t, filepath.Join("../testdata/strd/linear", s.Name+".csv"))
			text := fmt.Sprintf("y ~ powers(x, %d)", len(s.Design)-1)
			if s.Design[0] != "1" {
				text = "y ~ x - intercept"
			}
			r := mustFit(t, text, table, nil)
			coefs, err := trammel.Coefficients(r, 0.95)
			if err != nil {
				t.Fatal(err)
			}
			if len(coefs) != len(s.Exact.Estimates) || r.Freedom() != s.DF {
				t.Fatalf("%d coefficients, freedom %d", len(coefs), r.Freedom())
			}
			worst := digits.Most + 0.0
			check := func(what string, got float64, want string, scale float64) {
				if want == "0" {
					if math.Abs(got) > 1e-14*scale {
						t.Errorf("%s is %g, want 0 to 1e-14 of the coefficient", what, got)
					}
					return
				}
				d := digits.AgreeString(got, want)
				worst = min(worst, d)
				if d < 14 {
					t.Errorf("%s is %.17g, want %s: %.1f digits", what, got, want, d)
				}
			}
			for j, c := range coefs {
				check(c.Name, c.Estimate, s.Exact.Estimates[j], 0)
				check("the standard error of "+c.Name, c.StdError, s.Exact.Deviations[j], math.Abs(c.Estimate))
				if s.Exact.Deviations[j] == "0" && !math.IsNaN(c.P) {
					t.Errorf("%s has p = %g in an exact fit", c.Name, c.P)
				}
			}
			g := r.Goodness()
			check("R²", g.RSquared, s.Exact.RSquared, 0)
			check("residual sd", g.ResidualSD, s.Exact.ResidualSD, 1)
			if s.Exact.ResidualSD == "0" && !slices.ContainsFunc(r.Notes(), func(n trammel.Note) bool { return strings.Contains(n.Text, "exact") }) {
				t.Errorf("no note says that the fit is exact: %v", r.Notes())
			}
			t.Logf("at least %.1f digits by %s", worst, r.Path())
		})
	}
}

// TestCertifiedOneWay: F and the residual sd of the eight one-way sets to 13
// digits of the exact answer for the float64 input.
func TestCertifiedOneWay(t *testing.T) {
	for _, s := range certifiedSets(t, "anova") {
		t.Run(s.Name, func(t *testing.T) {
			table := readCSV(t, filepath.Join("../testdata/strd/anova", s.Name+".csv"))
			r := mustFit(t, "response ~ cat(treatment)", table, nil)
			tests, err := trammel.Terms(r)
			if err != nil {
				t.Fatal(err)
			}
			if len(tests) != 1 || tests[0].Term != "cat(treatment)" {
				t.Fatalf("tests %v", tests)
			}
			f, sd, r2 := digits.AgreeString(tests[0].Stat, s.Exact.F), digits.AgreeString(r.Goodness().ResidualSD, s.Exact.ResidualSD), digits.AgreeString(r.Goodness().RSquared, s.Exact.RSquared)
			t.Logf("F %.1f, residual sd %.1f, R² %.1f digits by %s", f, sd, r2, r.Path())
			if f < 13 || sd < 13 || r2 < 13 {
				t.Errorf("F %.17g, want %s; sd %.17g, want %s; R² %.17g, want %s", tests[0].Stat, s.Exact.F, r.Goodness().ResidualSD, s.Exact.ResidualSD,
					r.Goodness().RSquared, s.Exact.RSquared)
			}
		})
	}
}

// plantRows is a table of 60 rows: four machines, two materials, a slope, a
// response with scatter, counts and weights.
type plantRows struct {
	machine, material []string
	x, z, y, w, m     []float64
}

func plant(n int) *plantRows {
	rng := rand.New(rand.NewPCG(4, 4))
	p := &plantRows{}
	for i := range n {
		k := i % 4
		p.machine = append(p.machine, fmt.Sprintf("M%d", k+1))
		p.material = append(p.material, []string{"fine", "coarse"}[(i/4)%2])
		p.x = append(p.x, 10+20*rng.Float64())
		p.z = append(p.z, rng.NormFloat64())
		p.y = append(p.y, 40+float64(k)-(0.3+0.05*float64(k))*p.x[i]+0.4*rng.NormFloat64())
		p.w = append(p.w, 0.5+rng.Float64())
		p.m = append(p.m, float64(1+rng.IntN(3)))
	}
	return p
}

func (p *plantRows) table(t testing.TB, rows []int) *design.Table {
	t.Helper()
	if rows == nil {
		for i := range p.y {
			rows = append(rows, i)
		}
	}
	pick := func(v []float64) []float64 {
		out := make([]float64, len(rows))
		for i, r := range rows {
			out[i] = v[r]
		}
		return out
	}
	words := func(v []string) []string {
		out := make([]string, len(rows))
		for i, r := range rows {
			out[i] = v[r]
		}
		return out
	}
	table, err := design.NewTable(design.Texts("machine", words(p.machine)), design.Texts("material", words(p.material)),
		design.Numbers("x", pick(p.x)), design.Numbers("z", pick(p.z)), design.Numbers("y", pick(p.y)),
		design.Numbers("w", pick(p.w)), design.Numbers("m", pick(p.m)))
	if err != nil {
		t.Fatal(err)
	}
	return table
}

// fitted gives the fitted values and the spread of the response.
func fitted(t testing.TB, r trammel.Result) []float64 {
	t.Helper()
	d, err := trammel.Diagnose(r)
	if err != nil {
		t.Fatal(err)
	}
	return d.Fitted
}

func spread(y []float64) float64 { return slices.Max(y) - slices.Min(y) }

// TestSameSpace: models that span the same space give the same fitted values,
// whatever the reference, the coding, the order of terms or the units.
func TestSameSpace(t *testing.T) {
	p := plant(60)
	table := p.table(t, nil)
	base := fitted(t, mustFit(t, "y ~ x*cat(machine)", table, nil))
	for _, text := range []string{
		"y ~ x*cat(machine against 'M3')",
		"y ~ x*cat(machine against mean)",
		"y ~ x*cat(machine against previous)",
		"y ~ cat(machine in ('M4', 'M2', 'M1', 'M3'))*x",
		"y ~ cat(machine) + x by cat(machine) - intercept",
		"y ~ x by cat(machine) + cat(machine)",
		"y ~ x + cat(machine) + x by cat(machine)",
		"y ~ num(x*1e6 + 3)*cat(machine)",
		"y ~ num(x*1e-18)*cat(machine)",
		"y ~ coded(x, 10, 30)*cat(machine)",
		"y ~ legendre(x, 1)*cat(machine)",
	} {
		got := fitted(t, mustFit(t, text, table, nil))
		for i := range got {
			if math.Abs(got[i]-base[i]) > 1e-12*spread(p.y) {
				t.Errorf("%s: fitted value %d is %.17g, want %.17g", text, i, got[i], base[i])
				break
			}
		}
	}
}

// TestSeparateLines: y ~ x*cat(m) is the separate straight line of each level.
func TestSeparateLines(t *testing.T) {
	p := plant(60)
	base := fitted(t, mustFit(t, "y ~ x*cat(machine)", p.table(t, nil), nil))
	own := mustFit(t, "y ~ cat(machine) + x by cat(machine) - intercept", p.table(t, nil), nil).Estimates()
	for k := range 4 {
		var rows []int
		for i := range p.y {
			if i%4 == k {
				rows = append(rows, i)
			}
		}
		r := mustFit(t, "y ~ x", p.table(t, rows), nil)
		for q, i := range rows {
			if got := fitted(t, r)[q]; math.Abs(got-base[i]) > 1e-12*spread(p.y) {
				t.Errorf("machine %d, row %d: %.17g apart, %.17g together", k+1, i, got, base[i])
			}
		}
		if e := r.Estimates(); digits.Agree(own[k], e[0]) < 12 || digits.Agree(own[4+k], e[1]) < 12 {
			t.Errorf("machine %d: own line %v %v, separate fit %v", k+1, own[k], own[4+k], e)
		}
	}
}

// same compares everything a summary says of two fits, row counts and notes
// excepted.
func same(t *testing.T, what string, a, b trammel.Result) {
	t.Helper()
	ca, errA := trammel.Coefficients(a, 0.9)
	cb, errB := trammel.Coefficients(b, 0.9)
	ta, errC := trammel.Terms(a)
	tb, errD := trammel.Terms(b)
	for _, err := range []error{errA, errB, errC, errD} {
		if err != nil {
			t.Fatalf("%s: %v", what, err)
		}
	}
	agree := func(name string, x, y float64) {
		if digits.Agree(x, y) < 11.5 {
			t.Errorf("%s: %s is %.17g and %.17g", what, name, x, y)
		}
	}
	for j := range ca {
		agree(ca[j].Name, ca[j].Estimate, cb[j].Estimate)
		agree("std error of "+ca[j].Name, ca[j].StdError, cb[j].StdError)
		agree("low of "+ca[j].Name, ca[j].Low, cb[j].Low)
	}
	for k := range ta {
		agree("F of "+ta[k].Term, ta[k].Stat, tb[k].Stat)
		agree("SS of "+ta[k].Term, ta[k].SS, tb[k].SS)
	}
	ga, gb := a.Goodness(), b.Goodness()
	agree("R²", ga.RSquared, gb.RSquared)
	agree("log-likelihood", ga.LogLikelihood, gb.LogLikelihood)
	agree("BIC", ga.BIC, gb.BIC)
	if a.Freedom() != b.Freedom() {
		t.Errorf("%s: freedom %d and %d", what, a.Freedom(), b.Freedom())
	}
}

// TestRowsAndWeights: row order says nothing; a row counted m is m rows; a row
// of weight 0 is no row.
func TestRowsAndWeights(t *testing.T) {
	p := plant(60)
	const model = "y ~ x*cat(machine) + cat(material)"
	order := rand.New(rand.NewPCG(1, 9)).Perm(60)
	same(t, "reordered rows", mustFit(t, model, p.table(t, nil), nil), mustFit(t, model, p.table(t, order), nil))

	var repeated []int
	for i := range p.y {
		for range int(p.m[i]) {
			repeated = append(repeated, i)
		}
	}
	same(t, "counts", mustFit(t, model+" counted m", p.table(t, nil), nil), mustFit(t, model, p.table(t, repeated), nil))
	same(t, "counts with weights", mustFit(t, model+" counted m weighted w", p.table(t, nil), nil), mustFit(t, model+" weighted w", p.table(t, repeated), nil))

	var kept []int
	for i := range p.y {
		if i%5 == 0 {
			p.w[i] = 0
			p.y[i] = 1e9
		} else {
			kept = append(kept, i)
		}
	}
	r := mustFit(t, model+" weighted w", p.table(t, nil), nil)
	same(t, "weight 0", r, mustFit(t, model+" weighted w", p.table(t, kept), nil))
	if rows := r.Rows(); rows.Given != 60 || rows.Used != 48 || len(rows.Zero) != 12 || rows.Zero[1] != 6 {
		t.Errorf("rows %+v", rows)
	}
	for i := range p.m {
		if p.w[i] == 0 {
			p.m[i] = 0
		}
	}
	same(t, "count 0", mustFit(t, model+" counted m", p.table(t, nil), nil), mustFit(t, model+" counted m", p.table(t, kept), nil))
}
