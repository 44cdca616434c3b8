package design

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"example.com/trammel/internal/factored"
	"example.com/trammel/internal/lsq"
)

// TestCondensed: a large frame gives the identities that its first rows give,
// by moments of cells and by blocks.
func TestCondensed(t *testing.T) {
	rng := rand.New(rand.NewPCG(2, 6))
	const n = 200_000
	machine, line := make([]string, n), make([]string, n)
	x, z, sum, y := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range n {
		k := rng.IntN(20)
		machine[i], line[i] = fmt.Sprintf("M%d", k), fmt.Sprintf("L%d", k/4)
		x[i], z[i], y[i] = float64(rng.IntN(1000)), float64(rng.IntN(50)), rng.NormFloat64()
		sum[i] = 2*x[i] - 3*z[i] + 7
	}
	table := func(rows int) *Table {
		tb, err := NewTable(Texts("machine", machine[:rows]), Texts("line", line[:rows]), Numbers("x", x[:rows]),
			Numbers("z", z[:rows]), Numbers("sum", sum[:rows]), Numbers("y", y[:rows]))
		if err != nil {
			t.Fatal(err)
		}
		return tb
	}
	for _, c := range []struct {
		model string
		rank  bool // full
	}{
		{"y ~ x*cat(machine) + z", true},
		{"y ~ cat(machine) + cat(line)", false},
		{"y ~ x + z + sum + cat(machine)", false},
		{"y ~ x by cat(machine) + x by cat(line) + z + sum", false},
	} {
		small, err := Prepare(parse(t, c.model), table(3000), &Options{NoRankCheck: true})
		if err != nil {
			t.Fatal(err)
		}
		large, err := Prepare(parse(t, c.model), table(n), &Options{NoRankCheck: true})
		if err != nil {
			t.Fatal(err)
		}
		text := func(q *lsq.Problem) []string {
			var out []string
			for _, id := range lsq.Identities(q) {
				out = append(out, small.Plan.identity(id).String())
			}
			return out
		}
		want := text(expandForm(small.Matrix.form))
		if (len(want) == 0) != c.rank {
			t.Errorf("%s: %q", c.model, want)
		}
		for name, q := range map[string]func(*factored.Form) *lsq.Problem{
			"cells":  func(form *factored.Form) *lsq.Problem { return condense(form, nil, nil) },
			"blocks": func(form *factored.Form) *lsq.Problem { return triangleByBlocks(form, nil) },
		} {
			problem := q(large.Matrix.form)
			if problem.N > 3000 {
				t.Errorf("%s: %d rows are left by %s", c.model, problem.N, name)
			}
			if got := text(problem); !slices.Equal(got, want) {
				t.Errorf("%s by %s: %q, want %q", c.model, name, got, want)
			}
		}
		start := time.Now()
		err = large.CheckRank()
		if (err == nil) != c.rank {
			t.Errorf("%s: %v", c.model, err)
		}
		t.Logf("%s: %v", c.model, time.Since(start))
	}
}
