package formula

import (
	"fmt"
	"os"
	"strings"
	"testing"

	"github.com/alecthomas/participle/v2/lexer"
)

// show writes the tokens of a text as kind and value.
func show(text string) string {
	names := lexer.SymbolsByRune(definition{})
	tokens, _ := scan(text)
	var b strings.Builder
	for _, t := range tokens[:len(tokens)-1] {
		fmt.Fprintf(&b, " %s‹%s›", names[t.Type], t.Value)
	}
	return strings.TrimSpace(b.String())
}

// TestTokens holds the token streams of odd texts.
func TestTokens(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"", ""},
		{" \t\r\n# all comment", ""},
		{"a#b\nc", "Name‹a› Name‹c›"},
		{"asé as", "Name‹asé› Keyword‹as›"},
		{"x.1", "Name‹x› Bad‹.› Number‹1›"},
		{"1e5e", "Bad‹1e5e›"},
		{"1e+5+2E-3", "Number‹1e+5› Operator‹+› Number‹2E-3›"},
		{"1-e", "Number‹1› Operator‹-› Name‹e›"},
		{"010", "Number‹010›"},
		{".5", "Bad‹.5›"},
		{"1..2", "Bad‹1..2›"},
		{"a**b", "Name‹a› Bad‹**› Name‹b›"},
		{"a^b", "Name‹a› Operator‹^› Name‹b›"},
		{"<<=>>=<>", "Operator‹<› Operator‹<=› Operator‹>› Operator‹>=› Operator‹<>›"},
		{"a//b", "Name‹a› Bad‹//› Name‹b›"},
		{"'it''s' 'a''", "Level‹'it''s'› Bad‹'a''›"},
		{`"by""" by`, `Quoted‹"by"""› Keyword‹by›`},
		{`"\n"`, `Quoted‹"\n"›`},
		{"_1 é́x ٣", "Name‹_1› Name‹é́x› Bad‹٣›"},
		{"AS mean Pi pi", "Name‹AS› Name‹mean› Name‹Pi› Keyword‹pi›"},
		{"a\u00a0b\u200bc", "Name‹a› Bad‹\u00a0› Name‹b› Bad‹\u200b› Name‹c›"},
		{"\xff", "Bad‹\xff›"},
		{"'\n'", "Level‹'\n'›"},
	} {
		if got := show(c.text); got != c.want {
			t.Errorf("%q:\n got %s\nwant %s", c.text, got, c.want)
		}
	}
}

// TestOperatorsAreOneToken: each operator and each word of the grammar is one
// token, so that no literal of the grammar can fail to match.
func TestOperatorsAreOneToken(t *testing.T) {
	for _, op := range operators {
		if got, want := show(op), "Operator‹"+op+"›"; got != want {
			t.Errorf("%s gives %s", op, got)
		}
	}
	for _, f := range foreign {
		if got, want := show(f.sign), "Bad‹"+f.sign+"›"; got != want {
			t.Errorf("%s gives %s", f.sign, got)
		}
	}
	for word := range reserved {
		if got, want := show(word), "Keyword‹"+word+"›"; got != want {
			t.Errorf("%s gives %s", word, got)
		}
	}
}

// TestGrammar holds the grammar as the parser itself prints it;
// TRAMMEL_UPDATE=1 writes the file anew.
func TestGrammar(t *testing.T) {
	got := modelParser.String() + "\n\n" + coefParser.String() + "\n"
	const golden = "testdata/grammar.ebnf"
	if os.Getenv("TRAMMEL_UPDATE") != "" {
		if err := os.WriteFile(golden, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	compareLines(t, golden, got, string(want))
}
