package design

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"example.com/trammel/internal/lsq"
)

// Collinearity describes near-dependencies between the columns of a frame: the
// condition indices of the columns scaled to unit norm with their variance
// proportions (D. A. Belsley, E. Kuh and R. E. Welsch, Regression Diagnostics,
// Wiley 1980, ch. 3), and variance inflation factors. Weights and counts are
// taken into account. p is the number of columns.
type Collinearity struct {
	// Indices are the p condition indices in ascending order: the largest
	// singular value over each. Above 30, with two or more proportions above
	// 0.5 in one row, the columns are nearly dependent (common practice).
	Indices []float64

	// Proportions[k][j] is the share of the variance of coefficient j that goes
	// with index k; each coefficient's shares add up to 1.
	Proportions [][]float64

	// Inflation[j] is the variance inflation factor of coefficient j: its
	// variance over what it would be were its column orthogonal to the others,
	// about the mean when the model has an intercept. NaN for the intercept.
	Inflation []float64
}

// Collinearity computes condition indices, variance proportions and variance
// inflation factors. Dependent columns are refused as by CheckRank.
func (f *Frame) Collinearity() (*Collinearity, error) {
	q := f.weighted()
	n, p := q.N, q.P
	for j := range p {
		col := q.X[j*n : (j+1)*n]
		s := norm(col)
		if s == 0 {
			return nil, f.CheckRank()
		}
		for i := range col {
			col[i] /= s
		}
	}
	// The singular values of the columns are those of R; R is p×p.
	q.XLo = nil
	r := triangle(q)
	var svd mat.SVD
	if !svd.Factorize(r, mat.SVDThin) {
		return nil, f.CheckRank()
	}
	d := svd.Values(nil)
	if d[p-1] <= 1e-14*d[0] {
		if err := f.CheckRank(); err != nil {
			return nil, err
		}
	}
	var v mat.Dense
	svd.VTo(&v)
	out := &Collinearity{Inflation: make([]float64, p)}
	total := make([]float64, p)
	for k := range p {
		out.Indices = append(out.Indices, d[0]/d[k])
		row := make([]float64, p)
		for j := range p {
			x := v.At(j, k) / d[k]
			row[j] = x * x
			total[j] += row[j]
		}
		out.Proportions = append(out.Proportions, row)
	}
	for _, row := range out.Proportions {
		for j := range row {
			row[j] /= total[j]
		}
	}
	intercept := f.Plan.list[0].Intercept
	for j := range p {
		out.Inflation[j] = total[j]
		if !intercept {
			continue
		}
		if j == 0 {
			out.Inflation[j] = math.NaN()
			continue
		}
		// total = 1/(1-R²) about 0 for a unit column; about the mean the column's
		// own sum of squares is 1 - (its product with the unit intercept)².
		dot := 0.0
		for i := range n {
			dot += q.X[i] * q.X[j*n+i]
		}
		out.Inflation[j] *= math.Max(0, 1-dot*dot)
	}
	return out, nil
}

// weighted is the frame's matrix, or few rows for it, with rows scaled by the
// square roots of weight times count.
func (f *Frame) weighted() *lsq.Problem {
	form := f.Matrix.form
	if form.N*len(form.Cols) > maxRankElements {
		return condense(form, f.Weights, f.Counts)
	}
	q := expandForm(form)
	for i, w := range rootWeights(form.N, f.Weights, f.Counts) {
		for j := range q.P {
			q.X[j*q.N+i] *= w
		}
	}
	return q
}

func norm(x []float64) float64 {
	big := 0.0
	for _, v := range x {
		big = math.Max(big, math.Abs(v))
	}
	if big == 0 {
		return 0
	}
	s := 0.0
	for _, v := range x {
		s += (v / big) * (v / big)
	}
	return big * math.Sqrt(s)
}

func triangle(q *lsq.Problem) *mat.Dense {
	n, p := q.N, q.P
	x := mat.NewDense(n, p, nil)
	for j := range p {
		x.SetCol(j, q.X[j*n:(j+1)*n])
	}
	var qr mat.QR
	qr.Factorize(x)
	var r mat.Dense
	qr.RTo(&r)
	return mat.DenseCopyOf(r.Slice(0, p, 0, p))
}
