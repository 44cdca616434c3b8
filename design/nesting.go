package design

import (
	"fmt"
	"slices"
	"strings"

	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/factored"
)

// resolveNests finds the nestings of all terms, gives their combinations of
// levels numbers, and sorts each term's categories into plain and nested ones.
func (c *compiled) resolveNests(catIndex map[string]int, cats []factored.Cat) ([]factored.Cat, *Error) {
	index := make(map[string]int)
	for _, t := range c.terms {
		// Outermost first: a nesting that another one is enclosed by comes earlier.
		order := slices.Clone(t.raw.nests)
		slices.SortStableFunc(order, func(a, b rawNest) int { return len(a.outer) - len(b.outer) })
		for _, rn := range order {
			inner := catIndex[rn.inner]
			var outer []int
			for _, key := range rn.outer {
				outer = append(outer, catIndex[key])
			}
			slices.Sort(outer)
			key := fmt.Sprint(inner, outer)
			k, ok := index[key]
			if !ok {
				k = len(c.nests)
				index[key] = k
				n := &nesting{inner: inner, outer: outer}
				cat := c.occupy(n, cats[:len(c.cats)])
				c.nests = append(c.nests, n)
				cats = append(cats, cat)
			}
			t.nests = append(t.nests, k)
			t.nested = append(t.nested, inner)
		}
		for i := range t.factors {
			f := &t.factors[i]
			switch {
			case f.num >= 0:
				t.nums = append(t.nums, f.num)
			default:
				for j, cat := range t.nested {
					if cat == f.cat {
						f.nest = t.nests[j]
					}
				}
				if f.nest < 0 {
					t.cats = append(t.cats, f.cat)
				}
			}
		}
		slices.Sort(t.nums)
	}
	return cats, nil
}

// occupy finds the combinations of a nesting that occur, numbers them and
// gives every row its number.
func (c *compiled) occupy(n *nesting, cats []factored.Cat) factored.Cat {
	rows := 0
	levels := make([][]int32, 0, len(n.outer)+1)
	for _, k := range append(slices.Clone(n.outer), n.inner) {
		l := catLevels(&cats[k])
		levels = append(levels, l)
		rows = len(l)
	}
	codes, combos := combinations(levels, rows)
	n.combos = combos
	n.place = make(map[string]int32, len(combos))
	n.column = make([]int, len(combos))
	last := len(levels) - 1
	base := 0
	for k, combo := range combos {
		n.place[comboKey(combo)] = int32(k)
		if k == 0 || !slices.Equal(combo[:last], combos[k-1][:last]) {
			n.column[k] = -1
			base = k
			continue
		}
		n.column[k] = len(n.combo)
		n.combo = append(n.combo, k)
		n.base = append(n.base, base)
	}
	return factored.Cat{Levels: len(combos), Codes: codes}
}

func catLevels(cat *factored.Cat) []int32 {
	n := len(cat.Codes)
	if cat.Bits != nil {
		n = len(cat.Bits)
	}
	out := make([]int32, n)
	cat.LevelsTo(out, 0)
	return out
}

func comboKey(combo []int32) string {
	b := make([]byte, 0, 4*len(combo))
	for _, l := range combo {
		b = append(b, byte(l), byte(l>>8), byte(l>>16), byte(l>>24))
	}
	return string(b)
}

// combinations lists the distinct rows of several level columns in ascending
// order and gives each row the number of its combination.
func combinations(levels [][]int32, rows int) (codes []int32, combos [][]int32) {
	seen := make(map[string]int32)
	codes = make([]int32, rows)
	combo := make([]int32, len(levels))
	key := make([]byte, 0, 4*len(levels))
	// A small table of numbers plus 1 by mixed radix saves the map's work.
	sizes, table := make([]int, len(levels)), []int32(nil)
	cells := 1
	for k, l := range levels {
		sizes[k] = int(slices.Max(l)) + 1
		cells = saturate(cells, sizes[k])
	}
	if cells <= 1<<20 {
		table = make([]int32, cells)
	}
	for i := range rows {
		if table != nil {
			at := 0
			for k, l := range levels {
				at = at*sizes[k] + int(l[i])
			}
			if table[at] == 0 {
				for k, l := range levels {
					combo[k] = l[i]
				}
				combos = append(combos, slices.Clone(combo))
				table[at] = int32(len(combos))
			}
			codes[i] = table[at] - 1
			continue
		}
		key = key[:0]
		for k, l := range levels {
			combo[k] = l[i]
			key = append(key, byte(l[i]), byte(l[i]>>8), byte(l[i]>>16), byte(l[i]>>24))
		}
		k, ok := seen[string(key)]
		if !ok {
			k = int32(len(combos))
			seen[string(key)] = k
			combos = append(combos, slices.Clone(combo))
		}
		codes[i] = k
	}
	order := make([]int, len(combos))
	for i := range order {
		order[i] = i
	}
	slices.SortFunc(order, func(a, b int) int { return slices.Compare(combos[a], combos[b]) })
	sorted := make([][]int32, len(combos))
	renumber := make([]int32, len(combos))
	for k, o := range order {
		sorted[k] = combos[o]
		renumber[o] = int32(k)
	}
	for i, k := range codes {
		codes[i] = renumber[k]
	}
	return codes, sorted
}

// nestCat gives the rows of another table their combinations.
func (c *compiled) nestCat(n *nesting, cats []factored.Cat, t *Table, rows []int) (factored.Cat, *Error) {
	var levels [][]int32
	list := append(slices.Clone(n.outer), n.inner)
	for _, k := range list {
		levels = append(levels, catLevels(&cats[k]))
	}
	out := factored.Cat{Levels: len(n.combos), Codes: make([]int32, t.rows)}
	combo := make([]int32, len(levels))
	for i := range t.rows {
		for k, l := range levels {
			combo[k] = l[i]
		}
		k, ok := n.place[comboKey(combo)]
		if !ok {
			words := make([]string, len(list))
			for q, cat := range list {
				words[q] = c.cats[cat].equals(int(combo[q]))
			}
			row := place{rows: rows}.row(i)
			return out, &Error{Code: codeUnseenLevel, Rows: []int{row}, Names: c.cats[n.inner].columns,
				Message: fmt.Sprintf("row %d has %s, a combination that no fitted row had", row, errtext.And(words)),
				Hint:    "take the row out, or fit the model anew with such rows"}
		}
		out.Codes[i] = k
	}
	return out, nil
}

// checkCells refuses a product of categories wherever a coded column has no
// row that is not zero.
func (c *compiled) checkCells(p *Plan, cats []factored.Cat) *Error {
	type group struct {
		cats []int
		cols []int
	}
	groups := make(map[string]*group)
	var order []string
	for j, col := range c.coded {
		var ks []int
		for _, f := range col.factors {
			switch {
			case f.nest >= 0:
				ks = append(ks, len(c.cats)+f.nest)
			case f.cat >= 0:
				ks = append(ks, f.cat)
			}
		}
		if len(ks) < 2 {
			continue
		}
		key := fmt.Sprint(ks)
		if groups[key] == nil {
			groups[key] = &group{cats: ks}
			order = append(order, key)
		}
		groups[key].cols = append(groups[key].cols, j)
	}
	for _, key := range order {
		g := groups[key]
		levels := make([][]int32, len(g.cats))
		for i, k := range g.cats {
			levels[i] = catLevels(&cats[k])
		}
		_, combos := combinations(levels, len(levels[0]))
		occupied := make(map[string]bool, len(combos))
		for _, combo := range combos {
			occupied[comboKey(combo)] = true
		}
		for _, j := range g.cols {
			if !c.anyCell(j, combos, occupied) {
				return c.emptyCell(p, j, g.cats, occupied)
			}
		}
	}
	return nil
}

// anyCell tells whether an occupied combination makes column j non-zero.
func (c *compiled) anyCell(j int, combos [][]int32, occupied map[string]bool) bool {
	var entries [][]int8
	one := true // each factor of the column is non-zero at a single level
	var levels []int32
	for i, f := range c.coded[j].factors {
		var e []int8
		switch {
		case f.nest >= 0:
			e = c.nestEntry(f.nest, c.coded[j].choice[i])
			levels = append(levels, int32(c.nests[f.nest].combo[c.coded[j].choice[i]]))
		case f.cat >= 0:
			g := c.cats[f.cat]
			e = c.entry(f.cat, f.full, c.coded[j].choice[i])
			one = one && (f.full || g.against == againstLevel)
			levels = append(levels, int32(g.level(f.full, c.coded[j].choice[i])))
		default:
			continue
		}
		entries = append(entries, e)
	}
	if one {
		return occupied[comboKey(levels)]
	}
	for _, combo := range combos {
		all := true
		for k, e := range entries {
			all = all && e[combo[k]] != 0
		}
		if all {
			return true
		}
	}
	return false
}

// emptyCell refuses the model and names the combinations without rows.
func (c *compiled) emptyCell(p *Plan, j int, ks []int, occupied map[string]bool) *Error {
	t := c.terms[c.coded[j].term]
	sizes := make([]int, len(ks))
	name := func(i int, level int32) string {
		if ks[i] >= len(c.cats) {
			n := c.nests[ks[i]-len(c.cats)]
			return c.comboWords(n, int(level))
		}
		return c.cats[ks[i]].equals(int(level))
	}
	total := 1
	for i, k := range ks {
		if k >= len(c.cats) {
			sizes[i] = len(c.nests[k-len(c.cats)].combos)
		} else {
			sizes[i] = len(c.cats[k].levels)
		}
		total = saturate(total, sizes[i])
	}
	empty := total - len(occupied)
	var words []string
	combo := make([]int32, len(ks))
	for range total {
		if !occupied[comboKey(combo)] {
			parts := make([]string, len(ks))
			for i, l := range combo {
				parts[i] = name(i, l)
			}
			words = append(words, strings.Join(parts, " by "))
			if len(words) == 3 {
				break
			}
		}
		for i := len(combo) - 1; i >= 0; i-- {
			if combo[i]++; int(combo[i]) < sizes[i] {
				break
			}
			combo[i] = 0
		}
	}
	if empty > len(words) {
		words = append(words, fmt.Sprintf("%d more", empty-len(words)))
	}
	e := &Error{Code: codeEmptyCells, Text: c.text, Span: t.raw.pos, Names: words,
		Message: fmt.Sprintf("no fitted row has %s, so %s cannot be estimated", errtext.Or(words), t.raw.text())}
	var columns []string
	for _, k := range ks {
		if k >= len(c.cats) {
			e.Hint = "take the term out, or leave out the levels without rows"
			return e
		}
		for _, name := range c.cats[k].columns {
			if !slices.Contains(columns, name) {
				columns = append(columns, name)
			}
		}
	}
	joint := "cat(" + strings.Join(quoteAll(columns), ", ") + ")"
	e.Hint = "write " + joint + ", one category of the combinations that occur"
	if mend := p.jointMend(ks, joint); mend != "" {
		e.Mends = []string{mend}
		e.Hint += ": " + mend
	}
	return e
}

func (c *compiled) comboWords(n *nesting, k int) string {
	combo := n.combos[k]
	last := len(combo) - 1
	outer := make([]string, last)
	for i := range outer {
		outer[i] = c.cats[n.outer[i]].equals(int(combo[i]))
	}
	text := strings.Join(outer, ", ")
	if len(outer) > 1 {
		text = "(" + text + ")"
	}
	return c.cats[n.inner].equals(int(combo[last])) + " inside " + text
}
