package design

import (
	"fmt"
	"slices"
	"sort"
	"strings"

	"example.com/trammel/formula"
)

// This file turns the terms of a model text into a flat list of terms, each a
// set of factors, by the algebra of Wilkinson and Rogers (1973): sums
// distribute, products of a factor with itself collapse, repeated terms merge.
// No data are needed here.

// A factor is one factor of an expanded term: a numeric factor (num set) or a
// category (cat set). Factors with equal keys are equal.
type factor struct {
	key  string
	text string // canonical, as written
	pos  formula.Span
	num  *numericSpec
	cat  *formula.Category
}

// A rawTerm is an expanded term. No factors: the intercept.
type rawTerm struct {
	factors []*factor // as first written, an enclosing category after what it encloses
	nests   []rawNest // outermost last written: c inside b inside a is {c|b,a}, {b|a}
	key     string
	pos     formula.Span
	written int // place in the list of terms as written out
}

// A rawNest says that the category with key inner stands inside outer.
type rawNest struct {
	inner string
	outer []string
}

func (t *rawTerm) find(key string) *factor {
	for _, f := range t.factors {
		if f.key == key {
			return f
		}
	}
	return nil
}

func (t *rawTerm) nested(key string) *rawNest {
	for i := range t.nests {
		if t.nests[i].inner == key {
			return &t.nests[i]
		}
	}
	return nil
}

// setKey makes the key under which equal terms merge.
func (t *rawTerm) setKey() {
	keys := make([]string, 0, len(t.factors)+len(t.nests))
	for _, f := range t.factors {
		keys = append(keys, f.key)
	}
	sort.Strings(keys)
	for _, n := range t.nests {
		outer := slices.Clone(n.outer)
		sort.Strings(outer)
		keys = append(keys, n.inner+" inside "+strings.Join(outer, " by "))
	}
	sort.Strings(keys[len(t.factors):])
	t.key = strings.Join(keys, "\x00")
}

// text is the term's canonical text.
func (t *rawTerm) text() string {
	if len(t.factors) == 0 {
		return "intercept"
	}
	enclosing := make(map[string]bool)
	for _, n := range t.nests {
		for _, k := range n.outer {
			enclosing[k] = true
		}
	}
	innermost := func(key string) bool { return t.nested(key) != nil && !enclosing[key] }
	var parts []string
	for _, f := range t.factors {
		switch {
		case innermost(f.key):
			parts = append(parts, t.nestText(f.key))
		case !enclosing[f.key]:
			parts = append(parts, f.text)
		}
	}
	return strings.Join(parts, " by ")
}

func (t *rawTerm) nestText(key string) string {
	text := t.find(key).text
	n := t.nested(key)
	if n == nil {
		return text
	}
	// In a chain the next link encloses this one and is itself nested.
	for _, k := range n.outer {
		if t.nested(k) != nil {
			return text + " inside " + t.nestText(k)
		}
	}
	outer := make([]string, len(n.outer))
	for i, k := range n.outer {
		outer[i] = t.find(k).text
	}
	if len(outer) > 1 {
		return text + " inside (" + strings.Join(outer, " by ") + ")"
	}
	return text + " inside " + outer[0]
}

// An expansion is a model's right side, expanded.
type expansion struct {
	terms []*rawTerm // by number of factors, then as written; the intercept first
	known []formula.Expr
	specs map[string]*formula.Category // by columns: in and against, wherever written
}

type expander struct {
	text  string
	known []formula.Expr
	specs map[string]*formula.Category // by columns: the first with in or against
	rows  []int                        // row numbers of the fitted rows, for messages; nil when all
}

func (x *expander) refuse(code Code, at formula.Span, hint, format string, args ...any) *Error {
	return &Error{Code: code, Message: fmt.Sprintf(format, args...), Hint: hint, Text: x.text, Span: at}
}

// expand expands the right side of a terms-form model.
func expand(text string, terms *formula.Terms) (*expansion, *Error) {
	x := &expander{text: text, specs: make(map[string]*formula.Category)}
	if err := x.collectSpecs(terms); err != nil {
		return nil, err
	}
	list, err := x.sum(terms, true)
	if err != nil {
		return nil, err
	}
	for k, t := range list {
		t.written = k
	}
	sort.SliceStable(list, func(i, j int) bool { return len(list[i].factors) < len(list[j].factors) })
	return &expansion{terms: list, known: x.known, specs: x.specs}, nil
}

// categoryKey identifies a category by its columns.
func categoryKey(c *formula.Category) string {
	names := make([]string, len(c.Columns))
	for i, n := range c.Columns {
		names[i] = formula.QuoteName(n.Name)
	}
	return "cat(" + strings.Join(names, ", ") + ")"
}

// collectSpecs finds the in and against of every category, wherever it stands,
// and refuses two different ones for the same columns.
func (x *expander) collectSpecs(t formula.Term) *Error {
	switch t := t.(type) {
	case *formula.Terms:
		for _, item := range t.Items {
			if err := x.collectSpecs(item.Term); err != nil {
				return err
			}
		}
	case *formula.Cross:
		return x.collectAll(t.Factors)
	case *formula.By:
		return x.collectAll(t.Factors)
	case *formula.Inside:
		return x.collectAll(t.Factors)
	case *formula.Call:
		if t.Terms != nil {
			return x.collectSpecs(t.Terms)
		}
	case *formula.Category:
		if t.In == nil && t.Against == nil {
			return nil
		}
		key := categoryKey(t)
		if old := x.specs[key]; old == nil {
			x.specs[key] = t
		} else if old.String() != t.String() {
			return x.refuse(codeConflictingCategory, t.Pos,
				"write it once in full and plain "+key+" elsewhere",
				"%s and %s differ about one category", old, t)
		}
	}
	return nil
}

func (x *expander) collectAll(ts []formula.Term) *Error {
	for _, t := range ts {
		if err := x.collectSpecs(t); err != nil {
			return err
		}
	}
	return nil
}

// sum expands a sum, operators acting from left to right.
func (x *expander) sum(ts *formula.Terms, outermost bool) ([]*rawTerm, *Error) {
	var list []*rawTerm
	index := make(map[string]int) // key to place in list
	if outermost {
		list = append(list, &rawTerm{})
		index[""] = 0
	}
	for _, item := range ts.Items {
		if c, ok := item.Term.(*formula.Call); ok && c.Func == "known" {
			x.known = append(x.known, c.Args[0])
			continue
		}
		sub, err := x.term(item.Term)
		if err != nil {
			return nil, err
		}
		for _, t := range sub {
			k, there := index[t.key]
			switch {
			case item.Minus && !there:
				hint := "leave it out"
				if len(t.factors) == 0 && !outermost {
					hint = "write - intercept outside the parentheses"
				}
				return nil, x.refuse(codeNothingToRemove, item.Term.Span(), hint,
					"there is no term %s to remove at this place", t.text())
			case item.Minus:
				list[k] = nil
				delete(index, t.key)
			case !there:
				index[t.key] = len(list)
				list = append(list, t)
				if len(list) > formula.MaxTerms {
					return nil, x.tooMany(item.Term.Span())
				}
			}
		}
	}
	return slices.DeleteFunc(list, func(t *rawTerm) bool { return t == nil }), nil
}

func (x *expander) tooMany(at formula.Span) *Error {
	return x.refuse(codeTooLarge, at, "use upto(2, …) or fewer factors",
		"the model expands to more than %d terms", formula.MaxTerms)
}

// merge adds the terms of more that are not in list yet.
func (x *expander) merge(at formula.Span, list []*rawTerm, more ...*rawTerm) ([]*rawTerm, *Error) {
	seen := make(map[string]bool, len(list)+len(more))
	for _, t := range list {
		seen[t.key] = true
	}
	for _, t := range more {
		if !seen[t.key] {
			seen[t.key] = true
			list = append(list, t)
		}
	}
	if len(list) > formula.MaxTerms {
		return nil, x.tooMany(at)
	}
	return list, nil
}

func (x *expander) term(t formula.Term) ([]*rawTerm, *Error) {
	switch t := t.(type) {
	case *formula.Terms:
		return x.sum(t, false)
	case *formula.Intercept:
		return []*rawTerm{{pos: t.Pos}}, nil
	case *formula.Name:
		return x.numeric(t.Pos, exprSpec(t)), nil
	case *formula.Category:
		return []*rawTerm{single(t.Pos, &factor{key: categoryKey(t), text: t.String(), pos: t.Pos, cat: t})}, nil
	case *formula.Call:
		return x.call(t)
	case *formula.Cross:
		list, err := x.term(t.Factors[0])
		for _, f := range t.Factors[1:] {
			if err != nil {
				return nil, err
			}
			var right, both []*rawTerm
			if right, err = x.term(f); err != nil {
				return nil, err
			}
			if both, err = x.product(t.Pos, list, right); err != nil {
				return nil, err
			}
			list, err = x.merge(t.Pos, list, append(right, both...)...)
		}
		return list, err
	case *formula.By:
		list, err := x.term(t.Factors[0])
		for _, f := range t.Factors[1:] {
			if err != nil {
				return nil, err
			}
			var right []*rawTerm
			if right, err = x.term(f); err != nil {
				return nil, err
			}
			list, err = x.product(t.Pos, list, right)
		}
		return list, err
	case *formula.Inside:
		last := len(t.Factors) - 1
		list, err := x.term(t.Factors[last])
		for i := last - 1; i >= 0; i-- {
			if err != nil {
				return nil, err
			}
			var inner []*rawTerm
			if inner, err = x.term(t.Factors[i]); err != nil {
				return nil, err
			}
			list, err = x.inside(t, t.Factors[i], inner, t.Factors[i+1], list)
		}
		return list, err
	}
	return nil, x.refuse(codeNotATerm, t.Span(), "write a column, cat(…), num(…) or one of the language's functions",
		"%s is not a term", t)
}

func single(pos formula.Span, f *factor) *rawTerm {
	t := &rawTerm{factors: []*factor{f}, pos: pos}
	t.setKey()
	return t
}

func (x *expander) numeric(pos formula.Span, specs ...*numericSpec) []*rawTerm {
	var list []*rawTerm
	seen := make(map[string]bool)
	for _, s := range specs {
		if !seen[s.text] {
			seen[s.text] = true
			list = append(list, single(pos, &factor{key: s.text, text: s.text, pos: pos, num: s}))
		}
	}
	return list
}

// product is the interaction of every term of left with every term of right.
func (x *expander) product(at formula.Span, left, right []*rawTerm) ([]*rawTerm, *Error) {
	if len(left)*len(right) > 4*formula.MaxTerms {
		return nil, x.tooMany(at)
	}
	var out []*rawTerm
	for _, l := range left {
		for _, r := range right {
			t, twice := times(l, r)
			if twice != nil {
				return nil, x.refuse(codeNumericByItself, at, "write "+powersHint(twice),
					"the numeric term %s is multiplied by itself", twice.text)
			}
			if n := manyNests(t); n != "" {
				return nil, x.refuse(codeNotNestable, at, "keep one nested category in a term",
					"the term %s would hold two separate nested categories", n)
			}
			out = append(out, t)
		}
	}
	return x.merge(at, nil, out...)
}

func powersHint(f *factor) string {
	if f.num.kind == exprKind {
		return "powers(" + f.num.expr.String() + ", 2)"
	}
	return "num(…^2) of the column"
}

// times is the union of two terms' factors. A numeric factor that stands in
// both is returned as twice.
func times(l, r *rawTerm) (t *rawTerm, twice *factor) {
	pos := formula.Span{Start: l.pos.Start, End: r.pos.End}
	if pos.End < pos.Start {
		pos = l.pos
	}
	t = &rawTerm{factors: slices.Clone(l.factors), nests: slices.Clone(l.nests), pos: pos}
	for _, f := range r.factors {
		switch {
		case t.find(f.key) == nil:
			t.factors = append(t.factors, f)
		case f.num != nil:
			return nil, f
		}
	}
	for _, n := range r.nests {
		if t.nested(n.inner) == nil {
			t.nests = append(t.nests, n)
		}
	}
	t.setKey()
	return t, nil
}

// manyNests gives the term's text when its nests are not one chain.
func manyNests(t *rawTerm) string {
	for i := range t.nests {
		for j := i + 1; j < len(t.nests); j++ {
			a, b := t.nests[i], t.nests[j]
			if !slices.Contains(a.outer, b.inner) && !slices.Contains(b.outer, a.inner) {
				return t.text()
			}
		}
	}
	return ""
}

// inside nests every category of inner in every term of outer.
func (x *expander) inside(at *formula.Inside, innerNode formula.Term, inner []*rawTerm, outerNode formula.Term, outer []*rawTerm) ([]*rawTerm, *Error) {
	var out []*rawTerm
	for _, b := range inner {
		if len(b.factors) != 1 || b.factors[0].cat == nil {
			return nil, x.refuse(codeNotNestable, innerNode.Span(), "write cat(…) inside cat(…); a slope by category is written with by",
				"%s stands inside something and is not one category", b.text())
		}
		f := b.factors[0]
		if spec := x.specs[f.key]; spec != nil && spec.Against != nil {
			return nil, x.refuse(codeNotNestable, spec.Pos, "take out against: within each enclosing level the first one is the reference",
				"%s is nested and has against", f.key)
		}
		for _, a := range outer {
			nest := rawNest{inner: f.key}
			for _, g := range a.factors {
				if g.cat == nil {
					return nil, x.refuse(codeNotNestable, outerNode.Span(), "write a category, or categories joined by by, after inside",
						"%s stands after inside and is not a category", g.text)
				}
				nest.outer = append(nest.outer, g.key)
			}
			switch {
			case len(a.factors) == 0:
				return nil, x.refuse(codeNotNestable, outerNode.Span(), "write a category, or categories joined by by, after inside",
					"intercept stands after inside and is not a category")
			case a.find(f.key) != nil:
				return nil, x.refuse(codeNotNestable, at.Pos, "name two different categories",
					"%s stands inside itself", f.text)
			}
			t := &rawTerm{factors: append([]*factor{f}, a.factors...), nests: append([]rawNest{nest}, a.nests...), pos: at.Pos}
			t.setKey()
			if n := manyNests(t); n != "" {
				return nil, x.refuse(codeNotNestable, at.Pos, "keep one nested category in a term",
					"the term %s would hold two separate nested categories", n)
			}
			out = append(out, t)
		}
	}
	return x.merge(at.Pos, nil, out...)
}

func (x *expander) call(c *formula.Call) ([]*rawTerm, *Error) {
	switch c.Func {
	case "num":
		return x.numeric(c.Pos, exprSpec(c.Args[0])), nil
	case "powers":
		k := whole(c.Args[1])
		specs := make([]*numericSpec, 0, k)
		for i := 1; i <= k; i++ {
			specs = append(specs, exprSpec(power(c.Args[0], i)))
		}
		return x.numeric(c.Pos, specs...), nil
	case "quadratic":
		var lines, squares, products []*rawTerm
		for i, a := range c.Args {
			one := x.numeric(c.Pos, exprSpec(a))
			lines = append(lines, one...)
			squares = append(squares, x.numeric(c.Pos, exprSpec(power(a, 2)))...)
			for _, b := range c.Args[:i] {
				both, err := x.product(c.Pos, x.numeric(c.Pos, exprSpec(b)), one)
				if err != nil {
					return nil, err
				}
				products = append(products, both...)
			}
		}
		return x.merge(c.Pos, nil, append(append(lines, squares...), products...)...)
	case "legendre", "spline", "hinge", "harmonics":
		return x.numeric(c.Pos, basisSpec(c)), nil
	case "upto":
		return x.upto(c)
	case "known":
		return nil, x.refuse(codeNotATerm, c.Pos, "write + known(…) at the top level", "known stands inside another term")
	}
	return x.numeric(c.Pos, exprSpec(c)), nil
}

// upto expands upto(k, terms): the terms and their interactions of up to k of
// them, numeric terms never by themselves.
func (x *expander) upto(c *formula.Call) ([]*rawTerm, *Error) {
	base, err := x.sum(c.Terms, false)
	if err != nil {
		return nil, err
	}
	list := slices.Clone(base)
	type chain struct {
		t    *rawTerm
		last int // index in base of the last factor taken
	}
	var level []chain
	for i, t := range base {
		level = append(level, chain{t, i})
	}
	for order := 2; order <= int(c.Order.Value) && len(level) > 0; order++ {
		var next []chain
		var made []*rawTerm
		for _, l := range level {
			for i := l.last + 1; i < len(base); i++ {
				t, twice := times(l.t, base[i])
				if twice != nil {
					continue
				}
				if n := manyNests(t); n != "" {
					return nil, x.refuse(codeNotNestable, c.Pos, "keep one nested category in a term",
						"the term %s would hold two separate nested categories", n)
				}
				next = append(next, chain{t, i})
				made = append(made, t)
				if len(made) > 4*formula.MaxTerms {
					return nil, x.tooMany(c.Pos)
				}
			}
		}
		if list, err = x.merge(c.Pos, list, made...); err != nil {
			return nil, err
		}
		level = next
	}
	return list, nil
}

// whole reads an argument that the parser has checked to be a whole number.
func whole(e formula.Expr) int {
	if n, ok := e.(*formula.Number); ok {
		return int(n.Value)
	}
	return 0
}

func power(x formula.Expr, k int) formula.Expr {
	if k == 1 {
		return x
	}
	return &formula.Binary{Op: '^', X: x, Y: &formula.Number{Value: float64(k)}}
}
