package design

import (
	"fmt"
	"math"
	"unicode/utf8"
)

// A builder collects one column cell by cell. While only missing cells have
// come, its kind is open; the first other cell, or the caller, settles it.
type builder struct {
	name  string
	kind  Kind
	known bool // kind is settled
	rows  int
	room  int // rows to make room for when storage begins

	num   []float64
	bits  []bool
	codes []int32
	dict  []string
	miss  []bool

	lookup  map[string]int32
	maxDict int // most distinct texts; a field so that tests reach it cheaply
	full    bool
	badUTF8 int // first row, from 1, with a text that is not UTF-8; 0 = none
}

func newBuilder(name string) *builder {
	return &builder{name: name, maxDict: math.MaxInt32}
}

// become settles the kind and fills in the missing cells that came before.
func (b *builder) become(kind Kind) {
	b.kind, b.known = kind, true
	room := max(b.room, b.rows)
	switch kind {
	case NumberColumn:
		b.num = make([]float64, b.rows, room)
		for i := range b.num {
			b.num[i] = math.NaN()
		}
	case BoolColumn:
		b.bits = make([]bool, b.rows, room)
	case TextColumn:
		b.lookup = make(map[string]int32)
		b.codes = make([]int32, b.rows, room)
		for i := range b.codes {
			b.codes[i] = -1
		}
	}
}

// addMissing adds a missing cell.
func (b *builder) addMissing() {
	if b.miss == nil {
		b.miss = make([]bool, b.rows, max(b.room, b.rows+1))
	}
	b.miss = append(b.miss, true)
	b.rows++
	if !b.known {
		return
	}
	switch b.kind {
	case NumberColumn:
		b.num = append(b.num, math.NaN())
	case BoolColumn:
		b.bits = append(b.bits, false)
	case TextColumn:
		b.codes = append(b.codes, -1)
	}
}

// present counts a cell that is not missing.
func (b *builder) present() {
	if b.miss != nil {
		b.miss = append(b.miss, false)
	}
	b.rows++
}

// addNumber adds a cell to a number column.
func (b *builder) addNumber(v float64) {
	b.num = append(b.num, v)
	b.present()
}

// addBool adds a cell to a true/false column.
func (b *builder) addBool(v bool) {
	b.bits = append(b.bits, v)
	b.present()
}

// addText adds a cell to a text column.
func (b *builder) addText(v string) {
	code, ok := b.lookup[v]
	if !ok {
		code = b.newText(v)
	}
	b.codes = append(b.codes, code)
	b.present()
}

// addBytes is addText for a cell whose bytes will be overwritten; only a text
// not met before is copied.
func (b *builder) addBytes(v []byte) {
	code, ok := b.lookup[string(v)]
	if !ok {
		code = b.newText(string(v))
	}
	b.codes = append(b.codes, code)
	b.present()
}

func (b *builder) newText(v string) int32 {
	if len(b.dict) >= b.maxDict {
		b.full = true
		return -1
	}
	if b.badUTF8 == 0 && !utf8.ValidString(v) {
		b.badUTF8 = b.rows + 1
	}
	code := int32(len(b.dict))
	b.dict = append(b.dict, v)
	b.lookup[v] = code
	return code
}

// addFrom adds cell i of a column of the same kind, or a missing cell.
func (b *builder) addFrom(c *column, i int, missing bool) {
	switch {
	case missing || c.miss != nil && c.miss[i]:
		b.addMissing()
	case c.kind == NumberColumn:
		b.addNumber(c.num[i])
	case c.kind == BoolColumn:
		b.addBool(c.bits[i])
	default:
		b.addText(c.dict[c.codes[i]])
	}
}

// finish gives the column. A column of missing cells alone is a number column:
// no cell says otherwise. The column is not nil even with an error.
func (b *builder) finish() (*column, *Error) {
	if !b.known {
		b.become(NumberColumn)
	}
	c := &column{name: b.name, kind: b.kind, num: b.num, bits: b.bits, codes: b.codes, dict: b.dict, miss: b.miss}
	switch {
	case b.badUTF8 > 0:
		return c, &Error{
			Code: codeInvalidUTF8,
			Message: fmt.Sprintf("row %d of column %s, %s, is not valid UTF-8",
				b.badUTF8, nameText(b.name), shown(c.dict[c.codes[b.badUTF8-1]])),
			Hint:  "convert the text to UTF-8",
			Names: []string{b.name}, Rows: []int{b.badUTF8},
		}
	case b.full:
		return c, &Error{
			Code:    codeTooLarge,
			Message: fmt.Sprintf("column %s has more than %d distinct texts", nameText(b.name), b.maxDict),
			Hint:    "keep only the columns that the model names",
			Names:   []string{b.name},
		}
	}
	return c, nil
}
