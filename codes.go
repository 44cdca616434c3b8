package trammel

// A Code names one kind of refusal. It is an error only so that
// errors.Is(err, Code("no-repeats")) can ask for it; refusals themselves are
// [*Error] values. Codes may be added in later versions.
type Code string

// Error is the code itself.
func (c Code) Error() string { return string(c) }

// Every code below carries at least one example, and a test checks that the
// example brings back exactly this code. An example is three comment lines:
//
//	csv: text     the data, written as inside a Go string literal
//	model: text   the model fitted to them
//	ask: name     a question of the table in codes_test.go
const (
	// codeBadLevel: a confidence level is not a number in (0, 1).
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	ask: coefficients at level 95
	codeBadLevel Code = "bad-level"

	// codeBadWeight: a weight of a row to predict is not a positive number, or
	// there is not one weight per row.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	ask: prediction with weight 0
	codeBadWeight Code = "bad-weight"

	// codeExactRepeats: repeated rows agree to rounding, so there is no pure
	// error to compare with.
	//
	//	csv: x,y\n1,2\n1,2\n2,5\n2,5\n3,6\n3,6\n
	//	model: y ~ x
	//	ask: lack of fit
	codeExactRepeats Code = "exact-repeats"

	// codeNoData: the question needs the fitted rows, and the result has none.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	ask: diagnostics without data
	codeNoData Code = "no-data"

	// codeNoFreedom: there are as many coefficients as cases, so nothing is left
	// to judge them by.
	//
	//	csv: x,y\n1,2\n2,3\n
	//	model: y ~ x
	//	ask: correlation
	codeNoFreedom Code = "no-freedom"

	// codeNoRepeats: no two rows agree in everything the model uses.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	ask: lack of fit
	codeNoRepeats Code = "no-repeats"

	// codeNoResult: the result is nil.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	ask: summary of nothing
	codeNoResult Code = "no-result"

	// codeNoWayBack: the response is not a one-to-one function of one column, so
	// predictions cannot be mapped back to it.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	ask: prediction on the original scale
	//
	//	csv: x,y,z\n1,2,1\n2,3,3\n3,5,2\n
	//	model: y/z ~ x
	//	ask: prediction on the original scale
	codeNoWayBack Code = "no-way-back"

	// codeNotNested: two results are not fits of the same rows, one a special case
	// of the other.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	ask: comparison with itself
	codeNotNested Code = "not-nested"

	// codeSaturated: the model has a coefficient for every distinct row, so it
	// cannot lack fit.
	//
	//	csv: m,y\nA,2\nA,3\nB,4\nB,7\n
	//	model: y ~ cat(m)
	//	ask: lack of fit
	codeSaturated Code = "saturated"

	// codeShortDestination: a slice to fill has not one place per row.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	ask: prediction into a short slice
	codeShortDestination Code = "short-destination"
)

// Codes lists every code of this package. The slice is the caller's.
func Codes() []Code {
	return []Code{
		codeBadLevel,
		codeBadWeight,
		codeExactRepeats,
		codeNoData,
		codeNoFreedom,
		codeNoRepeats,
		codeNoResult,
		codeNoWayBack,
		codeNotNested,
		codeSaturated,
		codeShortDestination,
	}
}
