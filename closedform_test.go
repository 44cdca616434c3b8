package trammel_test

import (
	"math"
	"math/big"
	"testing"
)

// Closed forms of tail probabilities for an even number of residual degrees of
// freedom, in 300-bit numbers: they are finite sums of algebraic numbers, and
// owe nothing to the module's own distributions. Source: M. Abramowitz and I. A.
// Stegun, Handbook of Mathematical Functions, 1964, 26.7.4 (Student's t) and
// 26.6.4 (F with an even first degree).

const bits = 300

func bigOf(x float64) *big.Float { return new(big.Float).SetPrec(bits).SetFloat64(x) }

// tTwoSided is P(|T| > t) for even df: 1 - A(t|df).
func tTwoSided(t float64, df int) float64 {
	if df%2 != 0 {
		panic("tTwoSided: odd degrees of freedom")
	}
	// sin θ = t/√(df+t²), cos² θ = df/(df+t²)
	tt := new(big.Float).Mul(bigOf(t), bigOf(t))
	den := new(big.Float).Add(bigOf(float64(df)), tt)
	cos2 := new(big.Float).Quo(bigOf(float64(df)), den)
	sin := new(big.Float).Sqrt(new(big.Float).Quo(tt, den))
	sum, term := bigOf(1), bigOf(1)
	for k := 1; k < df/2; k++ {
		term = new(big.Float).Mul(term, cos2)
		term.Mul(term, new(big.Float).Quo(bigOf(float64(2*k-1)), bigOf(float64(2*k))))
		sum.Add(sum, term)
	}
	a := new(big.Float).Mul(sin, sum)
	v, _ := new(big.Float).Sub(bigOf(1), a).Float64()
	return v
}

// tFactor is the t with tTwoSided(t, df) = 1 - level, by bisection.
func tFactor(level float64, df int) float64 {
	lo, hi := 0.0, 1e6
	for range 200 {
		mid := (lo + hi) / 2
		if tTwoSided(mid, df) > 1-level {
			lo = mid
		} else {
			hi = mid
		}
	}
	return (lo + hi) / 2
}

// fUpper is P(F > f) for even d2, and d1 = 1 or even.
func fUpper(f float64, d1, d2 int) float64 {
	if d1 == 1 {
		return tTwoSided(math.Sqrt(f), d2)
	}
	if d1%2 != 0 || d2%2 != 0 {
		panic("fUpper: odd degrees of freedom")
	}
	den := new(big.Float).Add(bigOf(float64(d2)), new(big.Float).Mul(bigOf(float64(d1)), bigOf(f)))
	x := new(big.Float).Quo(bigOf(float64(d2)), den)
	y := new(big.Float).Sub(bigOf(1), x)
	sum, term := bigOf(1), bigOf(1)
	for k := 1; k < d1/2; k++ {
		term = new(big.Float).Mul(term, y)
		term.Mul(term, new(big.Float).Quo(bigOf(float64(d2+2*k-2)), bigOf(float64(2*k))))
		sum.Add(sum, term)
	}
	for range d2 / 2 {
		sum.Mul(sum, x)
	}
	v, _ := sum.Float64()
	return v
}

// TestClosedForms holds the closed forms against printed percentage points
// (Abramowitz and Stegun, tables 26.9 and 26.10).
func TestClosedForms(t *testing.T) {
	for _, c := range []struct{ got, want, off float64 }{
		{tFactor(0.95, 10), 2.228, 5e-4},
		{tFactor(0.99, 4), 4.604, 5e-4},
		{tFactor(0.9, 120), 1.658, 5e-4},
		{fUpper(4.10, 2, 10), 0.05, 2e-4},
		{fUpper(4.96, 1, 10), 0.05, 2e-4},
		{fUpper(3.84, 4, 8), 0.05, 2e-4},
	} {
		if math.Abs(c.got-c.want) > c.off {
			t.Errorf("got %v, the table has %v", c.got, c.want)
		}
	}
}
