package design

import (
	"math"
	"math/big"
	"slices"
	"testing"

	"example.com/trammel/internal/digits"
	"example.com/trammel/internal/factored"
)

func rat(x float64) *big.Rat { return new(big.Rat).SetFloat64(x) }

// ratOf is hi + lo exactly.
func ratOf(n factored.Num, i int) *big.Rat {
	r := rat(n.Hi[i])
	if n.Lo != nil {
		r.Add(r, rat(n.Lo[i]))
	}
	return r
}

// relative is |got-want| relative to the largest |want| of its column.
func relative(got, want []*big.Rat) float64 {
	worst, scale := new(big.Rat), new(big.Rat)
	for i := range got {
		if a := new(big.Rat).Abs(want[i]); a.Cmp(scale) > 0 {
			scale = a
		}
		if d := new(big.Rat).Sub(got[i], want[i]); d.Abs(d).Cmp(worst) > 0 {
			worst = d
		}
	}
	f, _ := worst.Quo(worst, scale).Float64()
	return f
}

func basisColumns(t *testing.T, text string, x []float64, counts []float64) []factored.Num {
	t.Helper()
	y := make([]float64, len(x))
	cols := []Column{Numbers("x", x), Numbers("y", y)}
	if counts != nil {
		cols = append(cols, Numbers("m", counts))
		text += " counted m"
	}
	table, err := NewTable(cols...)
	if err != nil {
		t.Fatal(err)
	}
	f, err := Prepare(parse(t, "y ~ "+text), table, &Options{NoRankCheck: true})
	if err != nil {
		t.Fatal(err)
	}
	return f.Matrix.form.Nums
}

var basisX = []float64{0.1, 0.35, 1, 1.7, 2.2, 3, 3.3, 4.75, 5.5, 6.1, 7.9, 8}

// TestPowers: x^k as hi + lo agrees with the exact power to double-double
// rounding.
func TestPowers(t *testing.T) {
	for k, col := range basisColumns(t, "powers(x, 10)", basisX, nil) {
		var got, want []*big.Rat
		for i, x := range basisX {
			p := big.NewRat(1, 1)
			for range k + 1 {
				p.Mul(p, rat(x))
			}
			got, want = append(got, ratOf(col, i)), append(want, p)
		}
		if e := relative(got, want); e > 1e-30 {
			t.Errorf("x^%d is off by %g", k+1, e)
		}
	}
}

// TestLegendre compares with the explicit polynomials of degree 1 to 4
// (M. Abramowitz and I. A. Stegun, Handbook of Mathematical Functions, table
// 22.9, recalled) in exact arithmetic.
func TestLegendre(t *testing.T) {
	lo, hi := rat(basisX[0]), rat(basisX[len(basisX)-1])
	poly := [][]*big.Rat{
		{rat(0), rat(1)},
		{big.NewRat(-1, 2), rat(0), big.NewRat(3, 2)},
		{rat(0), big.NewRat(-3, 2), rat(0), big.NewRat(5, 2)},
		{big.NewRat(3, 8), rat(0), big.NewRat(-30, 8), rat(0), big.NewRat(35, 8)},
	}
	for k, col := range basisColumns(t, "legendre(x, 4)", basisX, nil) {
		var got, want []*big.Rat
		for i, x := range basisX {
			z := new(big.Rat).Sub(new(big.Rat).Sub(new(big.Rat).Mul(rat(2), rat(x)), lo), hi)
			z.Quo(z, new(big.Rat).Sub(hi, lo))
			v := new(big.Rat)
			for _, c := range slices.Backward(poly[k]) {
				v.Mul(v, z).Add(v, c)
			}
			got, want = append(got, ratOf(col, i)), append(want, v)
		}
		if e := relative(got, want); e > 1e-29 {
			t.Errorf("polynomial %d is off by %g", k+1, e)
		}
	}
}

// TestQuantiles: positions (N-1)·j/k with linear interpolation, counts
// standing for repeated rows.
func TestQuantiles(t *testing.T) {
	for _, c := range []struct {
		x, counts []float64
		k         int
		want      []float64
	}{
		{[]float64{3, 1, 2, 5, 4}, nil, 2, []float64{1, 3, 5}},
		{[]float64{3, 1, 2, 4}, nil, 2, []float64{1, 2.5, 4}},
		{[]float64{0, 10}, nil, 4, []float64{0, 2.5, 5, 7.5, 10}},
		{[]float64{1, 2, 3, 4, 5, 6, 7, 8, 9, 10}, nil, 3, []float64{1, 4, 7, 10}},
		{[]float64{5, 1, 2}, []float64{1, 3, 2}, 2, []float64{1, 1.5, 5}}, // 1 1 1 2 2 5
		{[]float64{1, 2}, []float64{1, 4}, 2, []float64{1, 2, 2}},         // 1 2 2 2 2
	} {
		got, err := quantiles(c.x, c.counts, c.k)
		if err != nil || !slices.Equal(got, c.want) {
			t.Errorf("quantiles of %v counted %v at %d parts: %v, want %v", c.x, c.counts, c.k, got, c.want)
		}
	}
}

// TestSpline holds what makes a natural cubic spline: pieces are cubics that
// meet with two continuous derivatives at the knots, linear outside; and k
// columns span, beside the constant, the k+1 dimensions of such splines.
func TestSpline(t *testing.T) {
	const k = 4
	spec := parse(t, "y ~ spline(x, 4)")
	table, err := NewTable(Numbers("x", basisX), Numbers("y", make([]float64, len(basisX))))
	if err != nil {
		t.Fatal(err)
	}
	p, err := Compile(spec, table, nil)
	if err != nil {
		t.Fatal(err)
	}
	q := p.nums[0]
	if len(q.knots) != k+1 || q.knots[0] != 0.1 || q.knots[k] != 8 {
		t.Fatalf("knots %v", q.knots)
	}
	// Divided differences in exact arithmetic of the columns at chosen points.
	at := func(xs ...float64) []factored.Num {
		tb, err := NewTable(Numbers("x", xs))
		if err != nil {
			t.Fatal(err)
		}
		m, err := p.Matrix(tb)
		if err != nil {
			t.Fatal(err)
		}
		return m.form.Nums
	}
	divided := func(col factored.Num, xs []float64) float64 {
		v := make([]*big.Rat, len(xs))
		for i := range v {
			v[i] = ratOf(col, i)
		}
		for d := 1; d < len(xs); d++ {
			for i := 0; i+d < len(xs); i++ {
				v[i] = new(big.Rat).Quo(new(big.Rat).Sub(v[i+1], v[i]), new(big.Rat).Sub(rat(xs[i+d]), rat(xs[i])))
			}
		}
		f, _ := v[0].Float64()
		return f
	}
	pieces := append(append([]float64{-4}, q.knots...), 13)
	for j := range k {
		for i := 1; i < len(pieces); i++ {
			lo, hi := pieces[i-1], pieces[i]
			order := 5 // five points: the fourth divided difference of a cubic is 0
			if i == 1 || i == len(pieces)-1 {
				order = 3 // linear outside
			}
			xs := make([]float64, order)
			for s := range xs {
				xs[s] = lo + (hi-lo)*float64(s)/float64(order-1)
			}
			if d := divided(at(xs...)[j], xs); math.Abs(d) > 1e-24 {
				t.Errorf("column %d between %g and %g: divided difference of order %d is %g", j+1, lo, hi, order-1, d)
			}
		}
		for _, knot := range q.knots {
			// Value, slope and curvature from both sides, by differences with
			// a step whose cubic error is removed exactly in each piece.
			for d := 0; d <= 2; d++ {
				side := func(sign float64) float64 {
					const h = 1.0 / 1024
					xs := []float64{knot, knot + sign*h, knot + 2*sign*h, knot + 3*sign*h}
					// Newton's form of the cubic through four points, differentiated at knot.
					c := make([]float64, 4)
					for o := range c {
						c[o] = divided(at(xs[:o+1]...)[j], xs[:o+1])
					}
					u := []float64{0, -sign * h, -2 * sign * h}
					switch d {
					case 0:
						return c[0]
					case 1:
						return c[1] + c[2]*(u[0]+u[1]) + c[3]*(u[0]*u[1]+u[0]*u[2]+u[1]*u[2])
					}
					return 2 * (c[2] + c[3]*(u[0]+u[1]+u[2]))
				}
				l, r := side(-1), side(1)
				// h^-2 amplifies the rounding of c to some 1e-10.
				if math.Abs(l-r) > 1e-9*(1+math.Abs(l)) {
					t.Errorf("column %d at knot %g: derivative %d is %g from the left, %g from the right", j+1, knot, d, l, r)
				}
			}
		}
	}
}

// TestHingeHarmonics compares with plain formulas.
func TestHingeHarmonics(t *testing.T) {
	cols := basisColumns(t, "hinge(x, 2, 5.5) + harmonics(x, 3, 2)", basisX, nil)
	for i, x := range basisX {
		for j, want := range []float64{math.Max(0, x-2), math.Max(0, x-5.5)} {
			if got := cols[j].Hi[i] + cols[j].Lo[i]; digits.Agree(got, want) < 15.5 {
				t.Errorf("hinge %d at %g: %g, want %g", j+1, x, got, want)
			}
		}
		for j := range 2 {
			// cos(2πk(x/3)) by the exact turn in rationals.
			turn := new(big.Rat).Mul(rat(x), big.NewRat(int64(j+1), 3))
			whole := new(big.Int).Quo(turn.Num(), turn.Denom())
			f, _ := turn.Sub(turn, new(big.Rat).SetInt(whole)).Float64()
			for s, want := range []float64{math.Cos(2 * math.Pi * f), math.Sin(2 * math.Pi * f)} {
				c := cols[2+2*j+s]
				if got := c.Hi[i] + c.Lo[i]; math.Abs(got-want) > 8e-16 {
					t.Errorf("harmonic %d.%d at %g: %g, want %g", j+1, s, x, got, want)
				}
			}
		}
	}
}

// TestHarmonicsFar: a whole number of periods away the columns repeat, however
// far that is.
func TestHarmonicsFar(t *testing.T) {
	near := basisColumns(t, "harmonics(x, 24, 3)", []float64{1, 2, 5, 7, 11, 13, 17, 20}, nil)
	far := basisColumns(t, "harmonics(x, 24, 3)", []float64{24e12 + 1, 24e12 + 2, 24e12 + 5, 24e12 + 7, 24e12 + 11, 24e12 + 13, 24e12 + 17, 24e12 + 20}, nil)
	for j := range near {
		for i := range near[j].Hi {
			a, b := near[j].Hi[i]+near[j].Lo[i], far[j].Hi[i]+far[j].Lo[i]
			if math.Abs(a-b) > 4e-16 {
				t.Errorf("column %d row %d: %g near, %g far", j, i, a, b)
			}
		}
	}
}
