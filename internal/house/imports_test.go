package house

import (
	"bytes"
	"os/exec"
	"slices"
	"strings"
	"testing"
)

const module = "example.com/trammel"

// arrows is the picture of the house: what each package of the module may
// import from the module. An arrow changes only together with DEVELOPERS.md.
var arrows = map[string][]string{
	"formula":           {"internal/errtext"},
	"design":            {"formula", "internal/dd", "internal/errtext", "internal/expr", "internal/factored", "internal/lsq", "internal/tape"},
	"":                  {"design", "formula", "internal/dd", "internal/dist", "internal/errtext", "internal/factored", "internal/handover", "internal/lsq"},
	"linfit":            {"", "design", "formula", "internal/dd", "internal/errtext", "internal/factored", "internal/handover", "internal/lsq"},
	"nlfit":             {"", "design", "formula", "internal/dd", "internal/errtext", "internal/factored", "internal/handover", "internal/lsq", "internal/search", "internal/tape"},
	"examples/fitfile":  {"", "design", "formula", "linfit", "nlfit"},
	"examples/furnaces": {"", "design", "linfit", "nlfit"},
	"internal/dd":       {},
	"internal/digits":   {},
	"internal/dist":     {"internal/dd"},
	"internal/errtext":  {},
	"internal/expr":     {"formula", "internal/dd"},
	"internal/factored": {"internal/dd", "internal/lsq"},
	"internal/handover": {"design"},
	"internal/house":    {},
	"internal/lsq":      {"internal/dd"},
	"internal/scenario": {},
	"internal/search":   {"internal/dd"},
	"internal/tape":     {"formula"},
}

// outside is what the module may import from elsewhere beside the standard
// library, and where.
var outside = map[string][]string{
	"gonum.org/v1/gonum":                  {"", "design", "linfit", "nlfit", "internal/lsq", "internal/factored"},
	"github.com/alecthomas/participle/v2": {"formula"},
	"golang.org/x/text":                   {"internal/errtext"},
}

func goTool(t *testing.T, args ...string) string {
	t.Helper()
	var stderr bytes.Buffer
	cmd := exec.Command("go", args...)
	cmd.Dir = "../.."
	cmd.Stderr = &stderr
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("go %s: %v\n%s", strings.Join(args, " "), err, &stderr)
	}
	return string(out)
}

// TestImportArrows holds that packages import only what stands below them.
func TestImportArrows(t *testing.T) {
	for line := range strings.Lines(goTool(t, "list", "-f", "{{.ImportPath}} {{join .Imports \" \"}}", "./...")) {
		words := strings.Fields(line)
		name := strings.TrimPrefix(strings.TrimPrefix(words[0], module), "/")
		allowed, known := arrows[name]
		if !known {
			t.Errorf("package %q is not in the picture", name)
			continue
		}
		for _, imp := range words[1:] {
			if inner, ok := strings.CutPrefix(imp, module); ok {
				if inner = strings.TrimPrefix(inner, "/"); !slices.Contains(allowed, inner) {
					t.Errorf("%q imports %q, which is no arrow of the picture", name, inner)
				}
				continue
			}
			if first, _, _ := strings.Cut(imp, "/"); !strings.Contains(first, ".") {
				if imp == "testing" {
					t.Errorf("%q imports testing outside its tests", name)
				}
				continue
			}
			found := false
			for prefix, where := range outside {
				if imp == prefix || strings.HasPrefix(imp, prefix+"/") {
					found = slices.Contains(where, name)
				}
			}
			if !found {
				t.Errorf("%q imports %s", name, imp)
			}
		}
	}
}
