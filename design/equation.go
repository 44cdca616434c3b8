package design

import (
	"fmt"
	"math"
	"slices"

	"example.com/trammel/formula"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/expr"
	"example.com/trammel/internal/factored"
	"example.com/trammel/internal/tape"
)

// An Equation is the compiled right side of an equation-form model. Parameter q
// of a row is the inverse of its link at the sum of its own columns, [From, To)
// of the plan's, times their coefficients. It is immutable and may be shared.
type Equation struct {
	Program *tape.Program // over Matrix.Parts and Params
	Params  []Parameter

	parts []*numeric
}

// A Parameter is one free parameter of an equation, in the order declared.
// Held parameters are constants of the program.
type Parameter struct {
	Name     string
	Link     string  // "", or log, logit, reciprocal: what is linear in the columns
	From, To int     // its columns, and so its coefficients
	Own      bool    // it has a model of its own, k ~ terms
	Low      float64 // closed bounds of the value; -Inf and +Inf where there are none
	High     float64
	Start    float64 // NaN when none was given
}

// Equation is the compiled equation; nil for a model in terms.
func (p *Plan) Equation() *Equation { return p.eq }

// Parts are the values, at the matrix's rows, of the parts of an equation in
// which no parameter stands. Shared, do not modify; nil for a model in terms.
func (m *Matrix) Parts() [][]float64 { return m.parts }

// newEquation compiles an equation and expands the models of its parameters.
// The expansion holds the terms of all parameters, one after another.
func newEquation(m *formula.Model) (*Equation, *expansion, [][]*rawTerm, *Error) {
	eq := &Equation{}
	x := &expansion{specs: make(map[string]*formula.Category)}
	ex := &expander{text: m.Text, specs: x.specs}
	held := make(map[string]float64)
	var names []string
	var own [][]*rawTerm
	for _, d := range m.Params {
		if d.Held != nil {
			held[d.Name.Name] = *d.Held
			continue
		}
		q := Parameter{Name: d.Name.Name, Link: d.ParLink, Low: math.Inf(-1), High: math.Inf(1), Start: math.NaN()}
		for _, b := range []struct {
			from *float64
			to   *float64
		}{{d.Low, &q.Low}, {d.High, &q.High}, {d.Start, &q.Start}} {
			if b.from != nil {
				*b.to = *b.from
			}
		}
		var terms []*rawTerm
		switch {
		case d.Terms != nil:
			q.Own = true
			if err := ex.collectSpecs(d.Terms); err != nil {
				return nil, nil, nil, err
			}
			list, err := ex.sum(d.Terms, true)
			if err != nil {
				return nil, nil, nil, err
			}
			for k, t := range list {
				t.written = k
			}
			slices.SortStableFunc(list, func(a, b *rawTerm) int { return len(a.factors) - len(b.factors) })
			terms = list
		case d.By != nil:
			if err := ex.collectSpecs(d.By); err != nil {
				return nil, nil, nil, err
			}
			terms = []*rawTerm{single(d.By.Pos, &factor{key: categoryKey(d.By), text: d.By.String(), pos: d.By.Pos, cat: d.By})}
		default:
			terms = []*rawTerm{{pos: d.Pos}}
		}
		eq.Params = append(eq.Params, q)
		names = append(names, q.Name)
		own = append(own, terms)
		x.terms = append(x.terms, terms...)
	}
	var err error
	if eq.Program, err = tape.Compile(substitute(m.Equation, held), names); err != nil {
		return nil, nil, nil, &Error{Code: codeNotATerm, Text: m.Text, Span: m.Equation.Span(), Err: err,
			Message: "the equation cannot be computed", Hint: "write plain arithmetic of columns and parameters"}
	}
	for _, part := range eq.Program.Parts() {
		prog, err := expr.Compile(part.Expr)
		if err != nil {
			return nil, nil, nil, &Error{Code: codeNotATerm, Text: m.Text, Span: part.Expr.Span(), Err: err,
				Message: part.Expr.String() + " cannot be computed", Hint: "write plain arithmetic of columns"}
		}
		eq.parts = append(eq.parts, &numeric{spec: exprSpec(part.Expr), prog: prog, pos: part.Expr.Span()})
	}
	return eq, x, own, nil
}

// substitute puts held values in the place of their parameters.
func substitute(e formula.Expr, held map[string]float64) formula.Expr {
	if len(held) == 0 {
		return e
	}
	switch e := e.(type) {
	case *formula.Name:
		if v, ok := held[e.Name]; ok {
			if v < 0 {
				return &formula.Unary{Pos: e.Pos, X: &formula.Number{Pos: e.Pos, Value: -v}}
			}
			return &formula.Number{Pos: e.Pos, Value: v}
		}
	case *formula.Unary:
		return &formula.Unary{Pos: e.Pos, X: substitute(e.X, held)}
	case *formula.Binary:
		return &formula.Binary{Pos: e.Pos, OpPos: e.OpPos, Op: e.Op, X: substitute(e.X, held), Y: substitute(e.Y, held)}
	case *formula.Compare:
		return &formula.Compare{Pos: e.Pos, OpPos: e.OpPos, Op: e.Op, X: substitute(e.X, held), Y: substitute(e.Y, held)}
	case *formula.Call:
		c := *e
		c.Args = make([]formula.Expr, len(e.Args))
		for i, a := range e.Args {
			c.Args[i] = substitute(a, held)
		}
		return &c
	}
	return e
}

// equationUses adds the columns of an equation: every name that is no
// parameter.
func (u *uses) equationUses(m *formula.Model) {
	params := make(map[string]bool)
	for _, d := range m.Params {
		params[d.Name.Name] = true
	}
	var eq uses
	eq.arithmetic(m.Equation, false)
	for _, v := range eq.list {
		if !params[v.name] {
			v.equation = true
			u.list = append(u.list, v)
		}
	}
}

// checkNames refuses a parameter that is named like a column.
func (eq *Equation) checkNames(m *formula.Model, t *Table) *Error {
	for _, d := range m.Params {
		if t.column(d.Name.Name) != nil {
			return &Error{Code: codeParameterColumn, Text: m.Text, Span: d.Name.Pos, Names: []string{d.Name.Name},
				Message: fmt.Sprintf("%s is declared as a parameter and is a column of the data", d.Name),
				Hint:    "give the parameter another name"}
		}
	}
	return nil
}

// codeParameters codes each parameter's own terms, apart from the others'.
func (p *Plan) codeParameters(own [][]*rawTerm) *Error {
	c := &p.compiled
	at := 0
	for q, terms := range own {
		list := c.terms[at : at+len(terms)]
		cols, from, err := c.code(list)
		if err != nil {
			return err
		}
		if len(cols) == 0 {
			return &Error{Code: codeNoColumns, Text: p.text, Span: p.model.Equation.Span(),
				Message: fmt.Sprintf("the model of %s has no column to fit", formula.QuoteName(p.eq.Params[q].Name)),
				Hint:    "write ~ intercept for a constant, or declare it without a model"}
		}
		p.eq.Params[q].From = len(c.coded)
		for k := range terms {
			c.from = append(c.from, len(c.coded)+from[k])
		}
		for _, col := range cols {
			col.term += at
			c.coded = append(c.coded, col)
		}
		p.eq.Params[q].To = len(c.coded)
		at += len(terms)
	}
	c.from = append(c.from, len(c.coded))
	return nil
}

// partsAt computes the equation's parts at rows of a table.
func (p *Plan) partsAt(t *Table, rows []int) ([][]float64, *Error) {
	if p.eq == nil {
		return nil, nil
	}
	out := make([][]float64, len(p.eq.parts))
	for k, q := range p.eq.parts {
		if p.eq.Program.Parts()[k].Guarded {
			v := make([]float64, t.rows)
			q.prog.Eval(v, nil, vars(q.prog, t), t.rows)
			out[k] = v
			continue
		}
		v, err := evaluate(q.prog, t, q.spec.text, place{p.text, q.pos, rows})
		if err != nil {
			return nil, err
		}
		out[k] = v.Hi
		if v.Lo != nil {
			out[k] = make([]float64, t.rows)
			for i := range out[k] {
				out[k][i] = v.Hi[i] + v.Lo[i]
			}
		}
	}
	return out, nil
}

// describeEquation names coefficients after their parameters.
func (p *Plan) describeEquation() {
	c := &p.compiled
	p.columns = make([]PlanColumn, len(c.coded))
	p.list = make([]PlanTerm, len(c.terms))
	at := 0
	for _, q := range p.eq.Params {
		name := formula.QuoteName(q.Name)
		quantity := name
		if q.Link != "" {
			name = q.Link + "(" + name + ")"
			quantity = map[string]string{"log": "log ", "logit": "log odds of ", "reciprocal": "reciprocal of "}[q.Link] + quantity
		}
		last := at
		for last < len(c.terms) && (last == at || c.from[last] < q.To) {
			last++
		}
		w := &wording{c: c, quantity: quantity, terms: c.terms[at:last], coded: c.coded[q.From:q.To], equation: true}
		for j := q.From; j < q.To; j++ {
			col := c.coded[j]
			p.columns[j] = PlanColumn{Name: name, Meaning: quantity, Term: col.term}
			if len(col.factors) > 0 || q.Own {
				p.columns[j].Name += "[" + c.columnName(col) + "]"
				p.columns[j].Meaning = w.meaning(col)
			}
		}
		first := at
		for at < last {
			t := c.terms[at]
			text := name
			if q.Own {
				text += "[" + t.raw.text() + "]"
			}
			// Only terms of a parameter's own model are tested against leaving them out.
			p.list[at] = PlanTerm{Text: text, Intercept: !q.Own || len(t.factors) == 0, From: c.from[at], To: c.from[at+1], Written: at}
			at++
		}
		for k := first; k < at; k++ {
			for l := first; l < at; l++ {
				if l != k && within(c.terms[k], c.terms[l]) {
					p.list[k].Within = append(p.list[k].Within, l)
				}
			}
		}
	}
}

// checkEquationRank checks the columns of each parameter's model.
func (f *Frame) checkEquationRank() *Error {
	p := f.Plan
	form := f.Matrix.form
	for _, q := range p.eq.Params {
		part := &factored.Form{N: form.N, Nums: form.Nums, Cats: form.Cats, Cols: form.Cols[q.From:q.To]}
		found := identities(part)
		if len(found) == 0 {
			continue
		}
		e := &Error{Code: codeDependentColumns, Text: p.text, Span: p.model.Equation.Span(),
			Hint: "take a term out of the model of " + formula.QuoteName(q.Name)}
		for _, id := range found {
			id.Column += q.From
			coefs := make([]float64, len(p.columns))
			copy(coefs[q.From:], id.Coefs)
			id.Coefs = coefs
			e.Identities = append(e.Identities, p.identity(id))
		}
		words := make([]string, 0, 3)
		for _, id := range e.Identities[:min(3, len(e.Identities))] {
			words = append(words, id.String())
		}
		e.Message = "columns depend on each other: " + errtext.And(words)
		return e
	}
	return nil
}
