package house

import (
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

func read(t *testing.T, path string) string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("../..", path))
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// TestTestdataReadme holds that every file of testdata is named with its
// source.
func TestTestdataReadme(t *testing.T) {
	readme := read(t, "testdata/README.md")
	err := filepath.WalkDir("../../testdata", func(path string, d os.DirEntry, err error) error {
		if err != nil || d.IsDir() || d.Name() == "README.md" {
			return err
		}
		rel, err := filepath.Rel("../../testdata", path)
		if err != nil {
			return err
		}
		rel = filepath.ToSlash(rel)
		folder, _, nested := strings.Cut(rel, "/")
		if !strings.Contains(readme, "`"+rel+"`") && !(nested && strings.Contains(readme, "`"+folder+"/`")) {
			t.Errorf("testdata/README.md does not say where %s comes from", rel)
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
}

// TestCoverage holds that testdata/README.md names an outside check for every
// JSON key of a summary and every function of the root package, and that the
// tests it names exist.
func TestCoverage(t *testing.T) {
	readme := read(t, "testdata/README.md")
	rows := regexp.MustCompile("(?m)^\\| `([^`]+)` \\| (.+) \\| `(Test\\w+)`").FindAllStringSubmatch(readme, -1)
	covered := make(map[string]bool)
	tests := allTests(t)
	for _, r := range rows {
		covered[r[1]] = true
		if !tests[r[3]] {
			t.Errorf("the check %s of %s does not exist", r[3], r[1])
		}
		if strings.TrimSpace(r[2]) == "" {
			t.Errorf("%s names no outside source", r[1])
		}
	}
	for _, key := range summaryKeys(t) {
		if !covered[key] {
			t.Errorf("no outside check is named for the JSON key %s", key)
		}
	}
	for _, name := range exported(t, "") {
		if f, ok := strings.CutPrefix(name, "func "); ok && !covered[f] {
			t.Errorf("no outside check is named for the function %s", f)
		}
	}
}

// allTests lists the test functions of the module.
func allTests(t *testing.T) map[string]bool {
	t.Helper()
	out := make(map[string]bool)
	find := regexp.MustCompile(`(?m)^func (Test\w+)\(`)
	err := filepath.WalkDir("../..", func(path string, d os.DirEntry, err error) error {
		if err != nil || d.IsDir() || !strings.HasSuffix(path, "_test.go") {
			return err
		}
		text, err := os.ReadFile(path)
		if err != nil {
			return err
		}
		for _, m := range find.FindAllStringSubmatch(string(text), -1) {
			out[m[1]] = true
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}
