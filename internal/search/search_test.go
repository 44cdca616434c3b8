package search

import (
	"errors"
	"math"
	"math/big"
	"math/rand/v2"
	"slices"
	"testing"
)

// approach is y = a(1 - exp(-k x)) with its derivatives.
func approach(x, y []float64) *Problem {
	n := len(x)
	return &Problem{N: n, P: 2, Y: y, Linear: []bool{true, false}, Range: []Range{{}, {Low: -30, High: 30, Log: true}},
		Eval: func(theta, f, jac, v, hess []float64) bool {
			a, k := theta[0], theta[1]
			ok := true
			for i, t := range x {
				e := math.Exp(-k * t)
				f[i] = a * (1 - e)
				ok = ok && f[i]-f[i] == 0
				if jac != nil {
					jac[i], jac[n+i] = 1-e, a*t*e
				}
				if hess != nil {
					hess[1] += v[i] * t * e
					hess[2] += v[i] * t * e
					hess[3] -= v[i] * a * t * t * e
				}
			}
			return ok
		}}
}

func approachData() (x, y []float64) {
	rng := rand.New(rand.NewPCG(1, 4))
	for i := range 20 {
		x = append(x, 1+float64(i))
		y = append(y, 5*(1-math.Exp(-0.3*x[i]))+0.05*rng.NormFloat64())
	}
	return x, y
}

// TestSolve: started and start-free searches end in one minimum, where the
// gradient vanishes to rounding; bounds, budgets and errors of Step do what they
// say; nothing depends on the number of workers.
func TestSolve(t *testing.T) {
	x, y := approachData()
	free, err := Solve(approach(x, y), nil)
	if err != nil || free.End.Reason != "converged" {
		t.Fatalf("%+v, %v", free, err)
	}
	started := approach(x, y)
	started.Start = []float64{1, 1}
	got, err := Solve(started, nil)
	if err != nil || math.Abs(got.Theta[1]-free.Theta[1]) > 1e-14 {
		t.Errorf("started %v, free %v, %v", got.Theta, free.Theta, err)
	}
	// The gradient at the answer, in exact arithmetic of its rounded terms.
	n := len(x)
	f, jac := make([]float64, n), make([]float64, 2*n)
	started.Eval(free.Theta, f, jac, nil, nil)
	for j := range 2 {
		sum, size := new(big.Rat), 0.0
		for i := range n {
			r := new(big.Rat).SetFloat64(y[i] - f[i])
			sum.Add(sum, r.Mul(r, new(big.Rat).SetFloat64(jac[j*n+i])))
			size += math.Abs((y[i] - f[i]) * jac[j*n+i])
		}
		if g, _ := sum.Float64(); math.Abs(g) > 1e-13*size {
			t.Errorf("the gradient by parameter %d is %g of terms of size %g", j, g, size)
		}
	}
	for _, workers := range []int{1, 3} {
		again, err := Solve(approach(x, y), &Options{Workers: workers})
		if err != nil || !slices.Equal(again.Theta, free.Theta) || again.RSS != free.RSS {
			t.Errorf("%d workers: %v, want %v", workers, again.Theta, free.Theta)
		}
	}
	bounded := approach(x, y)
	bounded.Linear = []bool{false, false}
	bounded.Range[0] = Range{Low: 0.1, High: 4}
	bounded.Low, bounded.High = []float64{0, 0.01}, []float64{4, 10}
	got, err = Solve(bounded, nil)
	if err != nil || got.End.Reason != "bound active" || !slices.Equal(got.End.Bound, []int{0}) || got.Theta[0] != 4 {
		t.Errorf("bounded: %+v, %v", got, err)
	}
	got, err = Solve(started, &Options{Budget: 4})
	if err != nil || got.End.Reason != "budget" {
		t.Errorf("a budget of 4: %+v, %v", got, err)
	}
	stop := errors.New("stop")
	if _, err := Solve(approach(x, y), &Options{Step: func(Progress) error { return stop }}); !errors.Is(err, stop) {
		t.Errorf("Step's error is lost: %v", err)
	}
	nowhere := approach(x, y)
	nowhere.Eval = func(theta, f, jac, v, hess []float64) bool { return false }
	if _, err := Solve(nowhere, nil); !errors.Is(err, ErrNoFinite) {
		t.Errorf("got %v", err)
	}
}

// TestLeastSquares compares with exact rational normal equations, a dependent
// column included.
func TestLeastSquares(t *testing.T) {
	rng := rand.New(rand.NewPCG(2, 2))
	for range 50 {
		const n, k = 8, 3
		a, b := make([]float64, n*k), make([]float64, n)
		for i := range a {
			a[i] = float64(rng.IntN(21) - 10)
		}
		for i := range b {
			b[i] = float64(rng.IntN(21) - 10)
		}
		m := make([][]*big.Rat, k)
		for i := range k {
			m[i] = make([]*big.Rat, k+1)
			for j := range k + 1 {
				s := new(big.Rat)
				for r := range n {
					v := b[r]
					if j < k {
						v = a[j*n+r]
					}
					s.Add(s, new(big.Rat).SetFloat64(a[i*n+r]*v))
				}
				m[i][j] = s
			}
		}
		for j := range k {
			for i := range k {
				if i == j || m[j][j].Sign() == 0 {
					continue
				}
				c := new(big.Rat).Quo(m[i][j], m[j][j])
				for q := range k + 1 {
					m[i][q].Sub(m[i][q], new(big.Rat).Mul(c, m[j][q]))
				}
			}
		}
		x := make([]float64, k)
		left := leastSquares(slices.Clone(a), n, k, b, x)
		rss := 0.0
		for r := range n {
			d := b[r]
			for j := range k {
				d -= a[j*n+r] * x[j]
			}
			rss += d * d
		}
		for j := range k {
			if want, _ := new(big.Rat).Quo(m[j][k], m[j][j]).Float64(); math.Abs(x[j]-want) > 1e-12*(1+math.Abs(want)) {
				t.Errorf("x%d is %g, want %g", j, x[j], want)
			}
		}
		if math.Abs(left-rss) > 1e-12*(1+rss) {
			t.Errorf("%g is left, want %g", left, rss)
		}
		// With a column repeated, one of the two gets 0 and the fit is the same.
		twice := append(slices.Clone(a), a[:n]...)
		y := make([]float64, k+1)
		if again := leastSquares(twice, n, k+1, b, y); math.Abs(again-left) > 1e-12*(1+left) || y[0] != 0 && y[k] != 0 {
			t.Errorf("a repeated column: %v, %g left, want %g", y, again, left)
		}
	}
}

// TestRange: starts stay inside their ranges, both signs and five decades of a log
// range on both sides are reached.
func TestRange(t *testing.T) {
	r := Range{Low: -3, High: 3, Log: true}
	signs, small, large := map[bool]bool{}, math.Inf(1), 0.0
	for i := range 200 {
		v := r.at(float64(i)/200, fraction(float64(i)*0.37))
		signs[v > 0] = true
		small, large = math.Min(small, math.Abs(v)), math.Max(large, math.Abs(v))
	}
	if len(signs) != 2 || small > 1e-4 || large > 3 || large < 2.5 {
		t.Errorf("signs %v, magnitudes %g to %g", signs, small, large)
	}
	if v := (Range{Low: 2, High: 8}).at(0.5, 0); v != 5 {
		t.Errorf("half way from 2 to 8 is %g", v)
	}
	if v := (Range{Low: -8, High: -2, Log: true}).at(0, 0); math.Abs(v+2) > 1e-12 {
		t.Errorf("the start of -8 to -2 is %g", v)
	}
}
