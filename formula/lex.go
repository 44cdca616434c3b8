package formula

import (
	"io"
	"strings"
	"unicode"
	"unicode/utf8"

	"github.com/alecthomas/participle/v2/lexer"
)

// The kinds of token. A token's value is its source text, quotes included, so
// that a quoted name never matches a word of the grammar and ends are known.
const (
	tokenName lexer.TokenType = iota + 1
	tokenQuoted
	tokenLevel
	tokenNumber
	tokenKeyword
	tokenOperator
	tokenBad // refused; the reason is kept beside the tokens
)

// operators, longer ones first: the first that fits is taken.
var operators = []string{"<>", "<=", ">=", "<", ">", "=", "+", "-", "*", "/", "^", "~", "(", ")", "[", "]", ","}

// foreign lists signs that other notations use, longer ones first, with what
// to write here.
var foreign = []struct{ sign, hint string }{
	{"===", "write = inside parentheses or an argument"},
	{"<->", "write * or by"},
	{"**", "write ^ inside num(…), as in num(x^2)"},
	{"==", "write = inside parentheses or an argument, as in num(m = 2)"},
	{"!=", "write <>, as in num(m <> 2)"},
	{"=>", "write >="},
	{"=<", "write <="},
	{"&&", "multiply comparisons: num((x > 1)*(z > 2))"},
	{"||", "take the larger comparison: num(max(x > 1, z > 2))"},
	{"//", "write / for a quotient and # before a comment"},
	{"->", "write ~ between response and terms"},
	{":=", "write = between response and equation"},
	{"%%", "there is no remainder of a division here"},
	{":", "write by for an interaction: a by b"},
	{"|", "write inside for nesting, or by for one slope per level: x by cat(m)"},
	{"&", "multiply comparisons: num((x > 1)*(z > 2))"},
	{"!", "compare with false: num(open = false)"},
	{"%", "divide by 100 for a percentage; there is no remainder of a division"},
	{"{", "write ( and ) for grouping"},
	{"}", "write ( and ) for grouping"},
	{";", "separate arguments by a comma and clauses by a space"},
	{"@", "put a column name with this sign in double quotes"},
	{"$", "put a column name with this sign in double quotes"},
	{"`", `put a column name in double quotes: "Hold time"`},
	{"?", "write if(condition, a, b)"},
	{`\`, "a text may go over several lines without any sign at their ends"},
	{".", `a name has no dot; put a column name with dots in double quotes: "oven.1"`},
}

// scan cuts the whole text into tokens, the last one the end. Where a piece is
// refused, a bad token stands and the reason is returned under its offset, so
// that the parser can report an earlier fault first.
func scan(text string) ([]lexer.Token, map[int]*Error) {
	tokens := make([]lexer.Token, 0, 16+len(text)/4)
	bad := make(map[int]*Error)
	for i := 0; i < len(text); {
		kind, n, e := scanOne(text, i)
		if e != nil {
			kind = tokenBad
			bad[i] = e
		}
		if kind != 0 {
			tokens = append(tokens, lexer.Token{Type: kind, Value: text[i : i+n], Pos: lexer.Position{Offset: i, Line: 1, Column: i + 1}})
		}
		i += n
	}
	end := lexer.EOFToken(lexer.Position{Offset: len(text), Line: 1, Column: len(text) + 1})
	return append(tokens, end), bad
}

// scanOne reads the piece at i: its kind (0 for white space and comments) and
// its length in bytes.
func scanOne(text string, i int) (lexer.TokenType, int, *Error) {
	rest := text[i:]
	r, size := utf8.DecodeRuneInString(rest)
	switch {
	case r == ' ' || r == '\t' || r == '\n' || r == '\r':
		return 0, 1, nil
	case r == '#':
		end := strings.IndexByte(rest, '\n')
		if end < 0 {
			end = len(rest)
		}
		for k, r := range rest[:end] {
			if r != '\t' && r != '\r' && isHidden(r) {
				if k > 0 {
					return 0, k, nil // the comment up to here; the next piece is refused
				}
			}
		}
		return 0, end, nil
	case r == '"':
		return quoted(rest, i, tokenQuoted)
	case r == '\'':
		return quoted(rest, i, tokenLevel)
	case r >= '0' && r <= '9', r == '.' && len(rest) > 1 && rest[1] >= '0' && rest[1] <= '9' && !endsName(text[:i]):
		return number(rest, i)
	case isNameStart(r):
		n := strings.IndexFunc(rest, func(r rune) bool { return !isNamePart(r) })
		if n < 0 {
			n = len(rest)
		}
		if reserved[rest[:n]] {
			return tokenKeyword, n, nil
		}
		return tokenName, n, nil
	}
	for _, f := range foreign {
		if strings.HasPrefix(rest, f.sign) {
			at := Span{i, i + len(f.sign)}
			return 0, len(f.sign), refuse(codeForeignOperator, at, f.hint, "%s has no meaning here", f.sign)
		}
	}
	for _, op := range operators {
		if strings.HasPrefix(rest, op) {
			return tokenOperator, len(op), nil
		}
	}
	at := Span{i, i + size}
	switch {
	case unicode.IsSpace(r):
		return 0, size, refuse(codeBadCharacter, at, "write an ordinary space",
			"the space character U+%04X cannot be told from an ordinary space", r)
	case isHidden(r):
		return 0, size, refuse(codeBadCharacter, at, "take it out; inside quotes it may stand",
			"the character U+%04X cannot be seen", r)
	}
	return 0, size, refuse(codeBadCharacter, at, "put a column name with this character in double quotes",
		"the character %c has no meaning here", r)
}

// endsName tells that a name ends where the text does: oven.1 is meant as one.
func endsName(text string) bool {
	r, _ := utf8.DecodeLastRuneInString(text)
	return isNamePart(r)
}

// isHidden recognises control and invisible format characters.
func isHidden(r rune) bool { return unicode.In(r, unicode.Cc, unicode.Cf, unicode.Zl, unicode.Zp) }

// quoted reads a name or a level up to its closing quote; doubled quotes stand
// for one.
func quoted(rest string, at int, kind lexer.TokenType) (lexer.TokenType, int, *Error) {
	quote := rest[0]
	for k := 1; k < len(rest); k++ {
		if rest[k] != quote {
			continue
		}
		if k+1 < len(rest) && rest[k+1] == quote {
			k++
			continue
		}
		if k == 1 && kind == tokenQuoted {
			return 0, 2, refuse(codeEmptyName, Span{at, at + 2}, "give the column's name", "a column name is empty")
		}
		return kind, k + 1, nil
	}
	what, hint := "level", `end it with '; a quote inside is doubled: 'O''Neill'`
	if kind == tokenQuoted {
		what, hint = "column name", `end it with "; a quote inside is doubled: "pipe 3"" long"`
	}
	return 0, len(rest), refuse(codeUnclosedQuote, Span{at, at + 1}, hint, "the quoted %s that begins here does not end", what)
}

// unquote takes the quotes off the source text of a quoted name or level.
func unquote(s string) string {
	return strings.ReplaceAll(s[1:len(s)-1], s[:1]+s[:1], s[:1])
}

// number reads digits [ . digits ] [ e [sign] digits ]. Letters, digits or a
// point right behind belong to the same piece, which is then refused.
func number(rest string, at int) (lexer.TokenType, int, *Error) {
	digits := func(k int) int {
		for k < len(rest) && rest[k] >= '0' && rest[k] <= '9' {
			k++
		}
		return k
	}
	n := digits(0)
	whole := n
	if n+1 < len(rest) && rest[n] == '.' && digits(n+1) > n+1 {
		n = digits(n + 1)
	}
	mantissa := n
	if n < len(rest) && (rest[n] == 'e' || rest[n] == 'E') {
		k := n + 1
		if k < len(rest) && (rest[k] == '+' || rest[k] == '-') {
			k++
		}
		if digits(k) > k {
			n = digits(k)
		}
	}
	all := n
	for all < len(rest) {
		r, size := utf8.DecodeRuneInString(rest[all:])
		if !isNamePart(r) && r != '.' {
			break
		}
		all += size
	}
	here := Span{at, at + all}
	piece := rest[:all]
	switch {
	case whole == 0 && all == n:
		return 0, all, refuse(codeBadNumber, here, "", "a number begins with a digit").pasting("0" + piece)
	case all == n && n > maxLiteral:
		return 0, all, refuse(codeBadNumber, here, "round it", "the number has %d characters; at most %d are read", n, maxLiteral)
	case all == n:
		if _, ok := parseNumber(piece); !ok {
			return 0, all, refuse(codeBadNumber, here, "numbers go up to 1.79e308", "the number %s is too large", shorten(piece))
		}
		return tokenNumber, n, nil
	case piece == rest[:n]+".":
		return 0, all, refuse(codeBadNumber, here, "", "a digit was expected after the point").pasting(rest[:n])
	case n == mantissa && (rest[n] == 'e' || rest[n] == 'E') && all == n+1:
		return 0, all, refuse(codeBadNumber, here, "write digits after the e, as in 1e3", "%s is no number", shorten(piece))
	}
	return 0, all, refuse(codeBadNumber, here, "write 2*x for a product, and put a column name that begins with a digit in double quotes",
		"%s is neither a number nor a name", shorten(piece))
}

// shorten cuts a piece of text to be quoted in a sentence.
func shorten(s string) string {
	if r := []rune(s); len(r) > maxSentence {
		return string(r[:maxSentence]) + "…"
	}
	return s
}

func spanOf(t lexer.Token) Span { return Span{t.Pos.Offset, t.Pos.Offset + len(t.Value)} }

// definition presents the scanner to participle.
type definition struct{}

func (definition) Symbols() map[string]lexer.TokenType {
	return map[string]lexer.TokenType{"EOF": lexer.EOF, "Name": tokenName, "Quoted": tokenQuoted, "Level": tokenLevel,
		"Number": tokenNumber, "Keyword": tokenKeyword, "Operator": tokenOperator, "Bad": tokenBad}
}

func (definition) Lex(_ string, r io.Reader) (lexer.Lexer, error) {
	b, err := io.ReadAll(r)
	if err != nil {
		return nil, err
	}
	tokens, _ := scan(string(b))
	return &replay{tokens}, nil
}

// replay hands out tokens that are already there; the last one stays.
type replay struct{ tokens []lexer.Token }

func (r *replay) Next() (lexer.Token, error) {
	t := r.tokens[0]
	if len(r.tokens) > 1 {
		r.tokens = r.tokens[1:]
	}
	return t, nil
}
