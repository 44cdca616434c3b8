package design

import (
	"strings"

	"example.com/trammel/formula"
	"example.com/trammel/internal/factored"
)

// recode codes some of the terms afresh, in the given order, over the same
// factors. It does not touch the receiver.
func (c *compiled) recode(terms []int) (*compiled, *Error) {
	sub := *c
	sub.terms = make([]*term, len(terms))
	for i, k := range terms {
		sub.terms[i] = c.terms[k]
	}
	sub.entries = make(map[[3]int][]int8)
	sub.productIndex = make(map[string]int, len(c.productIndex))
	for key, k := range c.productIndex {
		sub.productIndex[key] = k
	}
	var err *Error
	if sub.coded, sub.from, err = sub.code(sub.terms); err != nil {
		return nil, err
	}
	sub.cols = sub.lay(sub.coded)
	return &sub, nil
}

// Submodel codes the given terms (indices into Plan.Terms, the intercept
// included where it belongs) afresh, in the given order, over the rows of the
// frame. The columns of the last term are [from, len(form.Cols)). Nothing is
// copied but the columns' descriptions.
func (f *Frame) Submodel(terms []int) (form *factored.Form, from int) {
	sub, err := f.Plan.recode(terms)
	if err != nil || len(terms) == 0 {
		// A submodel of a sound model is sound: its effects are among those of
		// the full model, whose sizes were checked.
		return &factored.Form{N: f.Matrix.form.N}, 0
	}
	full := f.Matrix.form
	return &factored.Form{N: full.N, Nums: full.Nums, Cats: full.Cats, Cols: sub.cols}, sub.from[len(terms)-1]
}

// withoutTerms writes the model without the given terms (indices into
// Plan.Terms): a summand that says just the term is dropped; else the terms
// that stay are listed; in a long model the terms are subtracted.
func (p *Plan) withoutTerms(drop map[int]bool) string {
	const listed = 12
	text, ok := p.dropSummands(drop)
	if ok {
		return text
	}
	var keep, minus []string
	for k, t := range p.terms {
		src := p.sourceOf(t)
		switch {
		case drop[k]:
			minus = append(minus, src)
		case len(t.factors) > 0:
			keep = append(keep, src)
		}
	}
	intercept := len(p.terms) > 0 && len(p.terms[0].factors) == 0
	if len(p.terms) > listed || len(keep) == 0 {
		if len(keep) == 0 && intercept && !drop[0] {
			return p.withTerms("intercept" + p.knownText())
		}
		return p.withTerms(p.model.Terms.String() + " - " + strings.Join(minus, " - "))
	}
	terms := strings.Join(keep, " + ") + p.knownText()
	if !intercept || drop[0] {
		terms += " - intercept"
	}
	return p.withTerms(terms)
}

func (p *Plan) knownText() string {
	text := ""
	for _, q := range p.known {
		text += " + known(" + q.spec.expr.String() + ")"
	}
	return text
}

// sourceOf is a term's text for a model, each category with its levels and
// coding.
func (p *Plan) sourceOf(t *term) string {
	u := rawTerm{nests: t.raw.nests}
	for i, f := range t.raw.factors {
		g := *f
		if f.num != nil {
			g.text = f.num.source()
		} else {
			g.text = p.cats[t.factors[i].cat].text
		}
		u.factors = append(u.factors, &g)
	}
	return u.text()
}

// dropSummands drops summands of the model that say just one of the terms
// each. ok is false when some term is not such a summand.
func (p *Plan) dropSummands(drop map[int]bool) (text string, ok bool) {
	left := make(map[string]int)
	for k := range drop {
		if len(p.terms[k].factors) == 0 {
			left["intercept"] = k
			continue
		}
		left[p.terms[k].raw.key] = k
	}
	var items []formula.SignedTerm
	x := &expander{text: p.text, specs: map[string]*formula.Category{}}
	count := make(map[string]int)
	for _, item := range p.model.Terms.Items {
		if c, isCall := item.Term.(*formula.Call); isCall && c.Func == "known" {
			items = append(items, item)
			continue
		}
		list, err := x.term(item.Term)
		if err != nil {
			return "", false
		}
		for _, t := range list {
			count[t.key]++
		}
		if len(list) == 1 && !item.Minus {
			if _, there := left[list[0].key]; there && list[0].key != "" {
				delete(left, list[0].key)
				continue
			}
		}
		items = append(items, item)
	}
	for k := range drop {
		if count[p.terms[k].raw.key] > 1 {
			return "", false
		}
	}
	if _, also := left["intercept"]; also && len(items) > 0 {
		delete(left, "intercept")
		items = append(items, formula.SignedTerm{Minus: true, Term: &formula.Intercept{}})
	}
	if len(left) > 0 {
		return "", false
	}
	if len(items) == 0 {
		items = []formula.SignedTerm{{Term: &formula.Intercept{}}}
	}
	m := *p.model
	m.Terms = &formula.Terms{Items: items}
	return m.String(), true
}

// withTerms writes the model with other terms on its right side, in canonical
// form; empty when they do not parse.
func (p *Plan) withTerms(terms string) string {
	parsed, err := formula.Parse("response ~ " + terms)
	if err != nil {
		return ""
	}
	m := *p.model
	m.Terms = parsed.Terms
	return m.String()
}

// jointMend writes the model with the categories ks, wherever they stand,
// replaced by one category of their combinations.
func (p *Plan) jointMend(ks []int, joint string) string {
	in := make(map[int]bool)
	for _, k := range ks {
		in[k] = true
	}
	var terms []string
	seen := make(map[string]bool)
	for _, t := range p.terms {
		if len(t.factors) == 0 {
			continue
		}
		var parts []string
		for i, f := range t.raw.factors {
			var text string
			switch tf := t.factors[i]; {
			case f.num != nil:
				text = f.num.source()
			case len(t.nests) > 0:
				return ""
			case in[tf.cat]:
				text = joint
			default:
				text = p.cats[tf.cat].text
			}
			if len(parts) == 0 || parts[len(parts)-1] != text {
				parts = append(parts, text)
			}
		}
		text := strings.Join(parts, " by ")
		if !seen[text] {
			seen[text] = true
			terms = append(terms, text)
		}
	}
	text := strings.Join(terms, " + ") + p.knownText()
	if len(p.terms[0].factors) > 0 {
		text += " - intercept"
	}
	return p.withTerms(text)
}
