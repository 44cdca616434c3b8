package errtext

import (
	"strings"
	"testing"
)

// TestFormat holds the layout: the first line stands alone, the source line
// and a caret line follow, marks as wide as the characters above them.
func TestFormat(t *testing.T) {
	for _, c := range []struct {
		text       string
		start, end int
		message    string
		hint       string
		want       string
	}{
		{"", -1, -1, "the table has no rows", "give one", "design: the table has no rows; give one"},
		{"y ~ x", -1, -1, "no place", "", "design: no place"},
		{"y ~ x", 4, 5, "x holds text", "write cat(x)", "design: 1:5: x holds text; write cat(x)\n    y ~ x\n        ^"},
		{"y ~ x", 5, 5, "a term was expected", "", "design: 1:6: a term was expected\n    y ~ x\n         ^"},
		{"y ~ a +\n  größe + 温度 + z", 20, 26, "no such column", "did you mean T?", "design: 2:11: no such column; did you mean T?\n      größe + 温度 + z\n              ^^^^"},
		{"y ~\ta", 4, 5, "m", "", "design: 1:5: m\n    y ~ a\n        ^"},
		{"y ~ a\r\n+ b", 4, 5, "m", "", "design: 1:5: m\n    y ~ a\n        ^"},
		{"y ~ a", 4, 99, "ends outside", "", "design: 1:5: ends outside\n    y ~ a\n        ^"},
		{"y ~ a", 1, 2, "Is it?", "yes", "design: 1:2: Is it? yes\n    y ~ a\n     ^"},
	} {
		if got := Format("design", c.text, c.start, c.end, c.message, c.hint); got != c.want {
			t.Errorf("got\n%s\nwant\n%s", got, c.want)
		}
	}
	long := strings.Repeat("a + ", 100) + "bad" + strings.Repeat(" + a", 100)
	got := Format("formula", long, 400, 403, "m", "")
	lines := strings.Split(got, "\n")
	if len(lines) != 3 || len([]rune(lines[1])) > maxSnippet+8 {
		t.Fatalf("the snippet of a long line is\n%s", got)
	}
	if at := strings.Index(lines[2], "^^^"); []rune(lines[1])[at] != 'b' || !strings.HasSuffix(lines[1], "…") {
		t.Errorf("the marks are not under the place:\n%s", got)
	}
}

func TestWords(t *testing.T) {
	for _, c := range []struct{ got, want string }{
		{Rows([]int{3}, 1), "row 3"},
		{Rows([]int{3, 17}, 2), "rows 3 and 17"},
		{Rows([]int{1, 2, 3, 4, 5, 6}, 17), "rows 1, 2, 3, 4, 5 and 12 more"},
		{And(nil), ""}, {And([]string{"a"}), "a"}, {And([]string{"a", "b", "c"}), "a, b and c"},
		{Or([]string{"a", "b"}), "a or b"},
		{Count(1, "row"), "1 row"}, {Count(0, "row"), "0 rows"},
		{Alike("Hold", "hold"), "case"}, {Alike("hold ", "hold"), "spaces"},
		{Alike("Gr\u00f6\u00dfe", "Gro\u0308\u00dfe"), "Unicode form"}, {Alike("a", "b"), ""}, {Alike("a", "a"), ""},
		{Alike(" HOLD", "hold"), "case and spaces"},
	} {
		if c.got != c.want {
			t.Errorf("got %q, want %q", c.got, c.want)
		}
	}
}

// TestNearest: slips of the pen are found, words that merely look alike are not.
func TestNearest(t *testing.T) {
	for _, c := range []struct {
		word, want string
		candidates []string
	}{
		{"furnce", "furnace", []string{"hold", "furnace"}},
		{"hodl", "hold", []string{"cold", "hold"}}, // a swap is one step, like a letter changed; the earlier one loses only when farther
		{"temp", "", []string{"hold", "furnace"}},
		{"x", "", []string{"y", "z"}},
		{"x", "X", []string{"X"}},
		{"hold", "", []string{"hold", "holt"}}, // it is there
	} {
		got, ok := Nearest(c.word, c.candidates)
		if got != c.want || ok != (c.want != "") {
			t.Errorf("Nearest(%q, %q) = %q, %v; want %q", c.word, c.candidates, got, ok, c.want)
		}
	}
}

// TestPosition counts lines and characters from 1 and never leaves the text.
func TestPosition(t *testing.T) {
	const text = "a\ngröße + x\r\n温度"
	for _, c := range []struct{ offset, line, col int }{
		{-1, 1, 1}, {0, 1, 1}, {1, 1, 2}, {2, 2, 1}, {strings.Index(text, "+"), 2, 7}, {strings.Index(text, "度"), 3, 2}, {len(text), 3, 3}, {len(text) + 9, 3, 3},
	} {
		if line, col := Position(text, c.offset); line != c.line || col != c.col {
			t.Errorf("offset %d is %d:%d, want %d:%d", c.offset, line, col, c.line, c.col)
		}
	}
}

// TestHiddenCharacters: what cannot be seen, or turns the direction of writing,
// is shown as a space, so that the marks stay under the place.
func TestHiddenCharacters(t *testing.T) {
	for _, hidden := range []string{"\u202e", "\u200b", "\x00", "\x1b", "\u2028", "\ufeff", "\xff"} {
		text := "y ~ " + hidden + "x"
		want := "formula: 1:5: m\n    y ~  x\n        ^"
		if got := Format("formula", text, 4, 4+len(hidden), "m", ""); got != want {
			t.Errorf("%q:\ngot  %q\nwant %q", hidden, got, want)
		}
	}
}

// TestNearestLimits: one letter in three may be wrong, and one in the shortest words.
func TestNearestLimits(t *testing.T) {
	for _, c := range []struct {
		word, candidate string
		want            bool
	}{
		{"lgo", "log", true}, {"lxx", "log", false}, {"poison", "poisson", true}, {"ab", "ac", false}, {"AB", "ab", true},
		{"furnaec", "furnace", true}, {"supplierxxxx", "supplier", true}, {"supplierxxxxx", "supplier", false}, {strings.Repeat("x", 201), strings.Repeat("x", 200), false},
	} {
		if _, ok := Nearest(c.word, []string{c.candidate}); ok != c.want {
			t.Errorf("Nearest(%q, %q) = %v, want %v", c.word, c.candidate, ok, c.want)
		}
	}
}
