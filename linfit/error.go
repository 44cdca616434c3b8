package linfit

import (
	"example.com/trammel/formula"
	"example.com/trammel/internal/errtext"
)

// An Error is a refusal of this package. Its fields, not its text, are the
// contract; errors.Is(err, Code("cancelled")) tells refusals apart and errors.As
// reaches the fields. Composite literals outside the package must be keyed, for
// fields may be added.
type Error struct {
	Code    Code
	Message string // one plain sentence: what is wrong, and where
	Hint    string // what to write instead; may be empty

	// Text is the model text and Span the place in it, both zero when the
	// refusal is not about a place in a model.
	Text string
	Span formula.Span

	Names []string // the columns concerned
	Rows  []int    // the first few table rows concerned, from 1

	Err error // the cause; may be nil
}

// Error gives the whole text: the first line is complete by itself.
func (e *Error) Error() string {
	start, end := e.Span.Start, e.Span.End
	if e.Span == (formula.Span{}) {
		start, end = -1, -1
	}
	return errtext.Format("linfit", e.Text, start, end, e.Message, e.Hint)
}

// Unwrap gives the cause, nil when there is none.
func (e *Error) Unwrap() error { return e.Err }

// Is reports whether target is the [Code] of this refusal.
func (e *Error) Is(target error) bool {
	code, ok := target.(Code)
	return ok && code == e.Code
}
