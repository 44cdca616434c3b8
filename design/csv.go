package design

import (
	"bytes"
	"fmt"
	"io"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"

	"example.com/trammel/internal/errtext"
)

// DefaultMaxBytes is the longest CSV text read when the options name no limit.
const DefaultMaxBytes = 1 << 30

// CSVOptions say how [ReadCSV] reads. The zero value, and nil, read
// comma-separated text in which only empty cells are missing.
type CSVOptions struct {
	// Comma separates cells; 0 means ','. A double quote, a line break and the
	// Unicode replacement character cannot separate.
	Comma rune

	// MissingWords are cells that count as missing beside empty ones, such as
	// "NA" or "-". They are compared code point by code point, in every column.
	MissingWords []string

	// Types settles the kind of a column by its name. A cell that does not fit
	// is refused. A number column made this way takes leading zeros (007 is 7).
	Types map[string]Kind

	// MaxBytes is the longest text read, in bytes; 0 means [DefaultMaxBytes].
	// A longer one is refused.
	MaxBytes int64
}

// ReadCSV reads a table from comma-separated text in UTF-8: a header line of
// column names, then one line per row. It reads r to its end and holds the
// text in memory meanwhile. opts may be nil.
//
// Lines end with LF or CRLF, the last one may end with the text; a byte order
// mark at the start is passed over. A line without any character is passed
// over wherever it stands (in a table of one column, write "" for a missing
// cell). Double quotes protect separators, line breaks and, doubled,
// themselves; inside them everything is kept as it is, and they say nothing
// about the kind of a cell: "5" is a number, "" is missing. Spaces are kept,
// in names too: a cell of 5 after a space is text.
//
// The kind of a column is told from all its cells that are not missing:
//
//   - numbers, when all are an optional sign, decimal digits with an optional
//     point, and an optional exponent. Values are correctly rounded; NaN and
//     Inf in any case, and numbers too large for a float64, are non-finite
//     numbers, which a model refuses. Digits with a superfluous leading zero,
//     as in 007, are a code: one of them makes the column text;
//   - true/false, when all are true or false in any case;
//   - text otherwise. A column whose cells are all missing is a number column.
//
// Every refusal is an [*Error], with the line number where there is one. A
// text without a header (an empty one, or one whose first line holds only
// numbers) and a header without rows are refusals of their own.
func ReadCSV(r io.Reader, opts *CSVOptions) (*Table, error) {
	var o CSVOptions
	if opts != nil {
		o = *opts
	}
	if err := o.check(); err != nil {
		return nil, err
	}
	text, err := readText(r, o.MaxBytes)
	if err != nil {
		return nil, err
	}
	t, err := readTable(text, &o)
	if err != nil {
		return nil, err
	}
	return t, nil // not "return t, err": a nil *Error in an error is not nil
}

// check refuses options outside their domain and fills in the defaults.
func (o *CSVOptions) check() *Error {
	refuse := func(format string, args ...any) *Error {
		return &Error{Code: codeBadOption, Message: fmt.Sprintf(format, args...)}
	}
	switch o.Comma {
	case 0:
		o.Comma = ','
	case '"', '\n', '\r', utf8.RuneError:
		return refuse("Comma is %q; it must be a character other than a double quote, a line break or U+FFFD", o.Comma)
	}
	if !utf8.ValidRune(o.Comma) {
		return refuse("Comma is %d; it must be a Unicode character", o.Comma)
	}
	if o.MaxBytes == 0 {
		o.MaxBytes = DefaultMaxBytes
	}
	if o.MaxBytes < 0 {
		return refuse("MaxBytes is %d; it must be > 0, or 0 for the default of %d", o.MaxBytes, int64(DefaultMaxBytes))
	}
	for _, name := range sortedKeys(o.Types) {
		if kind := o.Types[name]; kind > TextColumn {
			err := refuse("Types[%s] is %v; it must be NumberColumn, BoolColumn or TextColumn", shown(name), kind)
			err.Names = []string{name}
			return err
		}
	}
	return nil
}

func sortedKeys(m map[string]Kind) []string {
	keys := make([]string, 0, len(m))
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

// readText reads all of r, at most limit bytes, checks that it is UTF-8 and
// takes off a byte order mark.
func readText(r io.Reader, limit int64) ([]byte, *Error) {
	if r == nil {
		return nil, &Error{Code: codeReadFailed, Message: "the reader is nil", Hint: "open the file first"}
	}
	text, failure := readAll(r, limit)
	if failure != nil {
		return nil, readFailed("reading the CSV text failed", failure)
	}
	if int64(len(text)) > limit {
		return nil, &Error{
			Code:    codeTooLarge,
			Message: fmt.Sprintf("the CSV text is longer than %d bytes", limit),
			Hint:    "raise MaxBytes, or keep only the columns that the model names",
		}
	}
	if !utf8.Valid(text) {
		at := 0
		for at < len(text) {
			r, size := utf8.DecodeRune(text[at:])
			if r == utf8.RuneError && size == 1 {
				break
			}
			at += size
		}
		hint := "save the file as UTF-8"
		if bytes.HasPrefix(text, []byte("\xff\xfe")) || bytes.HasPrefix(text, []byte("\xfe\xff")) {
			hint += " (it begins like UTF-16)"
		}
		return nil, &Error{
			Code:    codeInvalidUTF8,
			Message: fmt.Sprintf("byte %#02x is not valid UTF-8 here", text[at]),
			Hint:    hint,
			Line:    1 + bytes.Count(text[:at], []byte("\n")),
		}
	}
	return bytes.TrimPrefix(text, []byte("\ufeff")), nil
}

// readAll reads r to its end, or to one byte more than limit, which tells a
// text that is too long from one that just fits. Unlike the standard library's
// buffers it has no size at which it panics, and it trusts no reader's count.
func readAll(r io.Reader, limit int64) ([]byte, error) {
	room := 4096
	if sized, ok := r.(interface{ Len() int }); ok {
		// One more than Len lets the end be seen without growing. Len may say
		// anything, so it is believed only up to a modest size.
		room = max(1, min(sized.Len(), 64<<20)+1)
	}
	text := make([]byte, 0, room)
	for idle := 0; ; {
		free := text[len(text):cap(text)]
		if left := limit - int64(len(text)); left < int64(len(free)) {
			free = free[:left+1]
		}
		n, err := r.Read(free)
		if n < 0 || n > len(free) {
			return nil, fmt.Errorf("the reader claims %d bytes read into %d", n, len(free))
		}
		text = text[:len(text)+n]
		switch {
		case err == io.EOF || int64(len(text)) > limit:
			return text, nil
		case err != nil:
			return nil, err
		case n > 0:
			idle = 0
		default:
			if idle++; idle == 100 {
				return nil, io.ErrNoProgress
			}
		}
		if len(text) == cap(text) {
			text = slices.Grow(text, 1)
		}
	}
}

// readFailed wraps the error of a source, whose text is put on one line.
func readFailed(what string, cause error) *Error {
	return &Error{
		Code:    codeReadFailed,
		Message: what + ": " + strings.Join(strings.Fields(cause.Error()), " "),
		Err:     cause,
	}
}

// readTable makes the table in one pass over the text, and a second one over
// the columns that began as numbers or true/false and turned out to be text.
func readTable(text []byte, o *CSVOptions) (*Table, *Error) {
	s := newCSVScanner(text, o.Comma)
	cols, err := readHeader(s, o)
	if err != nil {
		return nil, err
	}
	body := *s
	rows, err := readRows(s, cols)
	if err != nil {
		return nil, err
	}
	if rows == 0 {
		return nil, &Error{Code: codeNoRows, Message: "the CSV text has a header and no rows", Hint: "write one line per row below the header"}
	}
	if slices.ContainsFunc(cols, (*csvColumn).turned) {
		for _, c := range cols {
			c.beginAgain(rows)
		}
		if _, err := readRows(&body, cols); err != nil {
			return nil, err
		}
	}
	made := make([]*column, len(cols))
	for j, c := range cols {
		made[j], err = c.finish()
		if err != nil {
			return nil, err
		}
		made[j].odd = c.odd
	}
	return assemble(rows, made), nil
}

// readHeader reads the line of names and makes the columns.
func readHeader(s *csvScanner, o *CSVOptions) ([]*csvColumn, *Error) {
	if !s.nextRow() {
		return nil, &Error{Code: codeNoHeader, Message: "the CSV text is empty; it has no header", Hint: headerHint}
	}
	line := s.line
	var cols []*csvColumn
	var named []*column // only so that the names can be checked
	numbers := 0
	for last := false; !last; {
		cell, end, err := s.cell()
		if err != nil {
			return nil, err
		}
		if len(cols) == s.maxColumns {
			return nil, &Error{
				Code:    codeTooLarge,
				Message: fmt.Sprintf("there are more than %d columns", s.maxColumns),
				Hint:    "keep only the columns that the model names",
				Line:    line,
			}
		}
		if v, class := parseNumeral(cell); class != notNumeral && v-v == 0 { // "Inf" can be a name
			numbers++
		}
		name := string(cell)
		cols = append(cols, &csvColumn{builder: *newBuilder(name), missing: o.MissingWords})
		named = append(named, &column{name: name})
		last = end
	}
	if numbers == len(cols) {
		return nil, &Error{
			Code:    codeNoHeader,
			Message: "the first line holds only numbers; it is not a header",
			Hint:    headerHint, Line: line,
		}
	}
	if err := checkNames(named, line, "give every column a name of its own in the header"); err != nil {
		return nil, err
	}
	index := assemble(0, named).index
	for _, name := range sortedKeys(o.Types) {
		j, ok := index[name]
		if !ok {
			err := &Error{
				Code:    codeBadOption,
				Message: fmt.Sprintf("Types names a column %s, which the header does not have", shown(name)),
				Hint:    "write the name as it stands in the header",
				Names:   []string{name},
			}
			if near, ok := errtext.Nearest(name, assemble(0, named).Names()); ok {
				err.Hint = "did you mean " + shown(near) + "?"
			}
			return nil, err
		}
		cols[j].settle(o.Types[name])
	}
	room := s.rowsAhead(len(cols))
	for _, c := range cols {
		c.room = room
	}
	return cols, nil
}

const headerHint = "begin it with a line that names every column"

// readRows hands every cell below the header to its column and counts the
// rows. A row of another length is refused.
func readRows(s *csvScanner, cols []*csvColumn) (rows int, err *Error) {
	for s.nextRow() {
		line, n := s.line, 0
		for last := false; !last; n++ {
			at := s.line
			cell, end, err := s.cell()
			if err != nil {
				return 0, err
			}
			if n < len(cols) {
				if err := cols[n].add(cell, at); err != nil {
					return 0, err
				}
			}
			last = end
		}
		if n != len(cols) {
			return 0, rowLength(line, rows+1, n, cols)
		}
		rows++
	}
	return rows, nil
}

func rowLength(line, row, cells int, cols []*csvColumn) *Error {
	err := &Error{
		Code: codeRowLength,
		Message: fmt.Sprintf("the row has %s and the header names %s",
			errtext.Count(cells, "cell"), errtext.Count(len(cols), "column")),
		Hint: "give the row one cell per column; a cell with a separator in it stands in double quotes",
		Line: line, Rows: []int{row},
	}
	if len(cols) == 1 {
		for _, comma := range []rune{';', '\t', '|'} {
			if strings.ContainsRune(cols[0].name, comma) {
				err.Hint = "the header looks separated by another character: set Comma to " + strconv.QuoteRune(comma)
				break
			}
		}
	}
	return err
}
