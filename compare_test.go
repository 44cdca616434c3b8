package trammel_test

import (
	"context"
	"errors"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/internal/digits"
	"example.com/trammel/linfit"
)

// TestCompare: the comparison of two models is the test of the one term by which
// they differ (which the conformance suite holds against exact rationals), and
// fits that cannot be compared are refused.
func TestCompare(t *testing.T) {
	table, err := design.ReadCSV(strings.NewReader(discs), nil)
	if err != nil {
		t.Fatal(err)
	}
	fit := func(model string, t2 *design.Table) trammel.Result {
		r, err := linfit.Fit(context.Background(), model, t2, nil)
		if err != nil {
			t.Fatal(err)
		}
		return r
	}
	small, large := fit("porosity ~ hold + cat(furnace)", table), fit("porosity ~ hold*cat(furnace)", table)
	got, err := trammel.Compare(small, large)
	if err != nil {
		t.Fatal(err)
	}
	tests, err := trammel.Terms(large)
	if err != nil {
		t.Fatal(err)
	}
	want := tests[len(tests)-1]
	// The difference of two sums of squares loses what the test's own sum keeps.
	if got.DF != want.DF || digits.Agree(got.Stat, want.Stat) < 9 || digits.Agree(got.P, want.P) < 9 {
		t.Errorf("got %+v, the term's test is %+v", got, want)
	}
	few, err := design.ReadCSV(strings.NewReader(discs[:strings.LastIndex(strings.TrimSpace(discs), "\n")+1]), nil)
	if err != nil {
		t.Fatal(err)
	}
	for name, pair := range map[string][2]trammel.Result{
		"the larger first": {large, small},
		"other rows":       {fit("porosity ~ hold", few), large},
		"another response": {fit("log(porosity) ~ hold", table), large},
		"weights":          {fit("porosity ~ hold weighted hold", table), large},
		"nothing":          {nil, large},
	} {
		var e *trammel.Error
		if _, err := trammel.Compare(pair[0], pair[1]); !errors.As(err, &e) {
			t.Errorf("%s: got %v", name, err)
		}
	}
}
