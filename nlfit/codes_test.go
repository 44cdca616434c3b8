package nlfit_test

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
	"example.com/trammel/nlfit"
)

var errStop = errors.New("the operator said stop")

// ways are the options that the examples of codes.go name.
var ways = map[string]func(model string, t *design.Table) error{
	"none":            fitWith(nil),
	"negative budget": fitWith(&nlfit.Options{Budget: -1}),
	"budget of two":   fitWith(&nlfit.Options{Budget: 2}),
	"cancelled": func(model string, t *design.Table) error {
		ctx, cancel := context.WithCancelCause(context.Background())
		cancel(errStop)
		_, err := nlfit.Fit(ctx, model, t, nil)
		if !errors.Is(err, errStop) {
			return fmt.Errorf("the cause is lost in %w", err)
		}
		return err
	},
}

func fitWith(o *nlfit.Options) func(string, *design.Table) error {
	return func(model string, t *design.Table) error {
		_, err := nlfit.Fit(context.Background(), model, t, o)
		return err
	}
}

// TestCodes runs the examples in the doc comments of codes.go: each must bring
// back exactly its code; their texts are those of testdata/refusals.txt.
func TestCodes(t *testing.T) {
	file, err := parser.ParseFile(token.NewFileSet(), "codes.go", nil, parser.ParseComments)
	if err != nil {
		t.Fatal(err)
	}
	example := regexp.MustCompile(`(?m)^\s*csv: (.*)\n\s*model: (.*)\n\s*options: (.*)$`)
	var written []nlfit.Code
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
			code := nlfit.Code(text)
			written = append(written, code)
			found := example.FindStringSubmatch(v.Doc.Text())
			if found == nil {
				t.Errorf("%s has no example", code)
				continue
			}
			data, err := strconv.Unquote(`"` + found[1] + `"`)
			if err != nil {
				t.Fatal(err)
			}
			table, err := design.ReadCSV(strings.NewReader(data), nil)
			if err != nil {
				t.Fatal(err)
			}
			err = ways[found[3]](found[2], table)
			var e *nlfit.Error
			if !errors.Is(err, code) || !errors.As(err, &e) || e.Code != code || e.Hint == "" && code != "cancelled" {
				t.Errorf("the example of %s brings %v", code, err)
				continue
			}
			fmt.Fprintf(&texts, "== %s: %s\n%s\n", found[2], code, err)
		}
	}
	listed := nlfit.Codes()
	slices.Sort(listed)
	slices.Sort(written)
	if !slices.Equal(written, listed) {
		t.Errorf("Codes() is %v, the file has %v", listed, written)
	}
	const golden = "testdata/refusals.txt"
	if os.Getenv("TRAMMEL_UPDATE") != "" {
		if err := os.MkdirAll("testdata", 0o755); err != nil {
			t.Fatal(err)
		}
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
}
