package design

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"slices"
	"strconv"
	"strings"
	"testing"
	"testing/iotest"
)

func readCSV(t *testing.T, text string, opts *CSVOptions) *Table {
	t.Helper()
	table, err := ReadCSV(strings.NewReader(text), opts)
	if err != nil {
		t.Fatalf("ReadCSV(%.200q): %v", text, err)
	}
	return table
}

// render writes a table on one line: name, kind and cells of every column.
func render(table *Table) string {
	var b strings.Builder
	for _, c := range table.cols {
		fmt.Fprintf(&b, "%s:%v", c.name, c.kind)
		for i := range table.rows {
			b.WriteByte(' ')
			switch {
			case c.miss != nil && c.miss[i]:
				b.WriteByte('-')
			case c.kind == NumberColumn:
				b.WriteString(strconv.FormatFloat(c.num[i], 'g', -1, 64))
			case c.kind == BoolColumn:
				b.WriteString(strconv.FormatBool(c.bits[i]))
			default:
				b.WriteString(strconv.Quote(c.dict[c.codes[i]]))
			}
		}
		b.WriteByte('\n')
	}
	return b.String()
}

func TestReadCSV(t *testing.T) {
	for _, c := range []struct {
		name, text string
		opts       *CSVOptions
		want       string
	}{
		{"kinds", "x,open,furnace\n1,true,F1\n-2.5e1,FALSE,F2\n", nil,
			"x:number 1 -25\nopen:true/false true false\nfurnace:text \"F1\" \"F2\"\n"},
		{"quotes say nothing about the kind", "x,b,s,m\n\"5\",\"true\",\"a\",\"\"\n6,false,b,\n", nil,
			"x:number 5 6\nb:true/false true false\ns:text \"a\" \"b\"\nm:number - -\n"},
		{"quotes protect", "\"a,b\",\"c\"\"d\"\n\"x\ny\",\"\"\"\"\n\"p\r\nq\",\"r,\"\n", nil,
			"a,b:text \"x\\ny\" \"p\\r\\nq\"\nc\"d:text \"\\\"\" \"r,\"\n"},
		{"spaces are kept", "x, y\n1, 2\n3,4 \n", nil, "x:number 1 3\n y:text \" 2\" \"4 \"\n"},
		{"byte order mark, CRLF, no last line end", "\ufeffx,y\r\n1,2\r\n3,4", nil, "x:number 1 3\ny:number 2 4\n"},
		{"byte order mark before a quoted name", "\ufeff\"x\",y\n1,2\n", nil, "x:number 1\ny:number 2\n"},
		{"last CR ends the text", "x,y\r\n1,2\r", nil, "x:number 1\ny:number 2\n"},
		{"blank lines are passed over", "\n\r\nx\n\n1\n\r\n2\n\n", nil, "x:number 1 2\n"},
		{"a missing cell of a single column", "x\n1\n\"\"\n2\n", nil, "x:number 1 - 2\n"},
		{"empty cells are missing", "x,y,s,b\n,2,,\n1,,a,true\n,,,\n", nil,
			"x:number - 1 -\ny:number 2 - -\ns:text - \"a\" -\nb:true/false - true -\n"},
		{"missing words", "x,s\n1,NA\nNA,a\n-,na\n", &CSVOptions{MissingWords: []string{"NA", "-"}},
			"x:number 1 - -\ns:text - \"a\" \"na\"\n"},
		{"a leading zero makes text", "a,b,c,d\n1,01,0,-1\n007,2,0.5,-01\n", nil,
			"a:text \"1\" \"007\"\nb:text \"01\" \"2\"\nc:number 0 0.5\nd:text \"-1\" \"-01\"\n"},
		{"one odd cell makes text of all above", "x,y,b\n1.50,1,TRUE\n,2,\n1e3,3,no\n", nil,
			"x:number 1.5 - 1000\ny:number 1 2 3\nb:text \"TRUE\" - \"no\"\n"},
		{"numbers then true", "x\n1.0\ntrue\n", nil, "x:text \"1.0\" \"true\"\n"},
		{"true then numbers", "x\nTrue\n1\n", nil, "x:text \"True\" \"1\"\n"},
		{"not finite", "x,y\nNaN,inf\n1,-INF\n1e999,2\n", nil, "x:number NaN 1 +Inf\ny:number +Inf -Inf 2\n"},
		{"words that only look like numbers", "a,b,c\n0x10,1_000,infinity\n1,2,3\n", nil,
			"a:text \"0x10\" \"1\"\nb:text \"1_000\" \"2\"\nc:text \"infinity\" \"3\"\n"},
		{"another separator", "x;y\n1,5;2\n", &CSVOptions{Comma: ';'}, "x:text \"1,5\"\ny:number 2\n"},
		{"tabs", "x\ty\n1\t2\n", &CSVOptions{Comma: '\t'}, "x:number 1\ny:number 2\n"},
		{"a separator of several bytes", "x→y é\n1→←\n", &CSVOptions{Comma: '→'}, "x:number 1\ny é:text \"←\"\n"},
		{"settled kinds", "a,b,c\n007,1,true\n,2,\n", &CSVOptions{Types: map[string]Kind{"a": NumberColumn, "b": TextColumn, "c": BoolColumn}},
			"a:number 7 -\nb:text \"1\" \"2\"\nc:true/false true -\n"},
		{"a settled kind outlives missing cells", "a,b\n,1\n", &CSVOptions{Types: map[string]Kind{"a": TextColumn}}, "a:text -\nb:number 1\n"},
		{"a number beside other names", "x,2019\n1,2\n", nil, "x:number 1\n2019:number 2\n"},
		{"a name that could be a number", "inf\n1\n", nil, "inf:number 1\n"},
		{"any characters", "温度,é\n1,ü\n", nil, "温度:number 1\né:text \"ü\"\n"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if got := render(readCSV(t, c.text, c.opts)); got != c.want {
				t.Errorf("reading %q gives\n%swant\n%s", c.text, got, c.want)
			}
		})
	}
}

// TestReadCSVOdd checks that a column that turned to text remembers where.
func TestReadCSVOdd(t *testing.T) {
	table := readCSV(t, "x,s,y\n1,a,true\n\"2\",\"b\nb\",\nn/a,3,maybe\n4,c,false\n", nil)
	x, s, y := table.column("x"), table.column("s"), table.column("y")
	if x.odd == nil || *x.odd != (oddCell{line: 5, cell: "n/a", was: NumberColumn}) {
		t.Errorf("x: %+v", x.odd)
	}
	if y.odd == nil || *y.odd != (oddCell{line: 5, cell: "maybe", was: BoolColumn}) {
		t.Errorf("y: %+v", y.odd)
	}
	if s.odd != nil {
		t.Errorf("s was text from the first cell, yet has %+v", s.odd)
	}
	if table.take([]int{0}, []string{"x"}).column("x").odd == nil {
		t.Error("taking rows forgets the odd cell")
	}
}

// TestReadCSVLines checks the line, counted through quoted line breaks, blank
// lines and CRLF, and the row that a refusal names.
func TestReadCSVLines(t *testing.T) {
	numbers := &CSVOptions{Types: map[string]Kind{"x": NumberColumn}}
	for _, c := range []struct {
		text string
		opts *CSVOptions
		code Code
		line int
		rows []int
	}{
		{"x,y\n1,2\n3\n", nil, codeRowLength, 3, []int{2}},
		{"x,y\n\"1\n\n\",2\r\n\r\n3,4,5\n", nil, codeRowLength, 6, []int{2}},
		{"\n\nx,x\n1,2\n", nil, codeDuplicateColumn, 3, nil},
		{"\nx,\n1,2\n", nil, codeEmptyColumnName, 2, nil},
		{"x,y\n1,\"a\nb\nc\n", nil, codeUnclosedQuote, 2, nil},
		{"x,y\n1,\"a\nb\"c\n", nil, codeStrayQuote, 3, nil},
		{"x,y\n1,2\n3,a\"\n", nil, codeStrayQuote, 3, nil},
		{"x,y\n1,2\n3,4\r5,6\n", nil, codeStrayReturn, 3, nil},
		{"x,y\n1,2\n3,\xe9t\xe9\n", nil, codeInvalidUTF8, 3, nil},
		{"\"x\",\"y\nz\"\n1,\"a\nb\"\noops,4\n", numbers, codeBadCell, 5, []int{2}},
		{"y,x\n\"a\nb\",oops\n", numbers, codeBadCell, 3, []int{1}}, // the cell's line, not the row's
		{"1,2\n3,4\n", nil, codeNoHeader, 1, nil},
		{"\"1\"\n2\n", nil, codeNoHeader, 1, nil},
		{"", nil, codeNoHeader, 0, nil},
		{"\ufeff\r\n\n", nil, codeNoHeader, 0, nil},
		{"x,y", nil, codeNoRows, 0, nil},
		{"x,y\n\n\r\n", nil, codeNoRows, 0, nil},
		{"x,y\n , \n", &CSVOptions{Types: map[string]Kind{"x": NumberColumn}}, codeBadCell, 2, []int{1}},
		{"x\n \"1\"\n", nil, codeStrayQuote, 2, nil},
		{"x\n01x\n", numbers, codeBadCell, 2, []int{1}},
		{"x\nyes\n", &CSVOptions{Types: map[string]Kind{"x": BoolColumn}}, codeBadCell, 2, []int{1}},
		{"x\nNA\n", numbers, codeBadCell, 2, []int{1}},
	} {
		_, err := ReadCSV(strings.NewReader(c.text), c.opts)
		e := wantCode(t, err, c.code)
		if e.Line != c.line || !slices.Equal(e.Rows, c.rows) {
			t.Errorf("%q: line %d, rows %v; want %d, %v", c.text, e.Line, e.Rows, c.line, c.rows)
		}
	}
}

func TestReadCSVOptions(t *testing.T) {
	for _, opts := range []*CSVOptions{
		{Comma: '"'}, {Comma: '\n'}, {Comma: '\r'}, {Comma: '\ufffd'}, {Comma: -1}, {Comma: 0xd800}, {Comma: 0x110000},
		{MaxBytes: -1},
		{Types: map[string]Kind{"x": TextColumn + 1}},
		{Types: map[string]Kind{"z": TextColumn}},
	} {
		_, err := ReadCSV(strings.NewReader("x,y\n1,2\n"), opts)
		wantCode(t, err, codeBadOption)
	}
	opts := &CSVOptions{Types: map[string]Kind{"x": TextColumn}}
	readCSV(t, "x\n1\n", opts)
	if opts.Comma != 0 || opts.MaxBytes != 0 {
		t.Error("ReadCSV wrote into the caller's options")
	}
}

func TestReadCSVMaxBytes(t *testing.T) {
	const text = "\ufeffx,y\n1,2\n"
	for _, reader := range []func() io.Reader{
		func() io.Reader { return strings.NewReader(text) },
		func() io.Reader { return iotest.OneByteReader(strings.NewReader(text)) },
	} {
		if _, err := ReadCSV(reader(), &CSVOptions{MaxBytes: int64(len(text))}); err != nil {
			t.Errorf("a text of MaxBytes bytes: %v", err)
		}
		_, err := ReadCSV(reader(), &CSVOptions{MaxBytes: int64(len(text)) - 1})
		wantCode(t, err, codeTooLarge)
	}
	if _, err := ReadCSV(strings.NewReader(text), &CSVOptions{MaxBytes: math.MaxInt64}); err != nil {
		t.Errorf("the largest MaxBytes: %v", err)
	}
	// Nothing beyond the limit is read.
	endless := &countingReader{}
	_, err := ReadCSV(endless, &CSVOptions{MaxBytes: 1000})
	wantCode(t, err, codeTooLarge)
	if endless.given > 1001 {
		t.Errorf("%d bytes were read under a limit of 1000", endless.given)
	}
}

// A countingReader never ends.
type countingReader struct{ given int }

func (r *countingReader) Read(p []byte) (int, error) {
	for i := range p {
		p[i] = 'x'
	}
	r.given += len(p)
	return len(p), nil
}

// TestReadCSVColumnLimit reaches the limit on columns by lowering it.
func TestReadCSVColumnLimit(t *testing.T) {
	for limit, ok := range map[int]bool{3: true, 2: false} {
		s := newCSVScanner([]byte("a,b,c\n1,2,3\n"), ',')
		s.maxColumns = limit
		_, err := readHeader(s, &CSVOptions{})
		if ok != (err == nil) || !ok && (err.Code != codeTooLarge || err.Line != 1) {
			t.Errorf("limit %d on 3 columns: %v", limit, err)
		}
	}
	if newCSVScanner(nil, ',').maxColumns != maxTableColumns {
		t.Error("the limit on columns is not in force")
	}
	if err := tooManyColumns(maxTableColumns); err != nil {
		t.Error(err)
	}
	if err := tooManyColumns(maxTableColumns + 1); err == nil || err.Code != codeTooLarge {
		t.Error("a table may have more columns than the limit")
	}
}

// TestReadCSVRoom checks that the room made ahead never outgrows the text.
func TestReadCSVRoom(t *testing.T) {
	for _, text := range []string{"", "x", strings.Repeat("\n", 1<<18), strings.Repeat("1,2\n", 1<<18), strings.Repeat("1", 1<<18)} {
		for _, cols := range []int{1, 2, 3, 1000} {
			if room := newCSVScanner([]byte(text), ',').rowsAhead(cols); room < 1 || (room-1)*max(2, cols) > len(text) {
				t.Errorf("room for %d rows of %d cells in %d bytes", room, cols, len(text))
			}
		}
	}
}

func TestReadCSVFailingReader(t *testing.T) {
	cause := errors.New("disk on fire")
	_, err := ReadCSV(io.MultiReader(strings.NewReader("x,y\n"), iotest.ErrReader(cause)), nil)
	wantCode(t, err, codeReadFailed)
	if !errors.Is(err, cause) {
		t.Errorf("the cause is lost: %v", err)
	}
	_, err = ReadCSV(nil, nil)
	wantCode(t, err, codeReadFailed)
	for _, claim := range []int{0, -1, 1 << 30} { // readers that break io.Reader's contract
		_, err = ReadCSV(brokenReader(claim), nil)
		wantCode(t, err, codeReadFailed)
	}
	for _, text := range []string{"x\n1\n", "x\n" + strings.Repeat("1\n", 10000)} {
		for name, r := range map[string]io.Reader{
			"data with EOF": iotest.DataErrReader(strings.NewReader(text)),
			"halves":        iotest.HalfReader(strings.NewReader(text)),
			"false length":  &falseLength{strings.NewReader(text), -5},
			"other length":  &falseLength{strings.NewReader(text), 3},
		} {
			if table, err := ReadCSV(r, nil); err != nil || table.Rows() != len(text)/2-1 {
				t.Errorf("%s: %v", name, err)
			}
		}
	}
}

// A brokenReader claims to have read that many bytes, without an error.
type brokenReader int

func (r brokenReader) Read([]byte) (int, error) { return int(r), nil }

// A falseLength says a wrong Len.
type falseLength struct {
	io.Reader
	length int
}

func (r *falseLength) Len() int { return r.length }

// TestReadCSVWritten reads back what encoding/csv writes from random cells,
// and compares with the cells. Tables of one column are left out: the writer
// makes a blank line of an empty cell there, which is passed over.
func TestReadCSVWritten(t *testing.T) {
	pieces := []string{"a", "é", ",", "\"", "\n", "\r\n", " ", "1", "007", "NaN", "true", ";", "", "x y"}
	rng := rand.New(rand.NewPCG(3, 1))
	for round := range 2000 {
		cols, rows := 2+rng.IntN(3), 1+rng.IntN(6)
		records := make([][]string, rows+1)
		opts := &CSVOptions{Types: map[string]Kind{}}
		for i := range records {
			records[i] = make([]string, cols)
			for j := range records[i] {
				for range rng.IntN(4) {
					records[i][j] += pieces[rng.IntN(len(pieces))]
				}
				if i == 0 {
					records[i][j] = "c" + strconv.Itoa(j) + records[i][j]
					opts.Types[records[i][j]] = TextColumn
				}
			}
		}
		var b bytes.Buffer
		w := csv.NewWriter(&b)
		if err := w.WriteAll(records); err != nil {
			t.Fatal(err)
		}
		text := b.String()
		table, err := ReadCSV(&b, opts)
		if err != nil {
			t.Fatalf("seed 3,1, round %d: %q: %v", round, text, err)
		}
		for j, name := range records[0] {
			c := table.column(name)
			if c == nil || table.rows != rows {
				t.Fatalf("seed 3,1, round %d: %q: %d rows, column %q %v", round, text, table.rows, name, c)
			}
			for i := range rows {
				cell, missing := records[i+1][j], c.miss != nil && c.miss[i]
				if missing != (cell == "") || !missing && c.dict[c.codes[i]] != cell {
					t.Fatalf("seed 3,1, round %d: %q: row %d of %q is not %q", round, text, i+1, name, cell)
				}
			}
		}
	}
}

// plainTable is the plain way to read: encoding/csv takes the cells apart and
// every column is judged after the fact, in separate passes. It knows no
// options, and no CR or blank line inside quotes, which encoding/csv changes.
func plainTable(text string) (*Table, bool) {
	r := csv.NewReader(strings.NewReader(strings.TrimPrefix(text, "\ufeff")))
	r.FieldsPerRecord = 0
	records, err := r.ReadAll()
	if err != nil || len(records) < 2 {
		return nil, false
	}
	columns := make([]Column, len(records[0]))
	for j, name := range records[0] {
		var cells []string
		miss := make([]bool, len(records)-1)
		all := [3]bool{true, true, true}
		for i, record := range records[1:] {
			cells = append(cells, record[j])
			if miss[i] = record[j] == ""; miss[i] {
				continue
			}
			_, class := parseNumeral([]byte(record[j]))
			all[NumberColumn] = all[NumberColumn] && class == plainNumeral
			low := strings.ToLower(record[j])
			all[BoolColumn] = all[BoolColumn] && (low == "true" || low == "false")
		}
		switch {
		case all[NumberColumn]:
			values := make([]float64, len(cells))
			for i, cell := range cells {
				values[i], _ = parseNumeral([]byte(cell))
			}
			columns[j] = Numbers(name, values).Missing(miss)
		case all[BoolColumn]:
			values := make([]bool, len(cells))
			for i, cell := range cells {
				values[i] = strings.EqualFold(cell, "true")
			}
			columns[j] = Bools(name, values).Missing(miss)
		default:
			columns[j] = Texts(name, cells).Missing(miss)
		}
	}
	table, err := NewTable(columns...)
	return table, err == nil
}

// TestReadCSVPlain compares with plainTable on random texts, good and bad.
func TestReadCSVPlain(t *testing.T) {
	pieces := []string{"1", "2.5", "-3", "007", "a", "true", "False", ",", ",", ",", "\n", "\n", "\"", "\"\"", "\"b,c\"", " ", "nan", "é"}
	rng := rand.New(rand.NewPCG(4, 1))
	read := 0
	for round := range 50000 {
		text := []string{"x,y\n", "x\n", "x,y,z\n"}[rng.IntN(3)]
		for range rng.IntN(14) {
			text += pieces[rng.IntN(len(pieces))]
		}
		want, ok := plainTable(text)
		got, err := ReadCSV(strings.NewReader(text), nil)
		if ok != (err == nil) {
			t.Fatalf("seed 4,1, round %d: %q: %v, but the plain reader is ok: %v", round, text, err, ok)
		}
		if ok && !sameTable(got, want) {
			t.Fatalf("seed 4,1, round %d: %q gives\n%swant\n%s", round, text, render(got), render(want))
		}
		if ok {
			read++
		}
	}
	if read < 3000 {
		t.Errorf("only %d of the random texts can be read; the test shows little", read)
	}
}

// TestReadCSVManyRows crosses the room that columns are made with.
func TestReadCSVManyRows(t *testing.T) {
	const rows = 200_000
	var b strings.Builder
	b.WriteString("x,s,late\n")
	for i := range rows {
		fmt.Fprintf(&b, "%d,F%d,", i, i%7)
		if i == rows-1 {
			b.WriteString("end")
		} else if i%2 == 0 {
			b.WriteString(strconv.Itoa(i % 10))
		}
		b.WriteByte('\n')
	}
	table := readCSV(t, b.String(), nil)
	x, s, late := table.column("x"), table.column("s"), table.column("late")
	if table.Rows() != rows || late.kind != TextColumn || late.odd.line != rows+1 || len(late.dict) != 6 {
		t.Fatalf("rows %d, late %v with %q", table.Rows(), late.kind, late.dict)
	}
	for i := range rows {
		if x.num[i] != float64(i) || s.dict[s.codes[i]] != "F"+strconv.Itoa(i%7) || (i%2 == 1 && i != rows-1) != late.miss[i] {
			t.Fatalf("row %d reads back wrongly", i+1)
		}
	}
}
