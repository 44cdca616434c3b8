package trammel_test

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/internal/digits"
)

// scatter gives n reproducible normal numbers of the given size.
func scatter(n int, size float64) []float64 {
	rng := rand.New(rand.NewPCG(1, 1))
	out := make([]float64, n)
	for i := range out {
		out[i] = size * rng.NormFloat64()
	}
	return out
}

// findingsOf fits and returns what the summary says to look at, by code.
func findingsOf(t *testing.T, model string, columns ...design.Column) (map[string]string, trammel.Result) {
	t.Helper()
	table, err := design.NewTable(columns...)
	if err != nil {
		t.Fatal(err)
	}
	r, err := exactFit(model, table, false)
	if err != nil {
		t.Fatal(err)
	}
	s, err := trammel.Summarize(r, nil)
	if err != nil {
		t.Fatal(err)
	}
	out := map[string]string{}
	for _, n := range s.Findings {
		out[n.Code] += n.Text
	}
	return out, r
}

// line is 22 rows of a straight line with even scatter: nothing to look at.
func line() (x, y []float64) {
	x, y = make([]float64, 22), scatter(22, 0.5)
	for i := range x {
		x[i] = float64(i) + 0.5
		y[i] += 40 - x[i]/4
	}
	return x, y
}

func only(t *testing.T, got map[string]string, want ...string) {
	t.Helper()
	for _, code := range want {
		if got[code] == "" {
			t.Errorf("%s is not found; findings are %q", code, got)
		}
	}
	if len(got) > len(want) {
		t.Errorf("findings %q, want %q only", got, want)
	}
}

func TestFindNothing(t *testing.T) {
	x, y := line()
	got, _ := findingsOf(t, "y ~ x", design.Numbers("x", x), design.Numbers("y", y))
	only(t, got)
}

// TestFindRows plants an outlier in the middle, where it has little leverage,
// and a row far out that pulls the line to itself.
func TestFindRows(t *testing.T) {
	x, y := line()
	y[10] += 4
	got, r := findingsOf(t, "y ~ x", design.Numbers("x", x), design.Numbers("y", y))
	only(t, got, "far-rows")
	d, err := trammel.Diagnose(r)
	if err != nil {
		t.Fatal(err)
	}
	// 22 rows, 2 coefficients; without the row 19 are left, and with one of the 20
	// degrees of freedom gone the closed form does not hold: the bound is read from
	// both neighbours with an even number.
	for i, s := range d.Studentized {
		s = math.Abs(s)
		if named := strings.Contains(got["far-rows"], fmt.Sprintf("row %d (", d.Row[i])); named != (i == 10) {
			t.Errorf("row %d: named %v in %s", d.Row[i], named, got["far-rows"])
		}
		if sure := tTwoSided(s, 18)*22 < 0.05; i == 10 && !sure {
			t.Errorf("row 11 is %v standard deviations off, which is within the bound", s)
		} else if possible := tTwoSided(s, 20)*22 < 0.05; i != 10 && possible {
			t.Errorf("row %d is %v standard deviations off, which is beyond the bound", d.Row[i], s)
		}
	}

	x, y = line()
	x[21], y[21] = 60, 45
	got, r = findingsOf(t, "y ~ x", design.Numbers("x", x), design.Numbers("y", y))
	if d, err = trammel.Diagnose(r); err != nil {
		t.Fatal(err)
	}
	for code, want := range map[string]string{
		"influential-rows": fmt.Sprintf("row 22 (Cook's distance %.2f)", d.Cook[21]),
		"high-leverage":    fmt.Sprintf("row 22 (leverage %.2f), where the mean is 0.091", d.Leverage[21]),
	} {
		if !strings.Contains(got[code], want) {
			t.Errorf("%s: %q does not say %q", code, got[code], want)
		}
	}
	// The median of F with 2 and 20 degrees of freedom is 10(2^(1/10) - 1), from
	// P(F > f) = (1 + f/10)^-10.
	if median := 10 * (math.Pow(2, 0.1) - 1); d.Cook[21] < median {
		t.Errorf("Cook's distance %v is below the median %v", d.Cook[21], median)
	}
}

// TestFindSoleRow has a level with one row, which nothing can contradict.
func TestFindSoleRow(t *testing.T) {
	x, y := line()
	furnace := make([]string, len(x))
	for i := range furnace {
		furnace[i] = "F1"
	}
	furnace[4] = "F2"
	got, _ := findingsOf(t, "y ~ x + cat(furnace)", design.Numbers("x", x), design.Numbers("y", y), design.Texts("furnace", furnace))
	only(t, got, "sole-rows")
	if want := "Row 5 determines a coefficient alone"; !strings.HasPrefix(got["sole-rows"], want) {
		t.Errorf("%q does not begin with %q", got["sole-rows"], want)
	}
}

func TestFindNearDependency(t *testing.T) {
	x, y := line()
	z, v := make([]float64, len(x)), make([]float64, len(x))
	for i, e := range scatter(len(x), 0.3) {
		z[i] = x[i] + e
		v[i] = math.Mod(float64(7*i), 5)
	}
	got, _ := findingsOf(t, "y ~ x + z + v", design.Numbers("x", x), design.Numbers("y", y), design.Numbers("z", z), design.Numbers("v", v))
	only(t, got, "near-dependency")
	if !strings.Contains(got["near-dependency"], ": x and z. ") {
		t.Errorf("%q does not name x and z", got["near-dependency"])
	}
}

// TestFindCurvature plants a bend and compares the p-value in the sentence with
// the F test of the model that has the square, in rationals.
func TestFindCurvature(t *testing.T) {
	x, y := line()
	x, y = x[:21], y[:21] // 18 degrees of freedom are left with the square
	for i := range y {
		y[i] += 0.03 * (x[i] - 11) * (x[i] - 11)
	}
	got, r := findingsOf(t, "y ~ x", design.Numbers("x", x), design.Numbers("y", y))
	only(t, got, "curvature")
	q := &problem{y: rats(y)}
	for i := range x {
		q.x = append(q.x, rats([]float64{1, x[i], x[i] * x[i]}))
		q.w = append(q.w, big.NewRat(1, 1))
	}
	rss := q.solve().rss
	ss := new(big.Rat).Sub(new(big.Rat).SetFloat64(r.Goodness().ResidualSS), rss)
	p := fUpper(float(ss.Quo(ss, new(big.Rat).Quo(rss, big.NewRat(18, 1)))), 1, 18)
	if want := fmt.Sprintf("bend along x (p = %.1e for its square): try powers(x, 2)", p); p > 0.0009 || !strings.Contains(got["curvature"], want) {
		t.Errorf("%q does not say %q", got["curvature"], want)
	}
	// With the square in the model there is no bend, and none is looked for.
	got, _ = findingsOf(t, "y ~ powers(x, 2)", design.Numbers("x", x), design.Numbers("y", y))
	if got["curvature"] != "" {
		t.Error(got["curvature"])
	}
}

// TestFindNonAdditive has effects that multiply.
func TestFindNonAdditive(t *testing.T) {
	var a, b []string
	var y []float64
	e := scatter(48, 0.2)
	for i := range 48 {
		k, l := i%4, i/4%4
		a, b = append(a, fmt.Sprint("F", k)), append(b, fmt.Sprint("S", l))
		y = append(y, 3*math.Pow(1.5, float64(k+l))+e[i])
	}
	got, _ := findingsOf(t, "y ~ cat(a) + cat(b)", design.Texts("a", a), design.Texts("b", b), design.Numbers("y", y))
	if !strings.Contains(got["curvature"], "along the fitted values") {
		t.Errorf("findings %q", got)
	}
	if got, _ = findingsOf(t, "log(y) ~ cat(a) + cat(b)", design.Texts("a", a), design.Texts("b", b), design.Numbers("y", y)); got["curvature"] != "" {
		t.Errorf("on the log scale: %q", got["curvature"])
	}
}

// TestKoenker compares the statistic for unequal spread with N·R² in rationals,
// with weights and with counts.
func TestKoenker(t *testing.T) {
	for _, sc := range scenarios {
		if sc.saturated || sc.exact {
			continue
		}
		t.Run(sc.name, func(t *testing.T) {
			r, err := exactFit(sc.model, tableOf(t, sc.data, true), sc.setAside)
			if err != nil {
				t.Fatal(err)
			}
			o := newOracle(sc)
			q, mean := &problem{}, &problem{}
			for i, d := range o.used {
				fitted := new(big.Rat).Sub(o.y[i], o.s.residual[i])
				q.x = append(q.x, []*big.Rat{big.NewRat(1, 1), fitted})
				mean.x = append(mean.x, []*big.Rat{big.NewRat(1, 1)})
				q.y = append(q.y, mul(o.weight(d), o.s.residual[i], o.s.residual[i]))
				q.w = append(q.w, o.count(d))
			}
			mean.y, mean.w = q.y, q.w
			s := q.solve()
			ratio := new(big.Rat).Quo(s.rss, mean.solve().rss)
			want := float(mul(big.NewRat(int64(o.cases), 1), ratio.Sub(big.NewRat(1, 1), ratio)))
			got, slope := trammel.Koenker(r)
			if digits.Agree(got, want) < 11 || slope > 0 != (s.b[1].Sign() > 0) {
				t.Errorf("got %v and slope %v, want %v and %v", got, slope, want, s.b[1])
			}
		})
	}
}

func TestFindUnequalSpread(t *testing.T) {
	x, y := make([]float64, 80), scatter(80, 1)
	for i := range x {
		x[i] = 1 + float64(i)/4
		y[i] = 10 + x[i] + y[i]*x[i]/10
	}
	got, _ := findingsOf(t, "y ~ x", design.Numbers("x", x), design.Numbers("y", y))
	if !strings.Contains(got["unequal-spread"], "grows with the fitted value") {
		t.Errorf("findings %q", got)
	}
	for i := range y {
		y[i] = 10 - x[i] + (y[i] - 10 - x[i])
	}
	got, _ = findingsOf(t, "y ~ x", design.Numbers("x", x), design.Numbers("y", y))
	if !strings.Contains(got["unequal-spread"], "shrinks with the fitted value") {
		t.Errorf("findings %q", got)
	}
}

// TestFindLackOfFit repeats settings of a law that the model misses.
func TestFindLackOfFit(t *testing.T) {
	var x, y []float64
	for i, e := range scatter(40, 0.1) {
		x = append(x, float64(i%5))
		y = append(y, []float64{1, 2, 1, 2, 1}[i%5]+e)
	}
	got, _ := findingsOf(t, "y ~ x", design.Numbers("x", x), design.Numbers("y", y))
	if !strings.Contains(got["lack-of-fit"], "means of 5 distinct settings") {
		t.Errorf("findings %q", got)
	}
}
