package tape

import (
	"math"
	"math/rand/v2"
	"testing"

	"example.com/trammel/formula"
	"example.com/trammel/internal/expr"
)

func equation(t testing.TB, text string) formula.Expr {
	t.Helper()
	m, err := formula.Parse("response = " + text + " + 0*(a + b + c) fitting a, b, c")
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	return m.Equation.(*formula.Binary).X
}

// machine evaluates a program at one block of rows.
type machine struct {
	p     *Program
	s     *Scratch
	parts [][]float64
}

func newMachine(t testing.TB, text string, columns map[string][]float64) *machine {
	t.Helper()
	p, err := Compile(equation(t, text), []string{"a", "b", "c"})
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	m := &machine{p: p, s: p.NewScratch(true)}
	for _, part := range p.Parts() {
		e, err := expr.Compile(part.Expr)
		if err != nil {
			t.Fatal(err)
		}
		var vars []expr.Var
		for _, name := range e.Names() {
			vars = append(vars, expr.Var{Num: columns[name]})
		}
		v := make([]float64, len(columns["x"]))
		e.Eval(v, nil, vars, len(v))
		m.parts = append(m.parts, v)
	}
	return m
}

func (m *machine) at(theta []float64, n, order int) []float64 {
	params := make([][]float64, 3)
	for q := range params {
		params[q] = make([]float64, n)
		for i := range params[q] {
			params[q][i] = theta[q]
		}
	}
	return m.s.Eval(m.parts, params, n, order)
}

var texts = []string{
	"a + b*x - c/z", "a*b*c", "a/(b + x)", "-a^2*x", "a^x", "x^a", "(a + x)^b", "(a*b)^(c/x)", "a^-2 + b^0.5", "exp(-a*x)*b", "log(a + b*x)", "log10(a*z) + log1p(b) + expm1(c*x)",
	"sqrt(a*x + b)", "abs(a - b*z - 3)", "sin(a*x) + cos(b*z) + tan(c)", "atan(a*x/b)", "tanh(a - b)*erf(c*x)", "min(a*x, b*z + 9) + max(a, b*x - 9, c)",
	"if(x > 1, a*exp(b), c*z)", "(x > 1)*a + (a < b)*c", "coded(a*x, 1, 5)*b", "a*x/(b + x + x^2/c)", "a*(1 - exp(-b*x)) + c", "a*exp(-b*x)*exp(-b*x)", "pi*a^2 + 2*pi*b*c",
	"a/(1 + exp(b - c*x))^(1/2)", "log(x)*a + b",
}

// TestDerivatives compares first derivatives with extrapolated central
// differences of the values, and second ones with those of the first.
func TestDerivatives(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 7))
	const n = 9
	columns := map[string][]float64{"x": make([]float64, n), "z": make([]float64, n)}
	for i := range n {
		columns["x"][i], columns["z"][i] = 0.3+2*rng.Float64(), 0.5+rng.Float64()
	}
	for _, text := range texts {
		m := newMachine(t, text, columns)
		theta := []float64{0.7, 1.3, 0.4}
		m.at(theta, n, 2)
		first, second := make([][]float64, 3), make([][][]float64, 3)
		get := func(v []float64) []float64 {
			out := make([]float64, n)
			copy(out, v)
			return out
		}
		for q := range 3 {
			first[q] = get(m.s.First(q))
			second[q] = make([][]float64, 3)
			for r := range 3 {
				second[q][r] = get(m.s.Second(q, r))
			}
		}
		// Three central differences, extrapolated twice: error of order h^6.
		difference := func(q int, f func() []float64) []float64 {
			step := func(h float64) []float64 {
				up, down := append([]float64(nil), theta...), append([]float64(nil), theta...)
				up[q] += h
				down[q] -= h
				m.at(up, n, 1)
				a := get(f())
				m.at(down, n, 1)
				b := get(f())
				for i := range a {
					a[i] = (a[i] - b[i]) / (2 * h)
				}
				return a
			}
			const h = 1e-2
			d1, d2, d3 := step(h), step(h/2), step(h/4)
			for i := range d1 {
				e1, e2 := d2[i]+(d2[i]-d1[i])/3, d3[i]+(d3[i]-d2[i])/3
				d1[i] = e2 + (e2-e1)/15
			}
			return d1
		}
		value := func() []float64 { return m.s.val[len(m.p.ops)-1][:n] }
		for q := range 3 {
			for i, d := range difference(q, value) {
				if math.Abs(d-first[q][i]) > 3e-9*(1+math.Abs(d)) {
					t.Errorf("%s: derivative %d in row %d is %.12g, differences give %.12g", text, q, i, first[q][i], d)
				}
			}
			for r := range 3 {
				for i, d := range difference(r, func() []float64 { return m.s.First(q) }) {
					if math.Abs(d-second[q][r][i]) > 3e-8*(1+math.Abs(d)) {
						t.Errorf("%s: second derivative %d %d in row %d is %.12g, differences give %.12g", text, q, r, i, second[q][r][i], d)
					}
				}
			}
		}
		// The values themselves, against package expr with the parameters as columns.
		all := map[string][]float64{"x": columns["x"], "z": columns["z"]}
		for q, name := range []string{"a", "b", "c"} {
			all[name] = make([]float64, n)
			for i := range n {
				all[name][i] = theta[q]
			}
		}
		e, err := expr.Compile(equation(t, text))
		if err != nil {
			t.Fatal(err)
		}
		var vars []expr.Var
		for _, name := range e.Names() {
			vars = append(vars, expr.Var{Num: all[name]})
		}
		want := make([]float64, n)
		e.Eval(want, nil, vars, n)
		for i, v := range m.at(theta, n, 0) {
			if math.Abs(v-want[i]) > 1e-14*(1+math.Abs(v)) {
				t.Errorf("%s: row %d is %.17g, want %.17g", text, i, v, want[i])
			}
		}
		if a := testing.AllocsPerRun(10, func() { m.s.Eval(m.parts, [][]float64{all["a"], all["b"], all["c"]}, n, 0) }); a > 1 {
			t.Errorf("%s: %v allocations a block", text, a)
		}
	}
}

// TestAffine: parameters in which equations are jointly affine.
func TestAffine(t *testing.T) {
	for text, want := range map[string][3]bool{
		"a*(1 - exp(-b*x)) + c":    {true, false, true},
		"a*x/(b + x)":              {true, false, false},
		"a*b*x + c":                {true, false, true}, // a, and then not b
		"a + b*x + c*x^2":          {true, true, true},
		"a*exp(-b*x) + c*exp(b*x)": {true, false, true},
		"(a + x)^2":                {false, false, false},
		"if(x > 1, a, b*x)":        {true, true, false},
		"if(c > 1, a, b*x)":        {true, true, false},
		"log(a*x)":                 {false, false, false},
	} {
		p, err := Compile(equation(t, text), []string{"a", "b", "c"})
		if err != nil {
			t.Fatal(err)
		}
		got := p.Affine(nil)
		for q := range want {
			if got[q] != want[q] {
				t.Errorf("%s: affine in %v, want %v", text, got, want)
				break
			}
		}
	}
}

// TestGuarded: parts inside the branches of if need not be defined everywhere.
func TestGuarded(t *testing.T) {
	p, err := Compile(equation(t, "if(x > 0, a*log(x), b) + c*log(z)"), []string{"a", "b", "c"})
	if err != nil {
		t.Fatal(err)
	}
	guarded := map[string]bool{}
	for _, part := range p.Parts() {
		guarded[part.Expr.String()] = part.Guarded
	}
	if !guarded["log(x)"] || guarded["log(z)"] || guarded["x>0"] {
		t.Errorf("guarded parts %v", guarded)
	}
}
