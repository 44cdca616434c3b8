package house

import (
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// public are the packages users import.
var public = []string{"", "design", "formula", "linfit", "nlfit"}

// maxNames is how many package-level identifiers a package may export.
const maxNames = 40

// TestSurface compares the exported package-level names with api.txt;
// TRAMMEL_UPDATE=1 writes that file anew, and a reviewer reads the difference.
func TestSurface(t *testing.T) {
	var b strings.Builder
	for _, dir := range public {
		names := exported(t, dir)
		if len(names) > maxNames {
			t.Errorf("package %q exports %d names, more than %d", dir, len(names), maxNames)
		}
		for _, n := range names {
			fmt.Fprintf(&b, "%s %s\n", filepath.Base(filepath.Join("trammel", dir)), n)
		}
	}
	const path = "api.txt"
	if os.Getenv("TRAMMEL_UPDATE") != "" {
		if err := os.WriteFile(path, []byte(b.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	got, was := strings.Split(b.String(), "\n"), strings.Split(string(want), "\n")
	for _, n := range got {
		if !slices.Contains(was, n) {
			t.Errorf("new in the public surface: %s", n)
		}
	}
	for _, n := range was {
		if !slices.Contains(got, n) {
			t.Errorf("gone from the public surface: %s", n)
		}
	}
}

// exported lists a package's exported package-level identifiers as "kind Name",
// and checks that each has a doc comment.
func exported(t *testing.T, dir string) []string {
	t.Helper()
	files, err := filepath.Glob(filepath.Join("../..", dir, "*.go"))
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	documented := false
	fset := token.NewFileSet()
	for _, path := range files {
		if strings.HasSuffix(path, "_test.go") {
			continue
		}
		file, err := parser.ParseFile(fset, path, nil, parser.ParseComments)
		if err != nil {
			t.Fatal(err)
		}
		documented = documented || file.Doc != nil
		add := func(kind, name string, docs ...*ast.CommentGroup) {
			if !ast.IsExported(name) {
				return
			}
			names = append(names, kind+" "+name)
			for _, d := range docs {
				if d.Text() != "" {
					return
				}
			}
			t.Errorf("%s: %s %s has no doc comment", path, kind, name)
		}
		for _, decl := range file.Decls {
			switch d := decl.(type) {
			case *ast.FuncDecl:
				if d.Recv == nil {
					add("func", d.Name.Name, d.Doc)
				} else if ast.IsExported(d.Name.Name) && d.Doc.Text() == "" {
					if r, ok := receiver(d); ok && ast.IsExported(r) && !quiet[d.Name.Name] {
						t.Errorf("%s: method %s.%s has no doc comment", path, r, d.Name.Name)
					}
				}
			case *ast.GenDecl:
				for _, spec := range d.Specs {
					switch s := spec.(type) {
					case *ast.TypeSpec:
						add("type", s.Name.Name, s.Doc, d.Doc)
					case *ast.ValueSpec:
						for _, n := range s.Names {
							add(d.Tok.String(), n.Name, s.Doc, s.Comment, d.Doc)
						}
					}
				}
			}
		}
	}
	if !documented {
		t.Errorf("package %q has no package comment", dir)
	}
	slices.Sort(names)
	return names
}

// quiet are methods whose meaning their interface documents.
var quiet = map[string]bool{"Span": true, "String": true, "Error": true, "Unwrap": true, "Is": true}

func receiver(d *ast.FuncDecl) (string, bool) {
	e := d.Recv.List[0].Type
	if s, ok := e.(*ast.StarExpr); ok {
		e = s.X
	}
	id, ok := e.(*ast.Ident)
	if !ok {
		return "", false
	}
	return id.Name, true
}
