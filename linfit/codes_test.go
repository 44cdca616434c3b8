package linfit_test

import (
	"context"
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

	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/linfit"
)

var errStop = errors.New("the operator said stop")

// ways are the options that the examples of codes.go name.
var ways = map[string]func(model string, t *design.Table) error{
	"none":        fitWith(linfit.Options{}),
	"Robust HC9":  fitWith(linfit.Options{Robust: "HC9"}),
	"Robust HC0":  fitWith(linfit.Options{Robust: linfit.HC0}),
	"Robust HC3":  fitWith(linfit.Options{Robust: linfit.HC3}),
	"ClusterBy f": fitWith(linfit.Options{ClusterBy: "f"}),
	"frame of one row": func(model string, t *design.Table) error {
		m, err := formula.Parse(model)
		if err != nil {
			return err
		}
		plan, err := design.Compile(m, t, nil)
		if err != nil {
			return err
		}
		one, err := design.NewTable(design.Numbers("x", []float64{1}), design.Numbers("y", []float64{2}))
		if err != nil {
			return err
		}
		frame, err := plan.Frame(one, &design.Options{NoRankCheck: true})
		if err != nil {
			return err
		}
		_, err = linfit.FitFrame(context.Background(), frame, nil)
		return err
	},
	"cancelled": func(model string, t *design.Table) error {
		ctx, cancel := context.WithCancelCause(context.Background())
		cancel(errStop)
		_, err := linfit.Fit(ctx, model, t, nil)
		return err
	},
}

func fitWith(o linfit.Options) func(model string, t *design.Table) error {
	return func(model string, t *design.Table) error {
		_, err := linfit.Fit(context.Background(), model, t, &o)
		return err
	}
}

func csvTable(t testing.TB, text string) *design.Table {
	t.Helper()
	table, err := design.ReadCSV(strings.NewReader(text), nil)
	if err != nil {
		t.Fatal(err)
	}
	return table
}

// TestCodes runs the examples in the doc comments of codes.go: each must bring
// back exactly its code, and each code must have one.
func TestCodes(t *testing.T) {
	file, err := parser.ParseFile(token.NewFileSet(), "codes.go", nil, parser.ParseComments)
	if err != nil {
		t.Fatal(err)
	}
	kebab := regexp.MustCompile(`^[a-z0-9]+(-[a-z0-9]+)*$`)
	example := regexp.MustCompile(`(?m)^\s*csv: (.*)\n\s*model: (.*)\n\s*options: (.*)$`)
	var written []linfit.Code
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
			code := linfit.Code(text)
			written = append(written, code)
			found := example.FindStringSubmatch(v.Doc.Text())
			if found == nil || !kebab.MatchString(text) {
				t.Errorf("%s has no example, or is not in kebab case", code)
				continue
			}
			data, err := strconv.Unquote(`"` + found[1] + `"`)
			if err != nil {
				t.Fatal(err)
			}
			try := ways[found[3]]
			if try == nil {
				t.Fatalf("no such options: %s", found[3])
			}
			err = try(found[2], csvTable(t, data))
			var e *linfit.Error
			if !errors.Is(err, code) || !errors.As(err, &e) || e.Code != code {
				t.Errorf("the example of %s brings %v", code, err)
				continue
			}
			if e.Hint == "" && code != "cancelled" {
				t.Errorf("%s does not say what to write instead", code)
			}
			fmt.Fprintf(&texts, "== %s: %s\n%s\n", found[2], code, err)
		}
	}
	slices.Sort(written)
	if !slices.Equal(written, linfit.Codes()) {
		t.Errorf("Codes() is %v, the file has %v", linfit.Codes(), written)
	}
	compareGolden(t, "testdata/refusals.txt", texts.String())
}

// TestEndedEarly: the cause of a cancelled fit and the error of a progress call
// come through, whatever wraps them.
func TestEndedEarly(t *testing.T) {
	table := csvTable(t, "x,y\n1,2\n2,3\n3,5\n")
	if err := ways["cancelled"]("y ~ x", table); !errors.Is(err, errStop) {
		t.Errorf("the cause is lost in %v", err)
	}
	stages := []string{}
	opts := linfit.Options{Progress: func(p linfit.Progress) error {
		stages = append(stages, p.Stage)
		if p.Stage == "factorised" {
			return errStop
		}
		return nil
	}}
	if err := fitWith(opts)("y ~ x", table); !errors.Is(err, errStop) || !errors.Is(err, linfit.Code("cancelled")) {
		t.Errorf("progress ended the fit with %v", err)
	}
	if !slices.Equal(stages, []string{"prepared", "factorised"}) {
		t.Errorf("the stages are %v", stages)
	}
}

// TestDependentColumns: the refusal is that of package design, with the identity.
func TestDependentColumns(t *testing.T) {
	_, err := linfit.Fit(context.Background(), "y ~ a + b + c", csvTable(t, "a,b,c,y\n1,1,2,1\n2,1,3,4\n3,5,8,2\n4,7,11,2\n5,2,7,8\n"), nil)
	var e *design.Error
	if !errors.As(err, &e) || e.Code != "dependent-columns" || len(e.Identities) != 1 {
		t.Errorf("the refusal is %v", err)
	}
}

// TestSaturated: as many rows as columns fit, without freedom and errors.
func TestSaturated(t *testing.T) {
	r, err := linfit.Fit(context.Background(), "y ~ x", csvTable(t, "x,y\n1,2\n3,5\n"), nil)
	if err != nil {
		t.Fatal(err)
	}
	if b := r.Estimates(); b[0] != 0.5 || b[1] != 1.5 || r.StdErrors() != nil || r.Freedom() != 0 || r.Covariance() != nil {
		t.Errorf("estimates %v, errors %v, freedom %d", b, r.StdErrors(), r.Freedom())
	}
}

// compareGolden compares text with a golden file; TRAMMEL_UPDATE=1 writes the
// file anew.
func compareGolden(t *testing.T, path, got string) {
	t.Helper()
	if os.Getenv("TRAMMEL_UPDATE") != "" {
		if err := os.WriteFile(path, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if got != string(want) {
		t.Errorf("the refusals differ from %s:\n%s", path, got)
	}
}

// TestFarWeights: weights that leave too few rows standing are named as the cause.
func TestFarWeights(t *testing.T) {
	table := csvTable(t, "x,y,w\n1,1,1e-300\n2,2,1e300\n3,3.5,1\n4,4,1\n")
	_, err := linfit.Fit(context.Background(), "y ~ x weighted w", table, nil)
	if !errors.Is(err, linfit.Code("out-of-range")) || !strings.Contains(err.Error(), "weights range from 1e-300 to 1e+300") {
		t.Errorf("got %v", err)
	}
}
