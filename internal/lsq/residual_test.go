package lsq

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"example.com/trammel/internal/dd"
	"gonum.org/v1/gonum/floats"
)

// The kernels against rationals, with cancellation: as good as twice the
// working precision, relative to the sum of the addends' sizes.
func TestKernels(t *testing.T) {
	const allowed = 0x1p-98 // about n²·2^-106 in the worst case, far less as a rule
	rng := rand.New(rand.NewPCG(1, 17))
	for round := range 200 {
		n := rng.IntN(40)
		draw := func() []float64 {
			v := make([]float64, n)
			for i := range v {
				v[i] = math.Ldexp(rng.NormFloat64(), rng.IntN(20)-10)
			}
			return v
		}
		low := func(v []float64) []float64 {
			l := make([]float64, n)
			for i := range l {
				l[i] = v[i] * 0x1p-54 * (2*rng.Float64() - 1)
			}
			return l
		}
		a, b, r := draw(), draw(), draw()
		rlo := low(r)
		want := func(col []float64) (sum, size *big.Rat) {
			sum, size = new(big.Rat), new(big.Rat)
			for i := range col {
				v := new(big.Rat).Mul(rat(col[i], 0), rat(r[i], rlo[i]))
				sum.Add(sum, v)
				size.Add(size, v.Abs(v))
			}
			return sum, size
		}
		check := func(what string, hi, lo float64, sum, size *big.Rat) {
			t.Helper()
			if size.Sign() == 0 {
				if hi != 0 || lo != 0 {
					t.Errorf("%s = %g + %g, want 0", what, hi, lo)
				}
				return
			}
			d := new(big.Rat).Sub(rat(hi, lo), sum)
			if e, _ := d.Quo(d, size).Float64(); math.Abs(e) > allowed {
				t.Errorf("round %d: %s is off by %.2g of its addends", round, what, e)
			}
		}
		sa, za := want(a)
		sb, zb := want(b)
		hi, lo := dot2(a, r, rlo)
		check("dot2", hi, lo, sa, za)
		ah, al, bh, bl := dots2(a, b, r, rlo)
		check("dots2, first", ah, al, sa, za)
		check("dots2, second", bh, bl, sb, zb)

		x, y := rng.NormFloat64(), rng.NormFloat64()
		xlo, ylo := x*0x1p-55, -y*0x1p-56
		one := func() ([]float64, []float64) {
			h, l := make([]float64, n), make([]float64, n)
			copy(h, r)
			copy(l, rlo)
			return h, l
		}
		h1, l1 := one()
		subtractColumn(h1, l1, a, x, xlo)
		h2, l2 := one()
		subtractColumns2(h2, l2, a, b, x, xlo, y, ylo)
		for i := range n {
			start := rat(r[i], rlo[i])
			px := new(big.Rat).Mul(rat(a[i], 0), rat(x, xlo))
			py := new(big.Rat).Mul(rat(b[i], 0), rat(y, ylo))
			size := new(big.Rat).Abs(start)
			size.Add(size, new(big.Rat).Abs(px))
			sum := new(big.Rat).Sub(start, px)
			check(fmt.Sprint("subtractColumn ", i), h1[i], l1[i], sum, size)
			sum = new(big.Rat).Sub(sum, py)
			size = new(big.Rat).Add(size, new(big.Rat).Abs(py))
			check(fmt.Sprint("subtractColumns2 ", i), h2[i], l2[i], sum, size)
		}
	}
}

// One evaluation of the augmented residuals, low parts of everything
// included, against rationals; 300 rows make two blocks.
func TestAugmented(t *testing.T) {
	for _, p := range []int{1, 2, 5} {
		const n = 300
		rng := rand.New(rand.NewPCG(uint64(p), 18))
		pr := &Problem{N: n, P: p, X: make([]float64, n*p), XLo: make([]float64, n*p)}
		pair := func() (float64, float64) {
			v := dd.Of(rng.NormFloat64()).Div(dd.Of(3))
			return v.Hi, v.Lo
		}
		fill := func(hi, lo []float64) {
			for i := range hi {
				hi[i], lo[i] = pair()
			}
		}
		fill(pr.X, pr.XLo)
		f := Factorize(pr, nil)
		y, ylo, r, rlo := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
		fill(y, ylo)
		fill(r, rlo)
		fill(f.x, f.xlo)
		f.side = side{y, ylo, 1, r, rlo}
		f.augmented()
		g := make([]*big.Rat, p)
		for q := range g {
			g[q] = new(big.Rat)
		}
		for i := range n {
			v := new(big.Rat).Sub(rat(y[i], ylo[i]), rat(r[i], rlo[i]))
			for q := range p {
				j := f.perm[q]
				a := rat(pr.X[j*n+i], pr.XLo[j*n+i])
				a.Mul(a, rat(f.scale[j], 0))
				v.Sub(v, new(big.Rat).Mul(a, rat(f.x[q], f.xlo[q])))
				g[q].Sub(g[q], a.Mul(a, rat(r[i], rlo[i])))
			}
			if d := agree(f.f[i], 0, v); d < 15.5 {
				t.Fatalf("p=%d: residual %d: %.1f digits", p, i, d)
			}
		}
		for q := range g {
			if d := agree(f.g[q], 0, g[q]); d < 15.5 {
				t.Errorf("p=%d: X'r %d: %.1f digits", p, q, d)
			}
		}
	}
}

// Leaves and root together are an orthogonal transformation: there and back
// changes nothing, and the residual part of a column of X is nothing.
func TestRotations(t *testing.T) {
	pr := randomProblem(4, 30_000, 6)
	f := Factorize(pr, nil)
	if f.leaves.count < fewestLeaves {
		t.Fatal("the test no longer reaches the leaves")
	}
	// Reflections err relative to the norm of the whole vector, by a few units.
	allowed := 1e-15 * floats.Norm(pr.Y, 2)
	copy(f.f, pr.Y)
	f.rotate()
	f.rotateBack()
	for i, v := range pr.Y {
		if math.Abs(f.f[i]-v) > allowed {
			t.Fatalf("element %d came back as %.17g, was %.17g", i, f.f[i], v)
		}
	}
	for q := range pr.P {
		j := f.perm[q]
		scaleTo(f.f, pr.X[j*pr.N:(j+1)*pr.N], f.scale[j])
		top := f.rotate()
		for i := range top {
			want := 0.0
			if i <= q {
				want = f.root[q*f.m+i]
			}
			if math.Abs(top[i]-want) > 1e-14 {
				t.Fatalf("column %d, element %d of Q'A is %g, want %g", q, i, top[i], want)
			}
		}
	}
}
