package nlfit_test

import (
	"math"
	"path/filepath"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/internal/digits"
	"example.com/trammel/internal/dist"
)

// profileOf is an independent computation of profile intervals for y = b1·g(b2, x):
// b1 is eliminated in closed form, and the profile of either parameter is solved by
// plain bisection, the inner minimum by golden sections. Nothing is shared with the
// package but the data.
type profileOf struct {
	x, y []float64
	g    func(b2, x float64) float64
}

func (p *profileOf) best(b2 float64) (b1, rss float64) {
	var gg, gy float64
	for i, x := range p.x {
		g := p.g(b2, x)
		gg += g * g
		gy += g * p.y[i]
	}
	b1 = gy / gg
	return b1, p.rss(b1, b2)
}

func (p *profileOf) rss(b1, b2 float64) float64 {
	s := 0.0
	for i, x := range p.x {
		d := p.y[i] - b1*p.g(b2, x)
		s += d * d
	}
	return s
}

// inner is the least sum of squares over b2 for a given b1, near from.
func (p *profileOf) inner(b1, lo, hi float64) float64 {
	r := (math.Sqrt(5) - 1) / 2
	a, b := lo, hi
	for range 200 {
		c, d := b-r*(b-a), a+r*(b-a)
		if p.rss(b1, c) < p.rss(b1, d) {
			b = d
		} else {
			a = c
		}
	}
	return p.rss(b1, (a+b)/2)
}

func crossing(f func(v float64) float64, inside, outside float64) float64 {
	for range 200 {
		mid := (inside + outside) / 2
		if f(mid) < 0 {
			inside = mid
		} else {
			outside = mid
		}
	}
	return (inside + outside) / 2
}

// TestProfile: profile intervals to 6 digits of the independent computation.
func TestProfile(t *testing.T) {
	for _, c := range []struct {
		name, model string
		g           func(b, x float64) float64
	}{
		{"BoxBOD", "y = b1*(1 - exp(-b2*x)) fitting b1, b2", func(b, x float64) float64 { return 1 - math.Exp(-b*x) }},
		{"Misra1a", "y = b1*(1 - exp(-b2*x)) fitting b1, b2", func(b, x float64) float64 { return 1 - math.Exp(-b*x) }},
		{"DanWood", "y = b1*x^b2 fitting b1, b2", func(b, x float64) float64 { return math.Pow(x, b) }},
	} {
		table := readTable(t, filepath.Join("../testdata/strd/nonlinear", c.name+".csv"))
		r := mustFit(t, c.model, table)
		got, err := trammel.ProfileIntervals(r, 0.9)
		if err != nil {
			t.Fatal(err)
		}
		cx, _ := table.Column("x")
		cy, _ := table.Column("y")
		p := &profileOf{cx.Floats(), cy.Floats(), c.g}
		b := r.Estimates()
		_, base := p.best(b[1])
		q := dist.TUpperQuantile(0.05, float64(len(p.x)-2))
		rise := q * q * base / float64(len(p.x)-2)
		second := func(v float64) float64 { _, s := p.best(v); return s - base - rise }
		first := func(v float64) float64 { return p.inner(v, b[1]/4, b[1]*4) - base - rise }
		want := []trammel.Interval{
			{Low: crossing(first, b[0], b[0]*0.2), High: crossing(first, b[0], b[0]*3)},
			{Low: crossing(second, b[1], b[1]*0.05), High: crossing(second, b[1], b[1]*8)},
		}
		for j := range want {
			if digits.Agree(got[j].Low, want[j].Low) < 6 || digits.Agree(got[j].High, want[j].High) < 6 {
				t.Errorf("%s: b%d has %v, want %v", c.name, j+1, got[j], want[j])
			}
		}
	}
}

// TestProfileEnds: bounds stop a profile, and data that set no limit give an
// infinite end.
func TestProfileEnds(t *testing.T) {
	table, err := design.ReadCSV(strings.NewReader("x,y\n1,9.5\n2,10.2\n3,9.8\n4,10.4\n5,9.9\n6,10.1\n"), nil)
	if err != nil {
		t.Fatal(err)
	}
	// The approach is over before the first row: a fast rate has no upper limit.
	r := mustFit(t, "y = a*(1 - exp(-k*x)) fitting a, k > 0", table)
	got, err := trammel.ProfileIntervals(r, 0.95)
	if err != nil {
		t.Fatal(err)
	}
	if !math.IsInf(got[1].High, 1) || !(got[1].Low > 1) {
		t.Errorf("k: %v", got[1])
	}
	r = mustFit(t, "y = a*(1 - exp(-k*x)) fitting a, k in (1, 30)", table)
	if got, err = trammel.ProfileIntervals(r, 0.95); err != nil {
		t.Fatal(err)
	}
	if got[1].High != 30 {
		t.Errorf("k within bounds: %v", got[1])
	}
	// A linear equation's profile is the interval from standard errors.
	r = mustFit(t, "y = a + b*x fitting a, b", table)
	if got, err = trammel.ProfileIntervals(r, 0.95); err != nil {
		t.Fatal(err)
	}
	list, err := trammel.Coefficients(r, 0.95)
	if err != nil {
		t.Fatal(err)
	}
	for j, c := range list {
		if digits.Agree(got[j].Low, c.Low) < 8 || digits.Agree(got[j].High, c.High) < 8 {
			t.Errorf("%s: profile %v, interval %g to %g", c.Name, got[j], c.Low, c.High)
		}
	}
}

// TestCurvature: for one parameter the measures are |η”| in and beside the
// tangent over |η'|², times the standard radius; intrinsic curvature is the same
// for every way of writing the parameters; a linear equation has none.
func TestCurvature(t *testing.T) {
	table := readTable(t, "../testdata/strd/nonlinear/Misra1a.csv")
	r := mustFit(t, "y = 239*(1 - exp(-b*x)) fitting b", table)
	c, err := trammel.CurvatureOf(r)
	if err != nil {
		t.Fatal(err)
	}
	col, _ := table.Column("x")
	b := r.Estimates()[0]
	var d1, d2, d12 float64
	for _, x := range col.Floats() {
		u, v := 239*x*math.Exp(-b*x), -239*x*x*math.Exp(-b*x)
		d1 += u * u
		d2 += v * v
		d12 += u * v
	}
	s := r.Goodness().ResidualSD
	in := math.Abs(d12) / math.Sqrt(d1) / d1 * s
	beside := math.Sqrt(d2-d12*d12/d1) / d1 * s
	if digits.Agree(c.ParameterEffects, in) < 9 || digits.Agree(c.Intrinsic, beside) < 9 {
		t.Errorf("got %+v, want %g and %g", c, in, beside)
	}

	ways := []string{
		"y = a*(1 - exp(-b*x)) fitting a, b",
		"y = a*(1 - exp(-b*x)) fitting log(a) ~ intercept, log(b) ~ intercept",
		"y = a*(1 - exp(-x/tau)) fitting a, tau > 0",
	}
	var first *trammel.Curvature
	for _, text := range ways {
		c, err := trammel.CurvatureOf(mustFit(t, text, table))
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = c
		}
		if digits.Agree(c.Intrinsic, first.Intrinsic) < 6 {
			t.Errorf("%s: intrinsic curvature %g, want %g", text, c.Intrinsic, first.Intrinsic)
		}
	}
	if c, err = trammel.CurvatureOf(mustFit(t, "y = a + b*x fitting a, b", table)); err != nil || c.Intrinsic != 0 || c.ParameterEffects != 0 {
		t.Errorf("a straight line has %+v, %v", c, err)
	}
}
