package lsq

import (
	"math"

	"example.com/trammel/internal/dd"
	"gonum.org/v1/gonum/floats"
)

// tinySquare is the sum of squares below which a vector of a problem scaled
// to unit norms counts as zero: dropping it is a backward error of 1e-140,
// while norms of such vectors would suffer from underflow.
const tinySquare = 1e-280

// dot returns Σ x[i] y[i]. Long sums are taken in pieces: the errors of a
// running sum of many like terms, as in a column of ones, all point one way.
func dot(x, y []float64) float64 {
	const piece = 128
	var sum, errs float64
	for len(x) > piece {
		s, e := dd.TwoSum(sum, floats.Dot(x[:piece], y[:piece]))
		sum = s
		errs += e
		x, y = x[piece:], y[piece:]
	}
	return sum + (errs + floats.Dot(x, y))
}

// makeReflector turns x into the Householder vector v (v[0] = 1 implied) with
// (I - tau v v') x = beta e₁, and stores beta in x[0]. ss is Σ x[1:]².
func makeReflector(x []float64) (tau float64) {
	alpha := x[0]
	ss := dot(x[1:], x[1:])
	if ss <= tinySquare {
		return 0
	}
	beta := math.Sqrt(alpha*alpha + ss)
	if alpha > 0 {
		beta = -beta
	}
	floats.Scale(1/(alpha-beta), x[1:])
	x[0] = beta
	return (beta - alpha) / beta
}

// applyReflection replaces c by (I - tau v v') c; v[0] = 1 implied.
func applyReflection(v []float64, tau float64, c []float64) {
	if tau == 0 {
		return
	}
	w := tau * (c[0] + dot(v[1:], c[1:]))
	c[0] -= w
	floats.AddScaled(c[1:], -w, v[1:])
}

// householder factorises the m×p column-major matrix a without pivoting,
// min(m, p) reflections.
func householder(a []float64, m, p int, tau []float64) {
	for k := 0; k < min(m, p); k++ {
		v := a[k*m+k : (k+1)*m]
		tau[k] = makeReflector(v)
		for j := k + 1; j < p; j++ {
			applyReflection(v, tau[k], a[j*m+k:(j+1)*m])
		}
	}
}

// applyQT replaces c by Q'c for k reflections in a.
func applyQT(a []float64, m, k int, tau, c []float64) {
	for j := 0; j < k; j++ {
		applyReflection(a[j*m+j:(j+1)*m], tau[j], c[j:m])
	}
}

// applyQ replaces c by Qc for k reflections in a.
func applyQ(a []float64, m, k int, tau, c []float64) {
	for j := k - 1; j >= 0; j-- {
		applyReflection(a[j*m+j:(j+1)*m], tau[j], c[j:m])
	}
}

// solveR replaces c by R⁻¹c for the leading r×r triangle of a.
func solveR(a []float64, m, r int, c []float64) {
	for j := r - 1; j >= 0; j-- {
		col := a[j*m : j*m+j+1]
		v := c[j] / col[j]
		c[j] = v
		for i, w := range col[:j] {
			c[i] -= v * w
		}
	}
}

// solveRT replaces c by R⁻ᵀc for the leading r×r triangle of a.
func solveRT(a []float64, m, r int, c []float64) {
	for j := 0; j < r; j++ {
		col := a[j*m : j*m+j+1]
		s := c[j]
		for i, w := range col[:j] {
			s -= w * c[i]
		}
		c[j] = s / col[j]
	}
}
