package lsq

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"example.com/trammel/internal/dd"
)

// checkFit compares everything a Factor can tell with exact rationals.
func checkFit(t *testing.T, p *Problem, need float64) {
	t.Helper()
	x, y := exactRows(p)
	want := exactLS(t, x, y, nil)
	f := Factorize(p, nil)
	if f.Rank() != p.P {
		t.Fatalf("rank %d, want %d; pivots %v", f.Rank(), p.P, f.Pivots())
	}
	var s Solution
	f.Solve(p.Y, p.YLo, &s)
	// Components far below the others, relative to their columns, are held to
	// the size that the largest gives them.
	for j := range p.P {
		atLeast(t, need, fmt.Sprint("estimate ", j), s.B[j], s.BLo[j], want.b[j])
		if s.B[j] != 0 && math.Abs(s.BLo[j]) > math.Abs(s.B[j])*0x1p-53 {
			t.Errorf("estimate %d: the parts %g, %g overlap", j, s.B[j], s.BLo[j])
		}
	}
	for i := range p.N {
		// Residuals keep the accuracy of y - X b relative to the largest of them.
		scale := new(big.Rat).SetFloat64(math.Sqrt(s.RSS.Float()))
		if scale.Sign() == 0 {
			atLeast(t, 16, fmt.Sprint("residual ", i), s.R[i], s.RLo[i], want.r[i])
			continue
		}
		d := new(big.Rat).Sub(rat(s.R[i], s.RLo[i]), want.r[i])
		rel, _ := d.Quo(d, scale).Float64()
		if math.Abs(rel) > 1e-15 {
			t.Errorf("residual %d is off by %.2g of the residual norm", i, rel)
		}
	}
	t.Logf("condition %.2g, %d passes, last pivot %.2g", f.Condition(), s.Passes, f.Pivots()[p.P-1])
	// Refinement stops once the next correction would be below 2^-57, and that
	// one falls on top of an error already squared: the sum of squares keeps
	// three digits more than a float64 holds, for differences with others.
	if want.rss.Sign() != 0 {
		q := new(big.Rat).Quo(rat(s.RSS.Hi, s.RSS.Lo), want.rss)
		if e, _ := q.Sub(q, big.NewRat(1, 1)).Float64(); math.Abs(e) > 1e-19 {
			t.Errorf("residual SS is off by %.2g of itself", e)
		}
	}
	diag, root, inv := f.InverseDiag(nil), f.InverseRootDiag(nil), f.Inverse(nil)
	for i := range p.P {
		atLeast(t, 14, fmt.Sprint("inverse diagonal ", i), diag[i], 0, want.inverse[i][i])
		atLeast(t, 14, fmt.Sprint("its root, squared ", i), root[i]*root[i], 0, want.inverse[i][i])
		for j := range p.P {
			if inv[i*p.P+j] != inv[j*p.P+i] {
				t.Errorf("inverse not symmetric at %d, %d", i, j)
			}
			w, _ := want.inverse[i][j].Float64()
			if e := math.Abs(inv[i*p.P+j]-w) / (root[i] * root[j]); !(e < 1e-14) {
				t.Errorf("inverse %d,%d = %.17g, want %.17g (off by %.2g of the diagonal's mean)", i, j, inv[i*p.P+j], w, e)
			}
		}
	}
	h := make([]float64, p.N)
	f.LeveragesTo(h)
	row, rowLo := make([]float64, p.P), make([]float64, p.P)
	scratch := make([]float64, f.QuadScratch())
	for i := range p.N {
		q := want.quad(x[i])
		atLeast(t, 13.5, fmt.Sprint("leverage ", i), h[i], 0, q)
		for j := range p.P {
			row[j] = p.X[j*p.N+i]
			if p.XLo != nil {
				rowLo[j] = p.XLo[j*p.N+i]
			}
		}
		atLeast(t, 13.5, fmt.Sprint("quadratic form ", i), f.QuadForm(row, rowLo, scratch), 0, q)
	}
}

// integerProblem has small whole numbers as entries, so everything about it
// is exact.
func integerProblem(rng *rand.Rand, n, p int) *Problem {
	pr := &Problem{N: n, P: p, X: make([]float64, n*p), Y: make([]float64, n)}
	for i := range pr.X {
		pr.X[i] = float64(rng.IntN(19) - 9)
	}
	for i := range pr.Y {
		pr.Y[i] = float64(rng.IntN(199) - 99)
	}
	return pr
}

func TestAgainstRationals(t *testing.T) {
	for seed := range uint64(60) {
		rng := rand.New(rand.NewPCG(seed, 2))
		p := 1 + rng.IntN(6)
		n := p + rng.IntN(12)
		t.Run(fmt.Sprintf("seed=%d/n=%d/p=%d", seed, n, p), func(t *testing.T) {
			pr := integerProblem(rng, n, p)
			if Factorize(pr, nil).Rank() < p {
				t.Skip("a singular draw; dependencies have tests of their own")
			}
			checkFit(t, pr, 15)
		})
	}
}

func TestExtremeScales(t *testing.T) {
	for seed := range uint64(40) {
		rng := rand.New(rand.NewPCG(seed, 3))
		pr := integerProblem(rng, 12, 4)
		if Factorize(pr, nil).Rank() < 4 {
			continue
		}
		scales := []float64{1e-18, 1e18, 1, 1e-150, 3e140, 1e-5}
		for j := range pr.P {
			s := scales[rng.IntN(len(scales))]
			for i := range pr.N {
				pr.X[j*pr.N+i] *= s
			}
		}
		s := scales[rng.IntN(len(scales))]
		for i := range pr.Y {
			pr.Y[i] *= s
		}
		t.Run(fmt.Sprint("seed=", seed), func(t *testing.T) {
			if s == 1e-150 || s == 3e140 {
				// The sum of squares leaves float64; estimates must not.
				x, y := exactRows(pr)
				want := exactLS(t, x, y, nil)
				var sol Solution
				Factorize(pr, nil).Solve(pr.Y, nil, &sol)
				for j := range pr.P {
					atLeast(t, 15, fmt.Sprint("estimate ", j), sol.B[j], 0, want.b[j])
				}
				return
			}
			for j := range pr.P {
				if m, _ := powerScale(pr.X[j*pr.N : (j+1)*pr.N]); m > 1e100 || m < 1e-100 {
					// The inverse leaves float64, its roots and the leverages do not.
					checkRoots(t, pr)
					return
				}
			}
			checkFit(t, pr, 15)
		})
	}
}

// checkRoots compares what stays representable at extreme scales.
func checkRoots(t *testing.T, p *Problem) {
	t.Helper()
	x, y := exactRows(p)
	want := exactLS(t, x, y, nil)
	f := Factorize(p, nil)
	var s Solution
	f.Solve(p.Y, nil, &s)
	root := f.InverseRootDiag(nil)
	for j := range p.P {
		atLeast(t, 15, fmt.Sprint("estimate ", j), s.B[j], s.BLo[j], want.b[j])
		r := rat(root[j], 0)
		q, _ := r.Mul(r, r).Quo(r, want.inverse[j][j]).Float64()
		if math.Abs(q-1) > 1e-14 {
			t.Errorf("root of inverse diagonal %d: its square is %g times the exact one", j, q)
		}
	}
	h := make([]float64, p.N)
	f.LeveragesTo(h)
	for i := range p.N {
		atLeast(t, 13.5, fmt.Sprint("leverage ", i), h[i], 0, want.quad(x[i]))
	}
}

// Columns at the very ends of float64 are stored scaled; the answer for
// powers of two is known from the unscaled problem.
func TestFarColumns(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 4))
	pr := integerProblem(rng, 15, 4)
	var plain, far Solution
	Factorize(pr, nil).Solve(pr.Y, nil, &plain)
	moved := &Problem{N: pr.N, P: pr.P, X: append([]float64(nil), pr.X...), XLo: make([]float64, len(pr.X)), Y: pr.Y}
	exps := []int{-1040, 1015, 0, -700}
	for j, e := range exps {
		for i := range pr.N {
			moved.X[j*pr.N+i] = math.Ldexp(moved.X[j*pr.N+i], e)
		}
	}
	f := Factorize(moved, nil)
	if f.Rank() != 4 {
		t.Fatalf("rank %d; pivots %v", f.Rank(), f.Pivots())
	}
	f.Solve(pr.Y, nil, &far)
	for j, e := range exps {
		if want := math.Ldexp(plain.B[j], -e); far.B[j] != want && !math.IsInf(want, 0) {
			t.Errorf("estimate %d = %.17g, want %.17g", j, far.B[j], want)
		}
	}
	for i := range pr.N {
		if far.R[i] != plain.R[i] {
			t.Errorf("residual %d = %.17g, want %.17g", i, far.R[i], plain.R[i])
		}
	}
}

// Nearly dependent columns, conditions 1e3 to 1e12, against rationals.
func TestIllConditioned(t *testing.T) {
	for _, bits := range []int{3, 10, 20, 30, 36, 40, 42} {
		t.Run(fmt.Sprint("bits=", bits), func(t *testing.T) {
			rng := rand.New(rand.NewPCG(uint64(bits), 5))
			pr := integerProblem(rng, 14, 4)
			n := pr.N
			for i := range n {
				// Whole numbers below 2^53: exact.
				sum := pr.X[i] + 2*pr.X[n+i] - pr.X[2*n+i]
				pr.X[3*n+i] = math.Ldexp(sum, bits) + float64(rng.IntN(19)-9)
			}
			checkFit(t, pr, 15)
		})
	}
}

// Powers of a variable as hi + lo pairs, y as hi + lo.
func TestLowParts(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 6))
	const n, p = 20, 7
	pr := &Problem{N: n, P: p, X: make([]float64, n*p), XLo: make([]float64, n*p), Y: make([]float64, n), YLo: make([]float64, n)}
	for i := range n {
		x := 3 + rng.Float64()
		for j := range p {
			v := dd.Of(x).PowInt(j)
			pr.X[j*n+i], pr.XLo[j*n+i] = v.Hi, v.Lo
		}
		y := dd.Of(rng.NormFloat64()).Div(dd.Of(3))
		pr.Y[i], pr.YLo[i] = y.Hi, y.Lo
	}
	checkFit(t, pr, 15)
}

// Rows multiplied by √w in double-double must give the weighted fit for w.
func TestWeights(t *testing.T) {
	for seed := range uint64(20) {
		rng := rand.New(rand.NewPCG(seed, 7))
		pr := integerProblem(rng, 16, 4)
		if Factorize(pr, nil).Rank() < 4 {
			continue
		}
		x, y := exactRows(pr)
		w := make([]*big.Rat, pr.N)
		wt := &Problem{N: pr.N, P: pr.P, X: make([]float64, len(pr.X)), XLo: make([]float64, len(pr.X)),
			Y: make([]float64, pr.N), YLo: make([]float64, pr.N)}
		for i := range pr.N {
			v := rng.ExpFloat64() * math.Pow(10, float64(rng.IntN(7)-3))
			if rng.IntN(5) == 0 {
				v = 0
			}
			w[i] = rat(v, 0)
			root := dd.Of(v).Sqrt()
			for j := range pr.P {
				q := root.MulF(pr.X[j*pr.N+i])
				wt.X[j*pr.N+i], wt.XLo[j*pr.N+i] = q.Hi, q.Lo
			}
			q := root.MulF(pr.Y[i])
			wt.Y[i], wt.YLo[i] = q.Hi, q.Lo
		}
		want := exactLS(t, x, y, w)
		f := Factorize(wt, nil)
		var s Solution
		f.Solve(wt.Y, wt.YLo, &s)
		diag := f.InverseDiag(nil)
		for j := range pr.P {
			atLeast(t, 15, fmt.Sprintf("seed %d: estimate %d", seed, j), s.B[j], s.BLo[j], want.b[j])
			atLeast(t, 14, fmt.Sprintf("seed %d: inverse %d", seed, j), diag[j], 0, want.inverse[j][j])
		}
		atLeast(t, 15, fmt.Sprintf("seed %d: residual SS", seed), s.RSS.Hi, s.RSS.Lo, want.rss)
	}
}

// Built backwards: y = X b for a chosen b, without rounding. The answer is b
// itself, zeros included, and nothing remains.
func TestExactZeroResidual(t *testing.T) {
	for seed := range uint64(100) {
		rng := rand.New(rand.NewPCG(seed, 8))
		p := 1 + rng.IntN(7)
		n := p + rng.IntN(30)
		pr := integerProblem(rng, n, p)
		if Factorize(pr, nil).Rank() < p {
			continue
		}
		b := make([]float64, p)
		clear(pr.Y)
		for j := range b {
			b[j] = math.Ldexp(float64(rng.IntN(7)-3), rng.IntN(9)-4)
			for i := range n {
				pr.Y[i] += b[j] * pr.X[j*n+i]
			}
		}
		var s Solution
		Factorize(pr, nil).Solve(pr.Y, nil, &s)
		for j := range b {
			if s.B[j] != b[j] || s.BLo[j] != 0 {
				t.Errorf("seed %d: estimate %d = %g + %g, want %g", seed, j, s.B[j], s.BLo[j], b[j])
			}
		}
		for i := range n {
			if s.R[i] != 0 || s.RLo[i] != 0 {
				t.Errorf("seed %d: residual %d = %g + %g, want 0", seed, i, s.R[i], s.RLo[i])
			}
		}
		if s.RSS != (dd.Num{}) {
			t.Errorf("seed %d: residual SS %v, want 0", seed, s.RSS)
		}
	}
}

// Estimates whose addends are 1e-9 of the largest addend keep all digits in an
// ill-conditioned problem, which takes a pass more than the largest estimate
// needs. y is built in hi + lo from whole numbers, the residuals orthogonal
// to X.
func TestSmallComponents(t *testing.T) {
	done := 0
	for seed := range uint64(40) {
		rng := rand.New(rand.NewPCG(seed, 22))
		pr := integerProblem(rng, 10, 3)
		if Factorize(pr, nil).Rank() < 3 {
			continue
		}
		for i := range 10 { // nearly column 0: condition 1e5
			pr.X[20+i] += math.Ldexp(pr.X[i], 14)
		}
		x, y := exactRows(pr)
		r := exactLS(t, x, y, nil).r
		den := big.NewInt(1)
		for _, v := range r {
			den.Mul(den, new(big.Int).Div(v.Denom(), new(big.Int).GCD(nil, nil, den, v.Denom())))
		}
		b := []float64{0x1p30, 2, 3}
		pr.YLo = make([]float64, pr.N)
		whole := true
		for i, v := range r {
			v.Mul(v, new(big.Rat).SetInt(den))
			for j := range b {
				v.Add(v, new(big.Rat).Mul(rat(b[j], 0), x[i][j]))
			}
			pr.Y[i], _ = v.Float64()
			lo, exact := v.Sub(v, rat(pr.Y[i], 0)).Float64()
			pr.YLo[i] = lo
			whole = whole && exact
		}
		if !whole {
			continue
		}
		done++
		var s Solution
		Factorize(pr, nil).Solve(pr.Y, pr.YLo, &s)
		for j, want := range b {
			if s.B[j] != want {
				t.Errorf("seed %d: estimate %d = %.17g, want %g", seed, j, s.B[j], want)
			}
		}
	}
	if done < 20 {
		t.Errorf("only %d draws were usable", done)
	}
}

// In most leaves the second column is so small that its squares underflow.
func TestTinyBlocks(t *testing.T) {
	const n = 70_000
	rng := rand.New(rand.NewPCG(1, 23))
	pr := integerProblem(rng, n, 2)
	rows, leaves := leafPlan(n, 2)
	if leaves < fewestLeaves {
		t.Fatal("the test no longer reaches the leaves")
	}
	for i := range (leaves - 1) * rows {
		pr.X[n+i] *= 3e-160 // about 3e-163 after scaling the column
	}
	x, y := exactRows(pr)
	// Powers that small are beyond the exact answer's patience and without
	// weight in it: 1e-160 of the rest.
	for i := range (leaves - 1) * rows {
		x[i][1].SetInt64(0)
	}
	want := exactLS(t, x, y, nil)
	var s Solution
	Factorize(pr, nil).Solve(pr.Y, nil, &s)
	for j := range 2 {
		atLeast(t, 16, fmt.Sprint("estimate ", j), s.B[j], 0, want.b[j])
	}
	if s.Passes > 1 {
		t.Errorf("%d passes for a well-conditioned problem: the factorisation is not orthogonal", s.Passes)
	}
}
