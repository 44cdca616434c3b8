package formula

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"sync"
	"testing"
)

// value evaluates arithmetic without columns.
func value(t *testing.T, x Expr) float64 {
	t.Helper()
	switch x := x.(type) {
	case *Number:
		return x.Value
	case *Name: // x stands for 1, so that a text has a column in it
		return 1
	case *Unary:
		return -value(t, x.X)
	case *Binary:
		a, b := value(t, x.X), value(t, x.Y)
		switch x.Op {
		case '+':
			return a + b
		case '-':
			return a - b
		case '*':
			return a * b
		case '/':
			return a / b
		case '^':
			return math.Pow(a, b)
		}
	case *Compare:
		a, b := value(t, x.X), value(t, x.Y)
		if map[string]bool{"=": a == b, "<>": a != b, "<": a < b, "<=": a <= b, ">": a > b, ">=": a >= b}[x.Op] {
			return 1
		}
		return 0
	}
	t.Fatalf("%T", x)
	return 0
}

// TestBinding checks precedence and grouping by values worked out by hand from
// the rules of arithmetic, not by trees.
func TestBinding(t *testing.T) {
	for text, want := range map[string]float64{
		"10 - 4 - 3": 3, "100/10/5": 2, "2^3^2": 512, "-2^2": -4, "(-2)^2": 4, "2*-3^2": -18, "2^-1": 0.5, "2^-1^2": 0.5,
		"1 + 2*3": 7, "(1 + 2)*3": 9, "2*3^2": 18, "8/2*4": 16, "8/(2*4)": 1, "7 - (3 - 1)": 5, "--3": 3, "1 - -1": 2, "-2*3": -6,
		"(2 > 1)*5": 5, "(1 + 1 = 2)": 1, "(1 > 2) + 1": 1, "(1 < 2) - (2 <= 2) - (3 <> 3)": 0, "-(2 >= 3)": 0, "1e3/1E+2": 10, "010": 10,
	} {
		m, err := Parse("y = x*(" + text + ") fitting x")
		if err != nil {
			t.Error(err)
			continue
		}
		if got := value(t, m.Equation); got != want {
			t.Errorf("%s is %g, want %g", text, got, want)
		}
		again, err := Parse(m.String())
		if err != nil || value(t, again.Equation) != want {
			t.Errorf("%s printed as %s has another value (%v)", text, m, err)
		}
	}
}

// TestTermsBinding: by binds more tightly than *, inside than by.
func TestTermsBinding(t *testing.T) {
	for text, full := range map[string]string{
		"a + b*c":                   "a + (b*c)",
		"a*b by c":                  "a*(b by c)",
		"x by cat(b) inside cat(a)": "x by (cat(b) inside cat(a))",
		"a by b by c":               "(a by b by c)",
		"-a + b":                    "-(a) + b",
	} {
		m, err := Parse("y ~ " + text)
		if err != nil {
			t.Fatal(err)
		}
		same, err := Parse("y ~ " + full)
		if err != nil {
			t.Fatal(err)
		}
		if !sameTree(m, same) {
			t.Errorf("%s is not %s", text, full)
		}
	}
}

// TestSpans checks that nodes know their places.
func TestSpans(t *testing.T) {
	const text = "log(y) ~ a*cat(m in ('A', 'B'))\n + num(x^2 > 3) as gamma link power(-1) weighted w"
	const comment = " # done\n "
	m, err := Parse(text + comment)
	if err != nil {
		t.Fatal(err)
	}
	at := func(n node) string { return text[n.Span().Start:n.Span().End] }
	cross := m.Terms.Items[0].Term.(*Cross)
	num := m.Terms.Items[1].Term.(*Call)
	compare := num.Args[0].(*Compare)
	for _, c := range []struct{ got, want string }{
		{at(m), text},
		{at(m.Response), "log(y)"},
		{at(m.Terms), "a*cat(m in ('A', 'B'))\n + num(x^2 > 3)"},
		{at(cross), "a*cat(m in ('A', 'B'))"},
		{at(cross.Factors[1]), "cat(m in ('A', 'B'))"},
		{at(cross.Factors[1].(*Category).In[1]), "'B'"},
		{at(num), "num(x^2 > 3)"},
		{text[num.FuncPos.Start:num.FuncPos.End], "num"},
		{at(compare), "x^2 > 3"},
		{text[compare.OpPos.Start:compare.OpPos.End], ">"},
		{at(compare.X), "x^2"},
		{at(m.Errors), "gamma link power(-1)"},
		{at(m.Weighted), "w"},
	} {
		if c.got != c.want {
			t.Errorf("a span holds %q, want %q", c.got, c.want)
		}
	}
	const equation = "y = k*x fitting k by cat(m) in (0,  5 )"
	if m, err = Parse(equation); err != nil {
		t.Fatal(err)
	}
	if p := m.Params[0]; equation[p.Pos.Start:p.Pos.End] != "k by cat(m) in (0,  5 )" {
		t.Errorf("the declaration's span holds %q", equation[p.Pos.Start:p.Pos.End])
	}
}

// TestFunctionNames: every function listed parses, alone as a term and in an
// equation, and nothing else does.
func TestFunctionNames(t *testing.T) {
	want := []string{"abs", "atan", "cos", "erf", "exp", "expm1", "if", "log", "log10", "log1p", "max", "min", "sin", "sqrt", "tan", "tanh"}
	if got := functionNames(); !slices.Equal(got, want) {
		t.Errorf("functionNames() = %v, want %v", got, want)
	}
	args := map[string]string{"if": "x, x, x", "min": "x, z", "max": "x, z"}
	for _, f := range functionNames() {
		a := args[f]
		if a == "" {
			a = "x"
		}
		for _, text := range []string{"y ~ " + f + "(" + a + ")", "y = k*" + f + "(" + a + ") fitting k"} {
			if _, err := Parse(text); err != nil {
				t.Error(err)
			}
		}
	}
}

// TestConcurrentUse: the parsers are shared by all goroutines.
func TestConcurrentUse(t *testing.T) {
	var wait sync.WaitGroup
	for range 4 {
		wait.Go(func() {
			for _, c := range roundTrips {
				if m, err := Parse(c.text); err != nil || m.String() != c.canonical {
					t.Errorf("%s: %v, %v", c.text, m, err)
				}
			}
			for _, text := range refused {
				if _, err := Parse(text); err == nil {
					t.Errorf("%q is not refused", text)
				}
			}
		})
	}
	wait.Wait()
}

// TestErrorIdentity: codes and fields are reachable through wrapping, and
// another code is not mistaken.
func TestErrorIdentity(t *testing.T) {
	_, err := Parse("y = k*x fitting k, k > 0")
	err = fmt.Errorf("line 3: %w", err)
	var e *Error
	if !errors.As(err, &e) || !errors.Is(err, Code("repeated-param")) || errors.Is(err, Code("syntax")) {
		t.Fatalf("%v", err)
	}
	if (e.Span != Span{19, 20}) || (e.Span2 != Span{16, 17}) || !slices.Equal(e.Names, []string{"k"}) || e.Unwrap() != nil {
		t.Errorf("%+v", e)
	}
	if Code("syntax").Error() != "syntax" {
		t.Error("a code's text is not the code")
	}
}
