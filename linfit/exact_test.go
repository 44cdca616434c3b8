package linfit

import (
	"context"
	"fmt"
	"math"
	"math/big"
	"testing"

	"example.com/trammel/design"
)

// The reference of these tests is least squares in rational numbers, written
// out from the textbook formulas with a row for each copy that a count stands
// for; it shares nothing with the package.

func rat(v float64) *big.Rat { return new(big.Rat).SetFloat64(v) }

func times(a ...*big.Rat) *big.Rat {
	p := big.NewRat(1, 1)
	for _, v := range a {
		p.Mul(p, v)
	}
	return p
}

func inner(a, b []*big.Rat) *big.Rat {
	s := new(big.Rat)
	for i := range a {
		s.Add(s, times(a[i], b[i]))
	}
	return s
}

// inverted is the inverse of a square matrix.
func inverted(m [][]*big.Rat) [][]*big.Rat {
	k := len(m)
	a := make([][]*big.Rat, k)
	for i := range a {
		for _, v := range m[i] {
			a[i] = append(a[i], new(big.Rat).Set(v))
		}
		for j := range k {
			e := new(big.Rat)
			if i == j {
				e.SetInt64(1)
			}
			a[i] = append(a[i], e)
		}
	}
	for c := range k {
		for r := c; r < k; r++ {
			if a[r][c].Sign() != 0 {
				a[c], a[r] = a[r], a[c]
				break
			}
		}
		inv := new(big.Rat).Inv(a[c][c])
		for j := range a[c] {
			a[c][j].Mul(a[c][j], inv)
		}
		for r := range k {
			if r != c {
				g := new(big.Rat).Set(a[r][c])
				for j := range a[r] {
					a[r][j].Sub(a[r][j], times(g, a[c][j]))
				}
			}
		}
	}
	for i := range a {
		a[i] = a[i][k:]
	}
	return a
}

// exactFit is a fit of rows x, weights w (one row per copy) to y.
type exactFit struct {
	x       [][]*big.Rat
	w, y    []*big.Rat
	group   []int
	b, r, h []*big.Rat
	inverse [][]*big.Rat
	rss     *big.Rat
}

func (e *exactFit) solve() {
	k := len(e.x[0])
	m := make([][]*big.Rat, k)
	rhs := make([]*big.Rat, k)
	for i := range m {
		m[i] = make([]*big.Rat, k)
		rhs[i] = new(big.Rat)
		for j := range m[i] {
			m[i][j] = new(big.Rat)
		}
		for r := range e.x {
			for j := range k {
				m[i][j].Add(m[i][j], times(e.w[r], e.x[r][i], e.x[r][j]))
			}
			rhs[i].Add(rhs[i], times(e.w[r], e.x[r][i], e.y[r]))
		}
	}
	e.inverse = inverted(m)
	e.b, e.r, e.h = nil, nil, nil
	for i := range k {
		e.b = append(e.b, inner(e.inverse[i], rhs))
	}
	e.rss = new(big.Rat)
	for r := range e.x {
		d := new(big.Rat).Sub(e.y[r], inner(e.x[r], e.b))
		e.r = append(e.r, d)
		e.rss.Add(e.rss, times(e.w[r], d, d))
		q := new(big.Rat)
		for i := range k {
			q.Add(q, times(e.x[r][i], inner(e.inverse[i], e.x[r])))
		}
		e.h = append(e.h, q.Mul(q, e.w[r]))
	}
}

// sandwich is the robust covariance of White (HC0), MacKinnon and White (HC1,
// HC2, HC3), and Liang and Zeger (clustered).
func (e *exactFit) sandwich(kind string) [][]*big.Rat {
	n, k := len(e.x), len(e.b)
	scores := map[int][]*big.Rat{}
	factor := big.NewRat(1, 1)
	meat := make([][]*big.Rat, k)
	for i := range meat {
		meat[i] = make([]*big.Rat, k)
		for j := range meat[i] {
			meat[i][j] = new(big.Rat)
		}
	}
	for r := range n {
		left := new(big.Rat).Sub(big.NewRat(1, 1), e.h[r])
		d := times(e.w[r], e.w[r], e.r[r], e.r[r])
		switch kind {
		case "HC2":
			d.Quo(d, left)
		case "HC3":
			d.Quo(d, times(left, left))
		case "clustered":
			if scores[e.group[r]] == nil {
				for range k {
					scores[e.group[r]] = append(scores[e.group[r]], new(big.Rat))
				}
			}
			for i, s := range scores[e.group[r]] {
				s.Add(s, times(e.w[r], e.r[r], e.x[r][i]))
			}
			continue
		}
		for i := range k {
			for j := range k {
				meat[i][j].Add(meat[i][j], times(d, e.x[r][i], e.x[r][j]))
			}
		}
	}
	for _, s := range scores {
		for i := range k {
			for j := range k {
				meat[i][j].Add(meat[i][j], times(s[i], s[j]))
			}
		}
	}
	switch g := int64(len(scores)); kind {
	case "HC1":
		factor.SetFrac64(int64(n), int64(n-k))
	case "clustered":
		factor.Mul(big.NewRat(g, g-1), big.NewRat(int64(n-1), int64(n-k)))
	}
	out := make([][]*big.Rat, k)
	for i := range k {
		out[i] = make([]*big.Rat, k)
		for j := range k {
			s := new(big.Rat)
			for a := range k {
				for b := range k {
					s.Add(s, times(e.inverse[i][a], meat[a][b], e.inverse[b][j]))
				}
			}
			out[i][j] = s.Mul(s, factor)
		}
	}
	return out
}

// exactOf expands a frame into rational rows, one for each copy.
func exactOf(f *design.Frame, form interface{ At(i, j int) float64 }, p int, groups []float64) *exactFit {
	e := &exactFit{}
	for i := range f.Y {
		row := make([]*big.Rat, p)
		for j := range row {
			row[j] = rat(form.At(i, j))
		}
		w, copies := 1.0, 1
		if f.Weights != nil {
			w = f.Weights[i]
		}
		if f.Counts != nil {
			copies = int(f.Counts[i])
		}
		for range copies {
			e.x, e.w, e.y = append(e.x, row), append(e.w, rat(w)), append(e.y, rat(f.Y[i]))
			e.group = append(e.group, int(groups[i]))
		}
	}
	e.solve()
	return e
}

// TestExactAnswers holds both numeric paths to rational answers: estimates,
// ordinary and robust covariances, leverages, and F and Wald tests of several
// columns, with weights and counts.
func TestExactAnswers(t *testing.T) {
	hold := []float64{1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 13, 15, 16}
	furnace := []float64{1, 2, 3, 1, 2, 3, 1, 2, 3, 1, 2, 3, 1, 3}
	y := []float64{2, 3, 7, 5, 4, 9, 8, 8, 15, 9, 11, 14, 16, 21}
	w := []float64{1, 2, 0.5, 1, 3, 1, 0.25, 1, 2, 1, 1, 0.5, 4, 1}
	m := []float64{1, 2, 1, 3, 1, 1, 2, 1, 1, 2, 1, 1, 1, 2}
	lot := []float64{1, 1, 2, 2, 3, 3, 4, 4, 5, 5, 1, 2, 3, 4}
	table, err := design.NewTable(design.Numbers("hold", hold), design.Numbers("furnace", furnace), design.Numbers("y", y),
		design.Numbers("w", w), design.Numbers("m", m), design.Numbers("lot", lot))
	if err != nil {
		t.Fatal(err)
	}
	for _, text := range []string{"y ~ hold + cat(furnace)", "y ~ hold * cat(furnace) weighted w", "y ~ hold + cat(furnace) weighted w counted m", "y ~ hold by cat(furnace) - intercept counted m"} {
		f := prepared(t, text, table)
		n, p := f.Matrix.Dims()
		want := exactOf(f, f.Matrix, p, lot)
		freedom := int64(len(want.x) - p)
		disp := new(big.Rat).Quo(want.rss, big.NewRat(freedom, 1))
		for _, kind := range []string{"", "HC0", "HC1", "HC2", "HC3", "clustered"} {
			var c *clusters
			robust := Robust(kind)
			if kind == "clustered" {
				robust = Ordinary
				var refusal *Error
				if c, refusal = clustersOf("lot", table, f); refusal != nil {
					t.Fatal(refusal)
				}
			}
			for path, solve := range map[string]func(*run, *clusters) (*solved, error){"direct": solveDirect, "streamed": solveStreamed} {
				t.Run(fmt.Sprint(text, " ", kind, " ", path), func(t *testing.T) {
					s, err := solve(runOf(f, robust, 1), c)
					if err != nil || s == nil {
						t.Fatal(s, err)
					}
					check := func(what string, got float64, want *big.Rat, size float64) {
						t.Helper()
						v, _ := want.Float64()
						if size == 0 {
							size = math.Abs(v)
						}
						if !(math.Abs(got-v) <= 1e-13*size) {
							t.Errorf("%s is %.17g, want %.17g", what, got, v)
						}
					}
					sd, _ := disp.Float64()
					s.engine.setDispersion(sd)
					cov := s.engine.Covariance()
					exact := want.sandwich(kind)
					if kind == "" {
						for i := range exact {
							for j := range exact[i] {
								exact[i][j] = times(want.inverse[i][j], disp)
							}
						}
					}
					for i := range p {
						check("an estimate", s.b[i], want.b[i], 0)
						for j := range p {
							vi, _ := exact[i][i].Float64()
							vj, _ := exact[j][j].Float64()
							check("a covariance", cov[i*p+j], exact[i][j], math.Sqrt(vi*vj))
						}
					}
					check("RSS", s.rss.Float(), want.rss, 0)
					st, _ := s.engine.Rows()
					at := 0
					for i := range n {
						check("a residual", st.Residual[i], want.r[at], math.Sqrt(sd))
						check("a leverage", st.Leverage[i], want.h[at], 0)
						at++
						if f.Counts != nil {
							at += int(f.Counts[i]) - 1
						}
					}
					var with []int
					for k := range f.Plan.Terms() {
						with = append(with, k)
					}
					test, err := s.engine.Nested(with)
					if err != nil {
						t.Fatal(err)
					}
					from := p - test.DF
					if kind != "" {
						var block [][]*big.Rat
						for i := from; i < p; i++ {
							block = append(block, exact[i][from:])
						}
						q := new(big.Rat)
						for i, row := range inverted(block) {
							q.Add(q, times(want.b[from+i], inner(row, want.b[from:])))
						}
						check("the Wald test", test.Stat, q.Quo(q, big.NewRat(int64(test.DF), 1)), 0)
						return
					}
					if from > 0 {
						less := *want
						less.x = nil
						for _, row := range want.x {
							less.x = append(less.x, row[:from])
						}
						less.solve()
						ss := new(big.Rat).Sub(less.rss, want.rss)
						check("the SS of a term", test.SS, ss, 0)
						check("F", test.Stat, new(big.Rat).Quo(ss, times(disp, big.NewRat(int64(test.DF), 1))), 0)
					}
				})
			}
		}
	}
}

// TestAllocations counts those of a small fit from a prepared frame.
func TestAllocations(t *testing.T) {
	f := prepared(t, "y ~ hold + temp + cat(furnace)", plant(t, 30, 2))
	ctx := context.Background()
	if got := testing.AllocsPerRun(100, func() {
		if _, err := FitFrame(ctx, f, nil); err != nil {
			t.Fatal(err)
		}
	}); got > 10 {
		t.Errorf("%g allocations, want 10 at most", got)
	}
}
