package design

import (
	"fmt"
	"math"
	"slices"
	"sort"
	"strings"

	"example.com/trammel/formula"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/expr"
)

// A use is one place where a model names a column, and what it needs there.
type use struct {
	name     string
	span     formula.Span
	as       need
	level    *formula.Level // as comparedWith
	left     bool           // response, out of, per, weighted, counted
	equation bool           // bare in an equation, where it might be a parameter not declared
}

type need uint8

const (
	asNumber   need = iota // arithmetic, or a bare term
	asCategory             // in cat(…)
	asCompared             // beside = or <> and a level
)

// uses lists everything a model takes from a table.
type uses struct {
	text     string
	list     []use // in order of place
	value    *expr.Program
	outOf    *expr.Program
	per      *expr.Program
	weighted *expr.Program
	counted  *expr.Program
	model    *formula.Model
}

// findUses collects the columns of a model and compiles its clauses.
func findUses(m *formula.Model, x *expansion) (*uses, *Error) {
	u := &uses{text: m.Text, model: m}
	for _, c := range []struct {
		e   formula.Expr
		dst **expr.Program
	}{
		{m.Response.Value, &u.value}, {m.Response.OutOf, &u.outOf}, {m.Response.Per, &u.per},
		{m.Weighted, &u.weighted}, {m.Counted, &u.counted},
	} {
		if c.e == nil {
			continue
		}
		p, err := expr.Compile(c.e)
		if err != nil {
			return nil, &Error{Code: codeNotATerm, Text: m.Text, Span: c.e.Span(), Err: err,
				Message: c.e.String() + " cannot be computed", Hint: "write plain arithmetic of columns"}
		}
		*c.dst = p
		u.arithmetic(c.e, true)
	}
	for _, t := range x.terms {
		for _, f := range t.factors {
			if f.cat != nil {
				for _, n := range f.cat.Columns {
					u.list = append(u.list, use{name: n.Name, span: n.Pos, as: asCategory})
				}
			} else {
				u.arithmetic(f.num.expr, false)
			}
		}
	}
	for _, e := range x.known {
		u.arithmetic(e, false)
	}
	if m.Equation != nil {
		u.equationUses(m)
	}
	sort.SliceStable(u.list, func(i, j int) bool { return u.list[i].span.Start < u.list[j].span.Start })
	return u, nil
}

func (u *uses) arithmetic(e formula.Expr, left bool) {
	switch e := e.(type) {
	case *formula.Name:
		u.list = append(u.list, use{name: e.Name, span: e.Pos, as: asNumber, left: left})
	case *formula.Unary:
		u.arithmetic(e.X, left)
	case *formula.Binary:
		u.arithmetic(e.X, left)
		u.arithmetic(e.Y, left)
	case *formula.Compare:
		n, isName := e.X.(*formula.Name)
		if l, isLevel := e.Y.(*formula.Level); isLevel && isName {
			u.list = append(u.list, use{name: n.Name, span: n.Pos, as: asCompared, level: l, left: left})
			return
		}
		if v, isNumber := e.Y.(*formula.Number); isNumber && isName && (e.Op == "=" || e.Op == "<>") {
			// A number beside = may be meant as a level.
			u.list = append(u.list, use{name: n.Name, span: n.Pos, as: asCompared, left: left,
				level: &formula.Level{Pos: v.Pos, Kind: formula.NumberLevel, Number: v.Value}})
			return
		}
		u.arithmetic(e.X, left)
		u.arithmetic(e.Y, left)
	case *formula.Call:
		for _, a := range e.Args {
			u.arithmetic(a, left)
		}
	}
}

// right is the part of the uses that the right side of the model has.
func (u *uses) right() *uses {
	r := &uses{text: u.text, model: u.model}
	for _, v := range u.list {
		if !v.left {
			r.list = append(r.list, v)
		}
	}
	return r
}

// names lists the columns used, each once, in order of place.
func (u *uses) names() []string {
	var out []string
	seen := make(map[string]bool)
	for _, v := range u.list {
		if !seen[v.name] {
			seen[v.name] = true
			out = append(out, v.name)
		}
	}
	return out
}

// check refuses columns that are not there or of the wrong type.
func (u *uses) check(t *Table) *Error {
	var absent []string
	var first *use
	for i, v := range u.list {
		if t.column(v.name) == nil && !slices.Contains(absent, v.name) {
			absent = append(absent, v.name)
			if first == nil {
				first = &u.list[i]
			}
		}
	}
	if first != nil {
		return u.unknown(t, absent, first)
	}
	for _, v := range u.list {
		c := t.column(v.name)
		name := formula.QuoteName(v.name)
		switch {
		case v.as == asNumber && c.kind == TextColumn:
			return u.holdsText(v, c)
		case v.as == asCompared && v.level.Kind == formula.TextLevel && c.kind != TextColumn:
			want := "a bare number"
			if c.kind == BoolColumn {
				want = "true or false"
			}
			return &Error{Code: codeWrongLevelType, Text: u.text, Span: v.level.Pos, Names: []string{v.name},
				Message: fmt.Sprintf("%s holds %s and is compared with text", name, c.kind.cells()),
				Hint:    "write " + want + " without quotes"}
		case v.as == asCompared && v.level.Kind != formula.TextLevel && c.kind == TextColumn:
			return &Error{Code: codeWrongLevelType, Text: u.text, Span: v.level.Pos, Names: []string{v.name},
				Message: fmt.Sprintf("%s holds text and is compared with %s", name, valueOf(v.level).source()),
				Hint:    "write " + formula.QuoteLevel(valueOf(v.level).plain())}
		}
	}
	return nil
}

func (u *uses) unknown(t *Table, absent []string, first *use) *Error {
	names := t.Names()
	e := &Error{Code: codeUnknownColumn, Text: u.text, Span: first.span, Names: absent}
	words := quoteAll(absent)
	if len(words) > 6 {
		words = append(words[:6:6], fmt.Sprintf("%d more", len(words)-6))
	}
	e.Message = "the data have no column " + words[0]
	if len(absent) > 1 {
		e.Message = "the data have no columns " + errtext.And(words)
	}
	e.Hint = u.suggest(t, names, absent[0])
	if first.equation {
		word := formula.QuoteName(absent[0])
		e.Message = fmt.Sprintf("%s is neither a column of the data nor a declared parameter", word)
		e.Hint = fmt.Sprintf("declare it after fitting: fitting %s", word)
		if near, ok := errtext.Nearest(absent[0], names); ok {
			e.Hint = fmt.Sprintf("did you mean the column %s? if it is a parameter, declare it after fitting", formula.QuoteName(near))
		}
	}
	return e
}

func (u *uses) suggest(t *Table, names []string, word string) string {
	for _, n := range names {
		if how := errtext.Alike(word, n); how != "" {
			return fmt.Sprintf("column %s differs only in %s: write it so", formula.QuoteName(n), how)
		}
	}
	for _, c := range t.cols {
		if c.kind == TextColumn && slices.Contains(c.dict, word) {
			n := formula.QuoteName(c.name)
			return fmt.Sprintf("%s is a level of %s: write cat(%s), or num(%s=%s)", word, n, n, n, formula.QuoteLevel(word))
		}
	}
	if near, ok := errtext.Nearest(word, names); ok {
		return "did you mean " + formula.QuoteName(near) + "?"
	}
	for _, n := range names {
		if strings.HasPrefix(n, word) && len(word) >= 3 {
			return "did you mean " + formula.QuoteName(n) + "?"
		}
	}
	list := quoteAll(names)
	if len(list) > 8 {
		list = append(list[:8:8], fmt.Sprintf("%d more", len(names)-8))
	}
	switch len(list) {
	case 0:
		return "the table has no columns"
	case 1:
		return "the only column is " + list[0]
	}
	return "the columns are " + errtext.And(list)
}

// holdsText refuses a text column in arithmetic.
func (u *uses) holdsText(v use, c *column) *Error {
	name := formula.QuoteName(v.name)
	e := &Error{Code: codeTextColumn, Text: u.text, Span: v.span, Names: []string{v.name}}
	row, cell := firstNotNumber(c)
	e.Message = name + " holds text"
	switch {
	case v.left && row > 0:
		e.Code = codeTextResponse
		e.Rows = []int{row}
		e.Message = fmt.Sprintf("%s must hold numbers and holds text; row %d holds %s", name, row, shown(cell))
		e.Hint = "mend that cell, or leave it empty when the value is missing"
	case v.left:
		e.Code = codeTextResponse
		e.Message = name + " must hold numbers and holds text that looks like numbers"
		e.Hint = "read the column as numbers (Types in CSVOptions)"
	case c.odd != nil && row > 0:
		e.Rows = []int{row}
		e.Message = fmt.Sprintf("%s holds text, for row %d holds %s", name, row, shown(cell))
		e.Hint = fmt.Sprintf("mend that cell, or write cat(%s)", name)
	case row == 0:
		e.Hint = fmt.Sprintf("write cat(%s), or read the column as numbers (Types in CSVOptions)", name)
	default:
		e.Hint = "write cat(" + name + ")"
	}
	return e
}

// firstNotNumber is the first row, from 1, whose text is no number; 0 when all
// are.
func firstNotNumber(c *column) (row int, cell string) {
	for i, k := range c.codes {
		if k < 0 {
			continue
		}
		if _, ok := parseNumber(c.dict[k]); !ok {
			return i + 1, c.dict[k]
		}
	}
	return 0, ""
}

// parseNumber tells whether a text cell is a number as CSV cells are read.
func parseNumber(s string) (float64, bool) {
	x, what := parseNumeral([]byte(s))
	return x, what == plainNumeral
}

// complete refuses missing cells and non-finite numbers in used columns, for
// tables whose rows must all be usable.
func (u *uses) complete(t *Table, rows []int) *Error {
	bad := u.incomplete(t, nil)
	if bad == nil {
		return nil
	}
	return u.refuseIncomplete(t, bad, place{rows: rows}, "take the rows out, or fill the cells")
}

// incomplete marks the rows, among those not in skip, with a missing or
// non-finite cell in a used column; nil when there are none.
func (u *uses) incomplete(t *Table, skip []bool) []bool {
	var bad []bool
	for _, name := range u.names() {
		c := t.column(name)
		if c.sound() {
			continue
		}
		for i := range t.rows {
			if c.usable(i) || skip != nil && skip[i] {
				continue
			}
			if bad == nil {
				bad = make([]bool, t.rows)
			}
			bad[i] = true
		}
	}
	return bad
}

// usable tells that cell i is neither missing nor non-finite.
func (c *column) usable(i int) bool {
	if c.miss != nil && c.miss[i] {
		return false
	}
	return c.kind != NumberColumn || c.num[i]-c.num[i] == 0
}

// sound tells that all cells are usable. The answer is kept: columns are
// immutable.
func (c *column) sound() bool {
	switch c.known.Load() {
	case 1:
		return true
	case 2:
		return false
	}
	ok := c.miss == nil
	if ok && c.kind == NumberColumn {
		// A sum of x·0 is 0 unless some x is not finite.
		s := 0.0
		for _, x := range c.num {
			s += x * 0
		}
		ok = s == 0
	}
	if ok {
		c.known.Store(1)
	} else {
		c.known.Store(2)
	}
	return ok
}

func (u *uses) refuseIncomplete(t *Table, bad []bool, at place, hint string) *Error {
	e := &Error{Code: codeMissingValues, Text: "", Hint: hint}
	total := 0
	for i, b := range bad {
		if b {
			if total++; len(e.Rows) < maxRows {
				e.Rows = append(e.Rows, at.row(i))
			}
		}
	}
	var words []string
	for _, name := range u.names() {
		c := t.column(name)
		miss, infinite := 0, 0
		for i, b := range bad {
			switch {
			case !b || c.usable(i):
			case c.miss != nil && c.miss[i]:
				miss++
			default:
				infinite++
			}
		}
		if miss+infinite == 0 {
			continue
		}
		e.Names = append(e.Names, name)
		text := formula.QuoteName(name) + " has "
		switch {
		case infinite == 0:
			text += fmt.Sprintf("%d missing", miss)
		case miss == 0:
			text += fmt.Sprintf("%d not finite", infinite)
		default:
			text += fmt.Sprintf("%d missing and %d not finite", miss, infinite)
		}
		words = append(words, text)
	}
	if len(words) > 8 {
		words = append(words[:8:8], fmt.Sprintf("%d more columns have some", len(words)-8))
	}
	verb := "cannot be used"
	e.Message = fmt.Sprintf("%s of %d %s: %s, in %s", errtext.Count(total, "row"), t.rows, verb, strings.Join(words, "; "), errtext.Rows(e.Rows, total))
	if total == 1 {
		e.Message = fmt.Sprintf("1 row of %d %s: %s, in %s", t.rows, verb, strings.Join(words, "; "), errtext.Rows(e.Rows, total))
	}
	return e
}

// A selection is the fitted rows of a table.
type selection struct {
	table    *Table // of the fitted rows only
	given    int
	rows     []int // row numbers from 1; nil when all
	setAside []int
	zero     []int
	weights  []float64
	counts   []float64
}

// selectRows drops rows of weight or count 0, then refuses or sets aside
// incomplete rows.
func (u *uses) selectRows(t *Table, setAside bool) (*selection, *Error) {
	s := &selection{table: t, given: t.rows}
	if t.rows == 0 {
		return nil, &Error{Code: codeNoRows, Message: "the table has no rows", Hint: "give at least one"}
	}

	var zero, aside []bool
	for _, c := range []struct {
		p    *expr.Program
		e    formula.Expr
		dst  *[]float64
		word string
	}{
		{u.weighted, u.model.Weighted, &s.weights, "weight"}, {u.counted, u.model.Counted, &s.counts, "count"},
	} {
		if c.p == nil {
			continue
		}
		v, err := u.clause(t, c.p, c.e, c.word)
		if err != nil {
			return nil, err
		}
		*c.dst = v
		for i, w := range v {
			if w == 0 {
				if zero == nil {
					zero = make([]bool, t.rows)
				}
				zero[i] = true
			}
		}
	}
	bad := u.incomplete(t, zero)
	if bad != nil {
		if !setAside {
			return nil, u.refuseIncomplete(t, bad, place{}, "fill the cells, or set incomplete rows aside (SetAside in the options, -set-aside on the command line)")
		}
		aside = bad
	}

	if zero == nil && aside == nil {
		return s, nil
	}
	var take []int
	for i := range t.rows {
		switch {
		case zero != nil && zero[i]:
			s.zero = append(s.zero, i+1)
		case aside != nil && aside[i]:
			s.setAside = append(s.setAside, i+1)
		default:
			take = append(take, i)
			s.rows = append(s.rows, i+1)
		}
	}
	if len(take) == 0 {
		return nil, &Error{Code: codeNoRows, Message: fmt.Sprintf("no row is left to fit: %d of %d have weight or count 0 and %d are incomplete",
			len(s.zero), t.rows, len(s.setAside)), Hint: "give at least one complete row with a positive weight"}
	}
	s.table = t.take(take, u.names())
	for _, v := range []*[]float64{&s.weights, &s.counts} {
		if *v == nil {
			continue
		}
		kept := make([]float64, len(take))
		for i, r := range take {
			kept[i] = (*v)[r]
		}
		*v = kept
	}
	return s, nil
}

// clause evaluates weights or counts at all rows of the table, also those that
// may turn out incomplete: cells that make the value itself undefined leave
// NaN, which the completeness check then reports.
func (u *uses) clause(t *Table, p *expr.Program, e formula.Expr, word string) ([]float64, *Error) {
	var v []float64
	if name, ok := p.Bare(); ok && t.column(name).num != nil {
		v = t.column(name).num
	} else {
		v = make([]float64, t.rows)
		p.Eval(v, nil, vars(p, t), t.rows)
	}
	var rows []int
	total, first := 0, math.NaN()
	for i, w := range v {
		if w-w == 0 && w >= 0 && (word == "weight" || w == math.Trunc(w) && w <= 1<<53) {
			continue
		}
		unusable := false
		for _, name := range p.Names() {
			unusable = unusable || !t.column(name).usable(i)
		}
		if unusable {
			continue
		}
		if total++; total == 1 {
			first = w
		}
		if len(rows) < maxRows {
			rows = append(rows, i+1)
		}
	}
	if total == 0 {
		return v, nil
	}
	what := "a finite number of at least 0"
	hint := "mend it; a row of weight 0 is not fitted"
	code := codeBadWeight
	if word == "count" {
		what = "a whole number of at least 0"
		hint = "mend it, or write weighted " + e.String() + " when these are precisions"
		code = codeBadCount
	}
	message := fmt.Sprintf("the %s %s must be %s and is %s in row %d", word, e.String(), what, plainFloat(first), rows[0])
	if total > 1 {
		message += fmt.Sprintf("; %s in all break this rule", errtext.Rows(rows, total))
	}
	return nil, &Error{Code: code, Text: u.text, Span: e.Span(), Rows: rows, Names: slices.Clone(p.Names()),
		Message: message, Hint: hint}
}

func plainFloat(x float64) string {
	if x-x != 0 {
		return fmt.Sprint(x)
	}
	return signedText(x)
}

func (s *selection) frame(p *Plan) *Frame {
	return &Frame{Plan: p, Weights: s.weights, Counts: s.counts, Given: s.given, Rows: s.rows, SetAside: s.setAside, Zero: s.zero}
}
