package design

import (
	"bytes"
	"fmt"
)

// A csvColumn is a builder that tells its kind from its cells. It takes the
// first cell that is not missing at its word and stores accordingly; a later
// cell that does not agree makes the whole column text, whose earlier cells
// are then read from the text once more.
type csvColumn struct {
	builder
	missing []string // words that count as missing
	forced  bool     // the caller settled the kind
	stage   csvStage
	odd     *oddCell
}

type csvStage uint8

const (
	storingStage   csvStage = iota // cells are stored
	waitingStage                   // the column turned to text; its cells are read again later
	rereadingStage                 // as text, in the second pass
	doneStage                      // complete; the second pass is for other columns
)

// settle fixes the kind by the caller's wish.
func (c *csvColumn) settle(kind Kind) {
	c.forced = true
	c.become(kind)
}

func (c *csvColumn) turned() bool { return c.stage == waitingStage }

// beginAgain prepares for the second pass over rows rows.
func (c *csvColumn) beginAgain(rows int) {
	if c.stage != waitingStage {
		c.stage = doneStage
		return
	}
	c.builder = *newBuilder(c.name)
	c.room = rows
	c.become(TextColumn)
	c.stage = rereadingStage
}

// add takes the next cell, which begins on the given line.
func (c *csvColumn) add(cell []byte, line int) *Error {
	switch {
	case c.stage == waitingStage || c.stage == doneStage:
		return nil
	case c.isMissing(cell):
		c.addMissing()
		return nil
	case !c.known:
		c.become(told(cell))
	}
	switch c.kind {
	case NumberColumn:
		v, class := parseNumeral(cell)
		if class == plainNumeral || class == codedNumeral && c.forced {
			c.addNumber(v)
			return nil
		}
	case BoolColumn:
		if v, ok := parseTruth(cell); ok {
			c.addBool(v)
			return nil
		}
	default:
		c.addBytes(cell)
		return nil
	}
	if c.forced {
		return c.badCell(cell, line)
	}
	c.odd = &oddCell{line: line, cell: cut(string(cell)), was: c.kind}
	c.builder = builder{name: c.name} // let go of what was stored
	c.stage = waitingStage
	return nil
}

// told is the kind that one cell alone suggests.
func told(cell []byte) Kind {
	if _, class := parseNumeral(cell); class == plainNumeral {
		return NumberColumn
	}
	if _, ok := parseTruth(cell); ok {
		return BoolColumn
	}
	return TextColumn
}

func (c *csvColumn) isMissing(cell []byte) bool {
	if len(cell) == 0 {
		return true
	}
	for _, word := range c.missing {
		if string(cell) == word {
			return true
		}
	}
	return false
}

func (c *csvColumn) badCell(cell []byte, line int) *Error {
	noun, example := "a number", "a plain number such as 12.5"
	if c.kind == BoolColumn {
		noun, example = "true or false", "true or false"
	}
	err := &Error{
		Code:    codeBadCell,
		Message: fmt.Sprintf("column %s holds %s, which is not %s", nameText(c.name), shown(string(cell)), noun),
		Hint:    "write " + example + ", leave the cell empty when it is missing, or take the column out of Types",
		Names:   []string{c.name},
		Rows:    []int{c.rows + 1},
		Line:    line,
	}
	// Two near misses have a mend of their own.
	fits := func(cell []byte) bool {
		if c.kind == BoolColumn {
			_, ok := parseTruth(cell)
			return ok
		}
		_, class := parseNumeral(cell)
		return class != notNumeral
	}
	if trimmed := bytes.TrimSpace(cell); fits(trimmed) {
		err.Hint = "spaces are kept: write " + cut(string(trimmed)) + " without them"
	} else if pointed := bytes.Replace(cell, []byte(","), []byte("."), 1); fits(pointed) {
		err.Hint = "the decimal sign is a point: write " + cut(string(pointed))
	}
	return err
}
