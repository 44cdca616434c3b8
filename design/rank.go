package design

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"example.com/trammel/formula"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/factored"
	"example.com/trammel/internal/lsq"
)

// CheckRank refuses a frame whose columns are linearly dependent: a column is
// dependent when, scaled to unit norm, it lies within 1e-13 of the span of
// others. The [*Error] carries every dependency as an identity in coefficient
// names and model texts that mend it, the most natural first. The verdict does
// not change when columns are rescaled.
func (f *Frame) CheckRank() error {
	if err := f.checkRank(); err != nil {
		return err
	}
	return nil
}

// maxRankElements bounds the dense copy made for a rank check; larger frames
// are condensed first.
const maxRankElements = 4_000_000

// rankProblem writes the columns of a form out for the least-squares core. A
// form too large for that is condensed to few rows with the same column
// relations. Weights, all positive, say nothing about the rank.
func rankProblem(form *factored.Form) *lsq.Problem {
	if n := form.N * len(form.Cols); n <= maxRankElements {
		return expandForm(form)
	}
	return condense(form, nil, nil)
}

func expandForm(form *factored.Form) *lsq.Problem {
	m := Matrix{form: form}
	n, p := m.Dims()
	q := &lsq.Problem{N: n, P: p, X: make([]float64, n*p), XLo: make([]float64, n*p)}
	for j := range p {
		m.ColumnTo(q.X[j*n:(j+1)*n], q.XLo[j*n:(j+1)*n], j)
	}
	return q
}

func (f *Frame) checkRank() *Error {
	if f.Plan.eq != nil {
		return f.checkEquationRank()
	}
	return f.Plan.dependent(f.Matrix.form, identities(f.Matrix.form))
}

// identities are the dependencies between the columns of a form.
func identities(form *factored.Form) []lsq.Identity {
	q := rankProblem(form)
	if lsq.Factorize(q, nil).Rank() == q.P {
		return nil
	}
	return lsq.Identities(q)
}

// dependent builds the refusal of dependent columns.
func (p *Plan) dependent(form *factored.Form, found []lsq.Identity) *Error {
	if len(found) == 0 {
		return nil
	}
	e := &Error{Code: codeDependentColumns, Text: p.text, Span: p.model.Terms.Pos}
	for _, id := range found {
		e.Identities = append(e.Identities, p.identity(id))
	}
	words := make([]string, 0, 4)
	for _, id := range e.Identities[:min(3, len(e.Identities))] {
		words = append(words, id.String())
		for _, n := range id.Names {
			if !slices.Contains(e.Names, n) {
				e.Names = append(e.Names, n)
			}
		}
	}
	if more := len(e.Identities) - len(words); more > 0 {
		words = append(words, fmt.Sprintf("%d more", more))
	}
	e.Message = "columns depend on each other: " + strings.Join(words, "; ")
	e.Mends = p.mends(form, found)
	switch len(e.Mends) {
	case 0:
		e.Hint = "take one of these columns out of the model or of the data"
	default:
		e.Hint = "write " + errtext.Or(e.Mends[:min(2, len(e.Mends))])
	}
	return e
}

// identity turns a dependency into names and coefficients: the sum of
// Coefs[i] times Names[i] is zero.
func (p *Plan) identity(id lsq.Identity) Identity {
	out := Identity{Exact: id.Exact}
	for j, c := range id.Coefs {
		if c != 0 {
			out.Names = append(out.Names, p.columns[j].Name)
			out.Coefs = append(out.Coefs, -c)
		}
	}
	out.Names = append(out.Names, p.columns[id.Column].Name)
	out.Coefs = append(out.Coefs, 1)
	if out.Exact {
		clearDenominators(out.Coefs)
	}
	return out
}

// clearDenominators multiplies small rationals (denominators up to 12) by
// their common denominator when that leaves small whole numbers.
func clearDenominators(c []float64) {
	for d := 1.0; d <= 12; d++ {
		ok := true
		for _, x := range c {
			ok = ok && math.Abs(x*d-math.Round(x*d)) < 1e-9 && math.Abs(x*d) < 1e6
		}
		if ok {
			for i := range c {
				c[i] = math.Round(c[i] * d)
			}
			return
		}
	}
}

// String writes the identity as an equation with positive coefficients on both
// sides, the longer side first: "oven_1 + oven_2 + oven_3 = intercept".
func (id Identity) String() string {
	var left, right []string
	sign := 1.0
	if len(id.Coefs) > 0 {
		sign = math.Copysign(1, id.Coefs[len(id.Coefs)-1])
	}
	for i, c := range id.Coefs {
		name := id.Names[i]
		a := math.Abs(c)
		if strings.Contains(name, " + ") || strings.Contains(name, " - ") || a != 1 && strings.Contains(name, " by ") {
			name = "(" + name + ")"
		}
		text := name
		if a != 1 {
			num := formula.FormatNumber(a)
			if !id.Exact {
				num = fmt.Sprintf("%.6g", a)
			}
			text = num + "*" + name
		}
		if c*sign > 0 {
			right = append(right, text)
		} else {
			left = append(left, text)
		}
	}
	if len(right) > len(left) {
		left, right = right, left
	}
	join := func(side []string) string {
		if len(side) == 0 {
			return "0"
		}
		return strings.Join(side, " + ")
	}
	text := join(left) + " = " + join(right)
	if !id.Exact {
		text += " (approximate decimals)"
	}
	return text
}

// maxMends is how many mends are looked for.
const maxMends = 4

// maxTries is how many changes are tried, so that a refusal stays quick: each
// try factorises the whole matrix once.
func maxTries(form *factored.Form) int {
	return max(4, min(24, 10_000_000/(1+form.N*len(form.Cols))))
}

// mends finds small changes that make the columns independent: each is tried
// by coding what is left and checking its rank.
func (p *Plan) mends(form *factored.Form, found []lsq.Identity) []string {
	c := &p.compiled
	var out []string
	works := func(drop map[int]bool) bool {
		var keep []int
		for k := range c.terms {
			if !drop[k] {
				keep = append(keep, k)
			}
		}
		sub, err := c.recode(keep)
		if err != nil || len(sub.coded) == 0 {
			return false
		}
		q := rankProblem(&factored.Form{N: form.N, Nums: form.Nums, Cats: form.Cats, Cols: sub.cols})
		return lsq.Factorize(q, nil).Rank() == q.P
	}
	add := func(drop map[int]bool) {
		if text := p.withoutTerms(drop); text != "" && !slices.Contains(out, text) {
			out = append(out, text)
		}
	}
	// The terms that take part, most natural to remove first.
	var candidates []int
	push := func(k int) {
		if !slices.Contains(candidates, k) {
			candidates = append(candidates, k)
		}
	}
	intercept := -1
	if len(c.terms[0].factors) == 0 {
		intercept = 0
	}
	for _, id := range found {
		terms := make(map[int]bool)
		for j, x := range id.Coefs {
			if x != 0 {
				terms[c.coded[j].term] = true
			}
		}
		terms[c.coded[id.Column].term] = true
		if intercept >= 0 && terms[intercept] && len(terms) > 2 && p.handMade(id) {
			// A full set of hand-made indicators: leave the first out, as
			// the reference level.
			for k := range c.terms {
				if terms[k] && k != intercept {
					push(k)
					break
				}
			}
			push(intercept)
		}
		for k := len(c.terms) - 1; k >= 0; k-- {
			if terms[k] && k != intercept {
				push(k)
			}
		}
	}
	if intercept >= 0 {
		for _, id := range found {
			if id.Coefs[0] != 0 {
				push(intercept)
			}
		}
	}
	tries, most := 0, maxTries(form)
	for _, k := range candidates {
		if tries++; tries > most || len(out) >= maxMends {
			break
		}
		if drop := map[int]bool{k: true}; works(drop) {
			add(drop)
		}
	}
	if len(out) > 0 {
		return out
	}
	// More than one term must go: take the term of each dependent column, then
	// put back those that need not go.
	drop := make(map[int]bool)
	for _, id := range found {
		drop[c.coded[id.Column].term] = true
	}
	if !works(drop) {
		for _, k := range candidates {
			if k != intercept {
				drop[k] = true
			}
			if works(drop) {
				break
			}
		}
	}
	if works(drop) {
		for _, k := range slices.Backward(candidates) {
			if tries++; tries > 2*most {
				break
			}
			if drop[k] {
				delete(drop, k)
				if !works(drop) {
					drop[k] = true
				}
			}
		}
		add(drop)
	}
	return out
}

// handMade tells that an identity says that bare columns add up to a multiple
// of the intercept.
func (p *Plan) handMade(id lsq.Identity) bool {
	n := 0
	var coef float64
	for j := range p.coded {
		x := 0.0
		switch {
		case j == id.Column:
			x = -1
		case j < len(id.Coefs):
			x = id.Coefs[j]
		}
		fs := p.coded[j].factors
		if x == 0 || len(fs) == 0 {
			continue
		}
		if len(fs) != 1 || fs[0].num < 0 || n > 0 && x != coef {
			return false
		}
		coef = x
		n++
	}
	return n > 1
}
