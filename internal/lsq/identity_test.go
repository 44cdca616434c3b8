package lsq

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"reflect"
	"testing"
)

// planted makes a whole-number design in which some columns are combinations
// of earlier independent ones; coefs[j] is nil for independent columns.
func planted(rng *rand.Rand, fractions bool) (pr *Problem, coefs [][]float64) {
	p := 2 + rng.IntN(7)
	n := p + 2 + rng.IntN(30)
	pr = &Problem{N: n, P: p, X: make([]float64, n*p)}
	coefs = make([][]float64, p)
	var independent []int
	for j := range p {
		col := pr.X[j*n : (j+1)*n]
		if rng.IntN(3) > 0 || j == 0 {
			independent = append(independent, j)
			for i := range col {
				// Multiples of 27720 have exact fractions with denominators to 12.
				col[i] = float64(27720 * (rng.IntN(199) - 99))
			}
			continue
		}
		c := make([]float64, p)
		num := make([]float64, p)
		den := make([]float64, p)
		for _, i := range independent {
			if rng.IntN(2) == 0 {
				continue
			}
			num[i], den[i] = float64(rng.IntN(11)-5), 1
			if fractions {
				den[i] = float64(1 + rng.IntN(12))
			}
			c[i] = num[i] / den[i]
			for r := range col {
				col[r] += pr.X[i*n+r] / den[i] * num[i]
			}
		}
		coefs[j] = c
	}
	return pr, coefs
}

func TestPlantedIdentities(t *testing.T) {
	for seed := range uint64(200) {
		rng := rand.New(rand.NewPCG(seed, 9))
		pr, coefs := planted(rng, seed%2 == 1)
		var want []Identity
		for j, c := range coefs {
			if c != nil {
				want = append(want, Identity{Column: j, Coefs: c, Exact: true})
			}
		}
		got := Identities(pr)
		if len(got) != len(want) {
			t.Errorf("seed %d: %d identities, want %d", seed, len(got), len(want))
			continue
		}
		for i := range want {
			if !reflect.DeepEqual(got[i], want[i]) {
				t.Errorf("seed %d: identity %+v, want %+v", seed, got[i], want[i])
			}
		}
	}
}

// Powers of two as column units change coefficients by powers of two and
// nothing else; other units change the coefficients accordingly.
func TestIdentitiesUnderScaling(t *testing.T) {
	for seed := range uint64(100) {
		rng := rand.New(rand.NewPCG(seed, 10))
		pr, coefs := planted(rng, false)
		n := pr.N
		scale := make([]float64, pr.P)
		for j := range scale {
			scale[j] = math.Ldexp(1, rng.IntN(121)-60)
			for i := range n {
				pr.X[j*n+i] *= scale[j]
			}
		}
		at := 0
		got := Identities(pr)
		for j, c := range coefs {
			if c == nil {
				continue
			}
			if at >= len(got) || got[at].Column != j || !got[at].Exact {
				t.Fatalf("seed %d: identities %+v, want an exact one for column %d", seed, got, j)
			}
			for i := range c {
				if want := c[i] * scale[j] / scale[i]; got[at].Coefs[i] != want {
					t.Errorf("seed %d: column %d: coefficient %d = %g, want %g", seed, j, i, got[at].Coefs[i], want)
				}
			}
			at++
		}
	}
}

// A column in a unit of 1e-18 is as good as any other; one that is a decimal
// combination is found, and not called exact.
func TestIdentitiesDecimalAndTiny(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 11))
	pr := randomProblem(3, 50, 4)
	n := pr.N
	for i := range n {
		pr.X[n+i] *= 1e-18
		pr.X[3*n+i] = 0.123456789*pr.X[i] + math.Pi*1e18*pr.X[n+i]
	}
	got := Identities(pr)
	if len(got) != 1 || got[0].Column != 3 || got[0].Exact {
		t.Fatalf("identities %+v, want one for column 3, not exact", got)
	}
	for i, want := range []float64{0.123456789, math.Pi * 1e18, 0, 0} {
		if d := math.Abs(got[0].Coefs[i] - want); d > 1e-14*math.Abs(want) {
			t.Errorf("coefficient %d = %.17g, want %.17g", i, got[0].Coefs[i], want)
		}
	}
	for j := range 3 {
		for i := range n {
			pr.X[j*n+i] = rng.NormFloat64() * []float64{1e-18, 1e18, 1}[j]
		}
	}
	for i := range n {
		pr.X[3*n+i] = rng.NormFloat64() * 1e-30
	}
	if got := Identities(pr); len(got) != 0 {
		t.Errorf("independent columns of extreme units: %+v", got)
	}
}

func TestIdentityOfZeroColumn(t *testing.T) {
	pr := &Problem{N: 3, P: 3, X: []float64{0, 0, 0, 1, 2, 3, 2, 4, 6}}
	want := []Identity{
		{Column: 0, Coefs: []float64{0, 0, 0}, Exact: true},
		{Column: 2, Coefs: []float64{0, 2, 0}, Exact: true},
	}
	if got := Identities(pr); !reflect.DeepEqual(got, want) {
		t.Errorf("identities %+v, want %+v", got, want)
	}
}

// Fewer rows than columns: the first n independent columns carry the rest.
func TestIdentitiesOfWideProblem(t *testing.T) {
	pr := &Problem{N: 2, P: 4, X: []float64{1, 0, 1, 1, 3, 2, 0, 5}}
	want := []Identity{
		{Column: 2, Coefs: []float64{1, 2, 0, 0}, Exact: true},
		{Column: 3, Coefs: []float64{-5, 5, 0, 0}, Exact: true},
	}
	if got := Identities(pr); !reflect.DeepEqual(got, want) {
		t.Errorf("identities %+v, want %+v", got, want)
	}
}

// X v = 0 in rational arithmetic, up to the rounding of v to float64.
func TestNullVectors(t *testing.T) {
	for seed := range uint64(200) {
		rng := rand.New(rand.NewPCG(seed, 12))
		pr, coefs := planted(rng, seed%2 == 1)
		dependent := 0
		for _, c := range coefs {
			if c != nil {
				dependent++
			}
		}
		f := Factorize(pr, nil)
		null := f.NullVectors()
		if len(null) != dependent || f.Rank() != pr.P-dependent {
			t.Errorf("seed %d: %d null vectors, rank %d of %d; want %d", seed, len(null), f.Rank(), pr.P, dependent)
			continue
		}
		x, _ := exactRows(pr)
		for q, v := range null {
			if j := f.Perm()[f.Rank()+q]; v[j] != 1 {
				t.Errorf("seed %d: element %d is %g, want 1", seed, j, v[j])
			}
			for i, row := range x {
				sum, size := new(big.Rat), new(big.Rat)
				for j, a := range row {
					term := new(big.Rat).Mul(a, rat(v[j], 0))
					sum.Add(sum, term)
					size.Add(size, term.Abs(term))
				}
				if size.Sign() == 0 {
					continue
				}
				if r, _ := sum.Quo(sum, size).Float64(); math.Abs(r) > 0x1p-53 {
					t.Errorf("seed %d: row %d of X v is %.2g of its addends", seed, i, r)
				}
			}
		}
	}
}

func TestNearFraction(t *testing.T) {
	for d := 1; d <= 12; d++ {
		for n := -30; n <= 30; n++ {
			if n == 0 {
				continue
			}
			b := float64(n) / float64(d)
			c, ok := nearFraction(b, 1e-9)
			want := big.NewRat(int64(n), int64(d))
			if !ok || agree(c.Hi, c.Lo, want) < 16 {
				t.Errorf("%d/%d: %v, %v", n, d, c, ok)
			}
		}
	}
	for _, b := range []float64{math.Pi, math.Sqrt2, 0.123456789, 1.0 / 13, 1e-20 * math.E} {
		if c, ok := nearFraction(b, 1e-9*b); ok {
			t.Errorf("%g taken for %v", b, c)
		}
	}
	for _, k := range []int{-60, -30, 30, 60} {
		if c, ok := nearFraction(math.Ldexp(5.0/3, k), 1e-9*math.Ldexp(1, k)); !ok || c.Hi != math.Ldexp(5.0/3, k) {
			t.Errorf("5/3·2^%d: %v, %v", k, c, ok)
		}
	}
}

func BenchmarkIdentities(b *testing.B) {
	for _, s := range []struct{ n, p int }{{30, 4}, {10_000, 20}} {
		pr := randomProblem(1, s.n, s.p)
		for i := range s.n {
			pr.X[(s.p-1)*s.n+i] = pr.X[i] - 2*pr.X[s.n+i]
		}
		b.Run(fmt.Sprintf("n=%d/p=%d", s.n, s.p), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if len(Identities(pr)) != 1 {
					b.Fatal("not found")
				}
			}
		})
	}
}

// A coefficient near a fraction is not that fraction.
func TestNearlyFraction(t *testing.T) {
	pr := randomProblem(6, 40, 3)
	n := pr.N
	const c = 0.5 + 1e-10
	for i := range n {
		pr.X[2*n+i] = c*pr.X[i] + pr.X[n+i]
	}
	got := Identities(pr)
	if len(got) != 1 || got[0].Exact || math.Abs(got[0].Coefs[0]-c) > 1e-15 || math.Abs(got[0].Coefs[1]-1) > 1e-15 {
		t.Errorf("identities %+v, want %g and 1, not exact", got, c)
	}
}

// A small addend leaves room for several fractions; the right one is found.
func TestFractionOfSmallAddend(t *testing.T) {
	pr := integerProblem(rand.New(rand.NewPCG(1, 21)), 40, 3)
	n := pr.N
	for i := range n {
		pr.X[n+i] = math.Ldexp(7*pr.X[n+i], -12)
		pr.X[2*n+i] = 1e6*pr.X[i] + pr.X[n+i]/7*2
	}
	want := []Identity{{Column: 2, Coefs: []float64{1e6, 2.0 / 7, 0}, Exact: true}}
	if got := Identities(pr); !reflect.DeepEqual(got, want) {
		t.Errorf("identities %+v, want %+v", got, want)
	}
}

// W. Kahan's matrix ("Numerical linear algebra", Canad. Math. Bull. 9 (1966)
// 757-801) keeps its last pivot far above its smallest singular value, which
// the reverse order of columns shows. The verdict of the pivoting stands: one
// planted copy is one identity, in any order.
func TestIdentitiesOfKahanMatrix(t *testing.T) {
	const n, c = 30, 0.9
	s := math.Sqrt(1 - c*c)
	pr := &Problem{N: n, P: n + 1, X: make([]float64, n*(n+1))}
	for j := range n {
		at := (n - j) % n // reverse order but for the first, which all ties favour
		col := pr.X[at*n : (at+1)*n]
		for i := range j {
			col[i] = -c * math.Pow(s, float64(i))
		}
		col[j] = 1.001 * math.Pow(s, float64(j)) // breaks ties in favour of j
	}
	copy(pr.X[n*n:], pr.X[3*n:4*n])
	f := Factorize(pr, nil)
	if f.Rank() != n {
		t.Fatalf("rank %d, want %d; pivots %v", f.Rank(), n, f.Pivots())
	}
	got := Identities(pr)
	if len(got) != 1 {
		t.Fatalf("%d identities, want 1", len(got))
	}
	if id := got[0]; id.Column != n || id.Coefs[3] != 1 || !id.Exact {
		t.Errorf("identity %+v, want column 3", id)
	}
}
