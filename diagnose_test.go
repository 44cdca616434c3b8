package trammel_test

import (
	"math"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
)

func diagnose(t *testing.T, model string, columns ...design.Column) *trammel.Diagnostics {
	t.Helper()
	table, err := design.NewTable(columns...)
	if err != nil {
		t.Fatal(err)
	}
	r, err := exactFit(model, table, false)
	if err != nil {
		t.Fatal(err)
	}
	d, err := trammel.Diagnose(r)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// TestDiagnoseInfinite has one row off a line that all others are on: without it
// there is no scatter left.
func TestDiagnoseInfinite(t *testing.T) {
	x := []float64{1, 2, 3, 4, 5, 6}
	y := []float64{3, 5, 9, 9, 11, 13}
	d := diagnose(t, "y ~ x", design.Numbers("x", x), design.Numbers("y", y))
	for i, s := range d.Studentized {
		if math.IsInf(s, 1) != (i == 2) || math.IsNaN(s) || math.IsInf(s, -1) {
			t.Errorf("row %d: studentized %v", i+1, s)
		}
	}
}

// TestDiagnoseEdges has a row that determines a coefficient alone, and a fit with
// one degree of freedom, where no scale is left without a row.
func TestDiagnoseEdges(t *testing.T) {
	d := diagnose(t, "y ~ x + cat(m)", design.Numbers("x", []float64{1, 2, 3, 4, 5}),
		design.Texts("m", []string{"A", "A", "B", "A", "A"}), design.Numbers("y", []float64{1, 3, 7, 4, 6}))
	for i := range d.Row {
		alone := i == 2
		if (d.Leverage[i] > 1-1e-12) != alone || math.IsNaN(d.Standardized[i]) != alone || math.IsNaN(d.Studentized[i]) != alone || math.IsNaN(d.Cook[i]) != alone {
			t.Errorf("row %d: leverage %v, standardized %v, studentized %v, Cook %v", i+1, d.Leverage[i], d.Standardized[i], d.Studentized[i], d.Cook[i])
		}
	}
	d = diagnose(t, "y ~ x", design.Numbers("x", []float64{1, 2, 3}), design.Numbers("y", []float64{1, 3, 4}))
	for i := range d.Row {
		if !math.IsNaN(d.Studentized[i]) || math.IsNaN(d.Standardized[i]) || math.IsNaN(d.Cook[i]) {
			t.Errorf("one degree of freedom, row %d: standardized %v, studentized %v, Cook %v", i+1, d.Standardized[i], d.Studentized[i], d.Cook[i])
		}
	}
}
