package lsq

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"example.com/trammel/internal/dd"
	"example.com/trammel/internal/digits"
)

func TestShapes(t *testing.T) {
	one := &Problem{N: 1, P: 1, X: []float64{4}, Y: []float64{2}}
	var s Solution
	f := Factorize(one, nil)
	f.Solve(one.Y, nil, &s)
	if f.Rank() != 1 || s.B[0] != 0.5 || s.RSS.Hi != 0 || f.InverseDiag(nil)[0] != 1.0/16 || f.Condition() != 1 {
		t.Errorf("one row: rank %d, %+v, inverse %v, condition %v", f.Rank(), s, f.InverseDiag(nil), f.Condition())
	}

	none := &Problem{N: 3, P: 0, Y: []float64{1, 2, 2}}
	f = Factorize(none, nil)
	f.Solve(none.Y, nil, &s)
	if f.Rank() != 0 || len(s.B) != 0 || s.RSS.Float() != 9 || !slices.Equal(s.R, none.Y) || f.Condition() != 1 {
		t.Errorf("no columns: rank %d, %+v", f.Rank(), s)
	}
	h := []float64{7, 7, 7}
	f.LeveragesTo(h)
	if !slices.Equal(h, []float64{0, 0, 0}) || len(f.Inverse(nil)) != 0 || f.QuadForm(nil, nil, nil) != 0 {
		t.Errorf("no columns: leverages %v", h)
	}
	if Identities(none) != nil || len(f.NullVectors()) != 0 {
		t.Error("no columns: dependencies found")
	}

	empty := &Problem{N: 0, P: 2}
	f = Factorize(empty, nil)
	f.Solve(nil, nil, &s)
	if f.Rank() != 0 || len(s.R) != 0 || !slices.Equal(s.B, []float64{0, 0}) || s.RSS.Hi != 0 {
		t.Errorf("no rows: rank %d, %+v", f.Rank(), s)
	}
	if ids := Identities(empty); len(ids) != 2 {
		t.Errorf("no rows: %d identities, want 2", len(ids))
	}

	wide := &Problem{N: 2, P: 3, X: []float64{1, 0, 0, 1, 1, 1}}
	if f = Factorize(wide, nil); f.Rank() != 2 || len(f.NullVectors()) != 1 {
		t.Errorf("wide: rank %d", f.Rank())
	}

	zeroY := &Problem{N: 3, P: 1, X: []float64{1, 2, 3}, Y: make([]float64, 3)}
	Factorize(zeroY, nil).Solve(zeroY.Y, nil, &s)
	if s.B[0] != 0 || s.RSS.Hi != 0 || s.R[2] != 0 {
		t.Errorf("y = 0: %+v", s)
	}
}

// A saturated fit, n = p, goes through every point.
func TestSaturated(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 13))
	pr := integerProblem(rng, 6, 6)
	checkFit0(t, pr)
}

// checkFit0 is for exact residuals of zero with estimates that are no floats.
func checkFit0(t *testing.T, p *Problem) {
	t.Helper()
	x, y := exactRows(p)
	want := exactLS(t, x, y, nil)
	var s Solution
	f := Factorize(p, nil)
	f.Solve(p.Y, nil, &s)
	for j := range p.P {
		atLeast(t, 15, fmt.Sprint("estimate ", j), s.B[j], s.BLo[j], want.b[j])
	}
	for i := range p.N {
		if math.Abs(s.R[i]) > 1e-28*math.Abs(p.Y[i]) {
			t.Errorf("residual %d = %g", i, s.R[i])
		}
	}
	h := make([]float64, p.N)
	f.LeveragesTo(h)
	for i, v := range h {
		if math.Abs(v-1) > 1e-14 {
			t.Errorf("leverage %d = %.17g, want 1", i, v)
		}
	}
}

// The verdict on rank, and the pivots themselves, do not change with the
// units of columns.
func TestRankUnderScaling(t *testing.T) {
	for seed := range uint64(100) {
		rng := rand.New(rand.NewPCG(seed, 14))
		pr, coefs := planted(rng, false)
		n := pr.N
		rank := 0
		for _, c := range coefs {
			if c == nil {
				rank++
			}
		}
		// Near dependence on both sides of the tolerance.
		for _, near := range []float64{1e-15, 1e-11} {
			q := &Problem{N: n, P: pr.P + 1, X: append(slices.Clone(pr.X), pr.X[:n]...)}
			wantRank := rank
			if near > Tolerance && n > rank {
				wantRank++
			}
			size := 0.0
			for _, v := range pr.X[:n] {
				size += math.Abs(v) / float64(n)
			}
			for i := range n {
				q.X[pr.P*n+i] += near * size * rng.NormFloat64()
			}
			plain := Factorize(q, nil)
			if near > Tolerance && plain.Rank() != wantRank || near < Tolerance && plain.Rank() != rank {
				t.Errorf("seed %d: near %g: rank %d, want %d", seed, near, plain.Rank(), wantRank)
			}
			pivots := slices.Clone(plain.Pivots())
			for _, s := range []float64{1e-18, 1e18, 3.7e-300, 0x1p-600, 0x1p70} {
				scaled := &Problem{N: n, P: q.P, X: slices.Clone(q.X)}
				for j := range q.P {
					if rng.IntN(2) == 0 {
						continue
					}
					for i := range n {
						scaled.X[j*n+i] *= s
					}
				}
				f := Factorize(scaled, nil)
				if f.Rank() != plain.Rank() {
					t.Errorf("seed %d: near %g: rank %d in other units (%g), %d before", seed, near, f.Rank(), s, plain.Rank())
				}
				for k, v := range f.Pivots()[:f.Rank()] {
					if (s == 0x1p-600 || s == 0x1p70) && v != pivots[k] {
						t.Errorf("seed %d: pivot %d is %g after powers of two, %g before", seed, k, v, pivots[k])
					}
				}
			}
		}
	}
}

// Buffers of an earlier, larger problem must not matter, nor what lies beyond
// the slices handed in.
func TestWorkspaceAndSlack(t *testing.T) {
	var ws Workspace
	var s Solution
	poison := func(x []float64) {
		x = x[:cap(x)]
		for i := range x {
			x[i] = math.NaN()
		}
	}
	for seed := range uint64(60) {
		rng := rand.New(rand.NewPCG(seed, 15))
		p := 1 + rng.IntN(8)
		n := p + rng.IntN(600)
		if seed%10 == 5 {
			p, n = 6, 20_000 // leaves
		}
		pr := integerProblem(rng, n, p)
		if seed%3 == 0 {
			pr = randomProblem(seed, n, p)
			for i := range n { // ill-conditioned, so that every path is taken
				pr.X[(p-1)*n+i] = pr.X[i] + 1e-6*pr.X[(p-1)*n+i]
			}
		}
		var fresh Solution
		f := Factorize(pr, nil)
		f.Solve(pr.Y, nil, &fresh)
		wantInv, wantCond := f.Inverse(nil), f.Condition()
		wantH := make([]float64, n)
		f.LeveragesTo(wantH)

		for _, b := range [][]float64{ws.floats, ws.white, ws.zero, s.B, s.BLo, s.R, s.RLo} {
			poison(b)
		}
		slack := func(x []float64) []float64 {
			return append(slices.Clone(x), math.NaN(), math.NaN())[:len(x)]
		}
		q := &Problem{N: n, P: p, X: slack(pr.X), Y: slack(pr.Y)}
		g := Factorize(q, &ws)
		g.Solve(q.Y, nil, &s)
		if seed%2 == 0 {
			g.Condition() // the order of questions must not matter
		}
		inv := slack(wantInv)
		poison(inv)
		inv = g.Inverse(inv[:len(wantInv)])
		h := slack(wantH)
		g.LeveragesTo(h)
		if !slices.Equal(s.B, fresh.B) || !slices.Equal(s.R, fresh.R) || s.RSS != fresh.RSS || !slices.Equal(h, wantH) ||
			!equalNaN(inv, wantInv) || g.Condition() != wantCond {
			t.Errorf("seed %d: results differ with a used workspace", seed)
		}
		if !math.IsNaN(h[:n+1][n]) || !math.IsNaN(inv[:p*p+1][p*p]) {
			t.Errorf("seed %d: slack written", seed)
		}
	}
}

func equalNaN(a, b []float64) bool {
	return slices.EqualFunc(a, b, func(x, y float64) bool { return x == y || math.IsNaN(x) && math.IsNaN(y) })
}

func TestAllocations(t *testing.T) {
	pr := randomProblem(1, 30, 4)
	if a := testing.AllocsPerRun(100, func() {
		var s Solution
		f := Factorize(pr, nil)
		f.Solve(pr.Y, nil, &s)
		f.InverseDiag(nil)
	}); a > 6 {
		t.Errorf("%g allocations for a fresh 30×4 fit, want at most 6", a)
	}
	f := Factorize(pr, nil)
	f.Prepare()
	row, scratch := []float64{1, 2, 3, 4}, make([]float64, f.QuadScratch())
	if a := testing.AllocsPerRun(100, func() { f.QuadForm(row, nil, scratch) }); a > 0 {
		t.Errorf("%g allocations for a quadratic form, want none", a)
	}
	big := randomProblem(1, 40_000, 4)
	var ws Workspace
	var s Solution
	var d []float64
	run := func() {
		f := Factorize(big, &ws)
		f.Solve(big.Y, nil, &s)
		d = f.InverseDiag(d)
	}
	run()
	if a := testing.AllocsPerRun(3, run); a > 0 {
		t.Errorf("%g allocations with a used workspace, want none", a)
	}
}

// A tall problem takes the path over leaves; sums of whole numbers give the
// exact answer from a problem of p rows.
func TestTall(t *testing.T) {
	const n, p = 40_000, 3
	if _, leaves := leafPlan(n, p); leaves < fewestLeaves {
		t.Fatal("the test no longer reaches the leaves")
	}
	for seed := range uint64(3) {
		rng := rand.New(rand.NewPCG(seed, 16))
		pr := integerProblem(rng, n, p)
		if seed > 0 {
			for i := range n { // sums of like terms, whose errors add up
				pr.X[i] = 1
			}
		}
		if seed == 2 {
			for i := range n { // condition 1e6
				pr.X[2*n+i] = math.Ldexp(pr.X[i]+pr.X[n+i], 20) + pr.X[2*n+i]
			}
		}
		x, y := exactRows(pr)
		want := exactLS(t, x, y, nil)
		f := Factorize(pr, nil)
		var s Solution
		f.Solve(pr.Y, nil, &s)
		diag := f.InverseDiag(nil)
		h := make([]float64, n)
		f.LeveragesTo(h)
		for j := range p {
			atLeast(t, 16, fmt.Sprintf("seed %d: estimate %d", seed, j), s.B[j], 0, want.b[j])
			atLeast(t, 15, fmt.Sprintf("seed %d: inverse %d", seed, j), diag[j], 0, want.inverse[j][j])
		}
		atLeast(t, 16, fmt.Sprintf("seed %d: residual SS", seed), s.RSS.Hi, s.RSS.Lo, want.rss)
		for i := 0; i < n; i += 997 {
			atLeast(t, 14, fmt.Sprintf("seed %d: leverage %d", seed, i), h[i], 0, want.quad(x[i]))
			atLeast(t, 14, fmt.Sprintf("seed %d: residual %d", seed, i), s.R[i], s.RLo[i], want.r[i])
		}
	}
}

// One-way layouts with level indicators: level means and the sum of squares
// within levels, in float64 data of 1e12 with noise in the last digits.
func TestReferenceANOVA(t *testing.T) {
	sets := strdSets(t, "anova")
	if len(sets) != 8 {
		t.Fatalf("%d sets, want 8", len(sets))
	}
	for _, s := range sets {
		t.Run(s.Name, func(t *testing.T) {
			rows := strdRows(t, s.File)
			n, p := len(rows), len(s.Levels)
			pr := &Problem{N: n, P: p, X: make([]float64, n*p), Y: make([]float64, n)}
			for i, row := range rows {
				pr.X[slices.Index(s.Levels, row[0])*n+i] = 1
				pr.Y[i] = number(t, row[1])
			}
			f := Factorize(pr, nil)
			var sol Solution
			f.Solve(pr.Y, nil, &sol)
			need := func(what string, got float64, want string) {
				t.Helper()
				if d := digits.AgreeString(got, want); !(d >= 15) {
					t.Errorf("%s = %.17g, want %s: %.1f digits", what, got, want, d)
				}
			}
			for j, want := range s.Answer.LevelMeans {
				need("mean of level "+s.Levels[j], sol.B[j], want)
			}
			need("SS within", sol.RSS.Float(), s.Answer.Within.SS)
			tss := totalSS(pr.Y, true)
			need("SS between", tss.Sub(sol.RSS).Float(), s.Answer.Between.SS)
			need("R²", dd.Of(1).Sub(sol.RSS.Div(tss)).Float(), s.Answer.R2)
			need("residual sd", math.Sqrt(sol.RSS.Float()/float64(s.DF)), s.Answer.ResidualSD)
		})
	}
}

// The order of pivoting goes by relative norms: units that are no powers of
// two, which leave columns of different norms after scaling, do not change it.
func TestOrderUnderScaling(t *testing.T) {
	for seed := range uint64(50) {
		rng := rand.New(rand.NewPCG(seed, 20))
		pr := randomProblem(seed, 40, 6)
		want := slices.Clone(Factorize(pr, nil).Perm())
		for j := range pr.P {
			s := math.Exp(10 * rng.NormFloat64())
			for i := range pr.N {
				pr.X[j*pr.N+i] *= s
			}
		}
		// The first step finds relative norms of 1 throughout, so rounding
		// chooses the first column; columns that agree there are compared.
		f := Factorize(pr, nil)
		if f.Perm()[0] == want[0] && !slices.Equal(f.Perm(), want) {
			t.Errorf("seed %d: order %v in other units, %v before", seed, f.Perm(), want)
		}
		if want[0] != 0 {
			t.Errorf("seed %d: %d came first among columns of equal rank", seed, want[0])
		}
	}
}

// Remaining norms that are only downdated lose all digits when columns nearly
// cancel; the order of the last pivots shows it.
func TestDowndating(t *testing.T) {
	const n = 40
	pr := randomProblem(5, n, 5)
	base := slices.Clone(pr.X[:2*n])
	// Three copies of combinations, apart by 1e-10, 1e-9 and 1e-8.
	for j, near := range []float64{1e-10, 1e-9, 1e-8} {
		for i := range n {
			pr.X[(j+2)*n+i] = base[i] + base[n+i] + near*pr.X[(j+2)*n+i]
		}
	}
	f := Factorize(pr, nil)
	if f.Rank() != 5 {
		t.Fatalf("rank %d, pivots %v", f.Rank(), f.Pivots())
	}
	if p := f.Pivots(); !(p[2] > 1e-9 && p[3] < 3e-9 && p[3] > 1e-10 && p[4] < 3e-10) {
		t.Errorf("pivots %v, order %v", p, f.Perm())
	}
}
