package design

import (
	"fmt"
	"math"
	"slices"

	"example.com/trammel/formula"
	"example.com/trammel/internal/dd"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/expr"
)

func pair(hi, lo []float64, i int) dd.Num {
	v := dd.Of(hi[i])
	if lo != nil {
		v.Lo = lo[i]
	}
	return v
}

// response computes what the model describes at the fitted rows, and checks
// its domain.
func (u *uses) response(f *Frame, s *selection) *Error {
	r := u.model.Response
	at := place{u.text, r.Value.Span(), s.rows}
	y, err := evaluate(u.value, s.table, r.Value.String(), at)
	if err != nil {
		return err
	}
	f.Y, f.YLo = y.Hi, y.Lo
	for _, c := range []struct {
		p   *expr.Program
		e   formula.Expr
		dst *[]float64
	}{{u.outOf, r.OutOf, &f.OutOf}, {u.per, r.Per, &f.Per}} {
		if c.p == nil {
			continue
		}
		v, err := evaluate(c.p, s.table, c.e.String(), place{u.text, c.e.Span(), s.rows})
		if err != nil {
			return err
		}
		*c.dst = v.Hi
	}
	whole := func(x float64) bool { return x == math.Trunc(x) && math.Abs(x) <= 1<<53 }
	switch {
	case r.OutOf != nil:
		if err := u.violation(at, f, "whole numbers with 0 <= k <= n and n > 0", "mend those rows, or set the larger number after out of",
			r.Value.String()+" out of "+r.OutOf.String(), func(i int) bool {
				k, n := f.Y[i], f.OutOf[i]
				return whole(k) && whole(n) && n > 0 && k >= 0 && k <= n
			}, f.OutOf); err != nil {
			return err
		}
	case r.Per != nil:
		if err := u.violation(place{u.text, r.Per.Span(), s.rows}, f, "an exposure above 0", "take those rows out",
			r.Value.String()+" per "+r.Per.String(), func(i int) bool { return f.Per[i] > 0 }, f.Per); err != nil {
			return err
		}
	}
	if e := u.model.Errors; e != nil && e.Family == "binomial" && r.OutOf == nil {
		if err := u.violation(at, f, "0/1 or true/false", "write "+r.Value.String()+" out of n for grouped counts",
			"the binomial response "+r.Value.String(), func(i int) bool { return f.Y[i] == 0 || f.Y[i] == 1 }, nil); err != nil {
			return err
		}
	}
	return nil
}

func (u *uses) violation(at place, f *Frame, needs, hint, what string, ok func(i int) bool, second []float64) *Error {
	var rows []int
	total, first := 0, 0
	for i := range f.Y {
		if ok(i) {
			continue
		}
		if total++; total == 1 {
			first = i
		}
		if len(rows) < maxRows {
			rows = append(rows, at.row(i))
		}
	}
	if total == 0 {
		return nil
	}
	shown := signedText(f.Y[first])
	if second != nil {
		shown += " and " + signedText(second[first])
	}
	message := fmt.Sprintf("%s needs %s; row %d has %s", what, needs, at.row(first), shown)
	if total > 1 {
		message += fmt.Sprintf("; %s in all break this rule", errtext.Rows(rows, total))
	}
	return &Error{Code: codeResponseDomain, Text: at.text, Span: at.span, Rows: rows, Message: message, Hint: hint}
}

// A BackMap turns values of a transformed response back into values of its
// one column.
type BackMap struct {
	Column     string
	Increasing bool
	Map        func(float64) float64 // the inverse; values outside the range give the nearest end

	positive bool // one-to-one on values above 0 only
}

// BackMap gives the way back from a transformed response, such as log(y), to
// its column. ok is false when the response is a plain column, or is not a
// chain of steps that are one-to-one on the fitted values of one column.
func (p *Plan) BackMap() (b BackMap, ok bool) {
	if p.backMap == nil {
		return b, false
	}
	return *p.backMap, true
}

// findBackMap looks for the way back, given the column's fitted values.
func (p *Plan) findBackMap(t *Table) {
	b, ok := invert(p.model.Response.Value)
	if !ok {
		return
	}
	if b.positive {
		c := t.column(b.Column)
		if c.kind != NumberColumn || slices.Min(c.num) <= 0 {
			return
		}
	}
	p.backMap = &b
}

func invert(e formula.Expr) (b BackMap, ok bool) {
	if _, plain := e.(*formula.Name); plain {
		return b, false
	}
	b.Increasing = true
	b.Map = func(v float64) float64 { return v }
	for {
		switch x := e.(type) {
		case *formula.Name:
			b.Column = x.Name
			return b, true
		case *formula.Unary:
			b.chain(false, func(v float64) float64 { return -v })
			e = x.X
		case *formula.Binary:
			next, okay := b.undo(x)
			if !okay {
				return BackMap{}, false
			}
			e = next
		case *formula.Call:
			inv, okay := inverses[x.Func]
			if !okay || len(x.Args) != 1 {
				return BackMap{}, false
			}
			b.chain(true, inv)
			e = x.Args[0]
		default:
			return BackMap{}, false
		}
	}
}

// chain puts one more inverse step behind those so far.
func (b *BackMap) chain(increasing bool, inv func(float64) float64) {
	before := b.Map
	b.Map = func(v float64) float64 { return inv(before(v)) }
	if !increasing {
		b.Increasing = !b.Increasing
	}
}

// inverses of increasing functions; outside a range the nearest end.
var inverses = map[string]func(float64) float64{
	"log":   math.Exp,
	"log10": func(v float64) float64 { return math.Pow(10, v) },
	"log1p": math.Expm1,
	"exp":   func(v float64) float64 { return math.Log(max(v, 0)) },
	"expm1": func(v float64) float64 { return math.Log1p(max(v, -1)) },
	"sqrt":  func(v float64) float64 { v = max(v, 0); return v * v },
	"atan":  func(v float64) float64 { return math.Tan(max(-math.Pi/2, min(v, math.Pi/2))) },
	"tanh":  func(v float64) float64 { return math.Atanh(max(-1, min(v, 1))) },
	"erf":   func(v float64) float64 { return math.Erfinv(max(-1, min(v, 1))) },
}

// undo takes one arithmetic step off: the other operand must be a constant.
func (b *BackMap) undo(e *formula.Binary) (formula.Expr, bool) {
	c, right := constant(e.Y)
	inner := e.X
	if !right {
		var left bool
		if c, left = constant(e.X); !left {
			return nil, false
		}
		inner = e.Y
	}
	switch e.Op {
	case '+':
		b.chain(true, func(v float64) float64 { return v - c })
	case '-':
		if right {
			b.chain(true, func(v float64) float64 { return v + c })
		} else {
			b.chain(false, func(v float64) float64 { return c - v })
		}
	case '*':
		if c == 0 {
			return nil, false
		}
		b.chain(c > 0, func(v float64) float64 { return v / c })
	case '/':
		if c == 0 {
			return nil, false
		}
		if right {
			b.chain(c > 0, func(v float64) float64 { return v * c })
		} else {
			b.positive = true // c/x is one-to-one on either side of 0
			b.chain(c < 0, func(v float64) float64 {
				if v/c <= 0 {
					return math.Inf(1)
				}
				return c / v
			})
		}
	case '^':
		if right {
			odd := c == math.Trunc(c) && math.Mod(c, 2) != 0
			if c == 0 {
				return nil, false
			}
			b.positive = b.positive || !odd || c < 0
			b.chain(c > 0, func(v float64) float64 {
				if v < 0 && odd && c > 0 {
					return -math.Pow(-v, 1/c)
				}
				return math.Pow(max(v, 0), 1/c)
			})
		} else {
			if c <= 0 || c == 1 {
				return nil, false
			}
			b.chain(c > 1, func(v float64) float64 { return math.Log(max(v, 0)) / math.Log(c) })
		}
	default:
		return nil, false
	}
	return inner, true
}

// constant evaluates arithmetic without columns.
func constant(e formula.Expr) (float64, bool) {
	p, err := expr.Compile(e)
	if err != nil || len(p.Names()) > 0 {
		return 0, false
	}
	var v [1]float64
	p.Eval(v[:], nil, nil, 1)
	return v[0], v[0]-v[0] == 0
}
