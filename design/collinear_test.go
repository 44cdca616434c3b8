package design

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"example.com/trammel/internal/digits"
)

// TestCollinearity: the inflation factors are 1/(1-R²) of each column on the
// others, the squared condition indices are ratios of eigenvalues of the
// correlation-like matrix of unit columns, both computed here from their
// definitions (Belsley, Kuh and Welsch 1980, ch. 3) on the expanded weighted
// matrix; each coefficient's proportions add up to 1. A condensed frame gives
// the same.
func TestCollinearity(t *testing.T) {
	for _, n := range []int{60, 900_000} {
		rng := rand.New(rand.NewPCG(8, 8))
		m := make([]string, n)
		x, z, w, y := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
		for i := range n {
			m[i] = []string{"A", "B", "C"}[rng.IntN(3)]
			x[i] = 50 + 10*rng.Float64()
			z[i] = x[i] + rng.NormFloat64()
			w[i], y[i] = 0.5+rng.Float64(), rng.NormFloat64()
		}
		table, err := NewTable(Texts("m", m), Numbers("x", x), Numbers("z", z), Numbers("w", w), Numbers("y", y))
		if err != nil {
			t.Fatal(err)
		}
		f, err := Prepare(parse(t, "y ~ x + z + cat(m) weighted w"), table, nil)
		if err != nil {
			t.Fatal(err)
		}
		got, err := f.Collinearity()
		if err != nil {
			t.Fatal(err)
		}
		rows, p := f.Matrix.Dims()
		// Gram matrix of the weighted columns, plain sums.
		gram := mat.NewSymDense(p, nil)
		cols := make([][]float64, p)
		for j := range p {
			cols[j] = make([]float64, rows)
			f.Matrix.ColumnTo(cols[j], nil, j)
			for i := range cols[j] {
				cols[j][i] *= math.Sqrt(w[i])
			}
		}
		for j := range p {
			for k := range j + 1 {
				s := 0.0
				for i := range rows {
					s += cols[j][i] * cols[k][i]
				}
				gram.SetSym(j, k, s)
			}
		}
		unit := mat.NewSymDense(p, nil)
		for j := range p {
			for k := range j + 1 {
				unit.SetSym(j, k, gram.At(j, k)/math.Sqrt(gram.At(j, j)*gram.At(k, k)))
			}
		}
		var eig mat.EigenSym
		if !eig.Factorize(unit, false) {
			t.Fatal("no eigenvalues")
		}
		values := eig.Values(nil)
		for k, index := range got.Indices {
			// Eigenvalues of the Gram matrix carry half the digits of the smallest.
			if d := digits.Agree(index, math.Sqrt(values[p-1]/values[p-1-k])); d < 8 {
				t.Errorf("n %d: index %d is %g, want %g", n, k, index, math.Sqrt(values[p-1]/values[p-1-k]))
			}
		}
		var inv mat.Dense
		if err := inv.Inverse(gram); err != nil {
			t.Fatal(err)
		}
		for j := range p {
			sum := 0.0
			for _, row := range got.Proportions {
				sum += row[j]
			}
			if math.Abs(sum-1) > 1e-12 {
				t.Errorf("n %d: the proportions of coefficient %d add up to %g", n, j, sum)
			}
			if j == 0 {
				if !math.IsNaN(got.Inflation[0]) {
					t.Errorf("the intercept has an inflation factor %g", got.Inflation[0])
				}
				continue
			}
			// 1/(1-R²) = variance over that without the other columns, about the mean.
			about := gram.At(j, j) - gram.At(0, j)*gram.At(0, j)/gram.At(0, 0)
			if d := digits.Agree(got.Inflation[j], inv.At(j, j)*about); d < 8 {
				t.Errorf("n %d: inflation of %s is %g, want %g", n, f.Plan.Columns()[j].Name, got.Inflation[j], inv.At(j, j)*about)
			}
		}
	}
}
