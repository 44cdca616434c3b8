package formula

import (
	"github.com/alecthomas/participle/v2/lexer"

	"example.com/trammel/internal/errtext"
)

// choose reads one of a fixed set of words, which are special in this place
// only.
func (s *stream) choose(what string, words []string, code Code) string {
	t := s.peek()
	if t.Type != tokenName {
		s.expected(what)
		return ""
	}
	for _, w := range words {
		if t.Value == w {
			s.next()
			return w
		}
	}
	e := unexpected(lexer.Token{}, t, what, words)
	if e.Code == codeSyntax {
		e.Code = code
		e.Message = "there is no " + what[2:] + " called " + shorten(t.Value)
		e.naming(t.Value)
		if e.Hint == "" {
			e.Hint = "write " + errtext.Or(words)
		}
	}
	s.fail(e)
	return ""
}

// errors reads what follows the word as.
func (s *stream) errors() *Errors {
	e := &Errors{Pos: Span{Start: s.peek().Pos.Offset}}
	e.Overdispersed = s.take("overdispersed")
	e.Family = s.choose("a family", families, codeUnknownFamily)
	if s.take("link") {
		at := spanOf(s.peek())
		e.Link = s.choose("a link", links, codeUnknownLink)
		open := s.peek()
		switch has := s.at("("); {
		case e.Link == "power" && !has && s.err == nil:
			s.fail(refuse(codeLinkArgument, at, "", "the link power needs its exponent").pasting("power(0.5)"))
		case e.Link == "power":
			s.next()
			p := s.signed()
			e.Power = &p.value
			s.want(")")
			if p.value == 0 && s.err == nil {
				s.fail(refuse(codeLinkArgument, Span{at.Start, s.end}, "", "the exponent of the link power is not 0").pasting("log"))
			}
		case has:
			s.fail(refuse(codeLinkArgument, spanOf(open), "write link "+e.Link+" alone, or link power(2)", "the link %s takes no number", e.Link))
		}
	}
	e.Pos.End = s.end
	return e
}

// paramHead reads k, or log(k) when a model follows.
func (s *stream) paramHead() *headName {
	t := s.peek()
	h := &headName{pos: spanOf(t)}
	if t.Type != tokenName && t.Type != tokenQuoted {
		s.expected("a parameter's name")
		return h
	}
	h.name = s.name("a parameter's name")
	if t.Type != tokenName || !s.at("(") {
		return h
	}
	h.link = t.Value
	found := false
	for _, l := range parLinks {
		found = found || l == t.Value
	}
	if !found {
		e := refuse(codeUnknownLink, h.pos, "write log(k), logit(k) or reciprocal(k) before ~", "a parameter has no link called %s", shorten(t.Value)).naming(t.Value)
		if near, ok := errtext.Nearest(t.Value, parLinks); ok {
			e.pasting(near)
		}
		s.fail(e)
		return h
	}
	s.next()
	h.name = s.name("a parameter's name")
	s.want(")")
	h.pos.End = s.end
	return h
}

// paramCategory reads the category that follows "k by".
func (s *stream) paramCategory() *Category {
	t := s.peek()
	if s.take("cat") {
		return s.category(spanOf(t))
	}
	c := &Category{Pos: spanOf(t)}
	if t.Type == tokenName || t.Type == tokenQuoted {
		n := s.name("a category")
		s.fail(refuse(codeSyntax, n.Pos, "", "a category was expected after by").pasting("cat(" + n.String() + ")"))
		return c
	}
	s.expected("a category such as cat(furnace)")
	return c
}
