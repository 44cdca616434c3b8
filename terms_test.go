package trammel_test

import (
	"testing"

	"example.com/trammel"
)

// TestTermsAsWritten has terms whose order in the text is not that of the
// columns, where terms of fewer factors come first.
func TestTermsAsWritten(t *testing.T) {
	sc := furnaces("as written", "porosity", "", nil)
	sc.model = "porosity ~ " + furnaceTerms + " + w + m"
	sc.row = func(d disc) []float64 {
		x := byFurnace(d)
		return []float64{x[0], x[1], x[2], x[3], value(d.w), value(d.m), x[4], x[5]}
	}
	sc.names = []string{"intercept", "hold", "furnace='F2' against mean", "furnace='F3' against mean", "w", "m",
		"hold by furnace='F2' against mean", "hold by furnace='F3' against mean"}
	sc.terms = []handTerm{
		{"hold", []int{1}, []int{0, 2, 3, 4, 5}, []int{0}},
		{"cat(furnace against mean)", []int{2, 3}, []int{0, 1, 4, 5}, []int{0, 1}},
		{"hold by cat(furnace against mean)", []int{6, 7}, []int{0, 1, 2, 3, 4, 5}, []int{0, 1, 2, 3}},
		{"w", []int{4}, []int{0, 1, 2, 3, 5, 6, 7}, []int{0, 1, 2, 3, 6, 7}},
		{"m", []int{5}, []int{0, 1, 2, 3, 4, 6, 7}, []int{0, 1, 2, 3, 4, 6, 7}},
	}
	r, err := exactFit(sc.model, tableOf(t, sc.data, true), false)
	if err != nil {
		t.Fatal(err)
	}
	c := &cell{t, newOracle(sc), r, 12.5}
	coefficientsAgree(c)
	termsAgree(c, trammel.Terms, false)
	termsAgree(c, trammel.SequentialTerms, true)
}
