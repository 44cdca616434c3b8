package trammel_test

import (
	"errors"
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"os"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/internal/handover"
)

// asks are the questions that the examples of codes.go name.
var asks = map[string]func(r trammel.Result, t *design.Table) error{
	"coefficients at level 95": func(r trammel.Result, _ *design.Table) error {
		_, err := trammel.Coefficients(r, 95)
		return err
	},
	"prediction with weight 0": func(r trammel.Result, t *design.Table) error {
		_, err := trammel.Predict(r, t, &trammel.PredictOptions{Weights: make([]float64, t.Rows())})
		return err
	},
	"prediction on the original scale": func(r trammel.Result, t *design.Table) error {
		_, err := trammel.Predict(r, t, &trammel.PredictOptions{Original: true})
		return err
	},
	"prediction into a short slice": func(r trammel.Result, t *design.Table) error {
		return trammel.PredictTo(make([]float64, 1), r, t)
	},
	"lack of fit": func(r trammel.Result, _ *design.Table) error {
		_, err := trammel.LackOfFit(r)
		return err
	},
	"comparison with itself": func(r trammel.Result, _ *design.Table) error {
		_, err := trammel.Compare(r, r)
		return err
	},
	"correlation": func(r trammel.Result, _ *design.Table) error {
		_, err := trammel.Correlation(r)
		return err
	},
	"diagnostics without data": func(r trammel.Result, _ *design.Table) error {
		_, err := trammel.Diagnose(withoutData(r))
		return err
	},
	"summary of nothing": func(trammel.Result, *design.Table) error {
		_, err := trammel.Summarize(nil, nil)
		return err
	},
}

// withoutData is the result as a saved model would give it: plan and
// coefficients, no rows.
func withoutData(r trammel.Result) trammel.Result {
	return trammel.NewResult(&handover.Fit{Fitter: r.Fitter(), Plan: r.Plan(), Estimates: r.Estimates(), StdErrors: r.StdErrors(),
		Freedom: r.Freedom(), DispersionEstimated: true, Engine: &exactEngine{}})
}

// TestCodes runs the examples in the doc comments of codes.go: each must bring
// back exactly its code, and each code must have one.
func TestCodes(t *testing.T) {
	file, err := parser.ParseFile(token.NewFileSet(), "codes.go", nil, parser.ParseComments)
	if err != nil {
		t.Fatal(err)
	}
	kebab := regexp.MustCompile(`^[a-z0-9]+(-[a-z0-9]+)*$`)
	example := regexp.MustCompile(`(?m)^\s*csv: (.*)\n\s*model: (.*)\n\s*ask: (.*)$`)
	var written []trammel.Code
	used := map[string]bool{}
	var texts strings.Builder
	for _, decl := range file.Decls {
		gen, ok := decl.(*ast.GenDecl)
		if !ok || gen.Tok != token.CONST {
			continue
		}
		for _, spec := range gen.Specs {
			v := spec.(*ast.ValueSpec)
			text, err := strconv.Unquote(v.Values[0].(*ast.BasicLit).Value)
			if err != nil {
				t.Fatal(err)
			}
			code := trammel.Code(text)
			written = append(written, code)
			doc := v.Doc.Text()
			examples := example.FindAllStringSubmatch(doc, -1)
			if !kebab.MatchString(text) || code.Error() != text || !strings.HasPrefix(doc, v.Names[0].Name+": ") || len(examples) == 0 {
				t.Errorf("%s: the code, the beginning of its doc comment, or its examples are not as they should be", code)
			}
			for _, e := range examples {
				used[e[3]] = true
				got := runAsk(t, e[1], e[2], e[3])
				var refusal *trammel.Error
				if !errors.As(got, &refusal) || refusal.Code != code || refusal.Hint == "" {
					t.Errorf("%s: asking for %s brought %v", code, e[3], got)
					continue
				}
				fmt.Fprintf(&texts, "== %s of %s: %s\n%s\n", e[3], e[2], code, refusal)
				if text := refusal.Error(); !strings.HasPrefix(text, "trammel: ") || strings.Contains(text, "\n") {
					t.Errorf("%s: the text is not one line of this package: %s", code, text)
				}
			}
		}
	}
	slices.Sort(written)
	if got := slices.Sorted(slices.Values(trammel.Codes())); !slices.Equal(got, written) {
		t.Errorf("Codes lists\n%q, but codes.go has\n%q", got, written)
	}
	const golden = "testdata/refusals.txt"
	if os.Getenv("TRAMMEL_UPDATE") != "" {
		if err := os.WriteFile(golden, []byte(texts.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	if texts.String() != string(want) {
		t.Errorf("the refusals differ from %s:\n%s", golden, &texts)
	}
	for name := range asks {
		if !used[name] {
			t.Errorf("no code names the example %q", name)
		}
	}
}

func runAsk(t *testing.T, csv, model, ask string) error {
	t.Helper()
	text, err := strconv.Unquote(`"` + csv + `"`)
	if err != nil {
		t.Fatal(err)
	}
	table, err := design.ReadCSV(strings.NewReader(text), nil)
	if err != nil {
		t.Fatal(err)
	}
	r, err := exactFit(model, table, false)
	if err != nil {
		t.Fatal(err)
	}
	f := asks[ask]
	if f == nil {
		t.Fatalf("no such question: %s", ask)
	}
	return f(r, table)
}

// TestErrorThroughLayers matches a refusal after it has been wrapped.
func TestErrorThroughLayers(t *testing.T) {
	cause := errors.New("cause")
	err := errors.Join(errors.New("other"), &trammel.Error{Code: "no-repeats", Message: "m", Err: cause})
	var e *trammel.Error
	if !errors.Is(err, trammel.Code("no-repeats")) || errors.Is(err, trammel.Code("saturated")) || !errors.Is(err, cause) || !errors.As(err, &e) {
		t.Errorf("code, cause or type is lost in %v", err)
	}
}

// TestWithoutData asks a result without rows everything: what needs none is
// answered, the rest is refused.
func TestWithoutData(t *testing.T) {
	table := tableOf(t, plain, true)
	full, err := exactFit("porosity ~ hold", table, false)
	if err != nil {
		t.Fatal(err)
	}
	r := withoutData(full)
	for name, ask := range map[string]func() error{
		"terms":       func() error { _, err := trammel.Terms(r); return err },
		"sequence":    func() error { _, err := trammel.SequentialTerms(r); return err },
		"diagnostics": func() error { _, err := trammel.Diagnose(r); return err },
		"lack of fit": func() error { _, err := trammel.LackOfFit(r); return err },
	} {
		if err := ask(); !errors.Is(err, trammel.Code("no-data")) {
			t.Errorf("%s: %v", name, err)
		}
	}
	want, err := trammel.Coefficients(full, 0)
	if err != nil {
		t.Fatal(err)
	}
	s, err := trammel.Summarize(r, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !slices.Equal(s.Coefficients, want) || s.Terms != nil || s.Findings != nil {
		t.Errorf("summary %+v, want the coefficients %+v alone", s, want)
	}
}
