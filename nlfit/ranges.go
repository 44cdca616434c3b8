package nlfit

import (
	"math"

	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/internal/search"
)

// A parameter without a given start is sought where the equation and the data
// say that it can matter: a rate beside a column is about one over the
// column's range, a value added to a column lies among the column's values, an
// exponent is a small number. Nothing here knows of any particular problem.

// A role is one place of a parameter in an equation.
type role struct {
	kind  roleKind
	size  float64 // of the column beside it: the largest magnitude
	width float64 // the column's range
	low   float64 // the column's smallest and largest value
	high  float64
	even  bool    // only the parameter's square, say, stands there
	scale float64 // the size of what the place is added to
}

type roleKind uint8

const (
	rate     roleKind = iota // p * x: of the order 1/x
	size                     // x / p: of the order of x
	offset                   // x + p: of the order of x, positive first
	location                 // x - p: between the smallest and the largest x
	exponent                 // x ^ p
	base                     // p ^ x
	summand                  // in a sum whose other parts hold parameters: of the sum's size
	alone                    // no column beside it
)

// ranges gives every coefficient of the equation a range of starts.
func ranges(f *design.Frame) []search.Range {
	eq := f.Plan.Equation()
	parts := make(map[string][]float64)
	for k, part := range eq.Program.Parts() {
		parts[part.Expr.String()] = f.Matrix.Parts()[k]
	}
	response := roleOf(alone, f.Y).size
	if !(response > 0) {
		response = 1
	}
	_, p := f.Matrix.Dims()
	out := make([]search.Range, p)
	for _, q := range eq.Params {
		r := bounded(choose(roles(f.Plan.Model().Equation, q.Name, parts, response)), q)
		for j := q.From; j < q.To; j++ {
			out[j] = r
			if q.Link != "" || q.Own {
				out[j] = linked(r, q, f.Plan.Columns()[j].Name)
			}
		}
	}
	return out
}

// roles finds the places of a parameter.
func roles(e formula.Expr, name string, parts map[string][]float64, response float64) []role {
	var out []role
	// scale is the size that e should have: of the response at the root, of what e
	// is added to in a sum, 1 in the argument of a function.
	var visit func(e formula.Expr, scale float64)
	visit = func(e formula.Expr, scale float64) {
		switch e := e.(type) {
		case *formula.Unary:
			visit(e.X, scale)
		case *formula.Call:
			for _, a := range e.Args {
				visit(a, 1)
			}
		case *formula.Compare:
			visit(e.X, 1)
			visit(e.Y, 1)
			if x, ok := column(e.Y, parts); ok && is(e.X, name) {
				out = append(out, roleOf(location, x))
			} else if x, ok := column(e.X, parts); ok && is(e.Y, name) {
				out = append(out, roleOf(location, x))
			}
		case *formula.Binary:
			switch e.Op {
			case '+', '-':
				if size := addends(e, parts); size > 0 {
					scale = size
				}
				visit(e.X, scale)
				visit(e.Y, scale)
			case '/':
				// What is divided by, so that the quotient has the scale.
				over := addends(e.X, parts)
				if over == 0 {
					over = 1
				}
				visit(e.X, scale)
				visit(e.Y, over/scale)
			default:
				visit(e.X, scale)
				visit(e.Y, scale)
			}
			if r, ok := roleIn(e, name, parts); ok {
				r.scale = scale
				out = append(out, r)
			}
		}
	}
	visit(e, response)
	return out
}

// addends is the largest size among the summands of e without parameters; 0 when
// there are none.
func addends(e formula.Expr, parts map[string][]float64) float64 {
	if b, ok := e.(*formula.Binary); ok && (b.Op == '+' || b.Op == '-') {
		return math.Max(addends(b.X, parts), addends(b.Y, parts))
	}
	if n, ok := e.(*formula.Number); ok {
		return n.Value
	}
	if x, ok := parts[e.String()]; ok {
		return roleOf(alone, x).size
	}
	return 0
}

// roleIn is the role of the parameter as an operand of e.
func roleIn(e *formula.Binary, name string, parts map[string][]float64) (role, bool) {
	left, right := is(e.X, name), is(e.Y, name)
	x, evenX := evenPower(e.X)
	y, evenY := evenPower(e.Y)
	even := evenX && is(x, name) || evenY && is(y, name)
	left, right = left || evenX && is(x, name), right || evenY && is(y, name)
	if !left && !right {
		return role{}, false
	}
	if _, number := e.Y.(*formula.Number); number && e.Op == '^' {
		return role{}, false // its place is that of the power
	}
	other := e.Y
	if right {
		other = e.X
	}
	sum := e.Op == '+' || e.Op == '-'
	values, beside := column(other, parts)
	if !beside && !sum {
		values, beside = within(other, parts)
	}
	r := role{kind: alone, even: even}
	switch {
	case e.Op == '^' && right:
		r.kind = exponent
	case sum && !beside:
		r.kind = summand
	case !beside:
	case e.Op == '*':
		r = roleOf(rate, values)
	case e.Op == '/':
		r = roleOf(size, values)
	case e.Op == '+':
		r = roleOf(offset, values)
	case e.Op == '-':
		r = roleOf(location, values)
	default:
		r = roleOf(base, values)
	}
	r.even = even
	return r, true
}

// is tells that e is the parameter, perhaps with a sign or a factor that is no
// column.
func is(e formula.Expr, name string) bool {
	switch e := e.(type) {
	case *formula.Name:
		return e.Name == name
	case *formula.Unary:
		return is(e.X, name)
	case *formula.Binary:
		_, number := e.X.(*formula.Number)
		return e.Op == '*' && number && is(e.Y, name)
	}
	return false
}

// evenPower takes x from x^2, x^4 and the like.
func evenPower(e formula.Expr) (formula.Expr, bool) {
	b, ok := e.(*formula.Binary)
	if !ok || b.Op != '^' {
		return nil, false
	}
	n, ok := b.Y.(*formula.Number)
	return b.X, ok && math.Mod(n.Value, 2) == 0
}

// column gives the values of a part without parameters that varies.
func column(e formula.Expr, parts map[string][]float64) ([]float64, bool) {
	x, ok := parts[e.String()]
	return x, ok && varies(x)
}

func varies(x []float64) bool {
	for _, v := range x {
		if v != x[0] {
			return true
		}
	}
	return false
}

// within gives the first column inside an expression with parameters of its own.
func within(e formula.Expr, parts map[string][]float64) ([]float64, bool) {
	if x, ok := column(e, parts); ok {
		return x, true
	}
	switch e := e.(type) {
	case *formula.Unary:
		return within(e.X, parts)
	case *formula.Binary:
		if x, ok := within(e.X, parts); ok {
			return x, true
		}
		return within(e.Y, parts)
	case *formula.Call:
		for _, a := range e.Args {
			if x, ok := within(a, parts); ok {
				return x, true
			}
		}
	}
	return nil, false
}

func roleOf(kind roleKind, x []float64) role {
	r := role{kind: kind, low: math.Inf(1), high: math.Inf(-1)}
	for _, v := range x {
		if v-v != 0 {
			continue
		}
		r.low, r.high = math.Min(r.low, v), math.Max(r.high, v)
	}
	r.width = r.high - r.low
	r.size = math.Max(math.Abs(r.low), math.Abs(r.high))
	return r
}

// choose turns the first telling place of a parameter into a range.
func choose(list []role) search.Range {
	best := role{kind: alone, scale: 1}
	if len(list) > 0 {
		best = list[0]
	}
	for _, r := range list {
		if best.kind == alone {
			best = r
		}
	}
	const spread = 300 // on either side of the order of magnitude
	order := func(x float64) search.Range {
		if !(x > 0) || math.IsInf(x, 0) {
			x = 1
		}
		if best.even {
			return search.Range{Low: x / spread, High: x * spread, Log: true}
		}
		return search.Range{Low: -x * spread, High: x * spread, Log: true}
	}
	switch best.kind {
	case rate:
		return order(best.scale / math.Max(best.width, best.size/spread))
	case size:
		return order(best.size / 3)
	case offset:
		return order(best.size / 3)
	case summand:
		return order(best.scale)
	case location:
		return search.Range{Low: best.low, High: best.high}
	case exponent:
		return search.Range{Low: -4, High: 4}
	case base:
		return search.Range{Low: 0.05, High: 4, Log: true}
	}
	return order(best.scale)
}

// bounded cuts a range to the bounds of its parameter.
func bounded(r search.Range, q design.Parameter) search.Range {
	switch {
	case q.Low >= 0 && r.Log && r.Low < 0:
		r.Low = r.High / 1e5
	case q.High <= 0 && r.Log && r.High > 0:
		r.High = r.Low / 1e5
	}
	if lo, hi := math.Max(r.Low, q.Low), math.Min(r.High, q.High); lo < hi {
		r.Low, r.High = lo, hi
	} else if !math.IsInf(q.Low, 0) && !math.IsInf(q.High, 0) {
		return search.Range{Low: q.Low, High: q.High}
	}
	if r.Log && r.Low == 0 {
		r.Low = r.High / 1e5
	}
	return r
}

// linked turns a parameter's range into one of a coefficient of its own model:
// the constant spans the range on the scale of the link, other coefficients
// begin near 0.
func linked(r search.Range, q design.Parameter, name string) search.Range {
	lo, hi := r.Low, r.High
	switch q.Link {
	case "log":
		if lo <= 0 {
			lo = hi / 1e5
		}
		lo, hi = math.Log(lo), math.Log(hi)
	case "logit":
		lo, hi = -4, 4
	case "reciprocal":
		if lo <= 0 {
			lo = hi / 1e5
		}
		lo, hi = 1/hi, 1/lo
	}
	if name == q.Name+"[intercept]" || name == q.Link+"("+q.Name+")[intercept]" {
		return search.Range{Low: lo, High: hi, Log: q.Link == "" && r.Log}
	}
	return search.Range{Low: -(hi - lo) / 100, High: (hi - lo) / 100}
}
