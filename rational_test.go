package trammel_test

import "math/big"

// A problem is weighted least squares in rational numbers: minimise
// Σ w (y - x'b)². Rows of x may be empty.
type problem struct {
	x    [][]*big.Rat // n×p
	w, y []*big.Rat   // n
}

// A solution holds everything exactly.
type solution struct {
	b        []*big.Rat
	inverse  [][]*big.Rat // (X'WX)⁻¹
	residual []*big.Rat
	rss      *big.Rat
}

// solve forms the normal equations and eliminates (Gauss and Jordan); nil when
// columns are dependent.
func (p *problem) solve() *solution {
	n := len(p.y)
	k := 0
	if n > 0 {
		k = len(p.x[0])
	}
	// [X'WX | I | X'Wy]
	a := make([][]*big.Rat, k)
	for i := range a {
		a[i] = make([]*big.Rat, 2*k+1)
		for j := range a[i] {
			a[i][j] = new(big.Rat)
		}
		a[i][k+i].SetInt64(1)
		for r := range n {
			wx := new(big.Rat).Mul(p.w[r], p.x[r][i])
			for j := range k {
				a[i][j].Add(a[i][j], new(big.Rat).Mul(wx, p.x[r][j]))
			}
			a[i][2*k].Add(a[i][2*k], new(big.Rat).Mul(wx, p.y[r]))
		}
	}
	for c := range k {
		pivot := c
		for pivot < k && a[pivot][c].Sign() == 0 {
			pivot++
		}
		if pivot == k {
			return nil
		}
		a[c], a[pivot] = a[pivot], a[c]
		inv := new(big.Rat).Inv(a[c][c])
		for j := range a[c] {
			a[c][j].Mul(a[c][j], inv)
		}
		for r := range k {
			if r == c || a[r][c].Sign() == 0 {
				continue
			}
			f := new(big.Rat).Set(a[r][c])
			for j := range a[r] {
				a[r][j].Sub(a[r][j], new(big.Rat).Mul(f, a[c][j]))
			}
		}
	}
	s := &solution{rss: new(big.Rat)}
	for i := range k {
		s.b = append(s.b, a[i][2*k])
		s.inverse = append(s.inverse, a[i][k:2*k])
	}
	for r := range n {
		e := new(big.Rat).Sub(p.y[r], dot(p.x[r], s.b))
		s.residual = append(s.residual, e)
		s.rss.Add(s.rss, new(big.Rat).Mul(p.w[r], new(big.Rat).Mul(e, e)))
	}
	return s
}

func dot(a, b []*big.Rat) *big.Rat {
	sum := new(big.Rat)
	for i := range a {
		sum.Add(sum, new(big.Rat).Mul(a[i], b[i]))
	}
	return sum
}

// quad is x'Ax.
func quad(x []*big.Rat, a [][]*big.Rat) *big.Rat {
	sum := new(big.Rat)
	for i := range x {
		sum.Add(sum, new(big.Rat).Mul(x[i], dot(a[i], x)))
	}
	return sum
}

func float(r *big.Rat) float64 {
	f, _ := r.Float64()
	return f
}

func floats(r []*big.Rat) []float64 {
	out := make([]float64, len(r))
	for i := range r {
		out[i] = float(r[i])
	}
	return out
}
