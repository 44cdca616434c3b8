package design

import (
	"fmt"
	"slices"
	"sort"
	"strconv"
	"strings"

	"example.com/trammel/formula"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/factored"
)

// This file is the coding rule of the model language: which columns each term
// gets, so that the model spans what its terms say with no redundant column.

// A term is an expanded term whose factors are compiled.
type term struct {
	raw     *rawTerm
	factors []termFactor // in written order
	nums    []int        // the numeric factors, ascending: the set N
	cats    []int        // the categories, nested ones excepted, in written order: the list C
	nests   []int        // nestings from the outermost inwards, into compiled.nests
	nested  []int        // the categories that stand inside others, as nests
}

// A termFactor is a numeric factor (num >= 0), a category (cat >= 0) or both
// a category and the nesting it stands in (nest >= 0).
type termFactor struct{ num, cat, nest int }

// A nesting is one category inside others: the combinations that occur, in
// order of the enclosing levels and then of its own.
type nesting struct {
	inner  int
	outer  []int
	combos [][]int32 // levels of outer…, inner
	place  map[string]int32
	column []int // combo to its column, -1 for the first of each enclosing combination
	combo  []int // column to its combo
	base   []int // column to the combo it is measured against
}

// A block is one rectangular part of a term's columns: which categories take
// part, each in full or reduced.
type block []blockPart

type blockPart struct {
	pos  int // position in the list C
	full bool
}

// maxTermCategories bounds the effects of one term, 2^k of them.
const maxTermCategories = 16

// blocks is the recursive rule of the language: due holds the sets of
// categories (bit k for C[k]) for which columns are still due, ascending, for
// positions from k on.
func blocks(k, n int, due []uint32) []block {
	if len(due) == 0 {
		return nil
	}
	if k == n {
		return []block{{}}
	}
	bit := uint32(1) << k
	var with, without []uint32
	for _, s := range due {
		if s&bit != 0 {
			with = append(with, s&^bit)
		} else {
			without = append(without, s)
		}
	}
	// Both lists are ascending, as due is.
	in := func(set []uint32, s uint32) bool { _, ok := slices.BinarySearch(set, s); return ok }
	var both, onlyWith, onlyWithout []uint32
	for _, s := range with {
		if in(without, s) {
			both = append(both, s)
		} else {
			onlyWith = append(onlyWith, s)
		}
	}
	for _, s := range without {
		if !in(with, s) {
			onlyWithout = append(onlyWithout, s)
		}
	}
	var out []block
	for _, b := range blocks(k+1, n, both) {
		out = append(out, append(block{{k, true}}, b...))
	}
	for _, b := range blocks(k+1, n, onlyWith) {
		out = append(out, append(block{{k, false}}, b...))
	}
	return append(out, blocks(k+1, n, onlyWithout)...)
}

// effects remembers which effects earlier terms express.
type effects map[string]bool

func effectKey(nums, cats []int, nest string) string {
	var b strings.Builder
	for _, list := range [][]int{nums, cats} {
		sorted := slices.Clone(list)
		sort.Ints(sorted)
		for _, k := range sorted {
			b.WriteString(strconv.Itoa(k))
			b.WriteByte(',')
		}
		b.WriteByte('|')
	}
	b.WriteString(nest)
	return b.String()
}

// due lists the sets S ⊆ C whose effect (N, S, nest) is not expressed yet, and
// marks them as expressed. The empty set comes first.
func (e effects) due(nums, cats []int, nest string) []uint32 {
	var out []uint32
	subset := make([]int, 0, len(cats))
	for s := uint32(0); s < 1<<len(cats); s++ {
		subset = subset[:0]
		for k, c := range cats {
			if s&(1<<k) != 0 {
				subset = append(subset, c)
			}
		}
		key := effectKey(nums, subset, nest)
		if !e[key] {
			e[key] = true
			out = append(out, s)
		}
	}
	return out
}

// A codedFactor is one factor as it takes part in a block: a choice among
// width columns.
type codedFactor struct {
	termFactor
	full  bool
	width int
}

// A codedColumn is one column: for every factor that takes part, the column
// chosen.
type codedColumn struct {
	term    int // index into the list that was coded
	factors []codedFactor
	choice  []int
}

// code applies the rule to the terms in the given order. The columns of term
// k are [from[k], from[k+1]). Sizes are checked in saturating arithmetic
// before anything of that size is made.
func (c *compiled) code(terms []*term) (cols []codedColumn, from []int, err *Error) {
	seen := make(effects)
	total := 0
	for k, t := range terms {
		from = append(from, len(cols))
		parts, err := c.termBlocks(t, seen)
		if err != nil {
			return nil, nil, err
		}
		for _, fs := range parts {
			width := 1
			for _, f := range fs {
				width = saturate(width, f.width)
				if !f.full && f.width == 0 && f.cat >= 0 {
					return nil, nil, c.oneLevel(t, f)
				}
			}
			if total += width; total > maxTableColumns {
				return nil, nil, &Error{Code: codeTooLarge, Text: c.text, Span: t.raw.pos,
					Message: fmt.Sprintf("the term %s brings the model to more than %d columns", t.raw.text(), maxTableColumns),
					Hint:    "use fewer levels or factors"}
			}
			choice := make([]int, len(fs))
			for range width {
				cols = append(cols, codedColumn{term: k, factors: fs, choice: slices.Clone(choice)})
				for i := len(fs) - 1; i >= 0; i-- {
					if choice[i]++; choice[i] < fs[i].width {
						break
					}
					choice[i] = 0
				}
			}
		}
	}
	return cols, append(from, len(cols)), nil
}

func saturate(a, b int) int {
	if a == 0 || b == 0 {
		return 0
	}
	if a > 2*maxTableColumns/b {
		return 2 * maxTableColumns
	}
	return a * b
}

// termBlocks gives the factor lists of the term's blocks, factors in written
// order.
func (c *compiled) termBlocks(t *term, seen effects) ([][]codedFactor, *Error) {
	if len(t.cats) > maxTermCategories {
		return nil, &Error{Code: codeTooLarge, Text: c.text, Span: t.raw.pos,
			Message: fmt.Sprintf("the term %s joins %d categories; the limit is %d", t.raw.text(), len(t.cats), maxTermCategories),
			Hint:    "join fewer, or write cat(a, b, …) of several columns"}
	}
	var out [][]codedFactor
	for _, b := range blocks(0, len(t.cats), seen.due(t.nums, t.cats, "")) {
		out = append(out, c.blockFactors(t, t.cats, b, -1))
	}
	for _, k := range t.nests {
		n := c.nests[k]
		var rest []int
		for _, cat := range t.cats {
			if !slices.Contains(n.outer, cat) {
				rest = append(rest, cat)
			}
		}
		key := strconv.Itoa(n.inner) + "<" + effectKey(nil, n.outer, "")
		for _, b := range blocks(0, len(rest), seen.due(t.nums, rest, key)) {
			out = append(out, c.blockFactors(t, rest, b, k))
		}
	}
	return out, nil
}

func (c *compiled) blockFactors(t *term, cats []int, b block, nest int) []codedFactor {
	var fs []codedFactor
	for _, f := range t.factors {
		switch {
		case f.num >= 0:
			fs = append(fs, codedFactor{termFactor: f, full: true, width: len(c.nums[f.num].parts)})
		case f.nest >= 0:
			if f.nest == nest {
				fs = append(fs, codedFactor{termFactor: f, full: true, width: len(c.nests[nest].combo)})
			}
		default:
			for _, p := range b {
				if cats[p.pos] == f.cat {
					fs = append(fs, codedFactor{termFactor: f, full: p.full, width: c.cats[f.cat].width(p.full)})
				}
			}
		}
	}
	return fs
}

func (c *compiled) oneLevel(t *term, f codedFactor) *Error {
	g := c.cats[f.cat]
	hint := "take " + g.key + " out of the model"
	return &Error{Code: codeOneLevel, Text: c.text, Span: t.raw.find(g.key).pos, Names: g.columns,
		Message: fmt.Sprintf("%s has 1 level (%s) in the fitted rows; a category needs 2", errtext.And(quoteAll(g.columns)), g.plain(0)),
		Hint:    hint}
}

func quoteAll(names []string) []string {
	out := make([]string, len(names))
	for i, n := range names {
		out[i] = formula.QuoteName(n)
	}
	return out
}

// lay turns coded columns into the columns of a matrix. Numeric products and
// entry tables are shared; products are numbered in order of first use.
func (c *compiled) lay(cols []codedColumn) []factored.Col {
	out := make([]factored.Col, len(cols))
	for j, col := range cols {
		out[j].Num = -1
		var refs []numRef
		for i, f := range col.factors {
			switch {
			case f.num >= 0:
				refs = append(refs, numRef{f.num, col.choice[i]})
			case f.nest >= 0:
				out[j].Cells = append(out[j].Cells, factored.Cell{Cat: len(c.cats) + f.nest, Entry: c.nestEntry(f.nest, col.choice[i])})
			default:
				out[j].Cells = append(out[j].Cells, factored.Cell{Cat: f.cat, Entry: c.entry(f.cat, f.full, col.choice[i])})
			}
		}
		if refs != nil {
			out[j].Num = c.product(refs)
		}
	}
	return out
}

// A numRef is column col of numeric factor num.
type numRef struct{ num, col int }

// product gives the number of a product of numeric columns, made on first use.
func (c *compiled) product(refs []numRef) int {
	var b strings.Builder
	sorted := slices.Clone(refs)
	slices.SortFunc(sorted, func(x, y numRef) int { return slices.Compare([]int{x.num, x.col}, []int{y.num, y.col}) })
	for _, r := range sorted {
		fmt.Fprintf(&b, "%d.%d*", r.num, r.col)
	}
	k, ok := c.productIndex[b.String()]
	if !ok {
		k = len(c.products)
		c.productIndex[b.String()] = k
		c.products = append(c.products, refs)
	}
	return k
}

func (c *compiled) entry(cat int, full bool, k int) []int8 {
	key := [3]int{cat, k, 0}
	if full {
		key[2] = 1
	}
	e := c.entries[key]
	if e == nil {
		e = c.cats[cat].entry(full, k)
		c.entries[key] = e
	}
	return e
}

func (c *compiled) nestEntry(nest, k int) []int8 {
	key := [3]int{nest, k, 2}
	e := c.entries[key]
	if e == nil {
		e = make([]int8, len(c.nests[nest].combos))
		e[c.nests[nest].combo[k]] = 1
		c.entries[key] = e
	}
	return e
}
