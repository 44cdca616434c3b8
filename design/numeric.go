package design

import (
	"fmt"
	"math"
	"slices"

	"example.com/trammel/formula"
	"example.com/trammel/internal/dd"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/expr"
	"example.com/trammel/internal/factored"
)

// A numeric is a compiled numeric factor: a column of arithmetic, or a basis
// with the constants learnt from the fitted rows.
type numeric struct {
	spec  *numericSpec
	prog  *expr.Program
	pos   formula.Span
	parts []string // names of its columns

	low, high float64   // legendre: the fitted range
	knots     []float64 // spline: k+1 knots, ascending
}

func newNumeric(text string, spec *numericSpec, pos formula.Span) (*numeric, *Error) {
	prog, err := expr.Compile(spec.expr)
	if err != nil {
		return nil, &Error{Code: codeNotATerm, Message: spec.text + " cannot be computed", Hint: "write plain arithmetic of columns",
			Text: text, Span: pos, Err: err}
	}
	return &numeric{spec: spec, prog: prog, pos: pos, parts: spec.parts()}, nil
}

// vars binds the columns a program reads.
func vars(p *expr.Program, t *Table) []expr.Var {
	names := p.Names()
	out := make([]expr.Var, len(names))
	for i, name := range names {
		c := t.column(name)
		out[i] = expr.Var{Num: c.num, Bits: c.bits, Codes: c.codes, Dict: c.dict}
	}
	return out
}

// evaluate computes an expression for all rows. A bare number column is shared,
// not copied. Values that are not finite are refused with their rows.
func evaluate(p *expr.Program, t *Table, what string, at place) (factored.Num, *Error) {
	if name, ok := p.Bare(); ok {
		if c := t.column(name); c.kind == NumberColumn {
			return factored.Num{Hi: c.num}, nil
		}
	}
	n := t.rows
	out := factored.Num{Hi: make([]float64, n)}
	if p.HasLow() {
		out.Lo = make([]float64, n)
	}
	vs := vars(p, t)
	p.Eval(out.Hi, out.Lo, vs, n)
	var rows []int
	total := 0
	for i, v := range out.Hi {
		if v-v != 0 {
			if total++; len(rows) < maxRows {
				rows = append(rows, at.row(i))
			}
		}
	}
	if total > 0 {
		i := slices.IndexFunc(out.Hi, func(v float64) bool { return v-v != 0 })
		words := make([]string, 0, 3)
		for _, name := range p.Names() {
			if len(words) < 3 {
				words = append(words, formula.QuoteName(name)+" is "+valueAt(t.column(name), i).source())
			}
		}
		where := ""
		if len(words) > 0 {
			where = " (" + errtext.And(words) + ")"
			if total > 1 {
				where = fmt.Sprintf(" (in row %d %s)", at.row(i), errtext.And(words))
			}
		}
		return out, &Error{Code: codeDomain, Text: at.text, Span: at.span, Rows: rows, Names: slices.Clone(p.Names()),
			Message: fmt.Sprintf("%s is not a finite number in %s%s", what, errtext.Rows(rows, total), where),
			Hint:    "take those rows out, or write an expression that is defined there"}
	}
	return out, nil
}

// A place says where in the model text an expression stands and how rows of
// the table at hand are numbered in the user's table.
type place struct {
	text string
	span formula.Span
	rows []int // row numbers from 1; nil when rows are as given
}

func (p place) row(i int) int {
	if p.rows == nil {
		return i + 1
	}
	return p.rows[i]
}

// learn takes the basis constants from the fitted rows.
func (q *numeric) learn(x factored.Num, counts []float64, at place) *Error {
	switch q.spec.kind {
	case legendreKind:
		q.low, q.high = slices.Min(x.Hi), slices.Max(x.Hi)
		if !(q.low < q.high) {
			return q.constant(at)
		}
		if math.IsInf(q.high-q.low, 0) {
			return &Error{Code: codeDomain, Text: at.text, Span: at.span,
				Message: "the range of " + exprText(q.spec.expr) + " exceeds the largest number", Hint: "use smaller units"}
		}
	case splineKind:
		knots, err := quantiles(x.Hi, counts, q.spec.k)
		if err != nil {
			err.Text, err.Span = at.text, at.span
			return err
		}
		for i := 1; i < len(knots); i++ {
			if !(knots[i-1] < knots[i]) {
				if knots[0] == knots[len(knots)-1] {
					return q.constant(at)
				}
				return &Error{Code: codeCoincidingKnots, Text: at.text, Span: at.span,
					Message: fmt.Sprintf("knots %d and %d of %s coincide at %s: too many rows hold that value", i, i+1, q.spec.text, signedText(knots[i])),
					Hint:    q.fewerKnots(x.Hi, counts)}
			}
		}
		q.knots = knots
	}
	return nil
}

func (q *numeric) constant(at place) *Error {
	return &Error{Code: codeConstantBasis, Text: at.text, Span: at.span,
		Message: fmt.Sprintf("%s has one value in all fitted rows, so %s has no range", exprText(q.spec.expr), q.spec.text),
		Hint:    "take the term out"}
}

// fewerKnots finds the largest order whose knots differ.
func (q *numeric) fewerKnots(x, counts []float64) string {
	for k := q.spec.k - 1; k >= 2; k-- {
		knots, err := quantiles(x, counts, k)
		if err != nil {
			break
		}
		apart := true
		for i := 1; i < len(knots); i++ {
			apart = apart && knots[i-1] < knots[i]
		}
		if apart {
			return fmt.Sprintf("write spline(%s, %d)", q.spec.expr, k)
		}
	}
	return fmt.Sprintf("write powers(%s, 2) or the column itself", q.spec.expr)
}

// quantiles gives minimum, maximum and the quantiles j/k between, each row
// standing for count equal ones: linear interpolation at position (N-1)·j/k of
// the sorted values.
func quantiles(x, counts []float64, k int) ([]float64, *Error) {
	order := make([]int, len(x))
	for i := range order {
		order[i] = i
	}
	slices.SortFunc(order, func(a, b int) int {
		switch {
		case x[a] < x[b]:
			return -1
		case x[a] > x[b]:
			return 1
		}
		return 0
	})
	total := float64(len(x))
	if counts != nil {
		total = 0
		for _, c := range counts {
			total += c
		}
	}
	out := make([]float64, 0, k+1)
	i, before := 0, 0.0 // before: rows that stand before order[i]
	weight := func(i int) float64 {
		if counts == nil {
			return 1
		}
		return counts[order[i]]
	}
	at := func(position float64) float64 { // positions do not decrease
		for i < len(order)-1 && before+weight(i) <= position {
			before += weight(i)
			i++
		}
		return x[order[i]]
	}
	for j := 0; j <= k; j++ {
		// (N-1)·j/k with the whole part exact for N below 2^53/k.
		p := (total - 1) * float64(j)
		whole := math.Floor(p / float64(k))
		if j == k {
			out = append(out, x[order[len(order)-1]])
			break
		}
		frac := (p - whole*float64(k)) / float64(k)
		lo := at(whole)
		if frac == 0 {
			out = append(out, lo)
			continue
		}
		save, saveBefore := i, before
		hi := at(whole + 1)
		i, before = save, saveBefore
		out = append(out, lo+frac*(hi-lo))
	}
	return out, nil
}

// columns computes the factor's columns at the rows where its argument is x.
func (q *numeric) columns(x factored.Num) []factored.Num {
	if q.spec.kind == exprKind {
		return []factored.Num{x}
	}
	n := len(x.Hi)
	out := make([]factored.Num, len(q.parts))
	for j := range out {
		out[j] = factored.Num{Hi: make([]float64, n), Lo: make([]float64, n)}
	}
	row := make([]dd.Num, len(out))
	for i := range n {
		v := dd.Of(x.Hi[i])
		if x.Lo != nil {
			v.Lo = x.Lo[i]
		}
		q.rowTo(row, v)
		for j, b := range row {
			out[j].Hi[i], out[j].Lo[i] = b.Hi, b.Lo
		}
	}
	return out
}

// rowTo computes the basis at one x.
func (q *numeric) rowTo(dst []dd.Num, x dd.Num) {
	switch q.spec.kind {
	case legendreKind:
		// z = (2x - low - high)/(high - low), then Bonnet's recurrence
		// (j+1) P(j+1) = (2j+1) z P(j) - j P(j-1).
		span := dd.Of(q.high).AddF(-q.low)
		z := x.AddF(-q.low).Add(x.AddF(-q.high)).Div(span)
		before, p := dd.Of(1), z
		for j := range dst {
			dst[j] = p
			d := float64(j + 1)
			next := z.Mul(p).MulF(2*d + 1).Sub(before.MulF(d)).Div(dd.Of(d + 1))
			before, p = p, next
		}
	case splineKind:
		// Natural cubic spline in the truncated power basis, reduced to be
		// linear outside the end knots (Hastie, Tibshirani and Friedman, The
		// Elements of Statistical Learning, 2nd ed., eq. 5.4-5.5), on x scaled
		// to [0, 1] between the end knots.
		last := len(q.knots) - 1
		span := dd.Of(q.knots[last]).AddF(-q.knots[0])
		cube := func(knot float64) dd.Num {
			u := x.AddF(-knot)
			if u.Hi <= 0 {
				return dd.Num{}
			}
			u = u.Div(span)
			return u.Mul(u).Mul(u)
		}
		d := func(j int) dd.Num {
			w := dd.Of(q.knots[last]).AddF(-q.knots[j]).Div(span)
			return cube(q.knots[j]).Sub(cube(q.knots[last])).Div(w)
		}
		dst[0] = x.AddF(-q.knots[0]).Div(span)
		end := d(last - 1)
		for j := 1; j < len(dst); j++ {
			dst[j] = d(j - 1).Sub(end)
		}
	case hingeKind:
		for j, c := range q.spec.constants {
			u := x.AddF(-c)
			if u.Hi < 0 {
				u = dd.Num{}
			}
			dst[j] = u
		}
	case harmonicsKind:
		for j := 0; j < q.spec.k; j++ {
			// The turn is reduced to [-1/2, 1/2] before it meets pi.
			u := x.MulF(float64(j + 1)).Div(dd.Of(q.spec.constants[0]))
			u = u.AddF(-math.Round(u.Hi))
			angle := u.Mul(twoPi)
			s, c := math.Sincos(angle.Hi)
			// First-order correction for the angle's low part.
			dst[2*j] = dd.Of(c).AddF(-s * angle.Lo)
			dst[2*j+1] = dd.Of(s).AddF(c * angle.Lo)
		}
	}
}

// twoPi to 106 bits.
var twoPi = dd.Num{Hi: 2 * math.Pi, Lo: 2 * 1.2246467991473515e-16}

// multiply is the product of numeric columns, in double-double.
func multiply(factors []factored.Num) factored.Num {
	if len(factors) == 1 {
		return factors[0]
	}
	n := len(factors[0].Hi)
	out := factored.Num{Hi: make([]float64, n), Lo: make([]float64, n)}
	get := func(f *factored.Num, i int) dd.Num {
		v := dd.Of(f.Hi[i])
		if f.Lo != nil {
			v.Lo = f.Lo[i]
		}
		return v
	}
	for i := range n {
		v := get(&factors[0], i)
		for k := range factors[1:] {
			v = v.Mul(get(&factors[k+1], i))
		}
		out.Hi[i], out.Lo[i] = v.Hi, v.Lo
	}
	return out
}
