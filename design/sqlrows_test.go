package design

import (
	"database/sql/driver"
	"errors"
	"slices"
	"testing"
	"time"
)

func TestFromRows(t *testing.T) {
	canned := &cannedResult{
		names: []string{"x", "n", "open", "furnace", "Bytes of text", "money", "none", "e"},
		types: []string{"DOUBLE", "BIGINT", "BOOL", "VARCHAR", "TEXT", "DECIMAL(10,2)", "INT", "UNSIGNED BIGINT"},
		rows: [][]driver.Value{
			{nil, int64(1), true, "F1", []byte("a"), []byte("007.50"), nil, "12"},
			{1.5, int64(1 << 53), false, nil, []byte("b"), "NaN", nil, int64(3)},
			{-2.0, nil, nil, "F1", []byte("a"), "-Infinity", nil, nil},
			{4, uint8(7), true, "", nil, nil, nil, float32(0.5)},
		},
	}
	rows := canned.query(t)
	table, err := FromRows(rows)
	if err != nil {
		t.Fatal(err)
	}
	const want = "x:number - 1.5 -2 4\nn:number 1 9.007199254740992e+15 - 7\nopen:true/false true false - true\n" +
		"furnace:text \"F1\" - \"F1\" \"\"\nBytes of text:text \"a\" \"b\" \"a\" -\nmoney:number 7.5 NaN -Inf -\n" +
		"none:number - - - -\ne:number 12 3 - 0.5\n"
	if got := render(table); got != want {
		t.Errorf("got\n%swant\n%s", got, want)
	}
	checkSound(t, table)
}

func TestFromRowsLeavesRowsOpen(t *testing.T) {
	canned := &cannedResult{names: []string{"x"}, rows: [][]driver.Value{{1.0}, {"a"}, {2.0}}}
	rows := canned.query(t)
	_, err := FromRows(rows)
	wantCode(t, err, codeMixedColumn)
	if canned.closed || !rows.Next() {
		t.Error("FromRows closed rows that it did not read to the end")
	}
}

func TestFromRowsRefusals(t *testing.T) {
	one := func(name string, values ...driver.Value) *cannedResult {
		c := &cannedResult{names: []string{name}}
		for _, v := range values {
			c.rows = append(c.rows, []driver.Value{v})
		}
		return c
	}
	typed := func(typ string, values ...driver.Value) *cannedResult {
		c := one("x", values...)
		c.types = []string{typ}
		return c
	}
	for _, c := range []struct {
		name   string
		canned *cannedResult
		code   Code
		rows   []int
	}{
		{"no rows", one("x"), codeNoRows, nil},
		{"time", one("day", nil, time.Time{}), codeDateColumn, []int{2}},
		{"text under a date type", typed("DATETIME", []byte("2024-01-05 10:00:00")), codeDateColumn, []int{1}},
		{"text under a long date type", typed("timestamp with time zone", "2024-01-05"), codeDateColumn, []int{1}},
		{"no name", one("", 1.0), codeEmptyColumnName, nil},
		{"one name twice", &cannedResult{names: []string{"x", "y", "x"}}, codeDuplicateColumn, nil},
		{"number then text", one("x", 1.0, nil, "a"), codeMixedColumn, []int{3}},
		{"text then number", one("x", "1", int64(1)), codeMixedColumn, []int{2}},
		{"number then true", one("x", 1.0, true), codeMixedColumn, []int{2}},
		{"text under a number type", typed("numeric", []byte("12"), []byte("12 min")), codeBadCell, []int{2}},
		{"text and true under a number type", typed("INT", true, "12"), codeMixedColumn, []int{2}},
		{"not UTF-8", one("x", []byte("a"), []byte("\xff\xfe")), codeInvalidUTF8, []int{2}},
		{"another type", one("x", []float64{1}), codeUnsupportedType, []int{1}},
		{"duration", one("x", time.Hour), codeUnsupportedType, []int{1}},
	} {
		t.Run(c.name, func(t *testing.T) {
			table, err := FromRows(c.canned.query(t))
			e := wantCode(t, err, c.code)
			if table != nil || !slices.Equal(e.Rows, c.rows) {
				t.Errorf("rows %v, want %v: %v", e.Rows, c.rows, err)
			}
		})
	}
}

func TestFromRowsFailures(t *testing.T) {
	_, err := FromRows(nil)
	wantCode(t, err, codeReadFailed)

	canned := &cannedResult{names: []string{"x"}, rows: [][]driver.Value{{1.0}, {2.0}, {3.0}}, failAt: 3}
	_, err = FromRows(canned.query(t))
	wantCode(t, err, codeReadFailed)
	if !errors.Is(err, errCanned) {
		t.Errorf("the cause is lost: %v", err)
	}

	rows := (&cannedResult{names: []string{"x"}, rows: [][]driver.Value{{1.0}}}).query(t)
	rows.Close()
	_, err = FromRows(rows)
	wantCode(t, err, codeReadFailed)
}

func TestParseQueryNumber(t *testing.T) {
	for text, ok := range map[string]bool{
		"1": true, "-1.50": true, "007": true, "1e3": true, "NaN": true, "Infinity": true, "-infinity": true, "+INF": true,
		"": false, "x": false, "xinfinity": false, "infinityx": false, "--infinity": false, " 1": false, "1,000": false,
	} {
		if _, got := parseQueryNumber(text); got != ok {
			t.Errorf("parseQueryNumber(%q) is ok: %v, want %v", text, got, ok)
		}
	}
}
