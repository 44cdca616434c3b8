package design

import (
	"bytes"
	"errors"
	"strings"
	"testing"
)

// FuzzCSV: reading never panics, what is read is a sound table, refusals are
// of known codes with a text of one line, and where the plain reader of
// csv_test.go follows the same rules it agrees.
func FuzzCSV(f *testing.F) {
	known := make(map[Code]bool)
	for _, c := range Codes() {
		known[c] = true
	}
	f.Add("x,y\n1,2\n", "NA", uint8(','))
	f.Add("\ufeffx;\"y\nz\"\r\n007;true\r\nNaN;\"\"\r\n", "", uint8(';'))
	f.Add("x\n1\n\"a\"b\n", "1", uint8('\t'))
	f.Fuzz(func(t *testing.T, text, word string, comma uint8) {
		if len(text) > 1<<16 {
			return
		}
		table, err := ReadCSV(strings.NewReader(text), &CSVOptions{Comma: rune(comma), MissingWords: []string{word}})
		if err != nil {
			var e *Error
			if !errors.As(err, &e) || !known[e.Code] {
				t.Fatalf("%T of unknown code: %v", err, err)
			}
			if table != nil || e.Message == "" || strings.ContainsAny(err.Error(), "\n\r") || e.Line < 0 || e.Line > 1+strings.Count(text, "\n") {
				t.Fatalf("line %d, text %q", e.Line, err.Error())
			}
		} else {
			checkSound(t, table)
		}
		if strings.ContainsAny(text, "\r") || comma != ',' && comma != 0 || word != "" || bytes.IndexByte([]byte(text), 0) >= 0 {
			return
		}
		if err != nil && (errors.Is(err, codeNoHeader) || errors.Is(err, codeInvalidUTF8)) {
			return // rules that the plain reader does not have
		}
		want, ok := plainTable(text)
		if ok != (err == nil) || ok && !sameTable(table, want) {
			t.Fatalf("the plain reader is ok: %v; ReadCSV: %v", ok, err)
		}
	})
}

// checkSound holds a table against the promises of its layout.
func checkSound(t *testing.T, table *Table) {
	t.Helper()
	for j, c := range table.cols {
		if c.name == "" || table.index[c.name] != j || c.len() != table.rows || table.rows == 0 {
			t.Fatalf("column %d %q has %d of %d rows", j, c.name, c.len(), table.rows)
		}
		stored := 0
		for _, n := range []int{len(c.num), len(c.bits), len(c.codes)} {
			if n > 0 {
				stored++
			}
		}
		if stored != 1 || c.miss != nil && len(c.miss) != table.rows {
			t.Fatalf("column %q stores %d kinds and %d missing marks", c.name, stored, len(c.miss))
		}
		missing, next := 0, int32(0)
		for i := range table.rows {
			gone := c.miss != nil && c.miss[i]
			if gone {
				missing++
			}
			switch c.kind {
			case NumberColumn:
				if gone && c.num[i] == c.num[i] {
					t.Fatalf("column %q: missing cell %d is %v", c.name, i, c.num[i])
				}
			case TextColumn:
				code := c.codes[i]
				if gone != (code == -1) || code > next || code < -1 || int(code) >= len(c.dict) {
					t.Fatalf("column %q: cell %d has code %d, missing %v", c.name, i, code, gone)
				}
				if code == next {
					next++
				}
			}
		}
		if c.miss != nil && missing == 0 || int(next) != len(c.dict) {
			t.Fatalf("column %q: %d missing, %d of %d texts used", c.name, missing, next, len(c.dict))
		}
	}
}
