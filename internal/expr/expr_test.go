package expr

import (
	"math"
	"math/big"
	"testing"

	"example.com/trammel/formula"
)

// value parses an expression as a response and evaluates it over the columns.
func value(t *testing.T, text string, vars map[string]Var, n int) (hi, lo []float64, p *Program) {
	t.Helper()
	m, err := formula.Parse(text + " ~ zzz")
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	p, err = Compile(m.Response.Value)
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	var vs []Var
	for _, name := range p.Names() {
		vs = append(vs, vars[name])
	}
	hi, lo = make([]float64, n), make([]float64, n)
	p.Eval(hi, lo, vs, n)
	return hi, lo, p
}

var columns = map[string]Var{
	"x": {Num: []float64{0.1, 3, -2.5, 1e8}},
	"y": {Num: []float64{7, 0.3, 1.1, -1e-8}},
	"b": {Bits: []bool{true, false, true, true}},
	"s": {Codes: []int32{0, 1, 0, 2}, Dict: []string{"F1", "F2", "O'Neil"}},
}

// TestExact compares sums, products, quotients and powers with exact
// rationals: hi + lo must agree to double-double rounding.
func TestExact(t *testing.T) {
	r := func(f float64) *big.Rat { return new(big.Rat).SetFloat64(f) }
	add := func(a, b *big.Rat) *big.Rat { return new(big.Rat).Add(a, b) }
	mul := func(a, b *big.Rat) *big.Rat { return new(big.Rat).Mul(a, b) }
	quo := func(a, b *big.Rat) *big.Rat { return new(big.Rat).Quo(a, b) }
	for text, want := range map[string]func(x, y *big.Rat) *big.Rat{
		"x + y":          add,
		"x - 2*y":        func(x, y *big.Rat) *big.Rat { return add(x, mul(r(-2), y)) },
		"x*y*x":          func(x, y *big.Rat) *big.Rat { return mul(mul(x, y), x) },
		"x/y":            quo,
		"-x^2":           func(x, y *big.Rat) *big.Rat { return mul(r(-1), mul(x, x)) },
		"(-x)^2":         func(x, y *big.Rat) *big.Rat { return mul(x, x) },
		"x^-2":           func(x, y *big.Rat) *big.Rat { return quo(r(1), mul(x, x)) },
		"2^3^2 + 0*x":    func(x, y *big.Rat) *big.Rat { return r(512) },
		"x - y - x":      func(x, y *big.Rat) *big.Rat { return mul(r(-1), y) },
		"x/y/x":          func(x, y *big.Rat) *big.Rat { return quo(r(1), y) },
		"x^5":            func(x, y *big.Rat) *big.Rat { return mul(mul(mul(x, x), mul(x, x)), x) },
		"coded(x, 2, 7)": func(x, y *big.Rat) *big.Rat { return add(quo(mul(r(2), add(x, r(-2))), r(5)), r(-1)) },
		"min(x, y)":      func(x, y *big.Rat) *big.Rat { return map[bool]*big.Rat{true: x, false: y}[x.Cmp(y) < 0] },
		"max(x, y, 2)": func(x, y *big.Rat) *big.Rat {
			m := map[bool]*big.Rat{true: x, false: y}[x.Cmp(y) > 0]
			return map[bool]*big.Rat{true: m, false: r(2)}[m.Cmp(r(2)) > 0]
		},
		"abs(x - y)": func(x, y *big.Rat) *big.Rat { return new(big.Rat).Abs(add(x, mul(r(-1), y))) },
		"if(x > y, x*x, y)": func(x, y *big.Rat) *big.Rat {
			if x.Cmp(y) > 0 {
				return mul(x, x)
			}
			return y
		},
		"(x < y)*3": func(x, y *big.Rat) *big.Rat {
			if x.Cmp(y) < 0 {
				return r(3)
			}
			return r(0)
		},
	} {
		hi, lo, _ := value(t, text, columns, 4)
		for i := range hi {
			w := want(r(columns["x"].Num[i]), r(columns["y"].Num[i]))
			got := add(r(hi[i]), r(lo[i]))
			d := add(got, mul(r(-1), w))
			// An addition may cancel: the error is relative to the addends, at most 1e17 here.
			scale := new(big.Rat).Abs(w)
			if scale.Cmp(r(1e-9)) < 0 {
				scale = r(1e-9)
			}
			if e, _ := quo(d.Abs(d), scale).Float64(); e > 1e-28 {
				t.Errorf("%s in row %d: %g + %g is off by %g", text, i, hi[i], lo[i], e)
			}
		}
	}
}

// TestFunctions: functions are those of package math, comparisons and
// true/false count 1 and 0, text is compared with a level.
func TestFunctions(t *testing.T) {
	for text, want := range map[string][4]float64{
		"sqrt(4*(x - x) + 2)":  {math.Sqrt2, math.Sqrt2, math.Sqrt2, math.Sqrt2},
		"exp(y)":               {math.Exp(7), math.Exp(0.3), math.Exp(1.1), math.Exp(-1e-8)},
		"log(x)":               {math.Log(0.1), math.Log(3), math.NaN(), math.Log(1e8)},
		"b":                    {1, 0, 1, 1},
		"b + true":             {2, 1, 2, 2},
		"(s='F1')":             {1, 0, 1, 0},
		"(s<>'F1')":            {0, 1, 0, 1},
		"(s='O')":              {0, 0, 0, 0},
		"(x=3)":                {0, 1, 0, 0},
		"(x>=3)":               {0, 1, 0, 1},
		"if(x > 0, log(x), 0)": {math.Log(0.1), math.Log(3), 0, math.Log(1e8)},
		"sin(pi) + 0*x":        {math.Sin(math.Pi), math.Sin(math.Pi), math.Sin(math.Pi), math.Sin(math.Pi)},
	} {
		hi, lo, _ := value(t, text, columns, 4)
		for i, w := range want {
			if got := hi[i] + lo[i]; got != w && !(math.IsNaN(got) && math.IsNaN(w)) && math.Abs(got-w) > 2e-16*math.Abs(w) {
				t.Errorf("%s in row %d: %v, want %v", text, i, got, w)
			}
		}
	}
}

// TestBlocks: rows beyond one block are evaluated like those of the first, and
// nothing is allocated for each.
func TestBlocks(t *testing.T) {
	const n = 3*Block + 7
	x := make([]float64, n)
	for i := range x {
		x[i] = float64(i) / 3
	}
	hi, lo, p := value(t, "x*x + 1/(x + 1)", map[string]Var{"x": {Num: x}}, n)
	for i := range x {
		if got, want := hi[i]+lo[i], x[i]*x[i]+1/(x[i]+1); math.Abs(got-want) > 4e-16*want {
			t.Fatalf("row %d: %v, want %v", i, got, want)
		}
	}
	s := p.NewScratch()
	vs := []Var{{Num: x}}
	if a := testing.AllocsPerRun(10, func() { p.EvalBlock(hi[:Block], lo[:Block], vs, 0, s) }); a != 0 {
		t.Errorf("%v allocations for a block", a)
	}
	if p.HasLow() != true {
		t.Error("a product has no low parts")
	}
	if name, ok := p.Bare(); ok {
		t.Errorf("x*x + … is taken for the bare column %s", name)
	}
}
