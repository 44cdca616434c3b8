package dist

import (
	"math"
	"math/big"
	"testing"

	"example.com/trammel/internal/digits"
)

// Tails in 2,600-bit arithmetic for whole degrees of freedom, by the power
// series of the incomplete gamma and beta functions (M. Abramowitz and I. A.
// Stegun, Handbook of Mathematical Functions, 6.5.29 and 26.5.4), which share
// nothing with the methods of the package. A tail of 1e-300 found as 1 minus a
// sum keeps some 480 digits.
const bits = 2600

func num(x float64) *big.Float { return new(big.Float).SetPrec(bits).SetFloat64(x) }

func add(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(bits).Add(a, b) }
func sub(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(bits).Sub(a, b) }
func mul(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(bits).Mul(a, b) }
func quo(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(bits).Quo(a, b) }

// negligible tells that term no longer changes sum.
func negligible(term, sum *big.Float) bool {
	return term.Sign() == 0 || term.MantExp(nil) < sum.MantExp(nil)-bits
}

// exp is e^x by halving the argument and squaring the series.
func exp(x *big.Float) *big.Float {
	k := max(0, x.MantExp(nil)+20)
	y := new(big.Float).SetPrec(bits).SetMantExp(x, -k)
	sum, term := num(1), num(1)
	for n := 1.0; !negligible(term, sum); n++ {
		term = quo(mul(term, y), num(n))
		sum = add(sum, term)
	}
	for range k {
		sum = mul(sum, sum)
	}
	return sum
}

// pi by Machin's formula.
func pi() *big.Float {
	arccot := func(x float64) *big.Float {
		sum, power := num(0), quo(num(1), num(x))
		for n := 1.0; ; n += 2 {
			term := quo(power, num(n))
			if n > 1 && negligible(term, sum) {
				return sum
			}
			if int(n)%4 == 1 {
				sum = add(sum, term)
			} else {
				sum = sub(sum, term)
			}
			power = quo(power, num(x*x))
		}
	}
	return mul(num(4), sub(mul(num(4), arccot(5)), arccot(239)))
}

// gamma of half of a whole number.
func gamma(twice int) *big.Float {
	g, a := num(1), 1.0
	if twice%2 == 1 {
		g, a = new(big.Float).SetPrec(bits).Sqrt(pi()), 0.5
	}
	for ; 2*a < float64(twice); a++ {
		g = mul(g, num(a))
	}
	return g
}

// power is x^(twice/2).
func power(x *big.Float, twice int) *big.Float {
	r := num(1)
	for range twice / 2 {
		r = mul(r, x)
	}
	if twice%2 == 1 {
		r = mul(r, new(big.Float).SetPrec(bits).Sqrt(x))
	}
	return r
}

// gammaUpper is Q(twice/2, x).
func gammaUpper(twice int, x *big.Float) *big.Float {
	a := float64(twice) / 2
	term := quo(num(1), num(a))
	sum := term
	for n := 1.0; !negligible(term, sum); n++ {
		term = quo(mul(term, x), num(a+n))
		sum = add(sum, term)
	}
	p := quo(mul(mul(power(x, twice), exp(new(big.Float).Neg(x))), sum), gamma(twice))
	return sub(num(1), p)
}

// betaLower is I_x(twiceA/2, twiceB/2) for x < 1.
func betaLower(twiceA, twiceB int, x *big.Float) *big.Float {
	if x.Cmp(num(0.9)) > 0 {
		return sub(num(1), betaLower(twiceB, twiceA, sub(num(1), x)))
	}
	a, b := float64(twiceA)/2, float64(twiceB)/2
	term := num(1) // (1-b)(2-b)…(n-b)/n! · x^n
	sum := quo(term, num(a))
	for n := 1.0; ; n++ {
		term = quo(mul(mul(term, num(n-b)), x), num(n))
		part := quo(term, num(a+n))
		if negligible(part, sum) && n > b {
			break
		}
		sum = add(sum, part)
	}
	front := quo(mul(power(x, twiceA), gamma(twiceA+twiceB)), mul(gamma(twiceA), gamma(twiceB)))
	return mul(front, sum)
}

type tail struct {
	name string
	got  float64
	want *big.Float
}

// TestTails goes out to tails of 1e-300 and holds 12 digits, relative.
func TestTails(t *testing.T) {
	var all []tail
	reach := make(map[string]float64)
	put := func(family, name string, got float64, want *big.Float) {
		w, _ := want.Float64()
		if w > 1e-301 {
			all = append(all, tail{family + " " + name, got, want})
			if reach[family] == 0 || w < reach[family] {
				reach[family] = w
			}
		}
	}
	for _, x := range []float64{0.1, 0.5, 1, 2, 3, 5, 8.5, 12, 20, 30, 36.9, 37} {
		put("normal", "", NormalUpper(x), quo(gammaUpper(1, quo(mul(num(x), num(x)), num(2))), num(2)))
	}
	for _, df := range []int{1, 2, 3, 7, 30, 101, 1000} {
		for _, x := range []float64{0.01, 0.3, 1, 4, 20, 90, 300, 700, 1300, 1380} {
			v := x + float64(df)*math.Min(1, x/100)
			put("chi-square", "", ChiUpper(v, float64(df)), gammaUpper(df, num(v/2)))
		}
	}
	ratio := func(a, b *big.Float) *big.Float { return quo(a, add(a, b)) }
	for _, df := range []int{1, 2, 3, 5, 10, 31, 100, 501} {
		for _, x := range []float64{0.001, 0.2, 1, 2.5, 6, 15, 40, 55, 300, 1e5, 1e20, 1e60, 1e100, 1e150} {
			want := betaLower(df, 1, ratio(num(float64(df)), mul(num(x), num(x))))
			put("t", "", TTwoSided(x, float64(df)), want)
			put("t upper", "", TUpper(x, float64(df)), quo(want, num(2)))
		}
	}
	for _, d1 := range []int{1, 2, 5, 12, 100} {
		for _, d2 := range []int{1, 2, 3, 8, 41, 200, 1000} {
			for _, x := range []float64{0.01, 0.7, 1, 1.5, 4, 9, 30, 200, 4000, 1e6, 1e12, 1e30, 1e74, 1e150} {
				want := betaLower(d2, d1, ratio(num(float64(d2)), mul(num(float64(d1)), num(x))))
				put("F", "", FUpper(x, float64(d1), float64(d2)), want)
			}
		}
	}
	worst := math.Inf(1)
	for _, c := range all {
		d := digits.AgreeString(c.got, c.want.Text('e', 40))
		worst = math.Min(worst, d)
		if !(d >= 12) {
			t.Errorf("%s: got %.17g, want %s: %.1f digits", c.name, c.got, c.want.Text('e', 20), d)
		}
	}
	t.Logf("%d tails, at least %.1f digits", len(all), worst)
	for family, least := range reach {
		if least > 1e-250 {
			t.Errorf("%s was tried down to %g only", family, least)
		}
	}
}

// TestRoundTrip: quantiles undo tails, and tails of both sides add up.
func TestRoundTrip(t *testing.T) {
	for _, df := range []float64{0.3, 1, 2.5, 7, 40, 1e3, 1e6, math.Inf(1)} {
		for _, q := range []float64{1e-290, 1e-100, 1e-20, 1e-5, 0.025, 0.2, 0.3, 0.4999, 0.5, 0.6, 0.9, 0.999999} {
			x := TUpperQuantile(q, df)
			if math.IsInf(x, 0) || math.Abs(x) > 1e150 {
				continue // beyond what float64 holds
			}
			// A tail of condition κ = x·density/tail changes by κ units when x does by one.
			if d := digits.Agree(TUpper(x, df), q); d < 11.5 {
				t.Errorf("t df %g: the tail beyond the quantile of %g is off: %.1f digits", df, q, d)
			}
			if math.IsInf(df, 1) {
				continue
			}
			for name, c := range map[string]struct {
				tail func(x float64) float64
				x    float64
			}{
				"chi-square":       {func(x float64) float64 { return ChiCDF(x, df) }, ChiQuantile(q, df)},
				"chi-square upper": {func(x float64) float64 { return ChiUpper(x, df) }, ChiUpperQuantile(q, df)},
				"F":                {func(x float64) float64 { return FCDF(x, df, 9) }, FQuantile(q, df, 9)},
				"F upper":          {func(x float64) float64 { return FUpper(x, df, 9) }, FUpperQuantile(q, df, 9)},
			} {
				got := c.tail(c.x)
				if got == 0 {
					continue // the quantile is below the least number
				}
				// An x rounded to float64 moves the tail by κ = x·density/tail
				// roundings; with 1e6 degrees of freedom κ reaches 1e5.
				const h = 1e-7
				kappa := math.Abs(math.Log(c.tail(c.x*(1+h))/got)) / h
				if off := math.Abs(got-q) / q; !(off <= 3e-13+8e-16*kappa) {
					t.Errorf("%s df %g: quantile of %g comes back off by %g, κ is %g", name, df, q, off, kappa)
				}
			}
		}
	}
	for _, x := range []float64{0.01, 0.5, 1, 3, 40} {
		for _, df := range []float64{0.5, 3, 200} {
			for _, s := range []float64{ChiCDF(x, df) + ChiUpper(x, df), FCDF(x, df, 4) + FUpper(x, df, 4), TUpper(x, df) + TUpper(-x, df)} {
				if math.Abs(s-1) > 1e-15 {
					t.Errorf("x %g, df %g: both sides add up to %.17g", x, df, s)
				}
			}
			// F with 1 and df degrees of freedom is t squared.
			if d := digits.Agree(FUpper(x*x, 1, df), TTwoSided(x, df)); d < 13 {
				t.Errorf("F(1, %g) and t² differ at %g: %.1f digits", df, x, d)
			}
		}
	}
}

// TestEdges: what is not defined is NaN, the ends are exact.
func TestEdges(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for name, v := range map[string]float64{
		"t df 0": TUpper(1, 0), "t df NaN": TTwoSided(1, nan), "t of NaN": TTwoSided(nan, 3), "t p 2": TQuantile(2, 3), "t p NaN": TQuantile(nan, 3),
		"chi df -1": ChiUpper(1, -1), "chi of NaN": ChiUpper(nan, 1), "chi p -1": ChiQuantile(-1, 2), "F d1 0": FUpper(1, 0, 2), "F d2 NaN": FCDF(1, 2, nan),
		"F q 2": FUpperQuantile(2, 1, 1), "normal p 2": NormalQuantile(2), "normal of NaN": NormalUpper(nan),
	} {
		if !math.IsNaN(v) {
			t.Errorf("%s is %g, want NaN", name, v)
		}
	}
	for name, c := range map[string][2]float64{
		"t at inf": {TTwoSided(inf, 3), 0}, "t at 0": {TTwoSided(0, 3), 1}, "t quantile 1/2": {TQuantile(0.5, 3), 0}, "t quantile 1": {TQuantile(1, 3), inf}, "t quantile 0": {TQuantile(0, 3), -inf},
		"chi at 0": {ChiUpper(0, 3), 1}, "chi at inf": {ChiUpper(inf, 3), 0}, "chi cdf at -1": {ChiCDF(-1, 3), 0}, "F at 0": {FUpper(0, 1, 2), 1}, "F at inf": {FUpper(inf, 1, 2), 0},
		"F quantile 0": {FQuantile(0, 2, 3), 0}, "F upper quantile 0": {FUpperQuantile(0, 2, 3), inf}, "normal at -inf": {NormalUpper(-inf), 1}, "normal at inf": {NormalUpper(inf), 0},
		"normal quantile 0": {NormalQuantile(0), -inf}, "normal quantile 1": {NormalQuantile(1), inf}, "normal quantile 1/2": {NormalQuantile(0.5), 0},
	} {
		if c[0] != c[1] {
			t.Errorf("%s is %g, want %g", name, c[0], c[1])
		}
	}
}
