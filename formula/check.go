package formula

// check holds the rules that concern more than one part of a model.
func check(m *Model, clauses map[string]Span) *Error {
	c := checker{params: make(map[string]*Param)}
	steps := []func() *Error{
		func() *Error { return checkForm(m, clauses) },
		func() *Error { return c.declare(m) },
		func() *Error { return c.response(m) },
		func() *Error { return c.right(m) },
		func() *Error { return checkFamily(m, clauses) },
	}
	for _, step := range steps {
		if e := step(); e != nil {
			return e
		}
	}
	return nil
}

// checkForm checks which clauses go with ~ and which with =.
func checkForm(m *Model, clauses map[string]Span) *Error {
	if m.Terms != nil {
		if at, ok := clauses["fitting"]; ok {
			return refuse(codeClausePlace, at, "write = in place of ~ for an equation, or leave fitting out", "fitting declares the parameters of an equation, and this model has terms")
		}
		return nil
	}
	switch at, as := clauses["as"]; {
	case as:
		return refuse(codeClausePlace, at, "leave it out; weighted gives rows different variances", "an equation is fitted with normal errors and has no as")
	case m.Response.OutOf != nil:
		return refuse(codeClausePlace, m.Response.OutOf.Span(), "write terms after ~, as in k out of n ~ x as binomial", "an equation has no out of")
	case m.Response.Per != nil:
		return refuse(codeClausePlace, m.Response.Per.Span(), "write terms after ~, as in k per e ~ x as poisson", "an equation has no per")
	}
	if _, ok := clauses["fitting"]; !ok {
		return refuse(codeFittingMissing, m.Equation.Span(), "declare them after the equation, as in fitting k > 0; for a model in terms write ~", "the equation declares no parameters")
	}
	return nil
}

// A checker knows the names that have a part of their own in the model.
type checker struct {
	params    map[string]*Param
	explained map[string]*Name
}

func (c *checker) declare(m *Model) *Error {
	used := make(map[string]bool)
	if m.Equation != nil {
		eachName(m.Equation, func(n *Name) { used[n.Name] = true })
	}
	for _, p := range m.Params {
		name := p.Name.Name
		if before, ok := c.params[name]; ok {
			return refuse(codeRepeatedParam, p.Name.Pos, "declare it once", "the parameter %s is declared a second time", p.Name).naming(name).and(before.Name.Pos)
		}
		c.params[name] = p
	}
	for _, p := range m.Params {
		if !used[p.Name.Name] {
			return refuse(codeUnusedParam, p.Name.Pos, "use it in the equation or take the declaration out", "the parameter %s does not stand in the equation", p.Name).naming(p.Name.Name)
		}
	}
	return nil
}

// columns refuses parameters where only columns may stand.
func (c *checker) columns(what string, nodes ...node) *Error {
	var e *Error
	for _, n := range nodes {
		eachName(n, func(n *Name) {
			if p := c.params[n.Name]; p != nil && e == nil {
				e = refuse(codeParamPlace, n.Pos, "parameters stand in the equation only", "%s is a parameter and cannot stand in %s", n, what).naming(n.Name).and(p.Name.Pos)
			}
		})
	}
	return e
}

func (c *checker) response(m *Model) *Error {
	r := m.Response
	c.explained = make(map[string]*Name)
	eachName(r.Value, func(n *Name) { c.explained[n.Name] = n })
	for _, x := range []Expr{r.Value, r.OutOf, r.Per} {
		if x == nil {
			continue
		}
		some := false
		eachName(x, func(*Name) { some = true })
		if !some && x == r.Value {
			return refuse(codeConstantTerm, x.Span(), "write the column that is explained", "the response has no column in it")
		}
	}
	return c.columns("the response", r)
}

// right checks the right side: terms, equation, and the models of parameters.
func (c *checker) right(m *Model) *Error {
	var nodes []node
	if m.Terms != nil {
		if e := c.terms(m.Terms, true); e != nil {
			return e
		}
		nodes = append(nodes, m.Terms)
	} else {
		nodes = append(nodes, m.Equation)
	}
	for _, p := range m.Params {
		if p.Terms != nil {
			if e := c.terms(p.Terms, false); e != nil {
				return e
			}
			nodes = append(nodes, p.Terms)
			if e := c.columns("the model of a parameter", p.Terms); e != nil {
				return e
			}
		}
		if p.By != nil {
			nodes = append(nodes, p.By)
			if e := c.columns("a category", p.By); e != nil {
				return e
			}
		}
	}
	if len(c.explained) > 1 {
		nodes = nil // a ratio or a difference may be explained by its parts
	}
	var e *Error
	for _, n := range nodes {
		eachName(n, func(n *Name) {
			if first := c.explained[n.Name]; first != nil && e == nil {
				e = refuse(codeResponseOnRight, n.Pos, "take it out of the right side", "the response %s stands on the right side too", n).naming(n.Name).and(first.Pos)
			}
		})
	}
	if e != nil {
		return e
	}
	for _, x := range []Expr{m.Weighted, m.Counted} {
		if x != nil {
			if e := c.columns("a clause", x); e != nil {
				return e
			}
		}
	}
	return nil
}

// terms checks the size of an expansion before anything expands, then each term.
func (c *checker) terms(ts *Terms, outer bool) *Error {
	if countTerms(ts) > MaxTerms {
		return refuse(codeTooManyTerms, ts.Pos, "limit the order of the interactions, as in upto(2, a + b + c)", "the model expands to more than %d terms", MaxTerms)
	}
	for _, it := range ts.Items {
		if call, ok := it.Term.(*Call); ok && call.Func == "known" && outer && !it.Minus {
			continue
		}
		if e := c.term(it.Term); e != nil {
			return e
		}
	}
	return nil
}

func (c *checker) term(t Term) *Error {
	switch t := t.(type) {
	case *Terms:
		for _, it := range t.Items {
			if e := c.term(it.Term); e != nil {
				return e
			}
		}
	case *Cross:
		return c.factors(t.Factors, true)
	case *By:
		return c.factors(t.Factors, true)
	case *Inside: // what can be nested in what is told by package design
		return c.factors(t.Factors, false)
	case *Call:
		return c.call(t)
	}
	return nil
}

// factors checks the operands of *, by and inside; a numeric one may not stand
// beside itself.
func (c *checker) factors(factors []Term, numeric bool) *Error {
	seen := make(map[string]bool)
	for _, f := range factors {
		if e := c.term(f); e != nil {
			return e
		}
		n := numericTerm(f)
		if n == nil || !numeric {
			continue
		}
		text := n.TermText()
		if seen[text] {
			mend := "powers(" + text + ", 2)"
			return refuse(codeNumericByItself, f.Span(), "write "+mend, "the numeric term %s stands beside itself", shorten(text))
		}
		seen[text] = true
	}
	return nil
}

// numericTerm returns t when the text alone tells that it is one numeric term.
func numericTerm(t Term) Term {
	switch t := t.(type) {
	case *Name:
		return t
	case *Call:
		if _, ok := arithmetic[t.Func]; ok || t.Func == "num" {
			return t
		}
	}
	return nil
}

func (c *checker) call(t *Call) *Error {
	switch t.Func {
	case "known":
		return refuse(codeKnownPlace, t.Pos, "add it to the terms of the model: + "+shorten(t.String()), "known stands only as a summand of its own, added at the top level")
	case "upto":
		for _, it := range t.Terms.Items {
			if e := c.term(it.Term); e != nil {
				return e
			}
		}
		return nil
	}
	some := false
	eachName(t, func(*Name) { some = true })
	if !some {
		return refuse(codeConstantTerm, t.Pos, "the constant is called intercept", "%s has no column in it", shorten(t.String()))
	}
	return nil
}

// checkFamily checks that errors, response and weights go together.
func checkFamily(m *Model, clauses map[string]Span) *Error {
	if m.Terms == nil {
		return nil
	}
	family, over, at := "normal", false, m.Response.Pos
	if m.Errors != nil {
		family, over, at = m.Errors.Family, m.Errors.Overdispersed, m.Errors.Pos
	}
	wrong := func(hint, format string, args ...any) *Error {
		return refuse(codeFamilyPlace, at, hint, format, args...)
	}
	switch {
	case m.Response.OutOf != nil && m.Errors == nil:
		return wrong("write as binomial after the terms", "a share, k out of n, needs binomial errors")
	case m.Response.OutOf != nil && family != "binomial":
		return wrong("", "a share, k out of n, needs binomial errors, not %s", family).pasting("binomial")
	case m.Response.Per != nil && m.Errors == nil:
		return wrong("write as poisson or as negative_binomial after the terms", "a rate, k per e, needs errors of counts")
	case m.Response.Per != nil && family != "poisson" && family != "negative_binomial":
		return wrong("or negative_binomial", "a rate, k per e, needs errors of counts, not %s", family).pasting("poisson")
	case over && family != "binomial" && family != "poisson":
		return wrong("", "%s errors have a dispersion or a size of their own; overdispersed goes with binomial and poisson", family).pasting(family)
	case over && family == "binomial" && m.Response.OutOf == nil:
		return wrong("write the response as k out of n, or leave overdispersed out", "single yes/no rows cannot show overdispersion")
	case m.Weighted != nil && !over && !dispersed[family]:
		return refuse(codeFamilyPlace, clauses["weighted"], "", "%s errors have no dispersion that a weight could divide", family).pasting("counted")
	}
	return nil
}

// eachName calls f for every column or parameter name below a node.
func eachName(n node, f func(*Name)) {
	switch n := n.(type) {
	case *Name:
		f(n)
	case *Response:
		for _, x := range []Expr{n.Value, n.OutOf, n.Per} {
			if x != nil {
				eachName(x, f)
			}
		}
	case *Terms:
		for _, it := range n.Items {
			eachName(it.Term, f)
		}
	case *Cross:
		eachOf(n.Factors, f)
	case *By:
		eachOf(n.Factors, f)
	case *Inside:
		eachOf(n.Factors, f)
	case *Category:
		eachOf(n.Columns, f)
	case *Call:
		if n.Terms != nil {
			eachName(n.Terms, f)
		}
		eachOf(n.Args, f)
	case *Unary:
		eachName(n.X, f)
	case *Binary:
		eachName(n.X, f)
		eachName(n.Y, f)
	case *Compare:
		eachName(n.X, f)
		eachName(n.Y, f)
	}
}

func eachOf[N node](nodes []N, f func(*Name)) {
	for _, n := range nodes {
		eachName(n, f)
	}
}
