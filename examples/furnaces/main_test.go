package main

import (
	"bytes"
	"context"
	"os"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/internal/scenario"
	"example.com/trammel/linfit"
)

// TestOutput compares what the program prints with testdata/output.txt;
// TRAMMEL_UPDATE=1 writes that file anew. The numbers are held by TestTruth
// and, for the method, by the certified sets of linfit.
func TestOutput(t *testing.T) {
	var out bytes.Buffer
	if err := run(context.Background(), "../../testdata/furnaces.csv", &out); err != nil {
		t.Fatal(err)
	}
	const golden = "testdata/output.txt"
	if os.Getenv("TRAMMEL_UPDATE") != "" {
		if err := os.MkdirAll("testdata", 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(golden, out.Bytes(), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(out.Bytes(), want) {
		t.Errorf("the output differs from %s:\n%s", golden, &out)
	}
}

// TestTruth: the intervals hold the values the data were made with.
func TestTruth(t *testing.T) {
	file, err := os.Open("../../testdata/furnaces.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	table, err := design.ReadCSV(file, nil)
	if err != nil {
		t.Fatal(err)
	}
	r, err := linfit.Fit(context.Background(), "porosity ~ hold * cat(furnace)", table, nil)
	if err != nil {
		t.Fatal(err)
	}
	coefs, err := trammel.Coefficients(r, 0.999)
	if err != nil {
		t.Fatal(err)
	}
	truth := map[string]float64{"intercept": scenario.TrueOffset, "hold": scenario.TrueRate,
		"furnace='F2'": scenario.TrueOffsetF2, "hold by furnace='F3'": scenario.TrueRateF3}
	for _, c := range coefs {
		if want := truth[c.Name]; want < c.Low || want > c.High {
			t.Errorf("%s: the truth %g is outside [%g, %g]", c.Name, want, c.Low, c.High)
		}
		delete(truth, c.Name)
	}
	if len(truth) > 0 {
		t.Errorf("no coefficient for %v", truth)
	}
}
