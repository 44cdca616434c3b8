package formula

import (
	"fmt"

	"example.com/trammel/internal/errtext"
)

// An Error is the refusal of a text. Its fields, not its text, are the
// contract; errors.Is(err, Code("unknown-function")) tells refusals apart and
// errors.As reaches the fields. Composite literals outside the package must be
// keyed, for fields may be added.
type Error struct {
	Code    Code
	Message string // one plain sentence: what is wrong
	Hint    string // what to write instead; may be empty

	Text  string   // the whole text refused
	Span  Span     // the place in it
	Span2 Span     // a second place, when two are at fault; else zero
	Names []string // the names concerned: columns, parameters, functions

	Err error // the cause; may be nil

	// paste is the text that, put in place of Span, mends this refusal; the
	// tests put it there. The hint ends with it.
	paste string
}

// Error gives the whole text: the first line is complete by itself; the line of
// the text and carets under the place follow.
func (e *Error) Error() string {
	return errtext.Format("formula", e.Text, e.Span.Start, e.Span.End, e.Message, e.Hint)
}

// Unwrap gives the cause, nil when there is none.
func (e *Error) Unwrap() error { return e.Err }

// Is tells whether target is the [Code] of this refusal.
func (e *Error) Is(target error) bool {
	code, ok := target.(Code)
	return ok && code == e.Code
}

// refuse makes a refusal; Text is filled in where the text is known.
func refuse(code Code, at Span, hint, format string, args ...any) *Error {
	return &Error{Code: code, Span: at, Hint: hint, Message: fmt.Sprintf(format, args...)}
}

// pasting completes a refusal by the text to put in place of its span.
func (e *Error) pasting(text string) *Error {
	e.paste = text
	if len(text) <= maxMend {
		e.Hint = "write " + text
	}
	return e
}

func (e *Error) naming(names ...string) *Error {
	e.Names = names
	return e
}

func (e *Error) and(second Span) *Error {
	e.Span2 = second
	return e
}
