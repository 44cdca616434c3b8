package design

import (
	"strconv"

	"example.com/trammel/formula"
	"example.com/trammel/internal/errtext"
)

// An Error is a refusal of this package: a table that cannot be made, or a
// model that cannot be compiled against a table. Its fields, not its text, are
// the contract; errors.Is(err, Code("row-length")) tells refusals apart and
// errors.As reaches the fields. Composite literals outside the package must be
// keyed, for fields may be added.
type Error struct {
	Code    Code
	Message string // one plain sentence: what is wrong, and where
	Hint    string // what to write instead; may be empty

	// Text is the model text and Span the place in it, both zero when the
	// refusal is not about a place in a model.
	Text string
	Span formula.Span

	Names []string // the columns or coefficients concerned
	Rows  []int    // the first few rows concerned; data rows count from 1
	Line  int      // the line of a CSV text, from 1; 0 when there is none

	Identities []Identity // linear dependencies between columns
	Mends      []string   // model texts or changes that would mend it

	Err error // the cause; may be nil
}

// An Identity says that one column of a model is a combination of others:
// the sum of Coefs[i] times column Names[i] is zero.
type Identity struct {
	Names []string
	Coefs []float64
	Exact bool // Coefs are small rationals that reproduce the columns; else rounded decimals
}

// Error gives the whole text: the first line is complete by itself; when the
// refusal concerns a place in a model text, the line of the text and carets
// under the place follow.
func (e *Error) Error() string {
	message := e.Message
	if e.Line > 0 {
		message = "line " + strconv.Itoa(e.Line) + ": " + message
	}
	start, end := e.Span.Start, e.Span.End
	if e.Span == (formula.Span{}) {
		start, end = -1, -1
	}
	return errtext.Format("design", e.Text, start, end, message, e.Hint)
}

// Unwrap gives the cause, nil when there is none.
func (e *Error) Unwrap() error { return e.Err }

// Is reports whether target is the [Code] of this refusal.
func (e *Error) Is(target error) bool {
	code, ok := target.(Code)
	return ok && code == e.Code
}
