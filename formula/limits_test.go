package formula

import (
	"errors"
	"fmt"
	"math/big"
	"strings"
	"testing"
)

// nested makes texts of a given depth, one for each thing that is counted.
var nested = map[string]func(depth int) string{
	"parentheses of terms": func(d int) string { return "y ~ " + strings.Repeat("(", d) + "x" + strings.Repeat(")", d) },
	"parentheses of arithmetic": func(d int) string {
		return "y = " + strings.Repeat("(", d) + "x*k" + strings.Repeat(")", d) + " fitting k"
	},
	"calls":             func(d int) string { return "y ~ " + strings.Repeat("log(", d) + "x" + strings.Repeat(")", d) },
	"minus signs":       func(d int) string { return "y = k + " + strings.Repeat("-", d) + "x fitting k" },
	"minus signs apart": func(d int) string { return "y = k*" + strings.Repeat("- \n", d) + "x fitting k" },
	"powers":            func(d int) string { return "y = k" + strings.Repeat("^x", d) + " fitting k" },
	"powers and minus signs": func(d int) string {
		return "y = k" + strings.Repeat("^-x", d/2) + strings.Repeat("^x", d%2) + " fitting k"
	},
	"mixed": func(d int) string {
		return "y = k*" + strings.Repeat("-(", d/2) + strings.Repeat("-", d%2) + "x" + strings.Repeat(")", d/2) + " fitting k"
	},
}

func TestNesting(t *testing.T) {
	for name, text := range nested {
		if _, err := Parse(text(maxNesting)); err != nil {
			t.Errorf("%s: depth %d is refused: %v", name, maxNesting, err)
		}
		for _, depth := range []int{maxNesting + 1, 9000} {
			if _, err := Parse(text(depth)); !errors.Is(err, codeTooDeep) {
				t.Errorf("%s: depth %d gives %v", name, depth, err)
			}
		}
	}
	if _, err := ParseCoef(strings.Repeat("k[", maxNesting) + "x" + strings.Repeat("]", maxNesting)); err != nil {
		t.Errorf("brackets: %v", err)
	}
	if _, err := ParseCoef(strings.Repeat("k[", maxNesting+1) + "x" + strings.Repeat("]", maxNesting+1)); !errors.Is(err, codeTooDeep) {
		t.Errorf("brackets: %v", err)
	}
	// Long but flat texts are no nesting.
	for _, text := range []string{
		"y = k" + strings.Repeat(" - x", 10000) + " fitting k", "y ~ x" + strings.Repeat(" + x", 9999), "y = k" + strings.Repeat("*-x", 10000) + " fitting k",
		"y ~ x" + strings.Repeat(" - (x)", 9000), "y = k" + strings.Repeat("*x^2", 10000) + " fitting k",
	} {
		m, err := Parse(text)
		if err != nil {
			t.Errorf("%.30s…: %v", text, err)
		} else if again, err := Parse(m.String()); err != nil || !sameTree(m.Response, again.Response) || m.String() != again.String() {
			t.Errorf("%.30s…: no round trip: %v", text, err)
		}
	}
}

// TestDepthCost counts allocations: ten times the depth may cost little more
// than ten times the work.
func TestDepthCost(t *testing.T) {
	for name, text := range nested {
		cost := func(depth int) float64 {
			s := text(depth)
			return testing.AllocsPerRun(5, func() {
				if _, err := Parse(s); err != nil {
					t.Fatal(err)
				}
			})
		}
		if shallow, deep := cost(20), cost(200); deep > 15*shallow {
			t.Errorf("%s: depth 20 takes %.0f allocations, depth 200 %.0f", name, shallow, deep)
		}
	}
}

func TestTextLimit(t *testing.T) {
	text := "y ~ x" + strings.Repeat(" ", maxText-5)
	if _, err := Parse(text); err != nil {
		t.Errorf("%d bytes are refused: %v", len(text), err)
	}
	if _, err := Parse(text + " "); !errors.Is(err, codeTooLong) {
		t.Errorf("%d bytes: %v", len(text)+1, err)
	}
	if _, err := ParseCoef(strings.Repeat("x", maxText+1)); !errors.Is(err, codeTooLong) {
		t.Errorf("a long name: %v", err)
	}
}

// TestTermCount compares the bound with counts known by combinatorics.
func TestTermCount(t *testing.T) {
	count := func(right string) int {
		t.Helper()
		text := "y ~ " + right
		tokens, err := Parse(text)
		if err != nil {
			if errors.Is(err, codeTooManyTerms) {
				return MaxTerms + 1
			}
			t.Fatal(err)
		}
		return countTerms(tokens.Terms)
	}
	letters := func(n int, join string) string {
		names := make([]string, n)
		for i := range names {
			names[i] = fmt.Sprint("x", i)
		}
		return strings.Join(names, join)
	}
	for n := 1; n <= 13; n++ {
		if got, want := count(letters(n, "*")), 1<<n-1; got != want {
			t.Errorf("%d factors: %d terms, want %d", n, got, want)
		}
	}
	for _, n := range []int{5, 20, 140} {
		for k := 1; k <= 4; k++ {
			want := new(big.Int)
			for j := 1; j <= k; j++ {
				want.Add(want, new(big.Int).Binomial(int64(n), int64(j)))
			}
			if want.Cmp(big.NewInt(MaxTerms)) > 0 {
				want.SetInt64(MaxTerms + 1)
			}
			if got := count(fmt.Sprintf("upto(%d, %s)", k, letters(n, " + "))); int64(got) != want.Int64() {
				t.Errorf("upto(%d) of %d: %d terms, want %s", k, n, got, want)
			}
		}
	}
	for right, want := range map[string]int{
		"powers(x, 7)": 7, "quadratic(x, z, u)": 9, "spline(x, 4)": 1, "(a + b)*(c + d)": 8, "(a + b) by (c + d + e)": 6,
		letters(10000, "+"): 10000, letters(10001, "+"): MaxTerms + 1, "a - b": 2, "intercept": 1,
		letters(30, "*"): MaxTerms + 1, letters(8000, "*"): MaxTerms + 1, "upto(1000, " + letters(5000, " + ") + ")": MaxTerms + 1,
		"cat(a) inside (cat(b) by cat(c))": 1, "quadratic(" + letters(5000, ", ") + ")": MaxTerms + 1,
	} {
		if got := count(right); got != want {
			t.Errorf("%.40s: %d terms, want %d", right, got, want)
		}
	}
}

// TestManyFactorsCostNothing: thirty crossed factors would expand to 2^30
// terms; the refusal comes from counting alone.
func TestManyFactorsCostNothing(t *testing.T) {
	text := "y ~ a" + strings.Repeat("*b", 29)
	n := testing.AllocsPerRun(5, func() {
		if _, err := Parse(text); err == nil {
			t.Fatal("not refused")
		}
	})
	if n > 400 {
		t.Errorf("the refusal takes %.0f allocations", n)
	}
}
