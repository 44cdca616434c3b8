package trammel_test

import (
	"bytes"
	"encoding/json"
	"math"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/internal/digits"
	"example.com/trammel/internal/handover"
)

// chiEngine answers every term test with a chi-square of 5.3 on the columns of
// the term.
type chiEngine struct{ handover.Engine }

func (e chiEngine) Nested(with []int) (handover.NestedTest, error) {
	t, err := e.Engine.Nested(with)
	t.SS, t.Stat = 5.3, 5.3
	return t, err
}

// TestKnownDispersion asks a fit whose dispersion is not estimated, as that of
// counts is: the normal and chi-square distributions judge it. Their tails have
// closed forms: erfc for one degree of freedom, exp(-x/2) for two.
func TestKnownDispersion(t *testing.T) {
	f, err := exactHandover("porosity ~ hold + cat(furnace)", tableOf(t, plain, true), false)
	if err != nil {
		t.Fatal(err)
	}
	f.DispersionEstimated = false
	f.Engine = chiEngine{f.Engine}
	r := trammel.NewResult(f)
	// The upper 2.5 % point of the normal distribution (Abramowitz and Stegun 1964,
	// table 26.1 inverted): 1.959963984540054.
	const q = 1.959963984540054
	list, err := trammel.Coefficients(r, 0.95)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range list {
		for _, pair := range [][2]float64{
			{c.Low, c.Estimate - q*c.StdError}, {c.High, c.Estimate + q*c.StdError},
			{c.P, math.Erfc(math.Abs(c.Estimate/c.StdError) / math.Sqrt2)},
		} {
			if digits.Agree(pair[0], pair[1]) < 12 {
				t.Errorf("%s: got %v, want %v", c.Name, pair[0], pair[1])
			}
		}
	}
	tests, err := trammel.Terms(r)
	if err != nil {
		t.Fatal(err)
	}
	for i, want := range []float64{math.Erfc(math.Sqrt(5.3 / 2)), math.Exp(-5.3 / 2)} {
		if x := tests[i]; !x.Chi2 || x.Stat != 5.3 || x.DF != i+1 || digits.Agree(x.P, want) < 12 {
			t.Errorf("%+v, want p %v", x, want)
		}
	}
	s, err := trammel.Summarize(r, &trammel.SummaryOptions{SkipChecks: true})
	if err != nil {
		t.Fatal(err)
	}
	var text strings.Builder
	var b bytes.Buffer
	if err := s.WriteReport(&text); err != nil {
		t.Fatal(err)
	}
	if err := s.WriteJSON(&b); err != nil {
		t.Fatal(err)
	}
	var doc struct {
		Terms []struct{ F, Chi2 *float64 }
	}
	if err := json.Unmarshal(b.Bytes(), &doc); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(text.String(), "chi-square") || doc.Terms[0].F != nil || *doc.Terms[0].Chi2 != 5.3 {
		t.Errorf("JSON terms %+v, report\n%s", doc.Terms, text.String())
	}
}
