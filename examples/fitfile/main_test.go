package main

import (
	"bytes"
	"context"
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func call(args ...string) (status int, stdout, stderr string) {
	var out, errs bytes.Buffer
	status = run(context.Background(), args, &out, &errs)
	return status, out.String(), errs.String()
}

const furnaces = "../../testdata/furnaces.csv"

// TestRefusals: the plain sentence comes first on standard error, the status is
// 1, nothing stands on standard output, and no library speaks in its own words.
func TestRefusals(t *testing.T) {
	dir := t.TempDir()
	bad := filepath.Join(dir, "bad.csv")
	if err := os.WriteFile(bad, []byte("hold,porosity\n1,2\n3\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name  string
		args  []string
		first string // how the first line of standard error begins
	}{
		{"no data", []string{"porosity ~ hold"}, "fitfile: no data file was named"},
		{"no model", []string{"-data", furnaces}, "fitfile: no model was given"},
		{"two models", []string{"-data", furnaces, "porosity", "~ hold"}, "fitfile: one model was expected"},
		{"flag after model", []string{"-data", furnaces, "porosity ~ hold", "-json"}, "fitfile: one model was expected"},
		{"unknown flag", []string{"-report", "-data", furnaces, "porosity ~ hold"}, "fitfile: there is no flag -report"},
		{"level that is no number", []string{"-level", "x", "-data", furnaces, "porosity ~ hold"}, "fitfile: -level is \"x\""},
		{"flag without value", []string{"-data"}, "fitfile: -data needs a value"},
		{"level", []string{"-level", "95", "-data", furnaces, "porosity ~ hold"}, "fitfile: -level is 95"},
		{"no such file", []string{"-data", filepath.Join(dir, "none.csv"), "porosity ~ hold"}, "fitfile: the file "},
		{"a directory", []string{"-data", dir, "porosity ~ hold"}, "fitfile: "},
		{"bad table", []string{"-data", bad, "porosity ~ hold"}, "design: line 3: "},
		{"syntax", []string{"-data", furnaces, "porosity ~ hold +"}, "formula: 1:"},
		{"unknown column", []string{"-data", furnaces, "porosity ~ holt"}, "design: 1:12: "},
		{"dependent columns", []string{"-data", furnaces, "porosity ~ oven_1 + oven_2 + oven_3 + oven_4"}, "design: 1:12: columns depend on each other: "},
		{"another fitter's model", []string{"-data", furnaces, "porosity ~ hold as gamma"}, "linfit: "},
		{"a name not declared", []string{"-data", furnaces, "porosity = a*exp(-k*hold) fitting a"}, "design: 1:19: k is neither a column"},
	} {
		status, out, errs := call(c.args...)
		if status != 1 || out != "" || !strings.HasPrefix(errs, c.first) {
			t.Errorf("%s: status %d, standard output %q, standard error\n%s", c.name, status, out, errs)
		}
		for _, word := range []string{"goroutine", "participle", "strconv", "unexpected token", "%!"} {
			if strings.Contains(errs, word) {
				t.Errorf("%s: standard error says %q:\n%s", c.name, word, errs)
			}
		}
	}
}

// TestJSON: every key is there, whatever the model, and the report goes with it.
func TestJSON(t *testing.T) {
	status, out, errs := call("-json", "-level", "0.9", "-data", furnaces, "log(porosity) ~ hold * cat(furnace)")
	if status != 0 || errs != "" {
		t.Fatalf("status %d: %s", status, errs)
	}
	var got map[string]json.RawMessage
	if err := json.Unmarshal([]byte(out), &got); err != nil {
		t.Fatal(err)
	}
	for _, key := range strings.Fields("model fitter path rows coefficients derived freedom residual_sd residual_ss r_squared " +
		"adjusted_r_squared log_likelihood aic aicc bic terms deviance null_deviance pearson dispersion end notes") {
		if _, ok := got[key]; !ok {
			t.Errorf("the key %s is missing", key)
		}
	}
	status, out, errs = call("-data", furnaces, "porosity ~ hold * cat(furnace)")
	if status != 0 || errs != "" || !strings.Contains(out, "hold by furnace='F3'") {
		t.Errorf("status %d: %s\n%s", status, errs, out)
	}
}

// TestEarlyEnd: a search that ends early prints what it has, says why on standard
// error, and has status 1.
func TestEarlyEnd(t *testing.T) {
	for _, c := range []struct {
		args   []string
		reason string
		first  string
	}{
		{[]string{"-json", "-data", furnaces, "porosity = a*b*exp(-k*hold) fitting a, b, k"}, "singular", "nlfit: 1:12: a and b cannot be told apart"},
		{[]string{"-json", "-budget", "3", "-data", furnaces, "porosity = a*exp(-k*hold) fitting a start 1, k start 1"}, "budget", "nlfit: the search used its "},
	} {
		status, out, errs := call(c.args...)
		var got struct {
			End    struct{ Reason string }
			Minima []struct{ Parameters map[string]float64 }
		}
		if err := json.Unmarshal([]byte(out), &got); err != nil {
			t.Fatalf("%v: %s", err, out)
		}
		if status != 1 || got.End.Reason != c.reason || !strings.HasPrefix(errs, c.first) || len(got.Minima) == 0 {
			t.Errorf("status %d, reason %q, standard error\n%s", status, got.End.Reason, errs)
		}
	}
}

// TestSetAside: incomplete rows are refused, or set aside on request.
func TestSetAside(t *testing.T) {
	path := filepath.Join(t.TempDir(), "holes.csv")
	if err := os.WriteFile(path, []byte("hold,porosity\n10,4\n,5\n12,6\n14,NaN\n16,9\n20,10\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	if status, _, errs := call("-data", path, "porosity ~ hold"); status != 1 || !strings.Contains(errs, "-set-aside") {
		t.Errorf("status %d: %s", status, errs)
	}
	status, out, errs := call("-json", "-set-aside", "-data", path, "porosity ~ hold")
	if status != 0 {
		t.Fatalf("status %d: %s", status, errs)
	}
	var got struct {
		Rows struct {
			Given, Used int
			SetAside    []int `json:"set_aside"`
		}
	}
	if err := json.Unmarshal([]byte(out), &got); err != nil {
		t.Fatal(err)
	}
	if got.Rows.Given != 6 || got.Rows.Used != 4 || len(got.Rows.SetAside) != 2 || got.Rows.SetAside[0] != 2 || got.Rows.SetAside[1] != 4 {
		t.Errorf("rows %+v", got.Rows)
	}
}
