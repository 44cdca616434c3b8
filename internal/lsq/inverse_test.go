package lsq

import (
	"math"
	"testing"
)

// Sums over very many rows of like terms, whose errors agree in sign: merging
// chunks adds none to those within chunks, 16 units at most each for the lanes
// of a block and for its blocks, 9 as it turns out. A plain sum is off by 149.
func TestGramOfManyRows(t *testing.T) {
	const n = 3_999_999
	pr := &Problem{N: n, P: 1, X: make([]float64, n)}
	for i := range pr.X {
		pr.X[i] = 0.1
	}
	f := Factorize(pr, nil)
	w := f.invert()
	w.plain = false
	f.gram()
	b := 0.1 * f.scale[0] * w.s[0]
	if want := float64(b*b) * n; math.Abs(w.g[0]-want) > 20*0x1p-53*want {
		t.Errorf("G = %.17g, want %.17g", w.g[0], want)
	}
}
