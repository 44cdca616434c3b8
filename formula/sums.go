package formula

import (
	"math"
	"slices"

	"github.com/alecthomas/participle/v2/lexer"

	"example.com/trammel/internal/errtext"
)

const anOperand = "a number, a column or a function"

func isComparison(t lexer.Token) bool {
	return t.Type == tokenOperator && slices.Contains([]string{"=", "<>", "<", "<=", ">", ">="}, t.Value)
}

// outerSum reads a Sum that no parentheses enclose. "=" may follow (it parts
// the sides of an equation); any other comparison is refused here.
func (s *stream) outerSum() Expr {
	start := s.peek().Pos.Offset
	mark := s.lex.MakeCheckpoint()
	x := s.sum()
	if t := s.peek(); isComparison(t) && t.Value != "=" {
		e := refuse(codeComparisonPlace, Span{start, s.end}, "put it in parentheses",
			"a comparison stands only inside parentheses or a function's argument")
		s.lex.LoadCheckpoint(mark)
		if y := s.cond(); s.err == nil {
			e.Span.End = s.end
			e.pasting("(" + y.String() + ")")
		}
		s.err = e
	}
	return x
}

// cond reads a Cond: a sum, or a comparison of two.
func (s *stream) cond() Expr {
	start := s.peek().Pos.Offset
	if s.peek().Type == tokenLevel {
		return s.backwardLevel()
	}
	x := s.sum()
	if !isComparison(s.peek()) {
		return x
	}
	op := s.next()
	c := &Compare{OpPos: spanOf(op), Op: op.Value, X: x}
	if s.peek().Type == tokenLevel {
		l := s.level()
		c.Y = l
		if _, ok := x.(*Name); !ok {
			s.fail(refuse(codeLevelPlace, x.Span(), "compare a text column itself: furnace = "+shorten(l.String()),
				"only a column can be compared with the level %s", shorten(l.String())))
		} else if op.Value != "=" && op.Value != "<>" {
			s.fail(refuse(codeLevelPlace, c.OpPos, "", "levels of a text column have no size: %s cannot compare them", op.Value).pasting("<>"))
		}
	} else {
		c.Y = s.sum()
	}
	c.Pos = Span{start, s.end}
	if t := s.peek(); isComparison(t) {
		e := refuse(codeChainedComparison, c.Pos, "multiply two comparisons", "comparisons do not chain")
		s.next()
		if s.peek().Type == tokenLevel {
			s.level()
		} else if y := s.sum(); s.err == nil {
			e.Span.End = s.end
			second := &Compare{Op: t.Value, X: c.Y, Y: y}
			if _, ok := c.Y.(*Level); !ok {
				e.pasting("(" + c.String() + ")*(" + second.String() + ")")
			}
		}
		s.err = e
	}
	return c
}

// backwardLevel refuses a level where a number is needed; "level = column" is
// turned round.
func (s *stream) backwardLevel() Expr {
	l := s.level()
	e := refuse(codeLevelPlace, l.Pos, "write furnace = "+shorten(l.String())+" with the column first",
		"a level stands only after = or <> and inside cat(…)")
	if s.at("=") || s.at("<>") {
		op := s.next()
		if t := s.peek(); t.Type == tokenName || t.Type == tokenQuoted {
			n := s.name("a column name")
			e.Span.End = s.end
			e.pasting((&Compare{Op: op.Value, X: n, Y: l}).String())
		}
	}
	s.fail(e)
	return l
}

func (s *stream) sum() Expr {
	x := s.product()
	for s.at("+") || s.at("-") {
		op := s.next()
		x = s.binary(x, op, s.product())
	}
	return x
}

func (s *stream) product() Expr {
	x := s.unary()
	for s.at("*") || s.at("/") {
		op := s.next()
		x = s.binary(x, op, s.unary())
	}
	return x
}

func (s *stream) unary() Expr {
	start := s.peek().Pos.Offset
	if s.take("-") {
		x := s.unary()
		return &Unary{Pos: Span{start, s.end}, X: x}
	}
	x := s.primary()
	if s.at("^") {
		op := s.next()
		return s.binary(x, op, s.unary())
	}
	return x
}

func (s *stream) binary(x Expr, op lexer.Token, y Expr) Expr {
	return &Binary{Pos: Span{x.Span().Start, s.end}, OpPos: spanOf(op), Op: op.Value[0], X: x, Y: y}
}

func (s *stream) primary() Expr {
	t := s.peek()
	at := spanOf(t)
	switch {
	case t.Type == tokenNumber:
		return s.number()
	case t.Type == tokenLevel:
		return s.backwardLevel()
	case t.Type == tokenName:
		s.next()
		if s.at("(") {
			return s.call(t, false)
		}
		return &Name{Pos: at, Name: t.Value}
	case t.Type == tokenQuoted:
		return s.name("a column name")
	case s.take("pi"):
		return &Pi{Pos: at}
	case s.take("true"), s.take("false"):
		return &Bool{Pos: at, Value: t.Value == "true"}
	case s.take("("):
		x := s.cond()
		s.want(")")
		return x
	}
	s.expected(anOperand)
	return &Number{Pos: at}
}

// call reads the arguments of the function whose name has been read, and
// checks what can be checked without data.
func (s *stream) call(f lexer.Token, asTerm bool) *Call {
	c := &Call{FuncPos: spanOf(f), Func: f.Value}
	counts, known := arithmetic[f.Value]
	if !known && asTerm {
		counts, known = termOnly[f.Value]
	}
	if !known {
		s.fail(unknownFunction(f, asTerm))
		return c
	}
	s.want("(")
	if f.Value == "upto" {
		c.Order = s.number()
		s.want(",")
		c.Terms = s.terms()
	} else if !s.at(")") {
		for {
			c.Args = append(c.Args, s.cond())
			if !s.take(",") {
				break
			}
		}
	}
	s.want(")")
	c.Pos = Span{c.FuncPos.Start, s.end}
	if s.err == nil {
		if e := checkCall(c, counts); e != nil {
			s.fail(e)
		}
	}
	return c
}

func unknownFunction(f lexer.Token, asTerm bool) *Error {
	at := spanOf(f)
	if _, ok := termOnly[f.Value]; ok {
		hint := "let it stand among the terms"
		if f.Value == "num" {
			hint = "write the arithmetic itself, without num"
		}
		if f.Value == "cat" {
			hint = "compare with a level, as in furnace = 'F2', for an indicator"
		}
		return refuse(codeFunctionPlace, at, hint, "%s makes terms and cannot stand inside arithmetic", f.Value).naming(f.Value)
	}
	e := refuse(codeUnknownFunction, at, "a column is not followed by (", "there is no function %s", shorten(f.Value)).naming(f.Value)
	names := callNames(asTerm)
	if f.Value == "ln" {
		return e.pasting("log")
	}
	if near, ok := errtext.Nearest(f.Value, names); ok {
		return e.pasting(near)
	}
	return e
}

// constant evaluates a number with an optional minus sign.
func constant(x Expr) (float64, bool) {
	switch x := x.(type) {
	case *Number:
		return x.Value, true
	case *Unary:
		n, ok := x.X.(*Number)
		if ok {
			return -n.Value, true
		}
	}
	return 0, false
}

// checkCall checks number and kind of arguments.
func checkCall(c *Call, counts [2]int) *Error {
	if n := len(c.Args); c.Func != "upto" && (n < counts[0] || counts[1] >= 0 && n > counts[1]) {
		want := errtext.Count(counts[0], "argument")
		if counts[1] < 0 {
			want = "at least " + want
		}
		example := usage[c.Func]
		if example == "" {
			example = c.Func + "(x)"
		}
		return refuse(codeArgumentCount, c.Pos, "write it as in "+example, "%s takes %s, not %d", c.Func, want, n).naming(c.Func)
	}
	bad := func(x node, hint, format string, args ...any) *Error {
		return refuse(codeBadArgument, x.Span(), hint, format, args...).naming(c.Func)
	}
	whole := func(x Expr, least, most int) *Error {
		v, ok := constant(x)
		if ok && v == math.Trunc(v) && v >= float64(least) && v <= float64(most) {
			return nil
		}
		return bad(x, "write it as in "+usage[c.Func], "%s needs a whole number from %d to %d here, not %s", c.Func, least, most, shorten(x.String()))
	}
	number := func(x Expr) *Error {
		if _, ok := constant(x); ok {
			return nil
		}
		return bad(x, "write it as in "+usage[c.Func], "%s needs a number here, not %s", c.Func, shorten(x.String()))
	}
	switch c.Func {
	case "upto":
		return whole(c.Order, 1, maxOrder)
	case "powers", "legendre":
		return whole(c.Args[1], 1, maxPower)
	case "spline":
		return whole(c.Args[1], 2, maxBasis)
	case "harmonics":
		if e := number(c.Args[1]); e != nil {
			return e
		}
		if v, _ := constant(c.Args[1]); v <= 0 {
			return bad(c.Args[1], "write it as in "+usage["harmonics"], "a period is greater than 0")
		}
		return whole(c.Args[2], 1, maxBasis)
	case "coded":
		for _, x := range c.Args[1:] {
			if e := number(x); e != nil {
				return e
			}
		}
		low, _ := constant(c.Args[1])
		high, _ := constant(c.Args[2])
		if low == high {
			return bad(c.Args[2], "give the settings that are coded -1 and +1, as in "+usage["coded"], "low and high of coded are both %s", FormatNumber(low))
		}
	case "hinge":
		seen := make(map[float64]bool)
		for _, x := range c.Args[1:] {
			if e := number(x); e != nil {
				return e
			}
			v, _ := constant(x)
			if seen[v] {
				return bad(x, "write each bend once", "hinge bends at %s twice", FormatNumber(v))
			}
			seen[v] = true
		}
	}
	return nil
}
