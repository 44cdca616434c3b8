package formula

import (
	"slices"
	"strconv"
	"strings"

	"github.com/alecthomas/participle/v2/lexer"

	"example.com/trammel/internal/errtext"
)

// A stream reads tokens for the hand-written productions. The first refusal
// sticks: from then on only the end of the text is seen, so that every
// production winds up by itself.
type stream struct {
	lex *lexer.PeekingLexer
	end int // where the last token read ends
	err *Error
}

// result ends a production that participle called.
func (s *stream) result() error {
	if s.err == nil {
		return nil
	}
	return refusal{s.err}
}

// refusal carries an *Error through participle, which asks for a position.
type refusal struct{ cause *Error }

func (r refusal) Error() string { return r.cause.Message }

func (r refusal) Message() string { return r.cause.Message }

func (r refusal) Position() lexer.Position { return lexer.Position{Offset: r.cause.Span.Start} }

func (s *stream) fail(e *Error) {
	if s.err == nil {
		s.err = e
	}
}

func (s *stream) peek() lexer.Token {
	if s.err != nil {
		return lexer.EOFToken(lexer.Position{Offset: s.end})
	}
	return *s.lex.Peek()
}

func (s *stream) next() lexer.Token {
	t := s.peek()
	if s.err == nil {
		s.lex.Next()
		s.end = spanOf(t).End
	}
	return t
}

// at tells whether the next token is this operator or word; a quoted name
// never is, for its value keeps the quotes.
func (s *stream) at(word string) bool {
	t := s.peek()
	return t.Value == word && t.Type != lexer.EOF && t.Type != tokenBad
}

func (s *stream) take(word string) bool {
	if !s.at(word) {
		return false
	}
	s.next()
	return true
}

// want reads word or refuses what stands there.
func (s *stream) want(word string) {
	if !s.take(word) {
		s.expected(word)
	}
}

// after gives the token before the next one.
func (s *stream) after() lexer.Token {
	if c := s.lex.RawCursor(); c > 0 {
		return s.lex.Range(c-1, c)[0]
	}
	return lexer.Token{}
}

// expected refuses the next token; what says what should stand there.
func (s *stream) expected(what string, words ...string) {
	if s.err == nil {
		s.fail(unexpected(s.after(), s.peek(), what, words))
	}
}

// The words that may follow a complete operand somewhere.
var (
	joining     = []string{"by", "inside"}
	clauseWords = []string{"as", "weighted", "counted", "fitting"}
	laterWords  = []string{"out", "per", "link", "start", "against", "in", "others", "of"}
)

// belongs tells where words stand that are easily misplaced.
var belongs = map[string]string{
	"link":    "it follows a family, as in as gamma link log",
	"start":   "it belongs to a parameter after fitting, as in k start 0.3",
	"in":      "it lists levels inside cat, as in cat(grade in ('low', 'high')), or limits of a parameter",
	"against": "it stands inside cat, as in cat(furnace against 'F2')",
	"others":  "it ends a list of levels, as in cat(grade in ('low', others))",
	"out":     "it belongs to the response, as in rejects out of inspected ~ hold",
	"of":      "it belongs to the response, as in rejects out of inspected ~ hold",
	"per":     "it belongs to the response, as in inclusions per area ~ hold",
}

// unexpectedInParams words the refusal of a token behind a declaration, where
// limits and commas are what is usually meant; nil when neither is.
func unexpectedInParams(before, t lexer.Token) *Error {
	at := spanOf(t)
	switch {
	case (t.Value == ">=" || t.Value == "<=") && before.Type != tokenNumber:
		return refuse(codeSyntax, at, "", "limits are closed and written by > or <, not %s", t.Value).pasting(t.Value[:1])
	case isComparison(t):
		return refuse(codeSyntax, at, "write two limits as k in (0, 5)", "a parameter has one limit by > or <, before its start value")
	case t.Type == tokenName || t.Type == tokenQuoted:
		near, ok := errtext.Nearest(t.Value, slices.Concat(clauseWords, []string{"by", "in", "start"}))
		if !ok && !reserved[strings.ToLower(t.Value)] {
			return refuse(codeSyntax, at, "", "a comma was expected between the parameters %s and %s", shorten(before.Value), shorten(t.Value)).
				pasting(", " + t.Value)
		}
		if ok && !reserved[strings.ToLower(t.Value)] {
			return refuse(codeSyntax, at, "", "a comma or a clause was expected after %s, not %s", shorten(before.Value), shorten(t.Value)).pasting(near)
		}
	}
	return nil
}

// unexpected words the refusal of a token: what was expected ("" when nothing
// more fits), and words that would fit, for near misses.
func unexpected(before, t lexer.Token, what string, words []string) *Error {
	at := spanOf(t)
	where := ""
	if before.Value != "" {
		where = " after " + shorten(before.Value)
	}
	if t.Type == lexer.EOF {
		at = Span{spanOf(before).End, spanOf(before).End}
		if what == "" {
			what = "more"
		}
		return refuse(codeSyntax, at, "", "the text ends where %s was expected%s", what, where)
	}
	if t.Type == tokenName {
		lower := strings.ToLower(t.Value)
		if lower != t.Value && (reserved[lower] || slices.Contains(words, lower)) {
			return refuse(codeUpperCaseWord, at, "", "words of the language are written in lower case, not %s", t.Value).pasting(lower)
		}
	}
	if t.Value == "random" {
		return refuse(codeOutOfScope, at, "write cat(machine) to give each machine its own effect",
			"random effects are outside this language; the word random is reserved")
	}
	if what != "" {
		if t.Type == tokenKeyword && (strings.HasSuffix(what, "name") || what == "a term" || what == "a number, a column or a function") {
			e := refuse(codeReservedWord, at, "a column with this name is written "+QuoteName(t.Value),
				"%s was expected%s, not the reserved word %s", what, where, t.Value).naming(t.Value)
			if !slices.Contains(clauseWords, t.Value) {
				e.pasting(QuoteName(t.Value))
			}
			return e
		}
		e := refuse(codeSyntax, at, "", "%s was expected%s, not %s", what, where, shorten(t.Value))
		if near, ok := errtext.Nearest(t.Value, words); ok && t.Type == tokenName {
			e.pasting(near)
		}
		return e
	}
	switch {
	case t.Value == ")" || t.Value == "]":
		return refuse(codeSyntax, at, "take it out, or open it before", "nothing is open that this %s could close", t.Value)
	case t.Value == ",":
		return refuse(codeSyntax, at, "write + between terms", "a comma stands only between arguments and between declared parameters")
	case t.Value == "~" || t.Value == "=":
		return refuse(codeSyntax, at, "a text holds one model; a comparison stands inside parentheses or an argument", "%s cannot stand a second time", t.Value)
	case t.Value == "(" && (before.Type == tokenNumber || before.Value == ")"):
		return refuse(codeSyntax, at, "write * for a product", "an operator was expected%s", where)
	case t.Value == "[":
		return refuse(codeSyntax, at, "write a comparison such as num(furnace = 'F2') for rows of one level", "brackets stand only in names of coefficients")
	case t.Type == tokenName:
		all := slices.Concat(clauseWords, joining, laterWords)
		if near, ok := errtext.Nearest(t.Value, all); ok {
			return refuse(codeSyntax, at, "", "an operator or a clause was expected%s, not %s", where, t.Value).pasting(near)
		}
		fallthrough
	case t.Type == tokenQuoted, t.Type == tokenNumber, t.Type == tokenLevel:
		hint := "write + or * between terms"
		if before.Type == tokenName && t.Type == tokenName {
			hint = "write + or * between terms; a column name with a space stands in double quotes: " +
				QuoteName(shorten(before.Value+" "+t.Value))
		}
		return refuse(codeSyntax, at, hint, "an operator or a clause was expected%s, not %s", where, shorten(t.Value))
	case t.Type == tokenKeyword:
		hint := belongs[t.Value]
		if hint == "" {
			hint = "a column with this name is quoted: " + QuoteName(t.Value)
		}
		return refuse(codeSyntax, at, hint, "the word %s cannot stand here%s", t.Value, where)
	}
	return refuse(codeSyntax, at, "", "%s cannot stand here%s", shorten(t.Value), where)
}

// parseNumber turns a number of the language into a finite float64.
func parseNumber(s string) (float64, bool) {
	v, err := strconv.ParseFloat(s, 64)
	return v, err == nil
}

// name reads a column or parameter name.
func (s *stream) name(what string) *Name {
	t := s.peek()
	n := &Name{Pos: spanOf(t)}
	switch t.Type {
	case tokenName:
		n.Name = t.Value
	case tokenQuoted:
		n.Name = unquote(t.Value)
	default:
		s.expected(what)
		return n
	}
	s.next()
	return n
}

// number reads an unsigned number.
func (s *stream) number() *Number {
	t := s.peek()
	if t.Type != tokenNumber {
		s.expected("a number")
		return &Number{Pos: spanOf(t)}
	}
	s.next()
	v, _ := parseNumber(t.Value) // the scanner has refused what does not parse
	return &Number{Pos: spanOf(t), Value: v}
}

// signed reads a number with an optional minus sign.
func (s *stream) signed() *signedNumber {
	start := s.peek().Pos.Offset
	minus := s.take("-")
	v := s.number().Value
	if minus {
		v = -v
	}
	return &signedNumber{Span{start, s.end}, v}
}

// level reads one value of a category.
func (s *stream) level() *Level {
	t := s.peek()
	l := &Level{Pos: spanOf(t)}
	switch {
	case t.Type == tokenLevel:
		s.next()
		l.Kind, l.Text = TextLevel, unquote(t.Value)
	case t.Type == tokenNumber || s.at("-"):
		n := s.signed()
		l.Pos, l.Kind, l.Number = n.pos, NumberLevel, n.value
	case s.at("true") || s.at("false"):
		s.next()
		l.Kind, l.Bool = BoolLevel, t.Value == "true"
	case t.Type == tokenName || t.Type == tokenQuoted:
		text := t.Value
		if t.Type == tokenQuoted {
			text = unquote(text)
		}
		s.fail(refuse(codeLevelPlace, l.Pos, "", "a level was expected here; a level of a text column stands in single quotes").
			pasting(QuoteLevel(text)))
	default:
		s.expected("a level")
	}
	return l
}
