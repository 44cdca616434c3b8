package linfit_test

import (
	"math"
	"math/big"
	"testing"

	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/internal/digits"
)

// TestBases: estimates and standard errors with each basis, coding and known
// term agree with exact rational least squares on the columns as the design
// gives them (hi + lo; the columns themselves are held against their
// definitions in package design).
func TestBases(t *testing.T) {
	p := plant(48)
	table := p.table(t, nil)
	for _, text := range []string{
		"y ~ powers(x, 4)",
		"y ~ legendre(x, 5)",
		"y ~ legendre(x, 3) by cat(machine) + cat(machine)",
		"y ~ spline(x, 4)",
		"y ~ spline(x, 2)*cat(material)",
		"y ~ hinge(x, 15, 22)",
		"y ~ harmonics(x, 8, 2)",
		"y ~ coded(x, 10, 30) + num(1/x) + log(x)",
		"y ~ quadratic(x, z)",
		"y ~ x + known(-0.3*x) + cat(machine against mean)",
		"y ~ cat(machine against previous)*x weighted w",
		"y ~ cat(material) + cat(machine) inside cat(material) counted m",
		"log(y) ~ x*cat(machine)",
	} {
		m, err := formula.Parse(text)
		if err != nil {
			t.Fatal(err)
		}
		f, err := design.Prepare(m, table, nil)
		if err != nil {
			t.Fatalf("%s: %v", text, err)
		}
		r := mustFit(t, text, table, nil)
		b, variance := rationalFit(f)
		est, se := r.Estimates(), r.StdErrors()
		for j := range b {
			want, _ := b[j].Float64()
			v, _ := variance[j].Float64()
			// Conditions here reach 1e6; a dd-refined estimate keeps 14 digits of
			// whatever is not itself a cancelled sum.
			if d := digits.Agree(est[j], want); d < 13.5 {
				t.Errorf("%s: %s is %.17g, want %.17g: %.1f digits", text, f.Plan.Columns()[j].Name, est[j], want, d)
			}
			if d := digits.Agree(se[j], math.Sqrt(v)); d < 13.5 {
				t.Errorf("%s: the standard error of %s is %.17g, want %.17g: %.1f digits", text, f.Plan.Columns()[j].Name, se[j], math.Sqrt(v), d)
			}
		}
	}
}

// rationalFit solves the normal equations of a frame exactly: estimates and
// their variances.
func rationalFit(f *design.Frame) (b, variance []*big.Rat) {
	n, p := f.Matrix.Dims()
	rat := func(hi, lo float64) *big.Rat {
		r := new(big.Rat).SetFloat64(hi)
		return r.Add(r, new(big.Rat).SetFloat64(lo))
	}
	at := func(v []float64, i int) float64 {
		if v == nil {
			return 0
		}
		return v[i]
	}
	mass, cases := make([]*big.Rat, n), new(big.Rat)
	y := make([]*big.Rat, n)
	x := make([][]*big.Rat, p)
	for i := range n {
		mass[i] = big.NewRat(1, 1)
		count := big.NewRat(1, 1)
		if f.Weights != nil {
			mass[i].Mul(mass[i], rat(f.Weights[i], 0))
		}
		if f.Counts != nil {
			count = rat(f.Counts[i], 0)
			mass[i].Mul(mass[i], count)
		}
		cases.Add(cases, count)
		y[i] = rat(f.Y[i], at(f.YLo, i))
		if f.Known != nil {
			y[i].Sub(y[i], rat(f.Known[i], at(f.KnownLo, i)))
		}
	}
	hi, lo := make([]float64, n), make([]float64, n)
	for j := range p {
		f.Matrix.ColumnTo(hi, lo, j)
		x[j] = make([]*big.Rat, n)
		for i := range n {
			x[j][i] = rat(hi[i], lo[i])
		}
	}
	// [X'WX | X'Wy | I], reduced.
	a := make([][]*big.Rat, p)
	dot := func(u, v []*big.Rat) *big.Rat {
		s := new(big.Rat)
		for i := range u {
			q := new(big.Rat).Mul(u[i], v[i])
			s.Add(s, q.Mul(q, mass[i]))
		}
		return s
	}
	for j := range p {
		a[j] = make([]*big.Rat, 2*p+1)
		for k := range p {
			a[j][k] = dot(x[j], x[k])
			a[j][p+1+k] = new(big.Rat)
		}
		a[j][p] = dot(x[j], y)
		a[j][p+1+j].SetInt64(1)
	}
	for j := range p {
		inv := new(big.Rat).Inv(a[j][j]) // positive: the matrix is positive definite
		for k := range a[j] {
			a[j][k].Mul(a[j][k], inv)
		}
		for i := range p {
			if i == j {
				continue
			}
			c := new(big.Rat).Set(a[i][j])
			for k := range a[i] {
				a[i][k].Sub(a[i][k], new(big.Rat).Mul(c, a[j][k]))
			}
		}
	}
	rss := new(big.Rat)
	for i := range n {
		r := new(big.Rat).Set(y[i])
		for j := range p {
			r.Sub(r, new(big.Rat).Mul(x[j][i], a[j][p]))
		}
		rss.Add(rss, r.Mul(r, r).Mul(r, mass[i]))
	}
	rss.Quo(rss, cases.Sub(cases, new(big.Rat).SetInt64(int64(p))))
	for j := range p {
		b = append(b, a[j][p])
		variance = append(variance, new(big.Rat).Mul(rss, a[j][p+1+j]))
	}
	return b, variance
}
