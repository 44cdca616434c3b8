package lsq

import (
	"math/big"
	"testing"

	"example.com/trammel/internal/digits"
)

// exactFit is the least-squares answer in rational arithmetic: Gauss on the
// normal equations, which lose nothing there.
type exactFit struct {
	p       int
	b       []*big.Rat
	inverse [][]*big.Rat // (X'WX)⁻¹
	r       []*big.Rat   // y - X b, unweighted
	rss     *big.Rat     // weighted
}

func rat(hi, lo float64) *big.Rat {
	v := new(big.Rat).SetFloat64(hi)
	return v.Add(v, new(big.Rat).SetFloat64(lo))
}

// exactRows returns the rows of X and y as rationals.
func exactRows(p *Problem) (x [][]*big.Rat, y []*big.Rat) {
	lo := func(s []float64, i int) float64 {
		if s == nil {
			return 0
		}
		return s[i]
	}
	for i := range p.N {
		row := make([]*big.Rat, p.P)
		for j := range row {
			row[j] = rat(p.X[j*p.N+i], lo(p.XLo, j*p.N+i))
		}
		x = append(x, row)
		if p.Y != nil {
			y = append(y, rat(p.Y[i], lo(p.YLo, i)))
		}
	}
	return x, y
}

// exactLS solves the problem with weights w; nil means 1.
func exactLS(t testing.TB, x [][]*big.Rat, y []*big.Rat, w []*big.Rat) *exactFit {
	t.Helper()
	p := len(x[0])
	one := big.NewRat(1, 1)
	weight := func(i int) *big.Rat {
		if w == nil {
			return one
		}
		return w[i]
	}
	// [X'WX | X'Wy | I]
	a := make([][]*big.Rat, p)
	for r := range a {
		a[r] = make([]*big.Rat, 2*p+1)
		for c := range a[r] {
			a[r][c] = new(big.Rat)
		}
		a[r][p+1+r].SetInt64(1)
	}
	for i := range x {
		for r := range p {
			wx := new(big.Rat).Mul(weight(i), x[i][r])
			for c := range p {
				a[r][c].Add(a[r][c], new(big.Rat).Mul(wx, x[i][c]))
			}
			a[r][p].Add(a[r][p], new(big.Rat).Mul(wx, y[i]))
		}
	}
	for k := range p {
		at := k
		for at < p && a[at][k].Sign() == 0 {
			at++
		}
		if at == p {
			t.Fatal("the test's design is singular")
		}
		a[k], a[at] = a[at], a[k]
		inv := new(big.Rat).Inv(a[k][k])
		for c := range a[k] {
			a[k][c].Mul(a[k][c], inv)
		}
		for r := range p {
			if r == k || a[r][k].Sign() == 0 {
				continue
			}
			m := new(big.Rat).Set(a[r][k])
			for c := range a[r] {
				if a[k][c].Sign() != 0 {
					a[r][c].Sub(a[r][c], new(big.Rat).Mul(m, a[k][c]))
				}
			}
		}
	}
	f := &exactFit{p: p, rss: new(big.Rat)}
	for r := range p {
		f.b = append(f.b, a[r][p])
		f.inverse = append(f.inverse, a[r][p+1:])
	}
	for i := range x {
		v := new(big.Rat).Set(y[i])
		for j := range p {
			v.Sub(v, new(big.Rat).Mul(x[i][j], f.b[j]))
		}
		f.r = append(f.r, v)
		sq := new(big.Rat).Mul(v, v)
		f.rss.Add(f.rss, sq.Mul(sq, weight(i)))
	}
	return f
}

// quad returns x'(X'X)⁻¹x.
func (f *exactFit) quad(x []*big.Rat) *big.Rat {
	s := new(big.Rat)
	for i := range x {
		for j := range x {
			v := new(big.Rat).Mul(x[i], x[j])
			s.Add(s, v.Mul(v, f.inverse[i][j]))
		}
	}
	return s
}

// agree is the number of digits that got = hi + lo shares with want.
func agree(hi, lo float64, want *big.Rat) float64 {
	if want.Sign() == 0 {
		return digits.Agree(hi+lo, 0)
	}
	// The ratio minus one, scored against zero, keeps lo.
	q := new(big.Rat).Quo(rat(hi, lo), want)
	d, _ := q.Sub(q, big.NewRat(1, 1)).Float64()
	return digits.Agree(d, 0)
}

// atLeast fails the test when hi + lo agrees with want in fewer digits.
func atLeast(t testing.TB, need float64, what string, hi, lo float64, want *big.Rat) float64 {
	t.Helper()
	d := agree(hi, lo, want)
	if !(d >= need) {
		w, _ := want.Float64()
		t.Errorf("%s = %.17g, want %.17g: %.1f digits, need %g", what, hi, w, d, need)
	}
	return d
}
