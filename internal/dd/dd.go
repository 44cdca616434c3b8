// Package dd is double-double arithmetic: an unevaluated sum of two float64s,
// about 106 bits (31 decimal digits). The algorithms are those of T. J. Dekker,
// "A floating-point technique for extending the available precision",
// Numerische Mathematik 18 (1971) 224-242, and D. E. Knuth, The Art of Computer
// Programming, vol. 2, 4.2.2, with the product's error taken from a fused
// multiply-add (math.FMA). Error bounds for the forms used here: M. Joldes,
// J.-M. Muller and V. Popescu, "Tight and rigorous error bounds for basic
// building blocks of double-word arithmetic", ACM TOMS 44 (2017) 15.
//
// Overflow and non-finite operands give a non-finite Hi; Lo is then meaningless.
package dd

import "math"

// A Num is the number Hi + Lo, with |Lo| at most half a unit in the last place
// of Hi.
type Num struct{ Hi, Lo float64 }

// Of returns x as a Num, exactly.
func Of(x float64) Num { return Num{x, 0} }

// Float returns x rounded to the nearest float64.
func (x Num) Float() float64 { return x.Hi + x.Lo }

// TwoSum returns s = a + b rounded and the exact error e: s + e = a + b.
func TwoSum(a, b float64) (s, e float64) {
	s = a + b
	t := s - a
	e = (a - (s - t)) + (b - t)
	return s, e
}

// QuickTwoSum is TwoSum for |a| >= |b| or a = 0.
func QuickTwoSum(a, b float64) (s, e float64) {
	s = a + b
	return s, b - (s - a)
}

// TwoProd returns p = a·b rounded and the exact error e: p + e = a·b, unless
// the product over- or underflows.
func TwoProd(a, b float64) (p, e float64) {
	// The conversion keeps compilers from fusing the product into a later sum.
	p = float64(a * b)
	return p, math.FMA(a, b, -p)
}

// Neg returns -x.
func (x Num) Neg() Num { return Num{-x.Hi, -x.Lo} }

// Abs returns |x|.
func (x Num) Abs() Num {
	if x.Hi < 0 || x.Hi == 0 && x.Lo < 0 {
		return x.Neg()
	}
	return x
}

// Add returns x + y; relative error at most 3·2^-106 plus higher orders.
func (x Num) Add(y Num) Num {
	s, e := TwoSum(x.Hi, y.Hi)
	t, f := TwoSum(x.Lo, y.Lo)
	e += t
	s, e = QuickTwoSum(s, e)
	e += f
	s, e = QuickTwoSum(s, e)
	return Num{s, e}
}

// AddF returns x + y; relative error at most 2·2^-106.
func (x Num) AddF(y float64) Num {
	s, e := TwoSum(x.Hi, y)
	e += x.Lo
	s, e = QuickTwoSum(s, e)
	return Num{s, e}
}

// Sub returns x - y.
func (x Num) Sub(y Num) Num { return x.Add(Num{-y.Hi, -y.Lo}) }

// Mul returns x·y; relative error at most 5·2^-106.
func (x Num) Mul(y Num) Num {
	p, e := TwoProd(x.Hi, y.Hi)
	t := x.Lo * y.Lo
	t = math.FMA(x.Hi, y.Lo, t)
	t = math.FMA(x.Lo, y.Hi, t)
	e += t
	p, e = QuickTwoSum(p, e)
	return Num{p, e}
}

// MulF returns x·y; relative error at most 2·2^-106.
func (x Num) MulF(y float64) Num {
	p, e := TwoProd(x.Hi, y)
	e = math.FMA(x.Lo, y, e)
	p, e = QuickTwoSum(p, e)
	return Num{p, e}
}

// Div returns x/y; relative error at most 10·2^-106.
func (x Num) Div(y Num) Num {
	q := x.Hi / y.Hi
	if math.IsInf(q, 0) || math.IsNaN(q) || math.IsInf(y.Hi, 0) {
		return Num{q, 0}
	}
	r := x.Sub(y.MulF(q))
	q2 := r.Hi / y.Hi
	r = r.Sub(y.MulF(q2))
	q3 := r.Hi / y.Hi
	s, e := QuickTwoSum(q, q2)
	return Num{s, e}.AddF(q3)
}

// Sqrt returns the square root of x, NaN for x < 0; relative error at most
// 4·2^-106.
func (x Num) Sqrt() Num {
	s := math.Sqrt(x.Hi)
	if s == 0 || math.IsNaN(s) || math.IsInf(s, 0) {
		return Num{s, 0}
	}
	// One Newton step in double-double: s + (x - s²)/(2s).
	p, e := TwoProd(s, s)
	r := x.Sub(Num{p, e})
	s2, e2 := QuickTwoSum(s, r.Hi/(2*s))
	return Num{s2, e2}
}

// Cmp is -1, 0 or 1 as x is less than, equal to or greater than y.
func (x Num) Cmp(y Num) int {
	switch {
	case x.Hi < y.Hi || x.Hi == y.Hi && x.Lo < y.Lo:
		return -1
	case x.Hi == y.Hi && x.Lo == y.Lo:
		return 0
	}
	return 1
}

// PowInt returns x^k for a whole k by repeated squaring; x^0 is 1. The
// relative error is at most about 5·|k|·2^-106.
func (x Num) PowInt(k int) Num {
	n := uint(k)
	if k < 0 {
		n = -n // right for the least int too
	}
	r := Num{1, 0}
	for ; n > 0; n >>= 1 {
		if n&1 == 1 {
			r = r.Mul(x)
		}
		if n > 1 {
			x = x.Mul(x)
		}
	}
	if k < 0 {
		return Num{1, 0}.Div(r)
	}
	return r
}
