package lsq

import (
	"fmt"
	"slices"
	"testing"
)

// The number of workers must not show, not even in the last bit.
func TestWorkers(t *testing.T) {
	for _, s := range []struct{ n, p int }{{60_000, 5}, {20_000, 12}, {1500, 90}} {
		pr := randomProblem(9, s.n, s.p)
		for i := range s.n { // ill-conditioned, so that G is formed
			pr.X[(s.p-1)*s.n+i] = pr.X[s.n+i] + 1e-5*pr.X[(s.p-1)*s.n+i]
		}
		type answers struct {
			sol     Solution
			inv, h  []float64
			pivots  []float64
			workers int
		}
		ask := func(workers int) (a answers) {
			q := *pr
			q.Workers = workers
			f := Factorize(&q, nil)
			f.Solve(q.Y, nil, &a.sol)
			a.inv = f.Inverse(nil)
			a.h = make([]float64, s.n)
			f.LeveragesTo(a.h)
			a.pivots = f.Pivots()
			a.workers = f.workers
			if f.white.plain {
				t.Error("the test no longer reaches the Gram matrix")
			}
			return a
		}
		want := ask(0)
		for _, w := range []int{1, 2, 3, 8} {
			t.Run(fmt.Sprintf("n=%d/p=%d/workers=%d", s.n, s.p, w), func(t *testing.T) {
				got := ask(w)
				if got.workers != w {
					t.Errorf("%d workers used", got.workers)
				}
				if !slices.Equal(got.sol.B, want.sol.B) || !slices.Equal(got.sol.BLo, want.sol.BLo) ||
					!slices.Equal(got.sol.R, want.sol.R) || got.sol.RSS != want.sol.RSS ||
					!slices.Equal(got.inv, want.inv) || !slices.Equal(got.h, want.h) || !slices.Equal(got.pivots, want.pivots) {
					t.Error("results differ from those without workers")
				}
			})
		}
	}
}
