package design

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"example.com/trammel/formula"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/factored"
)

type against uint8

const (
	againstLevel against = iota
	againstMean
	againstPrevious
)

// A category is a compiled cat(…): its levels in order, as found in the fitted
// rows or as listed, and how it is coded when reduced.
type category struct {
	key     string
	text    string // canonical, with in and against where written
	pos     formula.Span
	columns []string
	kinds   []Kind
	levels  [][]value // one value per column; nil for the pooled level
	others  bool      // the last level pools every other value
	against against
	ref     int // the reference level

	place []map[value]int32    // per column: value to its number among the column's values
	combo []map[[2]int32]int32 // several columns: at each, (number so far, number here) to the next number
}

// maxLevels is the limit on columns that the model language states: a category
// of more levels could not be coded.
const maxLevels = 1_000_000

// newCategory learns the levels from the rows of t, all of which are fitted.
func newCategory(x *expander, c *formula.Category, t *Table) (*category, factored.Cat, *Error) {
	key := categoryKey(c)
	if spec := x.specs[key]; spec != nil {
		c = spec
	}
	g := &category{key: key, text: c.String(), pos: c.Pos}
	var none factored.Cat
	cols := make([]*column, len(c.Columns))
	for i, n := range c.Columns {
		if slices.Contains(g.columns, n.Name) {
			return nil, none, x.refuse(codeRepeatedColumn, n.Pos, "name each column once",
				"%s stands twice in %s", formula.QuoteName(n.Name), key)
		}
		g.columns = append(g.columns, n.Name)
		cols[i] = t.column(n.Name)
		g.kinds = append(g.kinds, cols[i].kind)
	}
	if len(cols) > 1 {
		if c.In != nil || c.Against != nil && c.Against.Level != nil {
			return nil, none, x.refuse(codeCombinedList, c.Pos, "write plain "+key,
				"a category of several columns takes its levels as they occur")
		}
		return g.combine(x, c, cols)
	}
	values, codes, level := distinct(cols[0])
	if len(values) > maxLevels {
		return nil, none, x.refuse(codeTooLarge, c.Pos, "use the column as a number, or group its values",
			"%s has %d levels; the limit is %d columns", key, len(values), maxLevels)
	}
	g.place = []map[value]int32{make(map[value]int32, len(values))}
	if c.In == nil {
		for i, v := range values {
			g.levels = append(g.levels, []value{v})
			g.place[0][v] = int32(i)
		}
	} else {
		var err *Error
		if level, err = g.list(x, c, cols[0], values, codes, level); err != nil {
			return nil, none, err
		}
	}
	if err := g.setAgainst(x, c); err != nil {
		return nil, none, err
	}
	cat := factored.Cat{Levels: len(g.levels), Codes: codes, Level: level}
	if cols[0].kind == BoolColumn {
		cat.Bits = cols[0].bits
	}
	return g, cat, nil
}

// list takes the levels from in (…) and gives the renumbering of values.
func (g *category) list(x *expander, c *formula.Category, col *column, values []value, codes, level []int32) ([]int32, *Error) {
	name := formula.QuoteName(col.name)
	for _, l := range c.In {
		v := valueOf(l)
		if v.kind != col.kind {
			return nil, x.wrongLevel(l, col)
		}
		if _, twice := g.place[0][v]; twice {
			return nil, x.refuse(codeRepeatedLevel, l.Pos, "list each level once", "level %s is listed twice", v.source())
		}
		g.place[0][v] = int32(len(g.levels))
		g.levels = append(g.levels, []value{v})
	}
	if c.Others {
		g.others = true
		g.levels = append(g.levels, nil)
	}
	filled := make([]bool, len(g.levels))
	renumber := make([]int32, len(values))
	var strange []value
	for i, v := range values {
		k, ok := g.place[0][v]
		switch {
		case ok:
		case g.others:
			k = int32(len(g.levels) - 1)
		default:
			strange = append(strange, v)
			continue
		}
		renumber[i] = k
		filled[k] = true
	}
	if len(strange) > 0 {
		rows, total := rowsOfValue(col, strange[0], place{rows: x.rows})
		words := make([]string, 0, 3)
		for _, v := range strange[:min(3, len(strange))] {
			words = append(words, v.source())
		}
		list := append(sources(g.levels), sourcesOf(strange)...)
		hint := fmt.Sprintf("add the value to in (%s), or end the list with others", strings.Join(cutList(list, 12), ", "))
		if near := nearValue(strange[0], g.levels); near != "" {
			hint = near
		}
		return nil, &Error{Code: codeUnlistedLevel, Text: x.text, Span: c.Pos, Names: []string{col.name}, Rows: rows,
			Message: fmt.Sprintf("%s holds %s, not listed after in (%s in %s)", name, errtext.And(words),
				strange[0].source(), errtext.Rows(rows, total)),
			Hint: hint}
	}
	for k, ok := range filled {
		if ok {
			continue
		}
		if g.levels[k] == nil {
			return nil, x.refuse(codeEmptyLevel, c.Pos, "take others out", "no fitted row of %s falls under others", name)
		}
		hint := "take it out of the list"
		unlisted := slices.DeleteFunc(slices.Clone(values), func(v value) bool { _, listed := g.place[0][v]; return listed })
		if near, ok := errtext.Nearest(g.levels[k][0].plain(), plains(unlisted)); ok {
			for _, v := range unlisted {
				if v.plain() == near {
					hint = "did you mean " + v.source() + "?"
				}
			}
		}
		return nil, x.refuse(codeEmptyLevel, c.In[k].Pos, hint, "no fitted row has %s=%s", name, g.levels[k][0].source())
	}
	if col.kind == BoolColumn || level == nil {
		out := []int32{0, 0}
		for k, l := range level {
			if l >= 0 {
				out[k] = renumber[l]
			}
		}
		return out, nil
	}
	out := make([]int32, len(level))
	for k, l := range level {
		out[k] = -1
		if l >= 0 {
			out[k] = renumber[l]
		}
	}
	return out, nil
}

func cutList(list []string, most int) []string {
	if len(list) <= most {
		return list
	}
	return append(slices.Clone(list[:most]), "…")
}

func sources(levels [][]value) []string {
	var out []string
	for _, l := range levels {
		if l != nil {
			out = append(out, l[0].source())
		}
	}
	return out
}

func sourcesOf(values []value) []string {
	out := make([]string, len(values))
	for i, v := range values {
		out[i] = v.source()
	}
	return out
}

func plains(values []value) []string {
	out := make([]string, len(values))
	for i, v := range values {
		out[i] = v.plain()
	}
	return out
}

// nearValue explains a text that differs from a level only in case, spaces or
// Unicode form.
func nearValue(v value, levels [][]value) string {
	if v.kind != TextColumn {
		return ""
	}
	for _, l := range levels {
		if l == nil || l[0].kind != TextColumn {
			continue
		}
		if how := errtext.Alike(v.text, l[0].text); how != "" {
			return fmt.Sprintf("%s differs from %s only in %s; make them one in the data, or list both", v.source(), l[0].source(), how)
		}
	}
	return ""
}

func (x *expander) wrongLevel(l *formula.Level, col *column) *Error {
	v := valueOf(l)
	want := "a bare number"
	switch col.kind {
	case TextColumn:
		want = formula.QuoteLevel(v.plain())
	case BoolColumn:
		want = "true or false"
	case NumberColumn:
		if f, err := strconv.ParseFloat(v.text, 64); err == nil && v.kind == TextColumn && !math.IsInf(f, 0) && f == f {
			want = signedText(f)
		}
	}
	return x.refuse(codeWrongLevelType, l.Pos, "write "+want,
		"%s holds %s and %s is no such value", formula.QuoteName(col.name), col.kind.cells(), v.source())
}

func (g *category) setAgainst(x *expander, c *formula.Category) *Error {
	b := c.Against
	switch {
	case b == nil:
	case b.Mean:
		g.against = againstMean
	case b.Previous:
		g.against = againstPrevious
	default:
		v := valueOf(b.Level)
		if v.kind != g.kinds[0] {
			return x.wrongLevel(b.Level, &column{name: g.columns[0], kind: g.kinds[0]})
		}
		for i, l := range g.levels {
			if l != nil && l[0] == v {
				g.ref = i
				return nil
			}
		}
		hint := "write one of " + strings.Join(cutList(sources(g.levels), 12), ", ")
		var known []string
		for _, l := range g.levels {
			if l != nil {
				known = append(known, l[0].plain())
			}
		}
		if near, ok := errtext.Nearest(v.plain(), known); ok {
			for _, l := range g.levels {
				if l != nil && l[0].plain() == near {
					hint = "did you mean " + l[0].source() + "?"
				}
			}
		}
		return x.refuse(codeUnknownReference, b.Pos, hint, "no fitted row has %s=%s, so it cannot be the reference", formula.QuoteName(g.columns[0]), v.source())
	}
	return nil
}

// combine makes the levels of a category of several columns: the combinations
// that occur, ordered column by column.
func (g *category) combine(x *expander, c *formula.Category, cols []*column) (*category, factored.Cat, *Error) {
	n := cols[0].len()
	codes := make([]int32, n)
	part := make([]int32, n)
	for j, col := range cols {
		values, cs, level := distinct(col)
		place := make(map[value]int32, len(values))
		for i, v := range values {
			place[v] = int32(i)
		}
		g.place = append(g.place, place)
		cat := factored.Cat{Codes: cs, Level: level}
		if col.kind == BoolColumn {
			cat.Bits = col.bits
		}
		if j == 0 {
			cat.LevelsTo(codes, 0)
			g.combo = append(g.combo, nil)
			for _, v := range values {
				g.levels = append(g.levels, []value{v})
			}
			continue
		}
		cat.LevelsTo(part, 0)
		// Pairs that occur, in order, get the next numbers.
		seen := make(map[[2]int32]int32)
		g.combo = append(g.combo, seen)
		var pairs [][2]int32
		for i := range codes {
			p := [2]int32{codes[i], part[i]}
			if _, ok := seen[p]; !ok {
				seen[p] = 0
				pairs = append(pairs, p)
			}
		}
		if len(pairs) > maxLevels {
			return nil, factored.Cat{}, x.refuse(codeTooLarge, c.Pos, "use fewer columns, or group their values",
				"%s has more than %d combinations", g.key, maxLevels)
		}
		slices.SortFunc(pairs, func(a, b [2]int32) int { return slices.Compare(a[:], b[:]) })
		levels := make([][]value, len(pairs))
		for k, p := range pairs {
			seen[p] = int32(k)
			levels[k] = append(slices.Clone(g.levels[p[0]]), values[p[1]])
		}
		for i := range codes {
			codes[i] = seen[[2]int32{codes[i], part[i]}]
		}
		g.levels = levels
	}
	if err := g.setAgainst(x, c); err != nil {
		return nil, factored.Cat{}, err
	}
	return g, factored.Cat{Levels: len(g.levels), Codes: codes}, nil
}

// cat gives the rows of another table their levels. A value never seen is
// refused with its rows.
func (g *category) cat(t *Table, rows []int) (factored.Cat, *Error) {
	at := place{rows: rows}
	none := factored.Cat{}
	var codes []int32
	for j, name := range g.columns {
		col := t.column(name)
		values, cs, level := distinct(col)
		renumber := make([]int32, len(values))
		for i, v := range values {
			k, ok := g.place[j][v]
			switch {
			case ok:
			case g.others:
				k = int32(len(g.levels) - 1)
			default:
				return none, g.unseen(col, v, at)
			}
			renumber[i] = k
		}
		out := make([]int32, len(level))
		for k, l := range level {
			if l >= 0 {
				out[k] = renumber[l]
			}
		}
		cat := factored.Cat{Levels: len(g.levels), Codes: cs, Level: out}
		if col.kind == BoolColumn {
			cat.Bits = col.bits
		}
		if len(g.columns) == 1 {
			return cat, nil
		}
		part := make([]int32, col.len())
		cat.LevelsTo(part, 0)
		if j == 0 {
			codes = part
			continue
		}
		for i := range codes {
			k, ok := g.combo[j][[2]int32{codes[i], part[i]}]
			if !ok {
				words := make([]string, len(g.columns))
				for q, nm := range g.columns {
					words[q] = formula.QuoteName(nm) + "=" + valueAt(t.column(nm), i).source()
				}
				return none, &Error{Code: codeUnseenLevel, Names: g.columns, Rows: []int{at.row(i)},
					Message: fmt.Sprintf("row %d has %s, a combination that no fitted row had", at.row(i), errtext.And(words)),
					Hint:    "take the row out, or fit the model anew with such rows"}
			}
			codes[i] = k
		}
	}
	return factored.Cat{Levels: len(g.levels), Codes: codes}, nil
}

func (g *category) unseen(col *column, v value, at place) *Error {
	rows, total := rowsOfValue(col, v, at)
	hint := "take the rows out, or fit the model anew with such rows; a level list that ends with others would pool them"
	if near := nearValue(v, g.levels); near != "" && len(g.columns) == 1 {
		hint = near
	}
	return &Error{Code: codeUnseenLevel, Names: []string{col.name}, Rows: rows,
		Message: fmt.Sprintf("%s %s %s=%s, a level that no fitted row had", errtext.Rows(rows, total),
			hasHave(total), formula.QuoteName(col.name), v.source()),
		Hint: hint}
}

func hasHave(n int) string {
	if n == 1 {
		return "has"
	}
	return "have"
}

func valueAt(c *column, i int) value {
	switch c.kind {
	case BoolColumn:
		return value{kind: BoolColumn, bit: c.bits[i]}
	case TextColumn:
		return value{kind: TextColumn, text: c.dict[c.codes[i]]}
	}
	return value{kind: NumberColumn, num: c.num[i] + 0}
}

// maxRows is how many row numbers an error carries.
const maxRows = 20

// rowsOfValue gives the first rows, from 1, that hold the value, and how many do.
func rowsOfValue(c *column, v value, at place) (rows []int, total int) {
	for i := range c.len() {
		if c.kind == TextColumn && c.codes[i] < 0 {
			continue
		}
		if valueAt(c, i) == v {
			if total++; len(rows) < maxRows {
				rows = append(rows, at.row(i))
			}
		}
	}
	return rows, total
}

// equals is the level's part of a coefficient's name, with or without the
// parentheses of several columns.
func (g *category) equals(level int) string {
	l := g.levels[level]
	if l == nil {
		return formula.QuoteName(g.columns[0]) + "=others"
	}
	parts := make([]string, len(l))
	for i, v := range l {
		parts[i] = formula.QuoteName(g.columns[i]) + "=" + v.source()
	}
	if len(parts) == 1 {
		return parts[0]
	}
	return "(" + strings.Join(parts, ", ") + ")"
}

// words is the level for reading: "F2", "the others", "site A machine M2",
// "head 3".
func (g *category) words(level int) string {
	l := g.levels[level]
	switch {
	case l == nil:
		return "the other levels of " + g.columns[0]
	case len(l) == 1 && l[0].kind == TextColumn:
		return l[0].text
	}
	parts := make([]string, len(l))
	for i, v := range l {
		parts[i] = g.columns[i] + " " + v.plain()
	}
	return strings.Join(parts, " ")
}

// columnsFull is the number of columns in full, columnsReduced when reduced.
func (g *category) width(full bool) int {
	if full {
		return len(g.levels)
	}
	return len(g.levels) - 1
}

// part is the name of column k of the category, in full or reduced.
func (g *category) part(full bool, k int) string {
	if full {
		return g.equals(k)
	}
	switch g.against {
	case againstMean:
		return g.equals(k+1) + " against mean"
	case againstPrevious:
		if g.levels[k] == nil || len(g.levels[k]) > 1 {
			return g.equals(k+1) + " against previous"
		}
		return g.equals(k+1) + " against " + g.levels[k][0].source()
	}
	return g.equals(g.level(full, k))
}

// level is the level that column k speaks of.
func (g *category) level(full bool, k int) int {
	if full {
		return k
	}
	if g.against == againstLevel && k < g.ref {
		return k
	}
	return k + 1
}

// entry is the table of column k: one entry per level.
func (g *category) entry(full bool, k int) []int8 {
	e := make([]int8, len(g.levels))
	e[g.level(full, k)] = 1
	if !full {
		switch g.against {
		case againstMean:
			e[0] = -1
		case againstPrevious:
			for l := k + 1; l < len(e); l++ {
				e[l] = 1
			}
		}
	}
	return e
}

// plain is the level's values alone.
func (g *category) plain(level int) string {
	l := g.levels[level]
	if l == nil {
		return "others"
	}
	return strings.Join(plains(l), ", ")
}
