package design

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"example.com/trammel/internal/factored"
	"example.com/trammel/internal/lsq"
)

// condense reduces a form of many rows to few whose columns stand to each other
// as those of the form do: by the moments of its cells where these are few and
// tell enough, else by blocks. Rows are scaled by the square roots of weight
// times count; nil stands for 1.
func condense(form *factored.Form, weights, counts []float64) *lsq.Problem {
	if len(form.Cols) > 0 {
		limit := maxRankElements / (len(form.Cols) * (len(form.Nums) + 1))
		if k := form.CountCells(limit); k <= limit {
			cells := &factored.Cells{Form: form, Count: k, Weights: weights, Counts: counts, Workers: 1}
			// A response plays no part in the rank; any column does for one.
			var y []float64
			if len(form.Nums) > 0 {
				y = form.Nums[0].Hi
			} else {
				y = make([]float64, form.N)
			}
			if m, err := cells.Sum(y); err == nil {
				if c := factored.Condense(m); c != nil {
					return c.Problem(form)
				}
			}
		}
	}
	return triangleByBlocks(form, rootWeights(form.N, weights, counts))
}

// triangleByBlocks is the triangle of the form's QR factorisation, built block by block (J. Demmel, L. Grigori, M. Hoemmen and
// J. Langou, "Communication-optimal parallel and sequential QR and LU
// factorizations", SIAM J. Sci. Comput. 34 (2012) A206-A239).
func triangleByBlocks(form *factored.Form, roots []float64) *lsq.Problem {
	n, p := form.N, len(form.Cols)
	block := max(4096, 4*p)
	var r *mat.Dense
	for from := 0; from < n; from += block {
		to := min(n, from+block)
		part := formRows(form, from, to)
		m := Matrix{form: part}
		rows := to - from
		old := 0
		if r != nil {
			old = p
		}
		x := mat.NewDense(max(rows+old, p), p, nil)
		col := make([]float64, rows)
		for j := range p {
			m.ColumnTo(col, nil, j)
			for i, v := range col {
				if roots != nil {
					v *= roots[from+i]
				}
				x.Set(i, j, v)
			}
			for i := range old {
				x.Set(rows+i, j, r.At(i, j))
			}
		}
		var qr mat.QR
		qr.Factorize(x)
		var next mat.Dense
		qr.RTo(&next)
		r = mat.DenseCopyOf(next.Slice(0, p, 0, p))
	}
	q := &lsq.Problem{N: p, P: p, X: make([]float64, p*p)}
	for j := range p {
		for i := range p {
			q.X[j*p+i] = r.At(i, j)
		}
	}
	return q
}

// formRows is the form of rows [from, to).
func formRows(form *factored.Form, from, to int) *factored.Form {
	out := &factored.Form{N: to - from, Cols: form.Cols}
	for _, v := range form.Nums {
		part := factored.Num{Hi: v.Hi[from:to]}
		if v.Lo != nil {
			part.Lo = v.Lo[from:to]
		}
		out.Nums = append(out.Nums, part)
	}
	for _, c := range form.Cats {
		if c.Bits != nil {
			c.Bits = c.Bits[from:to]
		} else {
			c.Codes = c.Codes[from:to]
		}
		out.Cats = append(out.Cats, c)
	}
	return out
}

// rootWeights are the square roots of weight times count; nil when all are 1.
func rootWeights(n int, weights, counts []float64) []float64 {
	if weights == nil && counts == nil {
		return nil
	}
	roots := make([]float64, n)
	for i := range roots {
		w := 1.0
		if weights != nil {
			w = weights[i]
		}
		if counts != nil {
			w *= counts[i]
		}
		roots[i] = math.Sqrt(w)
	}
	return roots
}
