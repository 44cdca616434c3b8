package formula

import (
	"errors"
	"strings"
	"testing"
	"unicode/utf8"
)

// refusedWell checks that a refusal of text is one of ours, placed in the text.
func refusedWell(t *testing.T, text string, err error) {
	t.Helper()
	var e *Error
	if !errors.As(err, &e) {
		t.Fatalf("%q: %v (%T) is no refusal of this package", text, err, err)
	}
	if e.Code == "" || e.Message == "" || e.Text != text || e.Err != nil {
		t.Fatalf("%q: incomplete refusal %+v", text, e)
	}
	if e.Span.Start < 0 || e.Span.End < e.Span.Start || e.Span.End > len(text) {
		t.Fatalf("%q: span %v", text, e.Span)
	}
	if s := e.Error(); utf8.ValidString(text) && !utf8.ValidString(s) || len(s) > 4000 {
		t.Fatalf("%q: the refusal has %d bytes: %q", text, len(s), s)
	}
}

// FuzzParse: never a panic; what parses prints to a text that parses to the
// same tree and prints the same.
func FuzzParse(f *testing.F) {
	for _, c := range roundTrips {
		f.Add(c.text)
	}
	for _, text := range refused {
		f.Add(text)
	}
	// A long level once stood in full in the remedy.
	f.Add("'" + strings.Repeat("\x06", 5000) + "' = f ~ x")
	f.Fuzz(func(t *testing.T, text string) {
		m, err := Parse(text)
		if err != nil {
			refusedWell(t, text, err)
			return
		}
		printed := m.String()
		if len(printed) > maxText {
			return // spaces round + and - may carry a text over the limit
		}
		again, err := Parse(printed)
		if err != nil {
			t.Fatalf("%q prints as %q, which is refused: %v", text, printed, err)
		}
		if !sameTree(m, again) || again.String() != printed {
			t.Fatalf("%q prints as %q, which parses to %q", text, printed, again)
		}
		if strings.Contains(printed, "\n") && !strings.ContainsAny(text, `"'`) {
			t.Fatalf("%q prints over several lines", text)
		}
	})
}

// FuzzParseCoef: the same for names of coefficients.
func FuzzParseCoef(f *testing.F) {
	for _, text := range coefNames {
		f.Add(text)
	}
	for _, text := range refusedCoefs {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		c, err := ParseCoef(text)
		if err != nil {
			refusedWell(t, text, err)
			return
		}
		printed := c.String()
		if len(printed) > maxText {
			return
		}
		again, err := ParseCoef(printed)
		if err != nil {
			t.Fatalf("%q prints as %q, which is refused: %v", text, printed, err)
		}
		if !sameTree(c, again) || again.String() != printed {
			t.Fatalf("%q prints as %q, which parses to %q", text, printed, again)
		}
	})
}
