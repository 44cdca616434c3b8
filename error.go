package trammel

import "example.com/trammel/internal/errtext"

// An Error is the answer to a question that has none: a level that is no
// probability, a lack-of-fit test without repeated rows. Its fields, not its
// text, are the contract; errors.Is(err, Code("no-repeats")) tells refusals
// apart and errors.As reaches the fields. Composite literals outside the package
// must be keyed, for fields may be added.
type Error struct {
	Code    Code
	Message string // one plain sentence: what cannot be answered, and why
	Hint    string // what to do instead; may be empty

	Names []string // the columns, coefficients or terms concerned
	Rows  []int    // the first few rows concerned, from 1

	Err error // the cause; may be nil
}

// Error gives the whole text in one line.
func (e *Error) Error() string {
	return errtext.Format("trammel", "", -1, -1, e.Message, e.Hint)
}

// Unwrap gives the cause, nil when there is none.
func (e *Error) Unwrap() error { return e.Err }

// Is tells that the error carries the code target.
func (e *Error) Is(target error) bool {
	code, ok := target.(Code)
	return ok && code == e.Code
}
