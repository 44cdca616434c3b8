package formula

import "unicode/utf8"

// Parse turns the text of one model into its tree. What breaks the language or
// one of its limits is refused by an [*Error]; whatever needs data to be told
// (names, kinds and levels of columns) is left to package design. Texts
// have at most 64 KiB and 200 open parentheses, unary minus signs and powers
// within each other. Parse does work in proportion to the length of the text and
// may be called concurrently.
func Parse(text string) (*Model, error) {
	m, e := parseModel(text)
	if e != nil {
		e.Text = text
		return nil, e
	}
	return m, nil
}

// ParseCoef turns the name of a coefficient, as results print it, into its
// tree. Its String gives the same name back. Refusals are [*Error] values.
func ParseCoef(text string) (*Coef, error) {
	syntax, _, e := parse(coefParser, text, true)
	if e != nil {
		e.Text = text
		return nil, e
	}
	return syntax.Coef.name(), nil
}

func parseModel(text string) (*Model, *Error) {
	syntax, end, e := parse(modelParser, text, false)
	if e != nil {
		return nil, e
	}
	m := &Model{Text: text, Response: &Response{Value: syntax.Value, OutOf: syntax.OutOf, Per: syntax.Per}, Equation: syntax.Equation}
	first := Expr(syntax.Value)
	last := first
	for _, x := range []Expr{syntax.OutOf, syntax.Per} {
		if x != nil {
			last = x
		}
	}
	m.Response.Pos = Span{first.Span().Start, last.Span().End}
	if syntax.Terms != nil {
		m.Terms = syntax.Terms.sum()
	}
	seen := make(map[string]Span)
	for _, c := range syntax.Clauses {
		word := c.word()
		at := Span{c.Pos.Offset, c.Pos.Offset + len(word)}
		if before, ok := seen[word]; ok {
			return nil, refuse(codeRepeatedClause, at, "write each clause once", "%s stands a second time", word).and(before)
		}
		seen[word] = at
		if e := c.into(m); e != nil {
			return nil, e
		}
	}
	m.Pos = Span{m.Response.Pos.Start, end}
	if e := check(m, seen); e != nil {
		return nil, e
	}
	return m, nil
}

func (c *clauseSyntax) word() string {
	switch {
	case c.Errors != nil:
		return "as"
	case c.Weighted != nil:
		return "weighted"
	case c.Counted != nil:
		return "counted"
	}
	return "fitting"
}

// into puts the clause into the model.
func (c *clauseSyntax) into(m *Model) *Error {
	switch {
	case c.Errors != nil:
		m.Errors = c.Errors.model()
	case c.Weighted != nil:
		m.Weighted = c.Weighted
	case c.Counted != nil:
		m.Counted = c.Counted
	}
	for _, p := range c.Fitting {
		param, e := p.param()
		if e != nil {
			return e
		}
		m.Params = append(m.Params, param)
	}
	return nil
}

// param turns a declaration into its node and checks that its parts agree.
func (p *paramSyntax) param() (*Param, *Error) {
	head := p.Head.head()
	n := &Param{Pos: head.pos, Name: head.name, ParLink: head.link}
	value := func(x signedLiteral) *float64 {
		if x == nil {
			return nil
		}
		v := x.number()
		n.Pos.End = max(n.Pos.End, v.pos.End)
		return &v.value
	}
	n.Held = value(p.Held)
	if p.Terms != nil {
		n.Terms = p.Terms.sum()
		n.Pos.End = n.Terms.Pos.End
	}
	if p.By != nil {
		n.By = p.By.columns()
		n.Pos.End = n.By.Pos.End
	}
	if b := p.Bounds; b != nil {
		n.Low, n.High = value(b.Above), value(b.Below)
		if b.Low != nil {
			n.Low, n.High = value(b.Low), value(b.High)
			n.Pos.End = spanOf(b.Tokens[len(b.Tokens)-1]).End
		}
	}
	n.Start = value(p.Start)
	return n, n.check()
}

func (n *Param) check() *Error {
	name := n.Name.String()
	bounded := n.Low != nil || n.High != nil
	form := func(hint, format string, args ...any) *Error {
		return refuse(codeParamForm, n.Pos, hint, format, args...).naming(n.Name.Name)
	}
	switch {
	case n.Held != nil && (bounded || n.Start != nil):
		return form("", "%s is held at a value and is not searched for", name).pasting(name + " = " + FormatNumber(*n.Held))
	case n.ParLink != "" && n.Terms == nil:
		return form("", "%s(%s) needs a model of its own after ~", n.ParLink, name).pasting(n.ParLink + "(" + name + ") ~ intercept")
	case n.Terms != nil && bounded:
		return form("take the limits out, or write log("+name+") ~ … to keep it positive", "%s has a model of its own and cannot have limits", name)
	case n.Low != nil && n.High != nil && *n.Low >= *n.High:
		e := refuse(codeBadBounds, n.Pos, "give the lower limit first", "the limits of %s leave it no room", name).naming(n.Name.Name)
		if *n.Low > *n.High && n.By == nil && n.Start == nil {
			e.pasting(name + " in (" + FormatNumber(*n.High) + ", " + FormatNumber(*n.Low) + ")")
		}
		return e
	}
	if n.Start == nil {
		return nil
	}
	outside := func(where string) *Error {
		return refuse(codeStartOutside, n.Pos, "give a start value there", "%s must be %s, and its start value is %s", name, where, FormatNumber(*n.Start)).naming(n.Name.Name)
	}
	switch s := *n.Start; {
	case n.Low != nil && s < *n.Low:
		return outside("at least " + FormatNumber(*n.Low))
	case n.High != nil && s > *n.High:
		return outside("at most " + FormatNumber(*n.High))
	case n.ParLink == "log" && s <= 0:
		return outside("greater than 0, as log needs")
	case n.ParLink == "logit" && (s <= 0 || s >= 1):
		return outside("between 0 and 1, as logit needs")
	case n.ParLink == "reciprocal" && s == 0:
		return outside("different from 0, as reciprocal needs")
	}
	return nil
}

// invalidUTF8 gives the offset of the first byte that is not UTF-8, or -1.
func invalidUTF8(text string) int {
	if utf8.ValidString(text) {
		return -1
	}
	for i, r := range text {
		if r == utf8.RuneError {
			if _, size := utf8.DecodeRuneInString(text[i:]); size == 1 {
				return i
			}
		}
	}
	return -1
}
