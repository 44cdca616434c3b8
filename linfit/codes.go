package linfit

// A Code names one kind of refusal. It is an error only so that
// errors.Is(err, Code("cancelled")) can ask for it; refusals themselves are
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
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	options: Robust HC9
	codeBadOption Code = "bad-option"

	// codeCancelled: the context ended, or Progress returned an error, before the
	// fit did; the cause is wrapped.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	options: cancelled
	codeCancelled Code = "cancelled"

	// codeEquation: the model is an equation.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y = a + b*x fitting a, b
	//	options: none
	codeEquation Code = "equation"

	// codeErrors: the model does not have normal errors with identity link.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x as gamma
	//	options: none
	codeErrors Code = "not-normal"

	// codeFullLeverage: HC2 and HC3 are not defined, for a row determines a
	// coefficient alone.
	//
	//	csv: x,z,y\n1,0,2\n2,0,3\n3,0,5\n4,1,9\n
	//	model: y ~ x + z
	//	options: Robust HC3
	codeFullLeverage Code = "full-leverage"

	// codeNoFreedom: a robust covariance is asked for and the residuals have no
	// freedom left.
	//
	//	csv: x,y\n1,2\n2,3\n
	//	model: y ~ x
	//	options: Robust HC0
	codeNoFreedom Code = "no-freedom"

	// codeOneCluster: fewer than two clusters.
	//
	//	csv: x,y,f\n1,2,a\n2,3,a\n3,5,a\n
	//	model: y ~ x
	//	options: ClusterBy f
	codeOneCluster Code = "one-cluster"

	// codeOutOfRange: sums of squares over- or underflow.
	//
	//	csv: x,y\n1,2e200\n2,3e200\n3,5e200\n
	//	model: y ~ x
	//	options: none
	codeOutOfRange Code = "out-of-range"

	// codeTooFewRows: a frame has fewer rows than the model has columns.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	options: frame of one row
	codeTooFewRows Code = "too-few-rows"

	// codeUnknownCluster: ClusterBy names no usable columns.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x
	//	options: ClusterBy f
	codeUnknownCluster Code = "unknown-cluster"
)

// Codes lists the codes in alphabetical order.
func Codes() []Code {
	return []Code{codeBadOption, codeCancelled, codeEquation, codeFullLeverage, codeNoFreedom, codeErrors,
		codeOneCluster, codeOutOfRange, codeTooFewRows, codeUnknownCluster}
}
