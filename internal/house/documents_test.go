package house

import (
	"bytes"
	"context"
	"encoding/json"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/linfit"
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

// summaryKeys lists the keys of a summary's JSON, those of its lists as
// "coefficients.estimate".
func summaryKeys(t *testing.T) []string {
	t.Helper()
	table, err := design.ReadCSV(strings.NewReader(read(t, "testdata/furnaces.csv")), nil)
	if err != nil {
		t.Fatal(err)
	}
	// Models that fill every list: derived effects and a note, minima.
	r, err := linfit.Fit(context.Background(), "porosity ~ cat(furnace against mean) + disc", table, nil)
	if err != nil {
		t.Fatal(err)
	}
	s, err := trammel.Summarize(r, nil)
	if err != nil {
		t.Fatal(err)
	}
	var b bytes.Buffer
	if err := s.WriteJSON(&b); err != nil {
		t.Fatal(err)
	}
	var all map[string]any
	if err := json.Unmarshal(b.Bytes(), &all); err != nil {
		t.Fatal(err)
	}
	var keys []string
	for k, v := range all {
		keys = append(keys, k)
		if list, ok := v.([]any); ok && len(list) > 0 {
			v = list[0]
		}
		if inner, ok := v.(map[string]any); ok {
			for q := range inner {
				keys = append(keys, k+"."+q)
			}
		}
	}
	slices.Sort(keys)
	return keys
}
