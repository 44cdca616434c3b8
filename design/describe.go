package design

import (
	"fmt"
	"slices"
	"strings"

	"example.com/trammel/formula"
)

// This file gives every column its name in the model language and its meaning
// in words, and lists the effects that have no column of their own.

// describe fills the plan's descriptions from the coded columns.
func (p *Plan) describe() {
	c := &p.compiled
	p.columns = make([]PlanColumn, len(c.coded))
	w := p.wording()
	for j, col := range c.coded {
		p.columns[j] = PlanColumn{Name: c.columnName(col), Meaning: w.meaning(col), Term: col.term}
	}
	p.list = make([]PlanTerm, len(c.terms))
	for k, t := range c.terms {
		p.list[k] = PlanTerm{Text: t.raw.text(), Intercept: len(t.factors) == 0, From: c.from[k], To: c.from[k+1], Written: t.raw.written}
		for l, u := range c.terms {
			if l != k && within(t, u) {
				p.list[k].Within = append(p.list[k].Within, l)
			}
		}
	}
	p.derive(w)
}

// within tells whether every factor of t stands in u too.
func within(t, u *term) bool {
	if len(t.factors) >= len(u.factors) {
		return false
	}
	for _, f := range t.raw.factors {
		if u.raw.find(f.key) == nil {
			return false
		}
	}
	return true
}

func (c *compiled) columnName(col codedColumn) string {
	parts := make([]string, 0, len(col.factors))
	for i, f := range col.factors {
		parts = append(parts, c.factorPart(f, col.choice[i]))
	}
	if len(parts) == 0 {
		return "intercept"
	}
	return strings.Join(parts, " by ")
}

// factorPart is the name of the chosen column of one factor.
func (c *compiled) factorPart(f codedFactor, choice int) string {
	switch {
	case f.num >= 0:
		return c.nums[f.num].parts[choice]
	case f.nest >= 0:
		n := c.nests[f.nest]
		return c.comboWords(n, n.combo[choice])
	}
	return c.cats[f.cat].part(f.full, choice)
}

// A wording knows what the coefficients are about.
type wording struct {
	c        *compiled
	quantity string
	terms    []*term       // of the model at hand: a parameter's own in an equation
	coded    []codedColumn // its columns
	equation bool
}

func (p *Plan) wording() *wording {
	w := &wording{c: &p.compiled, quantity: p.Response(), terms: p.terms, coded: p.coded}
	r := p.model.Response
	e := p.model.Errors
	if e == nil {
		return w
	}
	link := e.Link
	if link == "" {
		link = map[string]string{"normal": "identity", "binomial": "logit"}[e.Family]
		if link == "" {
			link = "log"
		}
	}
	switch {
	case r.OutOf != nil:
		w.quantity = "share of " + w.quantity
	case r.Per != nil:
		w.quantity += " per " + r.Per.String()
	}
	switch link {
	case "identity":
	case "logit":
		w.quantity = "log odds of " + w.quantity
	case "log":
		w.quantity = "log mean " + w.quantity
	default:
		w.quantity = link + " of mean " + w.quantity
	}
	return w
}

// meaning says in words what a coefficient measures.
func (w *wording) meaning(col codedColumn) string {
	var nums []string
	var full, reduced, where []string

	for i, f := range col.factors {
		k := col.choice[i]
		switch {
		case f.num >= 0:
			nums = append(nums, w.numeric(f.num, k))
		case f.nest >= 0:
			n := w.c.nests[f.nest]
			combo, base := n.combos[n.combo[k]], n.combos[n.base[k]]
			last := len(combo) - 1
			in := w.c.cats[n.inner]
			reduced = append(reduced, in.words(int(combo[last]))+" against "+in.words(int(base[last])))
			for q, o := range n.outer {
				where = append(where, w.c.cats[o].words(int(combo[q])))
			}
		default:
			g := w.c.cats[f.cat]
			if f.full {
				full = append(full, g.words(k))
				break
			}

			reduced = append(reduced, g.contrast(k))
		}
	}
	var subject string
	t := w.c.terms[col.term]
	switch {
	case len(nums) > 0:
		subject = joinSlopes(nums)
		if w.equation {
			subject += " in " + w.quantity
		}
	default:
		subject = w.quantity
	}
	var at []string
	if len(nums) == 0 {
		at = w.zeros(t, len(full) > 0 || len(col.factors) == 0)
	}
	if len(reduced) == 0 && len(full) == 0 {
		// The effect stands for the reference of every category it is crossed with.
		full = append(full, w.crossed(t, col)...)
	}
	text := subject
	if len(col.factors) == 0 && len(at) == 0 && len(full) == 0 {
		return "mean of " + subject
	}
	if len(reduced) > 0 {
		if len(nums) > 0 {
			subject = "the " + strings.TrimPrefix(subject, "the ")
		}
		text = "change in " + subject
		if len(reduced) > 1 {
			text += " beyond the single effects"
		}
	}
	if len(at) > 0 {
		text += " at " + strings.Join(at, ", ")
	}
	for _, part := range [][]string{{strings.Join(reduced, " and ")}, full, where} {
		for _, s := range part {
			if s != "" {
				text += ", " + s
			}
		}
	}
	return text
}

// contrast is "F2 against F1" for reduced column k.
func (g *category) contrast(k int) string {
	level := g.words(g.level(false, k))
	switch g.against {
	case againstMean:
		return level + " against the mean of the levels"
	case againstPrevious:
		return level + " against " + g.words(k)
	}
	return level + " against " + g.words(g.ref)
}

// numeric describes the slope of one numeric column.
func (w *wording) numeric(num, k int) string {
	q := w.c.nums[num]
	arg := exprText(q.spec.expr)
	switch q.spec.kind {
	case legendreKind:
		return fmt.Sprintf("coefficient of Legendre polynomial %d of %s", k+1, arg)
	case splineKind:
		return fmt.Sprintf("coefficient of spline column %d of %s", k+1, arg)
	case hingeKind:
		return fmt.Sprintf("change in the slope of %s above %s", arg, signedText(q.spec.constants[k]))
	case harmonicsKind:
		wave := "cosine"
		if k%2 == 1 {
			wave = "sine"
		}
		period := formula.FormatNumber(q.spec.constants[0])
		if j := k/2 + 1; j > 1 {
			period += "/" + fmt.Sprint(j)
		}
		return fmt.Sprintf("%s of %s with period %s", wave, arg, period)
	}
	switch e := q.spec.expr.(type) {
	case *formula.Compare:
		return "difference made by " + e.String()
	case *formula.Binary:
		if e.Op == '^' {
			return "coefficient of " + arg
		}
	}
	return "slope of " + arg
}

// joinSlopes describes a product of numeric columns.
func joinSlopes(nums []string) string {
	text := nums[0]
	for _, n := range nums[1:] {
		text = "change in the " + text + " per unit of " + strings.TrimPrefix(strings.TrimPrefix(n, "slope of "), "coefficient of ")
	}
	return text
}

// zeros lists the numeric terms that are 0 where an effect without numeric
// factors is measured: all of the model's for a level, those crossed with the
// term's categories for a change.
func (w *wording) zeros(t *term, level bool) []string {
	var out []string
	more := false
	for _, u := range w.terms {
		if len(u.nums) == 0 || !level && !within(t, u) {
			continue
		}
		for _, k := range u.nums {
			q := w.c.nums[k]
			if q.spec.kind != exprKind {
				more = true
				continue
			}
			if b, ok := q.spec.expr.(*formula.Binary); ok && b.Op == '^' {
				continue
			}
			if _, ok := q.spec.expr.(*formula.Compare); ok {
				continue
			}
			if s := q.spec.text + " = 0"; !slices.Contains(out, s) {
				out = append(out, s)
			}
		}
	}
	if more {
		out = append(out, "basis columns 0")
	}
	if len(out) > 3 {
		return []string{"all numeric terms 0"}
	}
	return out
}

// crossed lists, in words, at which levels an effect without categories is
// measured: the references of the categories it is crossed with.
func (w *wording) crossed(t *term, col codedColumn) []string {
	var out []string
	var seen []int
	for _, u := range w.coded {
		v := w.c.terms[u.term]
		if u.term == col.term || !slices.Equal(v.nums, t.nums) {
			continue
		}
		for _, f := range u.factors {
			if f.cat < 0 || f.nest >= 0 || f.full || slices.Contains(seen, f.cat) {
				continue
			}
			seen = append(seen, f.cat)
			g := w.c.cats[f.cat]
			switch g.against {
			case againstMean:
				out = append(out, "mean over "+strings.Join(g.columns, ", "))
			case againstPrevious:
				out = append(out, g.words(0))
			default:
				out = append(out, g.words(g.ref))
			}
		}
	}
	return out
}

// maxDerived bounds the list of derived effects.
const maxDerived = 10_000

// derive lists the effects of reference levels under "against mean".
func (p *Plan) derive(w *wording) {
	c := &p.compiled
	for from := 0; from < len(c.coded); {
		to := from + 1
		fs := c.coded[from].factors
		for to < len(c.coded) && len(fs) > 0 && len(c.coded[to].factors) > 0 && &c.coded[to].factors[0] == &fs[0] {
			to++
		}
		p.deriveBlock(w, from, to)
		from = to
	}
}

func (p *Plan) deriveBlock(w *wording, from, to int) {
	c := &p.compiled
	fs := c.coded[from].factors
	var mean []int
	for i, f := range fs {
		if f.cat >= 0 && f.nest < 0 && !f.full && c.cats[f.cat].against == againstMean {
			mean = append(mean, i)
		}
	}
	if len(mean) == 0 {
		return
	}
	// Every choice, with -1 for the reference of a mean-coded factor.
	choice := make([]int, len(fs))
	for i := range choice {
		if slices.Contains(mean, i) {
			choice[i] = -1
		}
	}
	first := slices.Clone(choice)
	for {
		if slices.Contains(choice, -1) {
			if len(p.derived) >= maxDerived {
				return
			}
			p.derived = append(p.derived, p.derivedAt(w, from, to, choice))
		}
		i := len(fs) - 1
		for ; i >= 0; i-- {
			if choice[i]++; choice[i] < fs[i].width {
				break
			}
			choice[i] = first[i]
		}
		if i < 0 {
			return
		}
	}
}

func (p *Plan) derivedAt(w *wording, from, to int, choice []int) Derived {
	c := &p.compiled
	fs := c.coded[from].factors
	d := Derived{Term: c.coded[from].term, Weights: make([]float64, len(c.coded))}
	sign := 1.0
	for _, k := range choice {
		if k < 0 {
			sign = -sign
		}
	}
	for j := from; j < to; j++ {
		match := true
		for i, k := range choice {
			match = match && (k < 0 || c.coded[j].choice[i] == k)
		}
		if match {
			d.Weights[j] = sign
		}
	}
	parts := make([]string, len(fs))
	words := codedColumn{term: d.Term, factors: slices.Clone(fs), choice: slices.Clone(choice)}
	for i, f := range fs {
		if choice[i] < 0 {
			g := c.cats[f.cat]
			parts[i] = g.equals(0) + " against mean"
			// Level 0 is what column -1 would speak of.
			continue
		}
		parts[i] = c.factorPart(f, choice[i])
	}
	d.Name = strings.Join(parts, " by ")
	d.Meaning = w.meaning(words)
	return d
}

// Decode gives the tables that turn levels into indicator columns, one for
// each category and coding in use.
func (p *Plan) Decode() []Decoding {
	c := &p.compiled
	var out []Decoding
	index := make(map[string]int)
	for _, col := range c.coded {
		for i, f := range col.factors {
			if f.num >= 0 {
				continue
			}
			key := fmt.Sprint(f.cat, f.nest, f.full)
			k, ok := index[key]
			if !ok {
				k = len(out)
				index[key] = k
				out = append(out, c.decoding(f))
			}
			d := &out[k]
			if text := c.terms[col.term].raw.text(); !slices.Contains(d.Terms, text) {
				d.Terms = append(d.Terms, text)
			}
			if name := c.factorPart(f, col.choice[i]); !slices.Contains(d.Columns, name) {
				d.Columns = append(d.Columns, name)
				e := c.readEntry(f, col.choice[i])
				for l := range d.Entries {
					d.Entries[l] = append(d.Entries[l], int(e[l]))
				}
			}
		}
	}
	return out
}

func (c *compiled) readEntry(f codedFactor, k int) []int8 {
	if f.nest >= 0 {
		e := make([]int8, len(c.nests[f.nest].combos))
		e[c.nests[f.nest].combo[k]] = 1
		return e
	}
	return c.cats[f.cat].entry(f.full, k)
}

func (c *compiled) decoding(f codedFactor) Decoding {
	if f.nest >= 0 {
		n := c.nests[f.nest]
		var outer []string
		for _, k := range n.outer {
			outer = append(outer, c.cats[k].text)
		}
		d := Decoding{Category: c.cats[n.inner].text + " inside " + strings.Join(outer, " by ")}
		for k := range n.combos {
			d.Levels = append(d.Levels, c.comboWords(n, k))
			d.Entries = append(d.Entries, nil)
		}
		return d
	}
	g := c.cats[f.cat]
	d := Decoding{Category: g.text}
	for k := range g.levels {
		d.Levels = append(d.Levels, g.equals(k))
		d.Entries = append(d.Entries, nil)
	}
	return d
}

// notes remarks on columns that look like codes but enter as slopes.
func (p *Plan) notes(f *Frame, x *expansion, t *Table) {
	used := make(map[string]bool) // columns that also stand in a category or inside arithmetic
	var bare []string
	for _, raw := range x.terms {
		for _, fac := range raw.factors {
			if fac.cat != nil {
				for _, n := range fac.cat.Columns {
					used[n.Name] = true
				}
				continue
			}
			if name := fac.num.bare; name != "" {
				if !slices.Contains(bare, name) {
					bare = append(bare, name)
				}
				continue
			}
			for _, name := range columnsOf(fac.num.expr) {
				used[name] = true
			}
		}
	}
	for _, name := range bare {
		c := t.column(name)
		if used[name] || c.kind != NumberColumn || !codeLike(c.num) {
			continue
		}
		q := formula.QuoteName(name)
		f.Notes = append(f.Notes, Note{Code: "code-like-column", Text: fmt.Sprintf("%s looks like a code: did you mean cat(%s)?", q, q)})
	}
}

// columnsOf lists the columns an expression reads.
func columnsOf(e formula.Expr) []string {
	var u uses
	u.arithmetic(e, false)
	return u.names()
}

// codeLike tells that the values are whole, of at most 12 kinds, each in 3
// rows or more.
func codeLike(x []float64) bool {
	const most, least = 12, 3
	var values [most]float64
	var counts [most]int
	n := 0
next:
	for _, v := range x {
		for k := range n {
			if values[k] == v {
				counts[k]++
				continue next
			}
		}
		if v != float64(int64(v)) || n == most {
			return false
		}
		values[n], counts[n] = v, 1
		n++
	}
	if n < 2 {
		return false
	}
	for _, m := range counts[:n] {
		if m < least {
			return false
		}
	}
	return true
}
