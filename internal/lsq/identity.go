package lsq

import (
	"math"

	"example.com/trammel/internal/dd"
	"gonum.org/v1/gonum/floats"
)

// An Identity says that a column is a combination of earlier, independent
// ones. Given those it is unique.
type Identity struct {
	Column int       // the dependent column
	Coefs  []float64 // length p: Column = Σ Coefs[j]·column j; 0 where not involved
	// Exact says that every coefficient is a fraction with a denominator up to
	// 12, or such a fraction times a power of two, and that these fractions
	// reproduce the column to 1e-12 of the largest addend's norm.
	Exact bool
}

// Identities returns the dependencies among the columns of X in the order of
// the columns: a column is dependent when it lies in the span of earlier
// ones. Their number is p less the rank that Factorize finds. It is empty at
// full rank.
func Identities(p *Problem) []Identity {
	f := Factorize(p, nil)
	if f.Rank() == p.P {
		return nil
	}
	dependent := f.dependentInOrder()
	independent := make([]int, 0, f.rank)
	for j, d := range dependent {
		if !d {
			independent = append(independent, j)
		}
	}
	g := Factorize(p.columns(independent), nil)
	var out []Identity
	var s Solution
	coefs := make([]dd.Num, len(independent))
	for j, d := range dependent {
		if !d {
			continue
		}
		hi, lo, scale := f.column(j)
		g.Solve(hi, lo, &s)
		out = append(out, g.identity(&s, coefs, hi, lo))
		id := &out[len(out)-1]
		id.Column = j
		id.Coefs = make([]float64, p.P)
		for q, i := range independent {
			// Solve saw the stored column, which a far one has scaled.
			id.Coefs[i] = coefs[q].Hi / f.scale[j] * scale
		}
	}
	return out
}

// columns returns the problem restricted to some columns.
func (p *Problem) columns(which []int) *Problem {
	n := p.N
	sub := &Problem{N: n, P: len(which), X: make([]float64, n*len(which)), Workers: p.Workers}
	if p.XLo != nil {
		sub.XLo = make([]float64, n*len(which))
	}
	for q, j := range which {
		copy(sub.X[q*n:(q+1)*n], p.X[j*n:(j+1)*n])
		if p.XLo != nil {
			copy(sub.XLo[q*n:(q+1)*n], p.XLo[j*n:(j+1)*n])
		}
	}
	return sub
}

// dependentInOrder marks the columns that depend on earlier ones, exactly
// p - rank of them. It works on the rank×p triangle of the pivoted
// factorisation, whose columns have the dependencies of X: there cannot be
// more independent columns than rows, and when the usual tolerance leaves
// fewer (an ill-conditioned order), a smaller one decides.
func (f *Factor) dependentInOrder() []bool {
	p, r := f.p.P, f.rank
	dependent := make([]bool, p)
	at := make([]int, p)
	for q, j := range f.perm {
		at[j] = q
	}
	a := make([]float64, r*p)
	tau := make([]float64, r)
	for tol := Tolerance; ; tol /= 10 {
		if tol < 1e-17 {
			tol = 0
		}
		for j := range p {
			q := at[j]
			k := min(q+1, r)
			copy(a[j*r:j*r+k], f.root[q*f.m:q*f.m+k])
			clear(a[j*r+k : (j+1)*r])
		}
		found := 0
		vectors := make([]int, 0, r)
		for j := range p {
			c := a[j*r : (j+1)*r]
			for k, v := range vectors {
				applyReflection(a[v*r+k:(v+1)*r], tau[k], c[k:])
			}
			rest := floats.Norm(c[found:], 2)
			dependent[j] = found == r || rest == 0 || rest < tol*f.norm[j]
			if !dependent[j] {
				tau[found] = makeReflector(c[found:])
				vectors = append(vectors, j)
				found++
			}
		}
		if found == r || tol == 0 {
			return dependent
		}
	}
}

// identity turns the solution for the dependent column hi + lo into
// coefficients of g's columns, left in coefs.
func (g *Factor) identity(s *Solution, coefs []dd.Num, hi, lo []float64) (id Identity) {
	p := g.p.P
	largest := g.largestAddend(s.B)
	id.Exact = true
	for i, b := range s.B {
		coefs[i] = dd.Num{}
		if g.addend(b, i) <= noise*largest {
			continue
		}
		// Nearness only proposes a fraction; the check below decides.
		c, ok := nearFraction(b, 1e-9*largest/g.addend(1, i))
		coefs[i] = c
		id.Exact = id.Exact && ok
	}
	if id.Exact && g.reproduces(coefs, hi, lo, largest) {
		return id
	}
	id.Exact = false
	for i := range p {
		coefs[i] = dd.Num{}
		if g.addend(s.B[i], i) > noise*largest {
			coefs[i] = dd.Num{Hi: s.B[i], Lo: s.BLo[i]}
		}
	}
	return id
}

// reproduces reports whether Σ coefs[i]·column i is the column hi + lo, to
// the noise relative to the largest addend.
func (g *Factor) reproduces(coefs []dd.Num, hi, lo []float64, largest float64) bool {
	n := g.p.N
	work := make([]float64, 2*n)
	h, l := work[:n], work[n:]
	sy, _ := powerScale(hi)
	scaleTo(h, hi, sy)
	if lo != nil {
		scaleTo(l, lo, sy)
	}
	for i, c := range coefs {
		if c.Hi == 0 {
			continue
		}
		// The column at hand is scaled by g.scale[i]/left already.
		a, al, left := g.column(i)
		c = c.MulF(sy / g.scale[i] * left)
		subtractColumn(h, l, a, c.Hi, c.Lo)
		if al != nil {
			floats.AddScaled(l, -c.Hi, al)
		}
	}
	floats.Add(h, l)
	return floats.Norm(h, 2) <= noise*largest*sy
}

// nearFraction returns a fraction with a small denominator that lies within
// tol of b, in double-double: n/d with d ≤ 12 and |n| ≤ 10⁶, or else n/d·2^k
// with n ≤ 1024. A larger denominator must come a thousand times nearer to be
// preferred. ok is false when there is none.
func nearFraction(b, tol float64) (c dd.Num, ok bool) {
	const largestNum, largestDen, bits = 1e6, 12, 10
	for d := 1.0; d <= largestDen; d++ {
		n := math.Round(b * d)
		if miss := math.Abs(b - n/d); n != 0 && math.Abs(n) <= largestNum && miss <= tol {
			c, ok = dd.Of(n).Div(dd.Of(d)), true
			tol = miss / 1000
		}
	}
	if ok {
		return c, true
	}
	m, e := math.Frexp(b)
	for d := 1.0; d <= largestDen; d += 2 {
		v := dd.Of(math.Round(math.Ldexp(m*d, bits))).Div(dd.Of(d))
		v.Hi, v.Lo = math.Ldexp(v.Hi, e-bits), math.Ldexp(v.Lo, e-bits)
		if miss := math.Abs(b - v.Hi); miss <= tol {
			c, ok = v, true
			tol = miss / 1000
		}
	}
	return c, ok
}
