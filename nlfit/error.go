package nlfit

import (
	"example.com/trammel/formula"
	"example.com/trammel/internal/errtext"
)

// An Error is a refusal of this package, or the early end of a search. Its
// fields, not its text, are the contract. Composite literals outside the
// package must be keyed, for fields may be added.
type Error struct {
	Code    Code
	Message string
	Hint    string
	Text    string // the model text; may be empty
	Span    formula.Span
	Names   []string // coefficients concerned
	Err     error    // the cause; may be nil
}

// Error gives the whole text: the first line is complete by itself.
func (e *Error) Error() string {
	start, end := e.Span.Start, e.Span.End
	if e.Span == (formula.Span{}) {
		start, end = -1, -1
	}
	return errtext.Format("nlfit", e.Text, start, end, e.Message, e.Hint)
}

// Unwrap gives the cause, nil when there is none.
func (e *Error) Unwrap() error { return e.Err }

// Is reports whether target is the [Code] of this refusal.
func (e *Error) Is(target error) bool {
	code, ok := target.(Code)
	return ok && code == e.Code
}
