package lsq

import (
	"fmt"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// randomProblem has an intercept and normal columns; y follows a line with
// unit noise.
func randomProblem(seed uint64, n, p int) *Problem {
	rng := rand.New(rand.NewPCG(seed, 1))
	pr := &Problem{N: n, P: p, X: make([]float64, n*p), Y: make([]float64, n)}
	for j := range p {
		for i := range n {
			pr.X[j*n+i] = rng.NormFloat64()
			if j == 0 {
				pr.X[j*n+i] = 1
			}
		}
	}
	for i := range n {
		pr.Y[i] = rng.NormFloat64()
		for j := range p {
			pr.Y[i] += pr.X[j*n+i] * float64(j+1)
		}
	}
	return pr
}

var benchSizes = []struct{ n, p int }{{30, 4}, {1000, 10}, {100_000, 20}, {2000, 300}, {4000, 1000}}

func BenchmarkFit(b *testing.B) {
	for _, s := range benchSizes {
		pr := randomProblem(1, s.n, s.p)
		name := fmt.Sprintf("n=%d/p=%d", s.n, s.p)
		b.Run(name+"/fresh", func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				var sol Solution
				f := Factorize(pr, nil)
				f.Solve(pr.Y, nil, &sol)
				f.InverseDiag(nil)
			}
		})
		b.Run(name+"/reused", func(b *testing.B) {
			var ws Workspace
			var sol Solution
			var d []float64
			b.ReportAllocs()
			for b.Loop() {
				f := Factorize(pr, &ws)
				f.Solve(pr.Y, nil, &sol)
				d = f.InverseDiag(d)
			}
		})
		b.Run(name+"/workers=2", func(b *testing.B) {
			two := *pr
			two.Workers = 2
			var ws Workspace
			var sol Solution
			var d []float64
			for b.Loop() {
				f := Factorize(&two, &ws)
				f.Solve(pr.Y, nil, &sol)
				d = f.InverseDiag(d)
			}
		})
		b.Run(name+"/baseline", func(b *testing.B) {
			// gonum's QR: estimates only, no refinement.
			x := mat.NewDense(s.n, s.p, nil)
			for j := range s.p {
				x.SetCol(j, pr.X[j*s.n:(j+1)*s.n])
			}
			y := mat.NewVecDense(s.n, pr.Y)
			b.ReportAllocs()
			for b.Loop() {
				var qr mat.QR
				var beta mat.VecDense
				qr.Factorize(x)
				if err := qr.SolveVecTo(&beta, false, y); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkParts(b *testing.B) {
	for _, s := range benchSizes {
		pr := randomProblem(1, s.n, s.p)
		name := fmt.Sprintf("n=%d/p=%d", s.n, s.p)
		var ws Workspace
		b.Run(name+"/factorize", func(b *testing.B) {
			for b.Loop() {
				Factorize(pr, &ws)
			}
		})
		f := Factorize(pr, &ws)
		var sol Solution
		b.Run(name+"/solve", func(b *testing.B) {
			for b.Loop() {
				f.Solve(pr.Y, nil, &sol)
			}
		})
		f.side = side{pr.Y, nil, 1, sol.R, sol.RLo}
		b.Run(name+"/residuals", func(b *testing.B) {
			b.SetBytes(int64(8 * s.n * s.p))
			for b.Loop() {
				f.augmented()
			}
		})
		b.Run(name+"/read", func(b *testing.B) {
			// What the memory allows: reading X once.
			b.SetBytes(int64(8 * s.n * s.p))
			for b.Loop() {
				floats.Sum(pr.X)
			}
		})
		b.Run(name+"/whiten", func(b *testing.B) {
			for b.Loop() {
				f.white = whitened{}
				f.whiten()
			}
		})
		b.Run(name+"/gram", func(b *testing.B) {
			w := f.whiten()
			plain := w.plain
			w.plain = false
			for b.Loop() {
				f.gram()
			}
			w.plain = plain
		})
		h := make([]float64, s.n)
		b.Run(name+"/leverages", func(b *testing.B) {
			for b.Loop() {
				f.LeveragesTo(h)
			}
		})
	}
}
