package formula

import (
	"errors"

	"github.com/alecthomas/participle/v2"
	"github.com/alecthomas/participle/v2/lexer"
)

// The outer structure of a model, as the grammar of the language has it. The
// two ladders of operators, and the small pieces that need words of their own
// when they are missing, are read by the functions of stream.
type modelSyntax struct {
	Value    expression      `parser:"@@"`
	OutOf    expression      `parser:"( 'out':Keyword 'of':Keyword @@"`
	Per      expression      `parser:"| 'per':Keyword @@ )?"`
	Terms    termSum         `parser:"( '~':Operator @@"`
	Equation expression      `parser:"| '=':Operator @@ )"`
	Clauses  []*clauseSyntax `parser:"@@*"`
}

type clauseSyntax struct {
	Pos      lexer.Position
	Errors   errorModel     `parser:"  'as':Keyword @@"`
	Weighted expression     `parser:"| 'weighted':Keyword @@"`
	Counted  expression     `parser:"| 'counted':Keyword @@"`
	Fitting  []*paramSyntax `parser:"| 'fitting':Keyword @@ ( ',':Operator @@ )*"`
}

type paramSyntax struct {
	Head   paramHead     `parser:"@@"`
	Held   signedLiteral `parser:"( '=':Operator @@"`
	Terms  termSum       `parser:"| '~':Operator @@"`
	By     category      `parser:"| 'by':Keyword @@ )?"`
	Bounds *boundsSyntax `parser:"@@?"`
	Start  signedLiteral `parser:"( 'start':Keyword @@ )?"`
}

type boundsSyntax struct {
	Tokens []lexer.Token // all of them, from participle
	Above  signedLiteral `parser:"  '>':Operator @@"`
	Below  signedLiteral `parser:"| '<':Operator @@"`
	Low    signedLiteral `parser:"| 'in':Keyword '(':Operator @@"`
	High   signedLiteral `parser:"  ',':Operator @@ ')':Operator"`
}

type coefSyntax struct {
	Coef coefficient `parser:"@@"`
}

// Participle hands interfaces to parsing functions only, so each piece that
// stream reads has one here.
type (
	expression    interface{ Expr }
	termSum       interface{ sum() *Terms }
	errorModel    interface{ model() *Errors }
	category      interface{ columns() *Category }
	signedLiteral interface{ number() *signedNumber }
	paramHead     interface{ head() *headName }
	coefficient   interface{ name() *Coef }
)

// A signedNumber is a number with an optional minus sign.
type signedNumber struct {
	pos   Span
	value float64
}

// A headName is what a declaration begins with: k or log(k).
type headName struct {
	pos  Span
	link string
	name *Name
}

func (n *Terms) sum() *Terms                  { return n }
func (n *Errors) model() *Errors              { return n }
func (n *Category) columns() *Category        { return n }
func (n *Coef) name() *Coef                   { return n }
func (n *signedNumber) number() *signedNumber { return n }
func (n *headName) head() *headName           { return n }

func build[T any]() *participle.Parser[T] {
	return participle.MustBuild[T](
		participle.Lexer(definition{}),
		participle.UseLookahead(0), // the next token decides everywhere: what is begun must be completed
		piece(func(s *stream) expression { return s.outerSum() }),
		piece(func(s *stream) termSum { return s.terms() }),
		piece(func(s *stream) errorModel { return s.errors() }),
		piece(func(s *stream) category { return s.paramCategory() }),
		piece(func(s *stream) signedLiteral { return s.signed() }),
		piece(func(s *stream) paramHead { return s.paramHead() }),
		piece(func(s *stream) coefficient { return s.coef() }),
	)
}

// piece lets stream read the pieces of type T.
func piece[T any](read func(*stream) T) participle.Option {
	return participle.ParseTypeWith(func(lex *lexer.PeekingLexer) (T, error) {
		s := &stream{lex: lex}
		x := read(s)
		return x, s.result()
	})
}

// The parsers are immutable and safe for concurrent use; building one takes
// longer than parsing a model.
var (
	modelParser = build[modelSyntax]()
	coefParser  = build[coefSyntax]()
)

// parse checks the limits, then reads text by the parser. It also tells where
// the last token ends.
func parse[T any](p *participle.Parser[T], text string, brackets bool) (*T, int, *Error) {
	if len(text) > maxText {
		return nil, 0, refuse(codeTooLong, Span{}, "split it into several models", "the text has %d bytes; at most %d are read", len(text), maxText)
	}
	if at := invalidUTF8(text); at >= 0 {
		return nil, 0, refuse(codeInvalidUTF8, Span{at, at + 1}, "save the text as UTF-8", "the text is not valid UTF-8 here")
	}
	tokens, bad := scan(text)
	if len(tokens) == 1 {
		if brackets {
			return nil, 0, refuse(codeSyntax, Span{}, "write a name such as hold by furnace='F2'", "the text is empty")
		}
		return nil, 0, refuse(codeSyntax, Span{}, "write a model such as porosity ~ hold", "the text is empty")
	}
	if e := checkNesting(tokens); e != nil {
		return nil, 0, e
	}
	lex, err := lexer.Upgrade(&replay{tokens})
	if err != nil {
		return nil, 0, &Error{Code: codeSyntax, Message: "the text cannot be read", Err: err}
	}
	syntax, err := p.ParseFromLexer(lex)
	if err != nil {
		return nil, 0, explain(err, tokens, bad, brackets)
	}
	return syntax, spanOf(tokens[len(tokens)-2]).End, nil
}

// explain turns what participle returns into a refusal of ours: the scanner's
// reason where a bad token stopped it, the one of a parsing function, or else a
// sentence about the token that found no place.
func explain(err error, tokens []lexer.Token, bad map[int]*Error, brackets bool) *Error {
	var own refusal
	if errors.As(err, &own) {
		if e := bad[own.cause.Span.Start]; e != nil && own.cause.Code != codeForeignOperator {
			return e
		}
		return own.cause
	}
	var misplaced *participle.UnexpectedTokenError
	if !errors.As(err, &misplaced) {
		return &Error{Code: codeSyntax, Message: "the text cannot be read", Err: err}
	}
	t := misplaced.Unexpected
	if e := bad[t.Pos.Offset]; e != nil && t.Type == tokenBad {
		return e
	}
	var before lexer.Token
	sides := 0 // signs between the sides of a model read so far
	params := false
	open := 0 // parentheses; those that stream reads are closed, or it has refused
	for _, b := range tokens {
		if b.Pos.Offset >= t.Pos.Offset {
			break
		}
		before = b
		switch b.Value {
		case "~", "=":
			sides++
		case "fitting":
			params = true
		case "(":
			open++
		case ")":
			open--
		}
	}
	what := ""
	switch {
	case brackets:
		what = "by or the end of the name"
		if t.Type == lexer.EOF {
			what = "a coefficient's name"
		}
	case before.Value == "out":
		what = "of"
	case before.Value == "in":
		what = "("
	case open > 0 && t.Value == ")":
		what = "a comma and the upper limit"
	case open > 0:
		what = "a comma or )"
	case sides == 0:
		what = "~ or ="
	case t.Type == lexer.EOF:
		what = "a number"
	}
	if params && what == "" {
		if e := unexpectedInParams(before, t); e != nil {
			return e
		}
	}
	return unexpected(before, t, what, nil)
}
