package design

import (
	"errors"
	"go/ast"
	"go/parser"
	"go/token"
	"io"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"
	"testing/iotest"
	"time"

	"example.com/trammel/formula"
)

// runModelExample compiles the model against the table and returns what comes.
func runModelExample(t *testing.T, table *Table, model string) error {
	t.Helper()
	m, err := formula.Parse(model)
	if err != nil {
		t.Errorf("model example %q: %v", model, err)
		return err
	}
	_, err = Compile(m, table, nil)
	return err
}

// goExamples are the examples that no CSV text can show, by the name that a
// "go:" line gives.
var goExamples = map[string]func() error{
	"level never seen": func() error {
		return predict("m,y\nA,1\nB,2\nA,3\n", "y ~ cat(m)", "m\nC\n")
	},
	"text where numbers were": func() error {
		return predict("x,y\n1,1\n2,2\n4,3\n", "y ~ x", "x\nlow\n")
	},
	"known inside a sum": func() error {
		x := &expander{}
		_, err := x.call(&formula.Call{Func: "known", Args: []formula.Expr{&formula.Name{Name: "x"}}})
		return err
	},
	"text cell in a column overridden to numbers": func() error {
		_, err := ReadCSV(strings.NewReader("x\n1\na\n"), &CSVOptions{Types: map[string]Kind{"x": NumberColumn}})
		return err
	},
	"negative MaxBytes": func() error {
		_, err := ReadCSV(strings.NewReader("x\n1\n"), &CSVOptions{MaxBytes: -1})
		return err
	},
	"time field": func() error {
		_, err := FromStructs([]struct{ Day time.Time }{})
		return err
	},
	"number and text in one query column": func() error {
		c := sqlColumn{builder: *newBuilder("x")}
		for _, v := range []any{1.5, "a"} {
			if err := c.add(v); err != nil {
				return err
			}
		}
		return nil
	},
	"nil struct pointer": func() error {
		_, err := FromStructs([]*struct{ X float64 }{nil})
		return err
	},
	"number in place of a slice": func() error {
		_, err := FromStructs(1)
		return err
	},
	"failing reader": func() error {
		_, err := ReadCSV(iotest.ErrReader(io.ErrUnexpectedEOF), nil)
		return err
	},
	"more bytes than MaxBytes": func() error {
		_, err := ReadCSV(strings.NewReader("x\n1\n"), &CSVOptions{MaxBytes: 3})
		return err
	},
	"columns of two lengths": func() error {
		_, err := NewTable(Numbers("x", []float64{1}), Numbers("y", nil))
		return err
	},
	"zero Column": func() error {
		_, err := NewTable(Column{})
		return err
	},
	"slice field": func() error {
		_, err := FromStructs([]struct{ B []byte }{})
		return err
	},
}

// A codeDoc is one constant of codes.go with its doc comment.
type codeDoc struct {
	constant string
	code     Code
	doc      string
}

// codeDocs reads the constants of type Code from codes.go.
func codeDocs(t *testing.T) []codeDoc {
	t.Helper()
	file, err := parser.ParseFile(token.NewFileSet(), "codes.go", nil, parser.ParseComments)
	if err != nil {
		t.Fatal(err)
	}
	var docs []codeDoc
	for _, decl := range file.Decls {
		gen, ok := decl.(*ast.GenDecl)
		if !ok || gen.Tok != token.CONST {
			continue
		}
		for _, spec := range gen.Specs {
			v := spec.(*ast.ValueSpec)
			if typ, ok := v.Type.(*ast.Ident); !ok || typ.Name != "Code" || len(v.Values) != 1 {
				t.Errorf("%s: constants of codes.go are written one by one, as name Code = text", v.Names[0].Name)
				continue
			}
			code, err := strconv.Unquote(v.Values[0].(*ast.BasicLit).Value)
			if err != nil {
				t.Fatal(err)
			}
			docs = append(docs, codeDoc{v.Names[0].Name, Code(code), v.Doc.Text()})
		}
	}
	return docs
}

// TestCodes runs the examples in the doc comments of codes.go: each must bring
// back exactly its code, and each code must have one.
func TestCodes(t *testing.T) {
	kebab := regexp.MustCompile(`^[a-z0-9]+(-[a-z0-9]+)*$`)
	docs := codeDocs(t)
	var written []Code
	used := make(map[string]bool)
	for _, d := range docs {
		written = append(written, d.code)
		t.Run(string(d.code), func(t *testing.T) {
			if !kebab.MatchString(string(d.code)) || d.code.Error() != string(d.code) {
				t.Errorf("code %q is not of small words and hyphens", d.code)
			}
			if !strings.HasPrefix(d.doc, d.constant+": ") {
				t.Errorf("the doc comment does not begin with %q", d.constant+": ")
			}
			results := runExamples(t, d.doc, used)
			if len(results) == 0 {
				t.Error("no example")
			}
			for _, r := range results {
				var e *Error
				if !errors.As(r.err, &e) || e.Code != d.code {
					t.Errorf("%s: got %v", r.example, r.err)
				}
			}
		})
	}
	listed := Codes()
	slices.Sort(written)
	if got := slices.Sorted(slices.Values(listed)); !slices.Equal(got, written) || len(slices.Compact(got)) != len(written) {
		t.Errorf("Codes lists\n%q, but codes.go has\n%q", listed, written)
	}
	for name := range goExamples {
		if !used[name] {
			t.Errorf("no code names the example %q", name)
		}
	}
	Codes()[0] = "changed"
	if Codes()[0] == "changed" {
		t.Error("Codes lends its own slice")
	}
}

type exampleResult struct {
	example string
	err     error
}

// runExamples runs the example lines of a doc comment. A csv line followed by
// a model line is the model's table, else an example of its own.
func runExamples(t *testing.T, doc string, used map[string]bool) []exampleResult {
	t.Helper()
	var results []exampleResult
	lines := strings.Split(doc, "\n")
	for i, line := range lines {
		line = strings.TrimSpace(line)
		if text, ok := exampleLine(line, "csv:"); ok {
			if i+1 < len(lines) && strings.HasPrefix(strings.TrimSpace(lines[i+1]), "model:") {
				continue
			}
			_, err := ReadCSV(strings.NewReader(goText(t, text)), nil)
			results = append(results, exampleResult{line, err})
		}
		if text, ok := exampleLine(line, "model:"); ok {
			above, ok := "", false
			if i > 0 {
				above, ok = exampleLine(strings.TrimSpace(lines[i-1]), "csv:")
			}
			if !ok {
				t.Errorf("%s: no csv line above it", line)
				continue
			}
			table, err := ReadCSV(strings.NewReader(goText(t, above)), nil)
			if err != nil {
				t.Errorf("the table of %s: %v", line, err)
				continue
			}
			results = append(results, exampleResult{line, runModelExample(t, table, goText(t, text))})
		}
		if name, ok := exampleLine(line, "go:"); ok {
			used[name] = true
			run := goExamples[name]
			if run == nil {
				t.Errorf("%s: no such case in goExamples", line)
				continue
			}
			results = append(results, exampleResult{line, run()})
		}
	}
	return results
}

func exampleLine(line, key string) (string, bool) {
	text, ok := strings.CutPrefix(line, key)
	return strings.TrimPrefix(text, " "), ok
}

// goText undoes the escapes of a Go string literal without its quotes; double
// quotes may stand bare or escaped.
func goText(t *testing.T, text string) string {
	t.Helper()
	out, err := strconv.Unquote(`"` + regexp.MustCompile(`(\\.)|"`).ReplaceAllStringFunc(text, func(m string) string {
		if m == `"` {
			return `\"`
		}
		return m
	}) + `"`)
	if err != nil {
		t.Fatalf("example %q: %v", text, err)
	}
	return out
}

// TestErrorThroughLayers matches a refusal after it has been wrapped.
func TestErrorThroughLayers(t *testing.T) {
	cause := errors.New("cause")
	err := errors.Join(errors.New("other"), &Error{Code: codeReadFailed, Message: "m", Err: cause})
	var e *Error
	if !errors.Is(err, codeReadFailed) || errors.Is(err, codeNoRows) || !errors.Is(err, cause) || !errors.As(err, &e) {
		t.Errorf("code, cause or type is lost in %v", err)
	}
}

// predict compiles a model against one CSV text and takes the rows of another.
func predict(fitted, model, rows string) error {
	table, err := ReadCSV(strings.NewReader(fitted), nil)
	if err != nil {
		return err
	}
	m, err := formula.Parse(model)
	if err != nil {
		return err
	}
	p, err := Compile(m, table, nil)
	if err != nil {
		return err
	}
	if table, err = ReadCSV(strings.NewReader(rows), nil); err != nil {
		return err
	}
	_, err = p.Matrix(table)
	return err
}
