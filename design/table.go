package design

import (
	"fmt"
	"slices"
	"strconv"
	"strings"
	"sync/atomic"
	"unicode"
	"unicode/utf8"
)

// A Kind is what the cells of a column are.
type Kind uint8

const (
	NumberColumn Kind = iota // float64 numbers, finite or not
	BoolColumn               // true and false
	TextColumn               // text
)

// String gives "number", "true/false" or "text".
func (k Kind) String() string {
	switch k {
	case NumberColumn:
		return "number"
	case BoolColumn:
		return "true/false"
	case TextColumn:
		return "text"
	}
	return "Kind(" + strconv.Itoa(int(k)) + ")"
}

// cells says what cells of the kind are, in the plural.
func (k Kind) cells() string {
	switch k {
	case BoolColumn:
		return "true/false"
	case TextColumn:
		return "text"
	}
	return "numbers"
}

// maxTableColumns is the limit on columns that the model language states.
const maxTableColumns = 1_000_000

// A column is one stored column, immutable once it is part of a table.
type column struct {
	name  string
	kind  Kind
	num   []float64 // NumberColumn: the values, NaN where missing; else nil
	bits  []bool    // BoolColumn: the values, false where missing; else nil
	codes []int32   // TextColumn: index into dict, -1 where missing; else nil
	dict  []string  // TextColumn: the distinct values in order of first appearance
	miss  []bool    // nil when no cell is missing

	// odd is the cell that made a CSV column text although the cells above it
	// were numbers or true/false; nil otherwise. It lets a later refusal point
	// at the one cell that is to blame.
	odd *oddCell

	known atomic.Int32 // whether every cell is usable: 0 not known yet, 1 yes, 2 no
}

// An oddCell is where a CSV column stopped looking like numbers or true/false.
type oddCell struct {
	line int    // of the CSV text, from 1
	cell string // as read, cut to a showable length
	was  Kind   // what the cells above it were
}

func (c *column) len() int {
	switch c.kind {
	case BoolColumn:
		return len(c.bits)
	case TextColumn:
		return len(c.codes)
	}
	return len(c.num)
}

// A Column is one named column of numbers, true/false or text, with a mark at
// the cells that are missing. It is made by [Numbers], [Bools] and [Texts],
// and is immutable: goroutines may share it.
type Column struct {
	c   *column
	err *Error // found while the column was made, reported by NewTable
}

// Numbers makes a column of numbers. It keeps values without copying them: the
// caller must not modify the slice afterwards. NaN and infinities are values
// like any other here, not missing cells; a model that uses the column refuses
// them. Mark missing cells by [Column.Missing].
func Numbers(name string, values []float64) Column {
	return Column{c: &column{name: name, kind: NumberColumn, num: values}}
}

// Bools makes a column of true and false. It keeps values without copying
// them: the caller must not modify the slice afterwards.
func Bools(name string, values []bool) Column {
	return Column{c: &column{name: name, kind: BoolColumn, bits: values}}
}

// Texts makes a column of text. The slice is not kept: each distinct text is
// stored once. An empty text is a value like any other here; mark missing
// cells by [Column.Missing]. A text that is not valid UTF-8 is refused by
// [NewTable], unless its cell is marked as missing.
func Texts(name string, values []string) Column {
	b := newBuilder(name)
	b.become(TextColumn)
	for _, v := range values {
		b.addText(v)
	}
	c, err := b.finish()
	return Column{c: c, err: err}
}

// Missing returns a copy of the column in which the cells with a true in mask
// are missing, beside those that were before. The mask has one value per row
// (another length is refused by [NewTable]) and is not kept.
func (c Column) Missing(mask []bool) Column {
	if c.c == nil || c.err != nil && c.err.Code != codeInvalidUTF8 {
		return c
	}
	old := c.c
	if len(mask) != old.len() {
		return Column{c: old, err: &Error{
			Code: codeUnequalLengths,
			Message: fmt.Sprintf("column %s has %d rows and its missing mask has %d",
				nameText(old.name), old.len(), len(mask)),
			Hint:  "give the mask one value per row",
			Names: []string{old.name},
		}}
	}
	b := newBuilder(old.name)
	b.become(old.kind)
	for i, m := range mask {
		b.addFrom(old, i, m)
	}
	made, err := b.finish()
	made.odd = old.odd
	return Column{c: made, err: err}
}

// Name is the name of the column; "" for the zero Column.
func (c Column) Name() string {
	if c.c == nil {
		return ""
	}
	return c.c.name
}

// Kind is what the cells are; NumberColumn for the zero Column.
func (c Column) Kind() Kind {
	if c.c == nil {
		return NumberColumn
	}
	return c.c.kind
}

// Len is the number of rows; 0 for the zero Column.
func (c Column) Len() int {
	if c.c == nil {
		return 0
	}
	return c.c.len()
}

// Floats returns a copy of the values of a number column, NaN where missing;
// nil for the other kinds.
func (c Column) Floats() []float64 {
	if c.c == nil {
		return nil
	}
	return slices.Clone(c.c.num)
}

// Bools returns a copy of the values of a true/false column, false where
// missing; nil for the other kinds.
func (c Column) Bools() []bool {
	if c.c == nil {
		return nil
	}
	return slices.Clone(c.c.bits)
}

// Texts returns a copy of the values of a text column, "" where missing; nil
// for the other kinds.
func (c Column) Texts() []string {
	if c.c == nil || c.c.kind != TextColumn {
		return nil
	}
	texts := make([]string, len(c.c.codes))
	for i, code := range c.c.codes {
		if code >= 0 {
			texts[i] = c.c.dict[code]
		}
	}
	return texts
}

// Mask returns a copy of the missing mask, one value per row; nil when no cell
// is missing.
func (c Column) Mask() []bool {
	if c.c == nil {
		return nil
	}
	return slices.Clone(c.c.miss)
}

// A Table is a set of equally long named columns. It is immutable: goroutines
// may share it. It is made by [NewTable], [ReadCSV], [FromStructs] or
// [FromRows]. Missing and non-finite cells are kept as they are; a model that
// uses their columns decides about them.
type Table struct {
	rows  int
	cols  []*column
	index map[string]int // name to place in cols
}

// NewTable makes a table of columns of equal length with distinct, non-empty
// names in valid UTF-8; anything else is refused by an [*Error]. Columns may
// have no rows: such a table serves prediction of nothing.
func NewTable(columns ...Column) (*Table, error) {
	if err := tooManyColumns(len(columns)); err != nil {
		return nil, err
	}
	cols := make([]*column, len(columns))
	for j, c := range columns {
		if c.c == nil {
			return nil, &Error{
				Code:    codeUnmadeColumn,
				Message: fmt.Sprintf("column %d of %d is the zero Column", j+1, len(columns)),
				Hint:    "make it by Numbers, Bools or Texts",
			}
		}
		cols[j] = c.c
	}
	if err := checkNames(cols, 0, "give every column a name of its own"); err != nil {
		return nil, err
	}
	for j, c := range columns {
		if c.err != nil {
			return nil, c.err
		}
		if n, first := c.c.len(), cols[0]; n != first.len() {
			return nil, &Error{
				Code: codeUnequalLengths,
				Message: fmt.Sprintf("column %s has %d rows and column %s has %d",
					nameText(first.name), first.len(), nameText(cols[j].name), n),
				Hint:  "give all columns the same number of rows, and mark absent cells by Missing",
				Names: []string{first.name, cols[j].name},
			}
		}
	}
	rows := 0
	if len(cols) > 0 {
		rows = cols[0].len()
	}
	return assemble(rows, cols), nil
}

// assemble makes a table of columns that are known to be sound.
func assemble(rows int, cols []*column) *Table {
	t := &Table{rows: rows, cols: cols, index: make(map[string]int, len(cols))}
	for j, c := range cols {
		t.index[c.name] = j
	}
	return t
}

// Rows is the number of rows.
func (t *Table) Rows() int { return t.rows }

// Names lists the columns in order. The slice is a copy.
func (t *Table) Names() []string {
	names := make([]string, len(t.cols))
	for j, c := range t.cols {
		names[j] = c.name
	}
	return names
}

// Column gives the column of that name, compared code point by code point; ok
// is false when there is none.
func (t *Table) Column(name string) (c Column, ok bool) {
	found := t.column(name)
	return Column{c: found}, found != nil
}

// column gives the stored column of that name, nil when there is none.
func (t *Table) column(name string) *column {
	j, ok := t.index[name]
	if !ok {
		return nil
	}
	return t.cols[j]
}

// take makes a table of the given rows (from 0, in the given order, repeats
// allowed) and columns. Names without a column are left out. A text column's
// dict is made anew, so that it holds only values of the taken rows, in order
// of their first appearance there. Rows outside the table are a programming
// error and panic.
func (t *Table) take(rows []int, names []string) *Table {
	cols := make([]*column, 0, len(names))
	for _, name := range names {
		if c := t.column(name); c != nil {
			cols = append(cols, c.take(rows))
		}
	}
	return assemble(len(rows), cols)
}

func (c *column) take(rows []int) *column {
	out := &column{name: c.name, kind: c.kind, odd: c.odd}
	switch c.kind {
	case NumberColumn:
		out.num = make([]float64, len(rows))
		for i, r := range rows {
			out.num[i] = c.num[r]
		}
	case BoolColumn:
		out.bits = make([]bool, len(rows))
		for i, r := range rows {
			out.bits[i] = c.bits[r]
		}
	case TextColumn:
		out.codes = make([]int32, len(rows))
		renumber := make([]int32, len(c.dict)) // new code + 1; 0 = not seen yet
		for i, r := range rows {
			code := c.codes[r]
			if code < 0 {
				out.codes[i] = -1
				continue
			}
			if renumber[code] == 0 {
				out.dict = append(out.dict, c.dict[code])
				renumber[code] = int32(len(out.dict))
			}
			out.codes[i] = renumber[code] - 1
		}
	}
	if c.miss != nil {
		for i, r := range rows {
			if !c.miss[r] {
				continue
			}
			if out.miss == nil {
				out.miss = make([]bool, len(rows))
			}
			out.miss[i] = true
		}
	}
	return out
}

func tooManyColumns(n int) *Error {
	if n <= maxTableColumns {
		return nil
	}
	return &Error{
		Code:    codeTooLarge,
		Message: fmt.Sprintf("there are %d columns; the limit is %d", n, maxTableColumns),
		Hint:    "keep only the columns that the model names",
	}
}

// checkNames refuses names that are empty, not UTF-8 or used twice. line is
// the line of a CSV header, 0 when there is none; hint says how this source
// gives a column another name.
func checkNames(cols []*column, line int, hint string) *Error {
	seen := make(map[string]int, len(cols))
	for j, c := range cols {
		switch before, twice := seen[c.name]; {
		case c.name == "":
			return &Error{
				Code:    codeEmptyColumnName,
				Message: fmt.Sprintf("column %d of %d has an empty name", j+1, len(cols)),
				Hint:    hint, Line: line,
			}
		case !utf8.ValidString(c.name):
			return &Error{
				Code:    codeInvalidUTF8,
				Message: fmt.Sprintf("the name of column %d, %s, is not valid UTF-8", j+1, shown(c.name)),
				Hint:    "write the name in UTF-8", Line: line, Names: []string{c.name},
			}
		case twice:
			return &Error{
				Code:    codeDuplicateColumn,
				Message: fmt.Sprintf("columns %d and %d are both named %s", before+1, j+1, nameText(c.name)),
				Hint:    hint, Line: line, Names: []string{c.name},
			}
		}
		seen[c.name] = j
	}
	return nil
}

// nameText writes a column name for a message: bare when it is a word, else in
// double quotes as the model language has it. Names that would break the line
// are shown with escapes instead.
func nameText(name string) string {
	word := name != ""
	for i, r := range name {
		if r < ' ' || r == utf8.RuneError || !unicode.IsPrint(r) {
			return shown(name)
		}
		if r != '_' && !unicode.IsLetter(r) && (i == 0 || !unicode.IsDigit(r) && !unicode.IsMark(r)) {
			word = false
		}
	}
	if len(name) > maxShown {
		return shown(name)
	}
	if word {
		return name
	}
	return `"` + strings.ReplaceAll(name, `"`, `""`) + `"`
}

// maxShown is how many bytes of a cell or name a message shows.
const maxShown = 60

// cut shortens a text to a showable length at a character's border.
func cut(s string) string {
	if len(s) <= maxShown {
		return s
	}
	end := maxShown
	for end > 0 && !utf8.RuneStart(s[end]) {
		end--
	}
	return s[:end] + "…"
}

// shown writes a text for a message, escaped, in double quotes, on one line.
func shown(s string) string { return strconv.Quote(cut(s)) }
