package formula

import "github.com/alecthomas/participle/v2/lexer"

// terms reads Terms: a sum of crossings.
func (s *stream) terms() *Terms {
	ts := &Terms{Pos: Span{Start: s.peek().Pos.Offset}}
	minus := s.take("-")
	for {
		t := s.cross()
		if inner, ok := t.(*Terms); ok && !minus && len(ts.Items) == 0 && !inner.Items[0].Minus {
			ts.Items = inner.Items // (a + b) + c is a + b + c: operators act from left to right
		} else {
			ts.Items = append(ts.Items, SignedTerm{minus, t})
		}
		if !s.at("+") && !s.at("-") {
			ts.Pos.End = s.end
			return ts
		}
		minus = s.next().Value == "-"
	}
}

// cross reads Cross, and refuses arithmetic in its place.
func (s *stream) cross() Term {
	start := s.peek().Pos.Offset
	mark := s.lex.MakeCheckpoint()
	factors := []Term{s.by()}
	for s.at("*") {
		s.next()
		factors = append(factors, s.by())
	}
	if t := s.peek(); s.at("/") || s.at("^") || isComparison(t) {
		s.arithmetic(mark, t)
	}
	if len(factors) == 1 {
		return factors[0]
	}
	return &Cross{Pos: Span{start, s.end}, Factors: factors}
}

// arithmetic refuses arithmetic between terms. It reads the place again as
// arithmetic, so that the mend can be given whole.
func (s *stream) arithmetic(mark lexer.Checkpoint, sign lexer.Token) {
	var e *Error
	switch {
	case sign.Type == tokenNumber:
		e = refuse(codeNumberInTerms, spanOf(sign), "write arithmetic inside num(…)", "a bare number is no term")
	case isComparison(sign):
		e = refuse(codeComparisonPlace, spanOf(sign), "write num(…) round the comparison",
			"a comparison stands only inside parentheses or a function's argument")
	default:
		e = refuse(codeArithmeticInTerms, spanOf(sign), "write num(…) round the arithmetic", "%s is arithmetic and cannot stand between terms", sign.Value)
	}
	s.err = nil
	s.lex.LoadCheckpoint(mark)
	start := s.peek().Pos.Offset
	var x Expr
	if isComparison(sign) {
		x = s.cond()
	} else {
		x = s.product()
	}
	some := false
	switch n, isNumber := x.(*Number); {
	case s.err != nil:
	case !isNumber:
		eachName(x, func(*Name) { some = true })
		if !some {
			e.Hint = "write intercept for the constant; every term has a coefficient of its own"
			break
		}
		e.Span = Span{start, s.end}
		e.pasting("num(" + x.String() + ")")
	case n.Value == 1:
		e.Hint = "the constant is called intercept"
		e.paste = "intercept"
	case n.Value == 0:
		e.Hint = "leave the constant out by - intercept"
	default:
		e.Hint = "leave it out; every term has a coefficient of its own"
	}
	s.err = e
}

// by reads By.
func (s *stream) by() Term {
	start := s.peek().Pos.Offset
	factors := []Term{s.inside()}
	for s.take("by") {
		factors = append(factors, s.inside())
	}
	if len(factors) == 1 {
		return factors[0]
	}
	return &By{Pos: Span{start, s.end}, Factors: factors}
}

// inside reads Inside.
func (s *stream) inside() Term {
	start := s.peek().Pos.Offset
	factors := []Term{s.factor()}
	for s.take("inside") {
		factors = append(factors, s.factor())
	}
	if len(factors) == 1 {
		return factors[0]
	}
	return &Inside{Pos: Span{start, s.end}, Factors: factors}
}

// factor reads Factor.
func (s *stream) factor() Term {
	t := s.peek()
	at := spanOf(t)
	switch {
	case s.take("intercept"):
		return &Intercept{Pos: at}
	case s.take("("):
		ts := s.terms()
		s.want(")")
		if len(ts.Items) == 1 && !ts.Items[0].Minus {
			return ts.Items[0].Term
		}
		return ts
	case t.Type == tokenName:
		s.next()
		switch {
		case !s.at("("):
			return &Name{Pos: at, Name: t.Value}
		case t.Value == "cat":
			return s.category(at)
		}
		return s.call(t, true)
	case t.Type == tokenQuoted:
		return s.name("a column name")
	case t.Type == tokenNumber, s.at("pi"), s.at("true"), s.at("false"):
		mark := s.lex.MakeCheckpoint()
		t.Type = tokenNumber
		s.arithmetic(mark, t)
		return &Intercept{Pos: at}
	case t.Type == tokenLevel:
		s.fail(refuse(codeLevelPlace, at, "write cat(furnace) for a category, num(furnace = "+t.Value+") for one level",
			"a level cannot stand as a term"))
		return &Intercept{Pos: at}
	}
	s.expected("a term")
	return &Intercept{Pos: at}
}

// category reads what follows the word cat, which stood at the given place.
func (s *stream) category(at Span) *Category {
	c := &Category{Pos: at}
	s.want("(")
	for {
		c.Columns = append(c.Columns, s.name("a column name"))
		if !s.take(",") {
			break
		}
	}
	if s.take("in") {
		s.want("(")
		for {
			if len(c.In) > 0 && s.take("others") {
				c.Others = true
				break
			}
			c.In = append(c.In, s.level())
			if !s.take(",") {
				break
			}
		}
		s.want(")")
	}
	if s.take("against") {
		c.Against = s.base()
	}
	if t := s.peek(); t.Type != lexer.EOF && t.Value != ")" {
		if t.Value == "(" {
			s.fail(refuse(codeSyntax, spanOf(t), "add a column to the data for a category from arithmetic", "cat takes column names, not functions"))
		}
		if c.Against == nil && isComparison(t) {
			s.fail(refuse(codeSyntax, spanOf(t), "write num(furnace = 'F2') for an indicator", "cat takes column names, not comparisons"))
		}
		s.expected(")", "in", "against")
	}
	s.want(")")
	c.Pos.End = s.end
	return c
}

// base reads what follows the word against.
func (s *stream) base() *Base {
	t := s.peek()
	b := &Base{Pos: spanOf(t)}
	switch {
	case s.take("mean"):
		b.Mean = true
	case s.take("previous"):
		b.Previous = true
	default:
		b.Level = s.level()
		b.Pos = b.Level.Pos
	}
	return b
}
