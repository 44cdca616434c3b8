package formula

import (
	"errors"
	"fmt"
	"os"
	"strings"
	"testing"
	"unicode/utf8"
)

// refused are texts that break a rule each; the ones under coefs are names of
// coefficients.
var refused = []string{
	// characters and quotes
	"", "   # only a comment", "y ~ x\u200b", "y ~ a\u00a0+ b", "\ufeffy ~ x", "y ~ x # \u202e hidden", "y ~ x\x00", "y ~ x\xff", "y ~ 'a\xff'",
	"y ~ €", "y ~ \"Hold time", "y ~ cat(m in ('A, 'B'))", "y ~ \"\"",
	"y ~ x +\n  größe + 温度 + € + z",
	// numbers
	"y ~ num(2x)", "y ~ num(x + .5)", "y ~ num(x*1.)", "y ~ num(1.2.3*x)", "y ~ num(0x10*x)", "y ~ num(1e*x)", "y ~ num(1e999*x)",
	"y ~ num(1_000*x)", "y ~ num(" + strings.Repeat("9", 401) + "*x)",
	// signs of other notations
	"y ~ a:b", "y ~ num(a == b)", "y ~ num(a != b)", "y ~ num(a && b)", "y ~ num(a || b)", "y ~ a | b", "y ~ a & b", "y ~ {a}", "y ~ a[1]",
	"y -> x", "y := x", "y ~ x ** 2", "y ~ a % b", "y ~ a; b", "y ~ $a", "y ~ `a`", "y ~ oven.1", "y ~ !a", "y ~ a // b", "y ~ num(a => b)", "y @ x", "y ~ x?",
	// words
	"y ~ x AS binomial", "y ~ cat(m) BY x", "y ~ cat(m IN ('A'))", "y ~ cat(m AGAINST 'A')", "y ~ x as Poisson", "y ~ x Weighted w",
	"y ~ start", "y ~ x + of", "of ~ x", "y ~ num(in + 2)", "y ~ cat(per)", "y ~ x random m", "y ~ random(m)", "y ~ x by random",
	"y ~ x wieghted w", "y = k*x fiting k", "y ~ x bye z", "y ~ cat(m agianst 'A')", "y ~ cat(m) insde cat(n)",
	// structure
	"y", "y ~", "~ x", "y x", "y + ~ x", "y ~ x +", "y ~ + x", "y ~ x + + z", "y ~ a b", "y ~ Hold time", "y ~ a \"b\"", "y ~ a 2", "y ~ (a + b", "y ~ a + b)", "y ~ ()",
	"y ~ a, b", "y ~ a ~ b", "y = k*x = z fitting k", "y ~ a by", "y ~ a * -b", "y ~ a inside", "k out n ~ x as binomial", "k out of ~ x as binomial",
	"k per ~ x as poisson", "y ~ x as", "y ~ x as gamma link", "y ~ x weighted", "y = fitting k", "y = k*x fitting", "y = k*x fitting k,", "y = k*x fitting k >",
	"y = k*x fitting k start", "y = k*x fitting k in 0, 5", "y = k*x fitting k in (0)", "y = k*x fitting k in (0, 5", "y = k*x fitting k =", "y = k*x fitting k ~", "y = k*x fitting 2", "y = k*x fitting k by furnace",
	"y = k*x fitting k by", "y ~ x as gamma as poisson", "y ~ x weighted w weighted w", "y = k(x) fitting k", "y = k*x fitting k + 1", "y = k*x fitting k >= 0", "y = k*x fitting k > 0 < 5", "y = k*x fitting k start 1 > 0", "y = k*m*x fitting k m",
	"y = k*x fitting k strat 2", "y ~ x link log", "y ~ x start 3", "y ~ x in (1, 2)", "y ~ x against 'A'", "y ~ x per z", "k out of n per m ~ x", "y ~ intercept(x)", "fitting k",
	// terms
	"y ~ 1", "y ~ x - 1", "y ~ 0 + x", "y ~ 7", "y ~ 2*x", "y ~ -2*x", "y ~ pi*x", "y ~ true", "y ~ x^2", "y ~ a/b", "y ~ 1/(temp + 273.15)", "y ~ (a + b)^2", "y ~ a*b/c", "y ~ cat(m)^2", "y ~ x > 2", "y ~ a = 'F2'",
	"y ~ (x > 2)", "y ~ 'F2'", "y ~ log(powers(x, 2))", "y ~ powers(num(x), 2)", "y = k*cat(m) fitting k", "y ~ ln(x)", "y ~ lgo(x)", "y ~ catt(m)", "y ~ furnace(2)", "y ~ num(3)", "y ~ 3 + x",
	"y ~ x by x", "y ~ x*num(x)", "y ~ log(x)*log(x)", "y ~ x by known(z)", "y ~ x - known(z)", "y ~ x + (known(z) + x)", "y ~ upto(2, known(z) + x)",
	"y ~ x + y", "log(y) ~ y", "y ~ cat(y)", "y = k*y fitting k", "y = k*x fitting k ~ y", "2 ~ x", "y ~ a*b*c*d*e*f*g*h*i*j*k*l*m*n", "y ~ upto(9, a+b+c+d+e+f+g+h+i+j+k+l+m+n+o+p+q)",
	// arithmetic
	"y ~ num(1 < x < 2)", "y ~ num(a = b = c)", "y ~ x weighted z > 2", "y < 2 ~ x", "y ~ num(m < 'F2')", "y ~ num('F2' = m)", "y ~ num(log(m) = 'F2')", "y ~ num('F2')", "y ~ num(x + 'F2')",
	"y ~ num(x +)", "y ~ num(x * / 2)", "y ~ num((x)", "y ~ num(x x)", "y ~ num(2(x))", "y ~ num()", "y ~ log(x, 2)", "y ~ max(x)", "y ~ if(x > 2, x)",
	// arguments
	"y ~ powers(x)", "y ~ powers(x, 0)", "y ~ powers(x, 1.5)", "y ~ powers(x, k)", "y ~ powers(x, 65)", "y ~ legendre(x, -1)", "y ~ spline(x, 1)", "y ~ spline(x, 1001)", "y ~ harmonics(t, 0, 2)", "y ~ harmonics(t, p, 2)", "y ~ harmonics(t, 24, 0)",
	"y ~ hinge(x)", "y ~ hinge(x, c)", "y ~ hinge(x, 5, 5)", "y ~ coded(x, 10, 10)", "y ~ coded(x, low, 30)", "y ~ coded(x)", "y ~ upto(a, b)", "y ~ upto(0, a + b)", "y ~ upto(1.5, a + b)", "y ~ upto(2)", "y ~ quadratic()",
	"y ~ cat()", "y ~ cat(2)", "y ~ cat(log(x))", "y ~ cat(m = 'A')", "y ~ cat(m in ())", "y ~ cat(m in (others))", "y ~ cat(m in ('A', others, 'B'))", "y ~ cat(m in (A, B))", "y ~ cat(m against F2)", "y ~ cat(m against)", "y ~ cat(m 'A')",
	// clauses
	"y ~ x fitting k", "y = k*x", "y = k*x as poisson fitting k", "k out of n = a*x fitting a", "k per e = a*x fitting a", "k out of n ~ x", "k out of n ~ x as poisson", "k per e ~ x", "k per e ~ x as gamma", "y ~ x as overdispersed gamma", "y ~ x as overdispersed binomial",
	"y ~ x as poisson weighted w", "y ~ x as poison", "y ~ x as weibull", "y ~ x as gamma link lgo", "y ~ x as gamma link cube", "y ~ x as gamma link power", "y ~ x as gamma link power(0)", "y ~ x as gamma link log(2)", "y ~ x as gamma link power(a)", "y ~ x as 'gamma'",
	// parameters
	"y = k*x fitting k, k > 0", "y = k*x fitting k, m", "y = k*x fitting k in (5, 0)", "y = k*x fitting k in (5, 5)", "y = k*x fitting k > 0 start -1", "y = k*x fitting k < 2 start 3", "y = k*x fitting k = 3 start 2", "y = k*x fitting log(k) > 0", "y = k*x fitting lgo(k) ~ x", "y = k*x fitting sqrt(k) ~ x",
	"y = k*x fitting k ~ x > 0", "y = k*x fitting k ~ x in (0, 1)", "y = k*x fitting log(k) ~ x start 0", "y = k*x fitting logit(k) ~ x start 1", "y = k*x fitting reciprocal(k) ~ x start 0", "y = k*m*x fitting k ~ m, m", "y = k*x fitting k by cat(k)", "k = k*x fitting k", "y = k*x weighted k fitting k", "y = k*x fitting k ~ known(x)",
}

var refusedCoefs = []string{
	"", "hold by", "a:b", "hold furnace", "furnace=", "furnace=F2", "furnace='F2' against", "legendre(hold, 3)", "legendre(hold, 3)[4]", "spline(hold, 3)[0.5]", "k[", "k[hold", "(a", "log(k)[", "sqrt(k)[x]", "reciprocal(k)",
	"head=2 inside machine", "(site='A', machine)", "hold ~ x", "1 < x < 2", "x > 2", "hold]",
}

// TestRefusals compares the whole texts of refusals with testdata/refusals.txt
// (TRAMMEL_UPDATE=1 writes it anew) and puts every mend in place.
func TestRefusals(t *testing.T) {
	var got strings.Builder
	seen := make(map[Code]bool)
	pasted := 0
	show := func(kind, text string, parse func(string) (fmt.Stringer, error)) {
		_, err := parse(text)
		var e *Error
		if !errors.As(err, &e) {
			t.Errorf("%s %q is not refused", kind, text)
			return
		}
		seen[e.Code] = true
		if first, _, _ := strings.Cut(err.Error(), "\n"); strings.Contains(first, "(expected") || strings.Contains(first, "unexpected token") {
			t.Errorf("%q: words of the parser's library reach the user: %s", text, first)
		}
		if e.Text != text || e.Span.Start < 0 || e.Span.End < e.Span.Start || e.Span.End > len(text) {
			t.Errorf("%q: the span is %v of %q", text, e.Span, e.Text)
		}
		if len(text) < 200 && utf8.ValidString(text) {
			fmt.Fprintf(&got, "== %s %q: %s\n%s\n", kind, text, e.Code, e)
		}
		if e.paste == "" {
			return
		}
		pasted++
		// A text may be at fault twice: every refusal on the way must bring
		// its mend.
		mended := text
		for range 3 {
			mended = mended[:e.Span.Start] + e.paste + mended[e.Span.End:]
			if _, err = parse(mended); err == nil {
				return
			}
			if !errors.As(err, &e) || e.paste == "" {
				break
			}
		}
		t.Errorf("%q mended to %q is refused: %v", text, mended, err)
	}
	for _, text := range refused {
		show("model", text, func(s string) (fmt.Stringer, error) { return Parse(s) })
	}
	for _, text := range refusedCoefs {
		show("coef", text, func(s string) (fmt.Stringer, error) { return ParseCoef(s) })
	}
	for _, code := range Codes() {
		if !seen[code] && code != codeTooDeep && code != codeTooLong {
			t.Errorf("no refusal shows the code %s", code)
		}
	}
	t.Logf("%d mends put in place", pasted)

	const golden = "testdata/refusals.txt"
	if os.Getenv("TRAMMEL_UPDATE") != "" {
		if err := os.WriteFile(golden, []byte(got.String()), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	compareLines(t, golden, got.String(), string(want))
}

func compareLines(t *testing.T, file, got, want string) {
	t.Helper()
	g, w := strings.Split(got, "\n"), strings.Split(want, "\n")
	for i := range max(len(g), len(w)) {
		a, b := "(end)", "(end)"
		if i < len(g) {
			a = g[i]
		}
		if i < len(w) {
			b = w[i]
		}
		if a != b {
			t.Fatalf("%s, line %d:\n got %s\nwant %s", file, i+1, a, b)
		}
	}
}
