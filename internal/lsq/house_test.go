package lsq

import (
	"math"
	"math/rand/v2"
	"testing"
)

// Sums of like terms: all rounding errors of a plain running sum agree in
// sign. 128 terms in eight lanes err by 16 units at most, pieces add none.
func TestDot(t *testing.T) {
	for _, n := range []int{0, 1, 127, 128, 129, 1000, 32_768} {
		x, y := make([]float64, n), make([]float64, n)
		for i := range x {
			x[i], y[i] = 0.1, 0.7
		}
		want := float64(n) * (0.1 * 0.7)
		if got := dot(x, y); math.Abs(got-want) > 17*0x1p-53*want {
			t.Errorf("n = %d: %.17g, want %.17g", n, got, want)
		}
	}
}

// Reflections are orthogonal and put the vector on its first element.
func TestReflector(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 24))
	for range 200 {
		n := 1 + rng.IntN(300)
		x, v := make([]float64, n), make([]float64, n)
		var ss float64
		for i := range x {
			x[i] = rng.NormFloat64()
			if rng.IntN(4) == 0 {
				x[i] = 0
			}
			ss += x[i] * x[i]
		}
		copy(v, x)
		tau := makeReflector(v)
		beta := v[0]
		applyReflection(v, tau, x)
		if math.Abs(x[0]-beta) > 1e-14*math.Sqrt(ss) || math.Abs(math.Abs(beta)-math.Sqrt(ss)) > 1e-14*math.Sqrt(ss) {
			t.Fatalf("first element %g, want %g of length %g", x[0], beta, math.Sqrt(ss))
		}
		for i, r := range x[1:] {
			if math.Abs(r) > 1e-14*math.Sqrt(ss) {
				t.Fatalf("element %d left at %g", i+1, r)
			}
		}
	}
}
