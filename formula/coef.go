package formula

import (
	"slices"

	"github.com/alecthomas/participle/v2/lexer"
)

// coef reads the name of a coefficient.
func (s *stream) coef() *Coef {
	start := s.peek().Pos.Offset
	c := &Coef{}
	for {
		p := s.part()
		if len(c.Parts) == 0 && s.at("[") && s.owner(c, p) {
			break
		}
		c.Parts = append(c.Parts, p)
		if !s.take("by") {
			break
		}
	}
	c.Pos = Span{start, s.end}
	return c
}

// owner reads [Coef] behind k or log(k).
func (s *stream) owner(c *Coef, p *Part) bool {
	switch x := p.Value.(type) {
	case *Name:
		c.Param = x
	case *Call:
		if !slices.Contains(parLinks, x.Func) || len(x.Args) != 1 {
			return false
		}
		name, ok := x.Args[0].(*Name)
		if !ok {
			return false
		}
		c.Param, c.ParLink = name, x.Func
	default:
		return false
	}
	s.next()
	c.Index = s.coef()
	s.want("]")
	return true
}

// part reads one factor of a name.
func (s *stream) part() *Part {
	t := s.peek()
	p := &Part{Pos: spanOf(t)}
	switch {
	case s.take("intercept"):
		p.Intercept = true
		return p
	case t.Type == tokenName && (t.Value == "legendre" || t.Value == "spline") && s.second().Value == "(":
		s.next()
		p.Basis = s.call(t, true)
		s.want("[")
		p.Index = s.column(p.Basis)
		s.want("]")
		p.Pos.End = s.end
		return p
	case (t.Type == tokenName || t.Type == tokenQuoted) && s.second().Value == "=", s.isCell():
		p.Cell = s.cell()
		if s.take("against") {
			p.Against = s.base()
		}
		if s.take("inside") {
			p.Inside = s.cell()
		}
		p.Pos.End = s.end
		return p
	}
	p.Value = s.value()
	p.Pos.End = s.end
	return p
}

// value reads a canonical expression. reciprocal and logit are no arithmetic,
// but stand before [ … ] in names of a parameter's coefficients.
func (s *stream) value() Expr {
	t := s.peek()
	if t.Type != tokenName || !slices.Contains(parLinks, t.Value) || t.Value == "log" || s.second().Value != "(" {
		return s.sum()
	}
	s.next()
	c := &Call{FuncPos: spanOf(t), Func: t.Value}
	s.want("(")
	c.Args = []Expr{s.name("a parameter's name")}
	s.want(")")
	c.Pos = Span{c.FuncPos.Start, s.end}
	if !s.at("[") {
		s.expected("[")
	}
	return c
}

// column reads the number of a basis' column.
func (s *stream) column(basis *Call) int {
	n := s.number()
	if s.err != nil {
		return 0
	}
	most, _ := constant(basis.Args[1])
	for k := 1; k <= int(most); k++ {
		if n.Value == float64(k) {
			return k
		}
	}
	s.fail(refuse(codeBadArgument, n.Pos, "number them from 1", "%s has %s columns and no column %s", shorten(basis.String()), FormatNumber(most), n))
	return 0
}

// second gives the token after the next one.
func (s *stream) second() lexer.Token {
	if s.err != nil {
		return lexer.Token{}
	}
	mark := s.lex.MakeCheckpoint()
	s.lex.Next()
	t := *s.lex.Peek()
	s.lex.LoadCheckpoint(mark)
	return t
}

// isCell tells whether "(column=level, " follows: several columns are a
// combination of levels, one alone is a comparison in parentheses.
func (s *stream) isCell() bool {
	if !s.at("(") {
		return false
	}
	mark, end := s.lex.MakeCheckpoint(), s.end
	s.next()
	t := s.peek()
	found := false
	if (t.Type == tokenName || t.Type == tokenQuoted) && s.second().Value == "=" {
		s.next()
		s.next()
		found = s.take("others")
		if !found {
			s.level()
			found = s.err == nil && s.at(",")
		}
	}
	s.lex.LoadCheckpoint(mark)
	s.end, s.err = end, nil
	return found
}

// cell reads column=level, or several in parentheses.
func (s *stream) cell() []Equal {
	if !s.take("(") {
		return []Equal{s.equal()}
	}
	var cell []Equal
	for {
		cell = append(cell, s.equal())
		if !s.take(",") {
			break
		}
	}
	s.want(")")
	return cell
}

func (s *stream) equal() Equal {
	start := s.peek().Pos.Offset
	e := Equal{Column: s.name("a column name")}
	s.want("=")
	if s.take("others") {
		e.Others = true
	} else {
		e.Level = s.level()
	}
	e.Pos = Span{start, s.end}
	return e
}
