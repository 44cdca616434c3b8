package linfit

import (
	"math"

	"example.com/trammel/design"
	"example.com/trammel/internal/dd"
	"example.com/trammel/internal/factored"
	"example.com/trammel/internal/lsq"
)

// rootsOf returns the square roots of weight times count, n in double-double;
// nil when the frame has neither.
func rootsOf(f *design.Frame) (hi, lo []float64) {
	if f.Weights == nil && f.Counts == nil {
		return nil, nil
	}
	n := len(f.Y)
	both := make([]float64, 2*n)
	hi, lo = both[:n], both[n:]
	for i := range n {
		s := massOf(f, i).Sqrt()
		hi[i], lo[i] = s.Hi, s.Lo
	}
	return hi, lo
}

// massOf is weight times count of row i.
func massOf(f *design.Frame, i int) dd.Num {
	switch {
	case f.Weights == nil && f.Counts == nil:
		return dd.Of(1)
	case f.Counts == nil:
		return dd.Of(f.Weights[i])
	case f.Weights == nil:
		return dd.Of(f.Counts[i])
	}
	p, e := dd.TwoProd(f.Weights[i], f.Counts[i])
	return dd.Num{Hi: p, Lo: e}
}

// responseOf is the response of row i with the known terms in it.
func responseOf(f *design.Frame, i int) dd.Num {
	y := dd.Of(f.Y[i])
	if f.YLo != nil {
		y.Lo = f.YLo[i]
	}
	return y
}

// knownOf is the sum of the known terms of row i.
func knownOf(f *design.Frame, i int) dd.Num {
	if f.Known == nil {
		return dd.Num{}
	}
	k := dd.Of(f.Known[i])
	if f.KnownLo != nil {
		k.Lo = f.KnownLo[i]
	}
	return k
}

// expand fills p with the columns of form, rows multiplied by roots.
func expand(p *lsq.Problem, form *factored.Form, roots, rootsLo []float64) {
	n, c := form.N, len(form.Cols)
	low := roots != nil
	for j := 0; j < c && !low; j++ {
		low = form.HasLow(j)
	}
	size := n * c
	if low {
		size *= 2
	}
	all := make([]float64, size)
	p.N, p.P, p.X = n, c, all[:n*c]
	if low {
		p.XLo = all[n*c:]
	}
	for j := range c {
		hi := p.X[j*n : (j+1)*n]
		var lo []float64
		if low {
			lo = p.XLo[j*n : (j+1)*n]
		}
		form.ColumnTo(hi, lo, j, 0)
		if roots != nil {
			timesRoots(hi, lo, roots, rootsLo)
		}
	}
}

// timesRoots multiplies hi + lo by roots + rootsLo.
func timesRoots(hi, lo, roots, rootsLo []float64) {
	for i, v := range hi {
		s := dd.Num{Hi: v, Lo: lo[i]}.Mul(dd.Num{Hi: roots[i], Lo: rootsLo[i]})
		hi[i], lo[i] = s.Hi, s.Lo
	}
}

// leftSide is the response less the known terms, rows multiplied by roots. It
// is the frame's own when there is nothing to do.
func leftSide(f *design.Frame, roots, rootsLo []float64) (hi, lo []float64) {
	if f.Known == nil && roots == nil {
		return f.Y, f.YLo
	}
	n := len(f.Y)
	both := make([]float64, 2*n)
	hi, lo = both[:n], both[n:]
	for i := range n {
		v := responseOf(f, i).Sub(knownOf(f, i))
		if roots != nil {
			v = v.Mul(dd.Num{Hi: roots[i], Lo: rootsLo[i]})
		}
		hi[i], lo[i] = v.Hi, v.Lo
	}
	return hi, lo
}

// totals is the sum of squares of the response about its mean, or about 0.
func totals(f *design.Frame, corrected bool) dd.Num {
	var mean, mass, sum dd.Num
	weighted := f.Weights != nil || f.Counts != nil
	if corrected {
		for i := range f.Y {
			y := responseOf(f, i)
			if weighted {
				w := massOf(f, i)
				mass = mass.Add(w)
				y = y.Mul(w)
			}
			mean = mean.Add(y)
		}
		if !weighted {
			mass = dd.Of(float64(len(f.Y)))
		}
		mean = mean.Div(mass)
	}
	for i := range f.Y {
		d := responseOf(f, i).Sub(mean)
		d = d.Mul(d)
		if weighted {
			d = d.Mul(massOf(f, i))
		}
		sum = sum.Add(d)
	}
	return sum
}

// hasIntercept reports whether a column is the constant 1.
func hasIntercept(form *factored.Form) bool {
	for i := range form.Cols {
		if form.Cols[i].Num < 0 && len(form.Cols[i].Cells) == 0 {
			return true
		}
	}
	return false
}

// spansConstant reports whether the constant lies in the span of the columns,
// by solving for it.
func spansConstant(f *lsq.Factor, n int, roots, rootsLo []float64) bool {
	var s lsq.Solution
	total := dd.Of(float64(n))
	if roots == nil {
		roots = make([]float64, n)
		for i := range roots {
			roots[i] = 1
		}
	} else {
		total = dd.Num{}
		for i, v := range roots {
			w := dd.Num{Hi: v, Lo: rootsLo[i]}
			total = total.Add(w.Mul(w))
		}
	}
	f.Solve(roots, rootsLo, &s)
	return math.Sqrt(s.RSS.Hi) < lsq.Tolerance*math.Sqrt(total.Hi)
}
