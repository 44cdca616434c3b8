package design

import (
	"fmt"
	"slices"

	"example.com/trammel/formula"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/factored"
)

// Compile turns a terms-form model into a plan for the rows of t: it expands
// the terms, finds levels and basis constants in the rows that are fitted,
// codes the columns and checks their rank. Everything that is wrong with the
// model or with the data it uses is refused by an [*Error]. opts may be nil.
func Compile(m *formula.Model, t *Table, opts *Options) (*Plan, error) {
	f, err := Prepare(m, t, opts)
	if err != nil {
		return nil, err
	}
	return f.Plan, nil
}

// Prepare compiles the model like [Compile] and returns the plan together with
// the fitted rows, ready for a fitter.
func Prepare(m *formula.Model, t *Table, opts *Options) (*Frame, error) {
	if opts == nil {
		opts = &Options{}
	}
	f, err := prepare(m, t, opts)
	if err != nil {
		return nil, err
	}
	return f, nil
}

func prepare(m *formula.Model, t *Table, opts *Options) (*Frame, *Error) {
	if m == nil || t == nil {
		return nil, &Error{Code: codeBadOption, Message: "the model or the table is nil", Hint: "give both"}
	}
	var x *expansion
	var eq *Equation
	var own [][]*rawTerm
	var err *Error
	if m.Terms != nil {
		x, err = expand(m.Text, m.Terms)
	} else {
		eq, x, own, err = newEquation(m)
	}
	if err != nil {
		return nil, err
	}
	p := &Plan{eq: eq, own: own, model: m, compiled: compiled{text: m.Text, productIndex: make(map[string]int), entries: make(map[[3]int][]int8)}}
	u, err := findUses(m, x)
	if err != nil {
		return nil, err
	}
	if err := u.check(t); err != nil {
		return nil, err
	}
	if eq != nil {
		if err := eq.checkNames(m, t); err != nil {
			return nil, err
		}
	}
	p.uses = u
	p.kinds = make(map[string]Kind)
	for _, name := range u.names() {
		p.kinds[name] = t.column(name).kind
	}
	sel, err := u.selectRows(t, opts.SetAside)
	if err != nil {
		return nil, err
	}
	f := sel.frame(p)
	if err := u.response(f, sel); err != nil {
		return nil, err
	}
	p.notes(f, x, sel.table)
	p.findBackMap(sel.table)
	form, err := p.learn(x, sel, f)
	if err != nil {
		return nil, err
	}
	f.Matrix = &Matrix{form: form}
	if f.Matrix.parts, err = p.partsAt(sel.table, sel.rows); err != nil {
		return nil, err
	}
	if eq != nil {
		p.describeEquation()
	} else {
		p.describe()
	}
	if !opts.NoRankCheck {
		if err := f.checkRank(); err != nil {
			return nil, err
		}
	}
	return f, nil
}

// Frame takes the rows of another table into the plan: levels, references and
// basis constants stay as they are. The response must be there. A level that
// the plan does not know is refused.
func (p *Plan) Frame(t *Table, opts *Options) (*Frame, error) {
	if opts == nil {
		opts = &Options{}
	}
	f, err := p.frame(t, opts)
	if err != nil {
		return nil, err
	}
	return f, nil
}

func (p *Plan) frame(t *Table, opts *Options) (*Frame, *Error) {
	if t == nil {
		return nil, &Error{Code: codeBadOption, Message: "the table is nil", Hint: "give a table"}
	}
	if err := p.checkKinds(p.uses, t); err != nil {
		return nil, err
	}
	sel, err := p.uses.selectRows(t, opts.SetAside)
	if err != nil {
		return nil, err
	}
	f := sel.frame(p)
	if err := p.uses.response(f, sel); err != nil {
		return nil, err
	}
	form, err := p.form(sel.table, sel.rows)
	if err != nil {
		return nil, err
	}
	f.Matrix = &Matrix{form: form}
	if f.Matrix.parts, err = p.partsAt(sel.table, sel.rows); err != nil {
		return nil, err
	}
	if f.Known, f.KnownLo, err = p.knownAt(sel.table, sel.rows); err != nil {
		return nil, err
	}
	if !opts.NoRankCheck {
		if err := f.checkRank(); err != nil {
			return nil, err
		}
	}
	return f, nil
}

// Matrix gives the plan's columns at the rows of t, which needs the columns on
// the right side of the model only. Missing and non-finite cells, columns that
// are absent or of another type, and levels that no fitted row had are refused.
func (p *Plan) Matrix(t *Table) (*Matrix, error) {
	form, err := p.rightSide(t)
	if err != nil {
		return nil, err
	}
	parts, err := p.partsAt(t, nil)
	if err != nil {
		return nil, err
	}
	return &Matrix{form: form, parts: parts}, nil
}

func (p *Plan) rightSide(t *Table) (*factored.Form, *Error) {
	if t == nil {
		return nil, &Error{Code: codeBadOption, Message: "the table is nil", Hint: "give a table"}
	}
	right := p.uses.right()
	if err := p.checkKinds(right, t); err != nil {
		return nil, err
	}
	if err := right.complete(t, nil); err != nil {
		return nil, err
	}
	return p.form(t, nil)
}

// Known gives the sum of the model's known terms at the rows of t, as hi + lo;
// nil when the model has none.
func (p *Plan) Known(t *Table) (hi, lo []float64, err error) {
	if len(p.known) == 0 {
		return nil, nil, nil
	}
	if t == nil {
		return nil, nil, &Error{Code: codeBadOption, Message: "the table is nil", Hint: "give a table"}
	}
	right := p.uses.right()
	if e := p.checkKinds(right, t); e != nil {
		return nil, nil, e
	}
	if e := right.complete(t, nil); e != nil {
		return nil, nil, e
	}
	hi, lo, e := p.knownAt(t, nil)
	if e != nil {
		return nil, nil, e
	}
	return hi, lo, nil
}

// checkKinds refuses another table's columns that are absent or of another kind
// than those of the fitted rows.
func (p *Plan) checkKinds(u *uses, t *Table) *Error {
	for _, v := range u.list {
		c := t.column(v.name)
		if c == nil {
			continue
		}
		if want := p.kinds[v.name]; c.kind != want {
			e := &Error{Code: codeWrongKind, Text: p.text, Span: v.span, Names: []string{v.name},
				Message: fmt.Sprintf("%s holds %s and held %s when the model was compiled", formula.QuoteName(v.name), c.kind.cells(), want.cells()),
				Hint:    "give it as " + want.cells()}
			if want == NumberColumn && c.kind == TextColumn {
				if row, cell := firstNotNumber(c); row > 0 {
					e.Rows = []int{row}
					e.Message += fmt.Sprintf("; row %d holds %s", row, shown(cell))
					e.Hint = "mend that cell, or leave it empty when the value is missing"
				}
			}
			return e
		}
	}
	return u.check(t)
}

func (p *Plan) knownAt(t *Table, rows []int) (hi, lo []float64, err *Error) {
	for k, q := range p.known {
		v, err := evaluate(q.prog, t, "known("+q.spec.expr.String()+")", place{p.text, q.pos, rows})
		if err != nil {
			return nil, nil, err
		}
		if k == 0 {
			hi, lo = v.Hi, v.Lo
			continue
		}
		sum := factored.Num{Hi: make([]float64, t.rows), Lo: make([]float64, t.rows)}
		for i := range sum.Hi {
			s := pair(hi, lo, i).Add(pair(v.Hi, v.Lo, i))
			sum.Hi[i], sum.Lo[i] = s.Hi, s.Lo
		}
		hi, lo = sum.Hi, sum.Lo
	}
	return hi, lo, nil
}

// learn compiles the factors from the fitted rows, codes the terms and makes
// the matrix.
func (p *Plan) learn(x *expansion, sel *selection, f *Frame) (*factored.Form, *Error) {
	c := &p.compiled
	t := sel.table
	catIndex := make(map[string]int)
	numIndex := make(map[string]int)
	var cats []factored.Cat
	var values [][]factored.Num
	ex := &expander{text: p.text, specs: x.specs, rows: sel.rows}
	for _, raw := range x.terms {
		tm := &term{raw: raw}
		for _, fac := range raw.factors {
			tf := termFactor{num: -1, cat: -1, nest: -1}
			if fac.cat != nil {
				k, ok := catIndex[fac.key]
				if !ok {
					g, cat, err := newCategory(ex, fac.cat, t)
					if err != nil {
						return nil, err
					}
					k = len(c.cats)
					catIndex[fac.key] = k
					c.cats = append(c.cats, g)
					cats = append(cats, cat)
				}
				tf.cat = k
			} else {
				k, ok := numIndex[fac.key]
				if !ok {
					q, err := newNumeric(p.text, fac.num, fac.pos)
					if err != nil {
						return nil, err
					}
					at := place{p.text, fac.pos, sel.rows}
					v, err := evaluate(q.prog, t, exprText(fac.num.expr), at)
					if err != nil {
						return nil, err
					}
					if err := q.learn(v, f.Counts, at); err != nil {
						return nil, err
					}
					k = len(c.nums)
					numIndex[fac.key] = k
					c.nums = append(c.nums, q)
					values = append(values, q.columns(v))
				}
				tf.num = k
			}
			tm.factors = append(tm.factors, tf)
		}
		c.terms = append(c.terms, tm)
	}
	levels := 0
	for _, g := range c.cats {
		if levels += len(g.levels) * len(g.levels); levels > maxCodingEntries {
			return nil, &Error{Code: codeTooLarge, Text: p.text, Span: g.pos, Names: g.columns,
				Message: fmt.Sprintf("%s has %d levels, too many to code", g.key, len(g.levels)),
				Hint:    "use the column as a number, or pool levels with in (…, others)"}
		}
	}
	for _, e := range x.known {
		q, err := newNumeric(p.text, &numericSpec{kind: exprKind, text: exprText(e), expr: e}, e.Span())
		if err != nil {
			return nil, err
		}
		c.known = append(c.known, q)
	}
	var err *Error
	if f.Known, f.KnownLo, err = p.knownAt(t, sel.rows); err != nil {
		return nil, err
	}
	if cats, err = c.resolveNests(catIndex, cats); err != nil {
		return nil, err
	}
	if p.eq != nil {
		err = p.codeParameters(p.own)
	} else {
		c.coded, c.from, err = c.code(c.terms)
	}
	if err != nil {
		return nil, err
	}
	if len(c.coded) == 0 {
		return nil, &Error{Code: codeNoColumns, Text: p.text, Span: p.model.Terms.Pos,
			Message: "the model has no column to fit", Hint: "write " + p.withTerms("intercept") + " for the constant model"}
	}
	// Before anything of the size of the columns is made.
	if n, k := t.rows, len(c.coded); n < k {
		return nil, &Error{Code: codeTooFewRows, Text: p.text, Span: p.rightSpan(),
			Message: fmt.Sprintf("the model has %s and %s", errtext.Count(k, "column"), errtext.Count(n, "fitted row")),
			Hint:    "give at least as many rows as columns, or take terms out"}
	}
	if err := c.checkCells(p, cats); err != nil {
		return nil, err
	}
	c.cols = c.lay(c.coded)
	form := &factored.Form{N: t.rows, Cats: cats, Cols: c.cols}
	if form.Nums, err = c.multiplyAll(values, sel.rows); err != nil {
		return nil, err
	}
	return form, nil
}

// maxCodingEntries bounds the entry tables of all categories together.
const maxCodingEntries = 400_000_000

// multiplyAll makes the products of numeric columns.
func (c *compiled) multiplyAll(values [][]factored.Num, rows []int) ([]factored.Num, *Error) {
	out := make([]factored.Num, len(c.products))
	for k, refs := range c.products {
		fs := make([]factored.Num, len(refs))
		names := make([]string, len(refs))
		for i, r := range refs {
			fs[i] = values[r.num][r.col]
			names[i] = c.nums[r.num].parts[r.col]
		}
		out[k] = multiply(fs)
		if len(refs) == 1 && c.nums[refs[0].num].spec.kind == exprKind {
			continue // checked when it was evaluated
		}
		if i := slices.IndexFunc(out[k].Hi, func(v float64) bool { return v-v != 0 }); i >= 0 {
			at := place{rows: rows}
			return nil, &Error{Code: codeDomain, Text: c.text, Span: c.nums[refs[0].num].pos, Rows: []int{at.row(i)},
				Message: fmt.Sprintf("the product of %s exceeds the largest number in row %d", errtext.And(names), at.row(i)),
				Hint:    "use smaller units"}
		}
	}
	return out, nil
}

// form makes the matrix of other rows. rows are their numbers for messages.
func (c *compiled) form(t *Table, rows []int) (*factored.Form, *Error) {
	form := &factored.Form{N: t.rows, Cols: c.cols}
	for _, g := range c.cats {
		cat, err := g.cat(t, rows)
		if err != nil {
			return nil, err
		}
		form.Cats = append(form.Cats, cat)
	}
	for _, n := range c.nests {
		cat, err := c.nestCat(n, form.Cats, t, rows)
		if err != nil {
			return nil, err
		}
		form.Cats = append(form.Cats, cat)
	}
	values := make([][]factored.Num, len(c.nums))
	for k, q := range c.nums {
		v, err := evaluate(q.prog, t, exprText(q.spec.expr), place{c.text, q.pos, rows})
		if err != nil {
			return nil, err
		}
		values[k] = q.columns(v)
	}
	var err *Error
	if form.Nums, err = c.multiplyAll(values, rows); err != nil {
		return nil, err
	}
	return form, nil
}

// rightSpan is the place of the right side in the model text.
func (p *Plan) rightSpan() formula.Span {
	if p.eq != nil {
		return p.model.Equation.Span()
	}
	return p.model.Terms.Pos
}
