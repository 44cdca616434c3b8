package nlfit

// A Code names one kind of refusal or early end. It is an error only so that
// errors.Is(err, Code("budget")) can ask for it; refusals themselves are
// [*Error] values. Codes may be added in later versions.
type Code string

// Error is the code itself.
func (c Code) Error() string { return string(c) }

// Every code below carries an example, and a test checks that it brings back
// exactly this code:
//
//	csv: text       the data, written as inside a Go string literal
//	model: text     the model fitted to them
//	options: name   a case of the table in codes_test.go
const (
	// codeBadOption: an option has a value outside its domain.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n4,9\n
	//	model: y = a*exp(b*x) fitting a, b
	//	options: negative budget
	codeBadOption Code = "bad-option"

	// codeBudget: the search used up its evaluations.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n4,9\n
	//	model: y = a*exp(b*x) fitting a start 1, b start 1
	//	options: budget of two
	codeBudget Code = "budget"

	// codeCancelled: the context ended, or Progress returned an error, before the
	// search did; the cause is wrapped.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n4,9\n
	//	model: y = a*exp(b*x) fitting a, b
	//	options: cancelled
	codeCancelled Code = "cancelled"

	// codeNoFinite: the equation is finite nowhere that was tried.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n4,9\n
	//	model: y = log(a*x) fitting a in (-2, -1)
	//	options: none
	codeNoFinite Code = "no-finite-value"

	// codeSingular: the data do not determine a combination of parameters.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n4,9\n
	//	model: y = top*k*x fitting top, k
	//	options: none
	codeSingular Code = "singular"

	// codeStart: the equation is not finite at the start that was given.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n4,9\n
	//	model: y = log(a*x) fitting a start -1
	//	options: none
	codeStart Code = "start"

	// codeTerms: the model is not an equation.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n4,9\n
	//	model: y ~ x
	//	options: none
	codeTerms Code = "terms"
)

// Codes lists the codes. The slice is the caller's.
func Codes() []Code {
	return []Code{codeBadOption, codeBudget, codeCancelled, codeNoFinite, codeSingular, codeStart, codeTerms}
}
