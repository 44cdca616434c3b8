package formula

// A Code names one kind of refusal. It is an error only so that
// errors.Is(err, Code("unknown-function")) can ask for it; refusals themselves
// are [*Error] values. Codes may be added in later versions.
type Code string

// Error is the code itself.
func (c Code) Error() string { return string(c) }

// Every code below carries at least one example, and a test checks that the
// example brings back exactly this code. An example is a comment line:
//
//	model: text     a model, written as inside a Go string literal
//	coef: text      a coefficient's name, written likewise
//	go: name        a case of the table in codes_test.go, where no short text can show it
const (
	// codeArgumentCount: a function has too few or too many arguments.
	//
	//	model: y ~ log(x, 2)
	//	model: y ~ powers(x)
	codeArgumentCount Code = "argument-count"

	// codeArithmeticInTerms: / or ^ stands between terms.
	//
	//	model: y ~ x^2
	//	model: y ~ a/b
	codeArithmeticInTerms Code = "arithmetic-in-terms"

	// codeBadArgument: an argument is not what the function takes there.
	//
	//	model: y ~ powers(x, 0)
	//	model: y ~ coded(x, 10, 10)
	//	model: y ~ hinge(x, 5, 5)
	codeBadArgument Code = "bad-argument"

	// codeBadBounds: the limits of a parameter leave it no room.
	//
	//	model: y = k*x fitting k in (5, 0)
	codeBadBounds Code = "bad-bounds"

	// codeBadCharacter: a character has no meaning here, or cannot be seen.
	//
	//	model: y ~ x\u200b
	//	model: y ~ a\u00a0+ b
	codeBadCharacter Code = "bad-character"

	// codeBadNumber: digits do not form a number.
	//
	//	model: y ~ num(2x)
	//	model: y ~ num(x + .5)
	//	model: y ~ num(1e999*x)
	codeBadNumber Code = "bad-number"

	// codeChainedComparison: comparisons are chained.
	//
	//	model: y ~ num(1 < x < 2)
	codeChainedComparison Code = "chained-comparison"

	// codeClausePlace: a clause does not go with this form of model.
	//
	//	model: y = k*x as poisson fitting k
	//	model: y ~ x fitting k
	codeClausePlace Code = "clause-place"

	// codeComparisonPlace: a comparison stands outside parentheses and arguments.
	//
	//	model: y ~ x > 2
	//	model: y ~ x weighted z > 2
	codeComparisonPlace Code = "comparison-place"

	// codeConstantTerm: a numeric term or the response has no column in it.
	//
	//	model: y ~ num(3)
	//	model: 2 ~ x
	codeConstantTerm Code = "constant-term"

	// codeEmptyName: a quoted column name is empty.
	//
	//	model: y ~ \"\"
	codeEmptyName Code = "empty-name"

	// codeFamilyPlace: the family does not go with this response or this clause.
	//
	//	model: k out of n ~ x
	//	model: k out of n ~ x as poisson
	//	model: k per e ~ x
	//	model: y ~ x as overdispersed gamma
	//	model: y ~ x as poisson weighted w
	codeFamilyPlace Code = "family-place"

	// codeFittingMissing: an equation declares no parameters.
	//
	//	model: y = k*x
	codeFittingMissing Code = "fitting-missing"

	// codeForeignOperator: a sign is no operator of this language.
	//
	//	model: y ~ a:b
	//	model: y ~ num(a == b)
	//	coef: a:b
	codeForeignOperator Code = "foreign-operator"

	// codeFunctionPlace: a function that makes terms stands inside arithmetic.
	//
	//	model: y ~ log(powers(x, 2))
	//	model: y ~ powers(num(x), 2)
	//	model: y = k*cat(m) fitting k
	codeFunctionPlace Code = "function-place"

	// codeInvalidUTF8: the text is not valid UTF-8.
	//
	//	model: y ~ x\xff
	codeInvalidUTF8 Code = "invalid-utf8"

	// codeKnownPlace: known stands elsewhere than as a summand added at the top level.
	//
	//	model: y ~ x by known(z)
	//	model: y ~ x - known(z)
	codeKnownPlace Code = "known-place"

	// codeLevelPlace: a level stands elsewhere than beside = or <> and a column.
	//
	//	model: y ~ 'F2'
	//	model: y ~ num(m < 'F2')
	//	model: y ~ num('F2' = m)
	codeLevelPlace Code = "level-place"

	// codeLinkArgument: a link has a number it does not take, or lacks one.
	//
	//	model: y ~ x as gamma link power
	//	model: y ~ x as gamma link log(2)
	//	model: y ~ x as gamma link power(0)
	codeLinkArgument Code = "link-argument"

	// codeNumberInTerms: a bare number stands among terms.
	//
	//	model: y ~ 1
	//	model: y ~ 2*x
	codeNumberInTerms Code = "number-in-terms"

	// codeNumericByItself: a numeric term is crossed with itself.
	//
	//	model: y ~ x by x
	codeNumericByItself Code = "numeric-by-itself"

	// codeOutOfScope: the text asks for a kind of model that this library does not fit.
	//
	//	model: y ~ x random m
	codeOutOfScope Code = "out-of-scope"

	// codeParamForm: parts of one declaration exclude each other.
	//
	//	model: y = k*x fitting k = 3 start 2
	//	model: y = k*x fitting log(k) > 0
	codeParamForm Code = "param-form"

	// codeParamPlace: a parameter stands where only columns may.
	//
	//	model: y = k*x fitting k ~ k
	codeParamPlace Code = "param-place"

	// codeRepeatedClause: a clause is written twice.
	//
	//	model: y ~ x as gamma as poisson
	codeRepeatedClause Code = "repeated-clause"

	// codeRepeatedParam: a parameter is declared twice.
	//
	//	model: y = k*x fitting k, k > 0
	codeRepeatedParam Code = "repeated-param"

	// codeReservedWord: a reserved word stands where a name is needed.
	//
	//	model: y ~ start
	//	model: of ~ x
	codeReservedWord Code = "reserved-word"

	// codeResponseOnRight: the response stands on the right side too.
	//
	//	model: y ~ x + y
	codeResponseOnRight Code = "response-on-right"

	// codeStartOutside: the start value lies outside the limits.
	//
	//	model: y = k*x fitting k > 0 start -1
	codeStartOutside Code = "start-outside"

	// codeSyntax: something else was expected.
	//
	//	model: y ~ a b
	//	model: y
	//	model:
	//	coef: a by
	codeSyntax Code = "syntax"

	// codeTooDeep: the text is nested deeper than 200 levels.
	//
	//	go: 201 parentheses
	codeTooDeep Code = "too-deep"

	// codeTooLong: the text is longer than 64 KiB.
	//
	//	go: 65537 bytes
	codeTooLong Code = "too-long"

	// codeTooManyTerms: the model expands to more terms than MaxTerms.
	//
	//	model: y ~ a*b*c*d*e*f*g*h*i*j*k*l*m*n
	codeTooManyTerms Code = "too-many-terms"

	// codeUnclosedQuote: a quoted name or level does not end.
	//
	//	model: y ~ \"Hold time
	//	model: y ~ num(m = 'F2)
	codeUnclosedQuote Code = "unclosed-quote"

	// codeUnknownFamily: there is no such family of errors.
	//
	//	model: y ~ x as poison
	codeUnknownFamily Code = "unknown-family"

	// codeUnknownFunction: there is no such function.
	//
	//	model: y ~ ln(x)
	//	model: y ~ catt(m)
	codeUnknownFunction Code = "unknown-function"

	// codeUnknownLink: there is no such link.
	//
	//	model: y ~ x as gamma link lgo
	codeUnknownLink Code = "unknown-link"

	// codeUnusedParam: a declared parameter does not stand in the equation.
	//
	//	model: y = k*x fitting k, m
	codeUnusedParam Code = "unused-param"

	// codeUpperCaseWord: a word of the language is written in capitals.
	//
	//	model: y ~ x AS poisson
	//	model: y ~ cat(m) BY x
	codeUpperCaseWord Code = "upper-case-word"
)

// Codes lists every code of this package. The slice is the caller's.
func Codes() []Code {
	return []Code{
		codeArgumentCount,
		codeArithmeticInTerms,
		codeBadArgument,
		codeBadBounds,
		codeBadCharacter,
		codeBadNumber,
		codeChainedComparison,
		codeClausePlace,
		codeComparisonPlace,
		codeConstantTerm,
		codeEmptyName,
		codeFamilyPlace,
		codeFittingMissing,
		codeForeignOperator,
		codeFunctionPlace,
		codeInvalidUTF8,
		codeKnownPlace,
		codeLevelPlace,
		codeLinkArgument,
		codeNumberInTerms,
		codeNumericByItself,
		codeOutOfScope,
		codeParamForm,
		codeParamPlace,
		codeRepeatedClause,
		codeRepeatedParam,
		codeReservedWord,
		codeResponseOnRight,
		codeStartOutside,
		codeSyntax,
		codeTooDeep,
		codeTooLong,
		codeTooManyTerms,
		codeUnclosedQuote,
		codeUnknownFamily,
		codeUnknownFunction,
		codeUnknownLink,
		codeUnusedParam,
		codeUpperCaseWord,
	}
}
