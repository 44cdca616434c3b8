package design

import (
	"bytes"
	"unicode/utf8"
)

// A csvScanner walks over comma-separated text cell by cell. It is written out
// rather than built on encoding/csv because it keeps line breaks inside quotes
// as they are, knows the line of every cell, and lends cells without copying.
type csvScanner struct {
	text    []byte
	pos     int
	line    int       // of pos, from 1
	special [256]bool // bytes that can end or spoil an unquoted cell
	comma   []byte    // the separator in UTF-8
	scratch []byte    // a cell whose doubled quotes had to be undone

	maxColumns int // limit on the header; a field so that tests reach it cheaply
}

func newCSVScanner(text []byte, comma rune) *csvScanner {
	s := &csvScanner{text: text, line: 1, comma: utf8.AppendRune(nil, comma), maxColumns: maxTableColumns}
	s.special[s.comma[0]] = true
	s.special['"'] = true
	s.special['\r'] = true
	s.special['\n'] = true
	return s
}

// nextRow passes over lines without characters and reports whether a row
// begins at pos.
func (s *csvScanner) nextRow() bool {
	for s.pos < len(s.text) {
		n := s.lineEnd()
		if n == 0 {
			return true
		}
		s.pos += n
		s.line++
	}
	return false
}

// rowsAhead guesses from the next lines how many rows are to come, to make
// room for them at once. Each row of cols cells takes at least as many bytes,
// and two, so the guess is bounded whatever the lines look like.
func (s *csvScanner) rowsAhead(cols int) int {
	rest := s.text[s.pos:]
	sample := rest[:min(len(rest), 1<<16)]
	lines := bytes.Count(sample, []byte("\n")) + 1
	guess := float64(len(rest)) / float64(max(1, len(sample))) * float64(lines)
	return min(int(1.02*guess)+1, len(rest)/max(2, cols)+1)
}

// lineEnd is the length of the line end at pos: 1 for LF, 2 for CRLF, 1 for a
// CR that ends the text, 0 for anything else.
func (s *csvScanner) lineEnd() int {
	rest := s.text[s.pos:]
	switch {
	case len(rest) == 0:
		return 0
	case rest[0] == '\n':
		return 1
	case rest[0] == '\r' && len(rest) == 1:
		return 1
	case rest[0] == '\r' && rest[1] == '\n':
		return 2
	}
	return 0
}

// cell reads one cell and what ends it. last is true when the row ends with
// it. The cell is lent until the next call.
func (s *csvScanner) cell() (cell []byte, last bool, err *Error) {
	if s.pos < len(s.text) && s.text[s.pos] == '"' {
		if cell, err = s.quoted(); err != nil {
			return nil, false, err
		}
	} else {
		from := s.pos
		for s.pos < len(s.text) && (!s.special[s.text[s.pos]] || s.text[s.pos] == s.comma[0] && !s.atComma()) {
			s.pos++
		}
		cell = s.text[from:s.pos]
	}
	switch n := s.lineEnd(); {
	case s.pos == len(s.text):
		return cell, true, nil
	case n > 0:
		s.pos += n
		s.line++
		return cell, true, nil
	case s.atComma():
		s.pos += len(s.comma)
		return cell, false, nil
	case s.text[s.pos] == '\r':
		return nil, false, &Error{
			Code:    codeStrayReturn,
			Message: "a carriage return stands alone outside quotes",
			Hint:    "end lines with LF or CRLF",
			Line:    s.line,
		}
	case s.text[s.pos] == '"':
		return nil, false, &Error{
			Code:    codeStrayQuote,
			Message: "a double quote stands inside the unquoted cell " + shown(string(cell)+`"`),
			Hint:    `put the whole cell in double quotes and double those inside it, as in "3"" pipe"`,
			Line:    s.line,
		}
	}
	return nil, false, &Error{
		Code:    codeStrayQuote,
		Message: "text follows the closing quote of the cell " + shown(string(cell)),
		Hint:    `put the whole cell in double quotes and double those inside it, as in "3"" pipe"`,
		Line:    s.line,
	}
}

// atComma reports whether the separator stands at pos.
func (s *csvScanner) atComma() bool {
	if s.text[s.pos] != s.comma[0] {
		return false
	}
	n := len(s.comma)
	return n == 1 || len(s.text)-s.pos >= n && string(s.text[s.pos:s.pos+n]) == string(s.comma)
}

// quoted reads a cell in double quotes, from the opening quote at pos to past
// the closing one.
func (s *csvScanner) quoted() ([]byte, *Error) {
	line := s.line
	s.pos++
	from := s.pos
	s.scratch = s.scratch[:0]
	doubled := false
	for s.pos < len(s.text) {
		switch s.text[s.pos] {
		case '\n':
			s.line++
		case '"':
			part := s.text[from:s.pos]
			s.pos++
			if s.pos == len(s.text) || s.text[s.pos] != '"' {
				if !doubled {
					return part, nil
				}
				s.scratch = append(s.scratch, part...)
				return s.scratch, nil
			}
			s.scratch = append(append(s.scratch, part...), '"')
			doubled = true
			from = s.pos + 1
		}
		s.pos++
	}
	return nil, &Error{
		Code:    codeUnclosedQuote,
		Message: "a quoted cell begins here and does not end: " + shown(string(s.text[from:min(len(s.text), from+2*maxShown)])),
		Hint:    `close it with a double quote; a quote inside a cell is doubled, as in "3"" pipe"`,
		Line:    line,
	}
}
