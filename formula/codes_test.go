package formula

import (
	"errors"
	"go/ast"
	"go/parser"
	"go/token"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// goExamples are the examples that no short text can show.
var goExamples = map[string]func() error{
	"201 parentheses": func() error {
		_, err := Parse("y ~ " + strings.Repeat("(", 201) + "x" + strings.Repeat(")", 201))
		return err
	},
	"65537 bytes": func() error {
		_, err := Parse("y ~ x" + strings.Repeat(" ", maxText-4))
		return err
	},
}

// TestCodeExamples runs the examples in the doc comments of codes.go.
func TestCodeExamples(t *testing.T) {
	file, err := parser.ParseFile(token.NewFileSet(), "codes.go", nil, parser.ParseComments)
	if err != nil {
		t.Fatal(err)
	}
	var declared []Code
	for _, decl := range file.Decls {
		gen, ok := decl.(*ast.GenDecl)
		if !ok || gen.Tok != token.CONST {
			continue
		}
		for _, spec := range gen.Specs {
			value := spec.(*ast.ValueSpec)
			text, err := strconv.Unquote(value.Values[0].(*ast.BasicLit).Value)
			if err != nil {
				t.Fatal(err)
			}
			code, name := Code(text), value.Names[0].Name
			declared = append(declared, code)
			doc := value.Doc.Text()
			if !strings.HasPrefix(doc, name+": ") {
				t.Errorf("%s: the comment does not begin with its name", name)
			}
			examples := 0
			for line := range strings.Lines(doc) {
				kind, rest, ok := strings.Cut(strings.TrimSpace(line), ":")
				rest = strings.TrimSpace(rest)
				var got error
				switch {
				case ok && kind == "model":
					_, got = Parse(unescape(t, rest))
				case ok && kind == "coef":
					_, got = ParseCoef(unescape(t, rest))
				case ok && kind == "go":
					got = goExamples[rest]()
				default:
					continue
				}
				examples++
				if !errors.Is(got, code) {
					t.Errorf("%s: %s %q brings back %v", name, kind, rest, got)
				}
			}
			if examples == 0 {
				t.Errorf("%s has no example", name)
			}
		}
	}
	if got := Codes(); !slices.Equal(got, declared) {
		t.Errorf("Codes() = %v\ndeclared  %v", got, declared)
	}
}

func unescape(t *testing.T, s string) string {
	t.Helper()
	text, err := strconv.Unquote(`"` + s + `"`)
	if err != nil {
		t.Fatalf("%s: %v", s, err)
	}
	return text
}
