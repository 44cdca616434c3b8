package dd

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

// precision of the references: products of two Nums are exact in it.
const precision = 500

func ref(x Num) *big.Float {
	v := new(big.Float).SetPrec(precision).SetFloat64(x.Hi)
	return v.Add(v, new(big.Float).SetFloat64(x.Lo))
}

func bigOp() *big.Float { return new(big.Float).SetPrec(precision) }

// within checks got against want in units of 2^-106 relative, and that the
// parts of got do not overlap.
func within(t *testing.T, what string, got Num, want *big.Float, units float64) {
	t.Helper()
	if got.Hi+got.Lo != got.Hi {
		t.Errorf("%s: parts %g and %g overlap", what, got.Hi, got.Lo)
	}
	d := bigOp().Sub(ref(got), want)
	if want.Sign() != 0 {
		d.Quo(d, want)
	}
	e, _ := d.Float64()
	if e = math.Abs(e) * 0x1p106; !(e <= units) {
		t.Errorf("%s = %g + %g: off by %.2f·2^-106, allowed %g", what, got.Hi, got.Lo, e, units)
	}
}

// random returns a Num with full low part and an exponent within ±span.
func random(rng *rand.Rand, span int) Num {
	hi := math.Ldexp(rng.Float64()+0.5, rng.IntN(2*span+1)-span)
	if rng.IntN(2) == 0 {
		hi = -hi
	}
	s, e := TwoSum(hi, hi*0x1p-53*(rng.Float64()*1.9-0.95)*math.Ldexp(1, -rng.IntN(3)))
	return Num{s, e}
}

const rounds = 50_000

// Bounds as proved in the papers named in the package comment, with one unit
// for the higher orders.
func TestArithmetic(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for i := range rounds {
		if t.Failed() {
			t.Fatalf("at round %d", i)
		}
		span := []int{0, 2, 60, 400}[i%4]
		x, y := random(rng, span), random(rng, span)
		if i%16 == 0 { // near cancellation
			y = Num{-x.Hi, -x.Lo * rng.Float64()}
			y.Hi, y.Lo = TwoSum(y.Hi, y.Lo)
		}
		bx, by := ref(x), ref(y)
		within(t, "Add", x.Add(y), bigOp().Add(bx, by), 3.01)
		within(t, "Sub", x.Sub(y), bigOp().Sub(bx, by), 3.01)
		within(t, "AddF", x.AddF(y.Hi), bigOp().Add(bx, ref(Of(y.Hi))), 2.01)
		within(t, "Mul", x.Mul(y), bigOp().Mul(bx, by), 5.01)
		within(t, "MulF", x.MulF(y.Hi), bigOp().Mul(bx, ref(Of(y.Hi))), 2.01)
		within(t, "Div", x.Div(y), bigOp().Quo(bx, by), 10)
		within(t, "Sqrt", x.Abs().Sqrt(), bigOp().Sqrt(bigOp().Abs(bx)), 4)
		within(t, "Abs", x.Abs(), bigOp().Abs(bx), 0)
		within(t, "Neg", x.Neg(), bigOp().Neg(bx), 0)
		if got, want := x.Cmp(y), bx.Cmp(by); got != want {
			t.Errorf("Cmp(%v, %v) = %d, want %d", x, y, got, want)
		}
	}
}

// The error-free transformations lose nothing at all.
func TestErrorFree(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for range rounds {
		a, b := random(rng, 300).Hi, random(rng, 300).Hi
		s, e := TwoSum(a, b)
		if ref(Num{s, e}).Cmp(bigOp().Add(ref(Of(a)), ref(Of(b)))) != 0 || s != a+b {
			t.Fatalf("TwoSum(%g, %g) = %g, %g", a, b, s, e)
		}
		if math.Abs(a) < math.Abs(b) {
			a, b = b, a
		}
		if q, f := QuickTwoSum(a, b); q != s || f != e {
			t.Fatalf("QuickTwoSum(%g, %g) = %g, %g, want %g, %g", a, b, q, f, s, e)
		}
		p, e := TwoProd(a, b)
		if ref(Num{p, e}).Cmp(bigOp().Mul(ref(Of(a)), ref(Of(b)))) != 0 {
			t.Fatalf("TwoProd(%g, %g) = %g, %g", a, b, p, e)
		}
	}
}

func TestPowInt(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 3))
	for i := range 20_000 {
		x := random(rng, 3)
		if i%2 == 0 {
			x = Of(x.Hi)
		}
		k := rng.IntN(61) - 30
		want := bigOp().SetInt64(1)
		for range max(k, -k) {
			want.Mul(want, ref(x))
		}
		if k < 0 {
			want.Quo(bigOp().SetInt64(1), want)
		}
		within(t, "PowInt", x.PowInt(k), want, 5*math.Abs(float64(k))+10)
	}
	for _, k := range []int{math.MinInt, -1, 0, 1, math.MaxInt} {
		if got := Of(1).PowInt(k); got != Of(1) {
			t.Errorf("1^%d = %v", k, got)
		}
	}
	if got := Of(-1).PowInt(math.MaxInt); got != Of(-1) {
		t.Errorf("(-1)^odd = %v", got)
	}
	if got := Of(0).PowInt(0); got != Of(1) {
		t.Errorf("0^0 = %v, want 1", got)
	}
}

func TestFloat(t *testing.T) {
	if got := (Num{1, 0x1p-53}).Float(); got != 1 {
		t.Errorf("tie rounded to %g, want 1 (even)", got)
	}
	if got := (Num{1 + 0x1p-52, 0x1p-53}).Float(); got != 1+0x1p-51 {
		t.Errorf("tie rounded to %g, want 1+2^-51 (even)", got)
	}
}

// What cannot be represented shows in Hi.
func TestNonFinite(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for _, c := range []struct {
		what string
		got  float64
		want float64
	}{
		{"1/0", Of(1).Div(Of(0)).Hi, inf},
		{"-1/0", Of(-1).Div(Of(0)).Hi, -inf},
		{"0/0", Of(0).Div(Of(0)).Hi, nan},
		{"1/∞", Of(1).Div(Of(inf)).Hi, 0},
		{"√-1", Of(-1).Sqrt().Hi, nan},
		{"√0", Of(0).Sqrt().Hi, 0},
		{"√∞", Of(inf).Sqrt().Hi, inf},
	} {
		if c.got != c.want && !(math.IsNaN(c.got) && math.IsNaN(c.want)) {
			t.Errorf("%s = %g, want %g", c.what, c.got, c.want)
		}
	}
	for what, hi := range map[string]float64{
		"max + max": Of(math.MaxFloat64).Add(Of(math.MaxFloat64)).Hi,
		"max · 2":   Of(math.MaxFloat64).Mul(Of(2)).Hi,
		"∞ + 1":     Of(inf).Add(Of(1)).Hi,
		"NaN · 1":   Of(nan).Mul(Of(1)).Hi,
	} {
		if !math.IsInf(hi, 0) && !math.IsNaN(hi) {
			t.Errorf("%s = %g, want a non-finite number", what, hi)
		}
	}
}
