package lsq

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// The estimate against the singular values of the unit columns.
func TestCondition(t *testing.T) {
	for seed := range uint64(60) {
		rng := rand.New(rand.NewPCG(seed, 19))
		p := 1 + rng.IntN(10)
		pr := randomProblem(seed, 40, p)
		n := pr.N
		if p > 2 {
			near := math.Pow(10, -float64(rng.IntN(10)))
			for i := range n {
				pr.X[(p-1)*n+i] = pr.X[n+i] + near*pr.X[(p-1)*n+i]
			}
		}
		unit := mat.NewDense(n, p, nil)
		for j := range p {
			v := mat.NewVecDense(n, pr.X[j*n:(j+1)*n])
			norm := mat.Norm(v, 2)
			for i := range n {
				unit.Set(i, j, v.AtVec(i)/norm)
			}
		}
		var svd mat.SVD
		if !svd.Factorize(unit, mat.SVDNone) {
			t.Fatal("no singular values")
		}
		want := svd.Cond()
		f := Factorize(pr, nil)
		got := f.Condition()
		if !(got <= want*(1+1e-6) && got >= want*0.95) {
			t.Errorf("seed %d: condition %g, want %g or slightly less", seed, got, want)
		}
		if b := f.conditionBound(); !(b >= want*(1-1e-6)) {
			t.Errorf("seed %d: bound %g below the condition %g", seed, b, want)
		}
	}
}
