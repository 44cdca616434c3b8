package design

import (
	"database/sql/driver"
	"errors"
	"fmt"
	"os"
	"strings"
	"testing"
	"testing/iotest"
	"time"

	"example.com/trammel/formula"
)

// TestTableRefusals compares the whole texts of the refusals with
// testdata/refusals_table.txt; TRAMMEL_UPDATE=1 writes that file anew.
func TestTableRefusals(t *testing.T) {
	csv := func(text string, opts *CSVOptions) error {
		_, err := ReadCSV(strings.NewReader(text), opts)
		return err
	}
	table := func(columns ...Column) error {
		_, err := NewTable(columns...)
		return err
	}
	structs := func(slice any) error {
		_, err := FromStructs(slice)
		return err
	}
	query := func(name, typ string, values ...driver.Value) error {
		c := &cannedResult{names: []string{name}, types: []string{typ}}
		for _, v := range values {
			c.rows = append(c.rows, []driver.Value{v})
		}
		_, err := FromRows(c.query(t))
		return err
	}
	numbers := &CSVOptions{Types: map[string]Kind{"hold": NumberColumn}}
	tooMany := make([]Column, maxTableColumns+1)
	full := newBuilder("note")
	full.maxDict = 1
	full.become(TextColumn)
	full.addText("a")
	full.addText("b")
	_, fullErr := full.finish()

	var got strings.Builder
	seen := make(map[Code]bool)
	for _, c := range []struct {
		name string
		err  error
	}{
		{"csv: empty", csv("", nil)},
		{"csv: no header", csv("1,2.5\n3,4\n", nil)},
		{"csv: no rows", csv("hold,porosity\n", nil)},
		{"csv: one name twice", csv("hold,porosity,hold\n1,2,3\n", nil)},
		{"csv: quoted name twice", csv("\"Hold \"\"h\"\"\",\"Hold \"\"h\"\"\"\n1,2\n", nil)},
		{"csv: name over two lines twice", csv("\"Hold\ntime\",\"Hold\ntime\"\n1,2\n", nil)},
		{"csv: empty name", csv("hold,,porosity\n1,2,3\n", nil)},
		{"csv: row too short", csv("hold,porosity\n1,2\n3\n", nil)},
		{"csv: row too long", csv("hold,porosity\n1,2,3\n", nil)},
		{"csv: decimal commas", csv("hold;porosity\n1,5;2,5\n", nil)},
		{"csv: stray quote", csv("hold,pipe\n1,3\" long\n", nil)},
		{"csv: text after quote", csv("hold,pipe\n1,\"3\" long\n", nil)},
		{"csv: unclosed quote", csv("hold,pipe\n1,\"3 long\n2,4\n"+strings.Repeat("5,6\n", 40), nil)},
		{"csv: lone carriage return", csv("hold,pipe\r1,2\r", nil)},
		{"csv: not UTF-8", csv("hold,grade\n1,tr\xe8s fin\n", nil)},
		{"csv: not UTF-8 from the start", csv("\xff\xfeh\x00", nil)},
		{"csv: not a number", csv("hold\n1\n12 min\n", numbers)},
		{"csv: space beside a number", csv("hold\n12 \n", numbers)},
		{"csv: decimal comma", csv("hold\n\"1,5\"\n", numbers)},
		{"csv: not true or false", csv("hold\ntrue\nyes\n", &CSVOptions{Types: map[string]Kind{"hold": BoolColumn}})},
		{"csv: long cell", csv("hold\n"+strings.Repeat("é", 100)+"\n", numbers)},
		{"csv: unknown name in Types", csv("Hold\n1\n", numbers)},
		{"csv: far name in Types", csv("porosity\n1\n", numbers)},
		{"csv: bad kind in Types", csv("hold\n1\n", &CSVOptions{Types: map[string]Kind{"hold": 7}})},
		{"csv: bad Comma", csv("hold\n1\n", &CSVOptions{Comma: '"'})},
		{"csv: impossible Comma", csv("hold\n1\n", &CSVOptions{Comma: -1})},
		{"csv: bad MaxBytes", csv("hold\n1\n", &CSVOptions{MaxBytes: -1})},
		{"csv: too long", csv("hold\n1\n", &CSVOptions{MaxBytes: 4})},
		{"csv: reader fails", func() error { _, err := ReadCSV(failingReader{}, nil); return err }()},
		{"csv: reader fails at length", func() error {
			_, err := ReadCSV(iotest.ErrReader(errors.New("disk 1:\n  on fire")), nil)
			return err
		}()},
		{"csv: nil reader", func() error { _, err := ReadCSV(nil, nil); return err }()},

		{"table: zero column", table(Numbers("hold", nil), Column{})},
		{"table: no name", table(Numbers("", nil))},
		{"table: one name twice", table(Numbers("hold", nil), Bools("hold", nil))},
		{"table: name not UTF-8", table(Numbers("h\xff", nil))},
		{"table: lengths", table(Numbers("hold", []float64{1, 2}), Texts("furnace", []string{"F1"}))},
		{"table: mask", table(Numbers("Hold time", []float64{1, 2}).Missing([]bool{true}))},
		{"table: text not UTF-8", table(Texts("furnace", []string{"F1", "F\xff"}))},
		{"table: too many columns", table(tooMany...)},
		{"table: too many texts", fullErr},

		{"structs: nil", structs(nil)},
		{"structs: map", structs(map[string]int{})},
		{"structs: nil element", structs([]*samplePlace{nil})},
		{"structs: date", structs([]struct{ Day time.Time }{})},
		{"structs: duration", structs([]struct{ Hold time.Duration }{})},
		{"structs: slice field", structs([]struct{ Values []float64 }{})},
		{"structs: embedded pointer", structs([]struct{ *sampleMachine }{})},
		{"structs: hidden field", structs([]struct {
			x int `trammel:"x"` //lint:ignore U1000 read by reflection only
		}{})},
		{"structs: one name twice", structs([]struct {
			samplePlace
			Site string `trammel:"site"`
		}{})},

		{"query: nil", func() error { _, err := FromRows(nil); return err }()},
		{"query: no rows", query("hold", "")},
		{"query: no name", query("", "", 1.0)},
		{"query: date", query("day", "", time.Time{})},
		{"query: date as text", query("day", "DATE", "2024-01-05")},
		{"query: mixed", query("hold", "", 1.0, "12 min")},
		{"query: not a number", query("Hold time", "NUMERIC", "1.5", "12 min")},
		{"query: another type", query("hold", "", []float64{1})},

		{"place in a model", &Error{Code: "example", Message: "hold holds text", Hint: "write cat(hold)",
			Text: "porosity ~ hold", Span: formula.Span{Start: 11, End: 15}}},
	} {
		e, ok := c.err.(*Error)
		if !ok {
			t.Errorf("%s: got %v (%T), want an *Error", c.name, c.err, c.err)
			continue
		}
		seen[e.Code] = true
		fmt.Fprintf(&got, "== %s: %s\n%s\n", c.name, e.Code, e)
	}
	for _, code := range []Code{codeBadCell, codeBadOption, codeDateColumn, codeDuplicateColumn, codeEmptyColumnName,
		codeInvalidUTF8, codeMixedColumn, codeNilElement, codeNoHeader, codeNoRows, codeNotASlice, codeReadFailed,
		codeRowLength, codeStrayQuote, codeStrayReturn, codeTooLarge, codeUnclosedQuote, codeUnequalLengths,
		codeUnmadeColumn, codeUnsupportedType} {
		if !seen[code] {
			t.Errorf("no refusal shows the code %s", code)
		}
	}

	const golden = "testdata/refusals_table.txt"
	if os.Getenv("TRAMMEL_UPDATE") != "" {
		if err := os.WriteFile(golden, []byte(got.String()), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	gotLines, wantLines := strings.Split(got.String(), "\n"), strings.Split(string(want), "\n")
	for i := range max(len(gotLines), len(wantLines)) {
		g, w := "(end)", "(end)"
		if i < len(gotLines) {
			g = gotLines[i]
		}
		if i < len(wantLines) {
			w = wantLines[i]
		}
		if g != w {
			t.Fatalf("%s, line %d:\n got %s\nwant %s", golden, i+1, g, w)
		}
	}
}

type failingReader struct{}

func (failingReader) Read([]byte) (int, error) { return 0, os.ErrClosed }
