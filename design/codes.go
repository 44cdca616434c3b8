package design

// A Code names one kind of refusal. It is an error only so that
// errors.Is(err, Code("row-length")) can ask for it; refusals themselves are
// [*Error] values. Codes may be added in later versions.
type Code string

// Error is the code itself.
func (c Code) Error() string { return string(c) }

// Every code below carries at least one example, and a test checks that the
// example brings back exactly this code. An example is a run of comment lines:
//
//	csv: text       a CSV text, written as inside a Go string literal
//	model: text     a model compiled against the table of the csv line above it
//	go: name        a case of the table in codes_test.go, where no CSV text can show it

// Refusals while a table is made.
const (
	// codeBadCell: a cell does not fit the kind that the caller asked for.
	//
	//	go: text cell in a column overridden to numbers
	codeBadCell Code = "bad-cell"

	// codeBadOption: an option has a value outside its domain.
	//
	//	go: negative MaxBytes
	codeBadOption Code = "bad-option"

	// codeDateColumn: a column holds dates or times.
	//
	//	go: time field
	codeDateColumn Code = "date-column"

	// codeDuplicateColumn: two columns have one name.
	//
	//	csv: x,y,x\n1,2,3\n
	codeDuplicateColumn Code = "duplicate-column"

	// codeEmptyColumnName: a column has no name.
	//
	//	csv: x,,y\n1,2,3\n
	codeEmptyColumnName Code = "empty-column-name"

	// codeInvalidUTF8: a text or a name is not valid UTF-8.
	//
	//	csv: x,y\n1,\xff\n
	codeInvalidUTF8 Code = "invalid-utf8"

	// codeMixedColumn: a query gives cells of different kinds in one column.
	//
	//	go: number and text in one query column
	codeMixedColumn Code = "mixed-column"

	// codeNilElement: an element of a slice of struct pointers is nil.
	//
	//	go: nil struct pointer
	codeNilElement Code = "nil-element"

	// codeNoHeader: the text does not begin with a line of column names.
	//
	//	csv:
	//	csv: 1,2\n3,4\n
	codeNoHeader Code = "no-header"

	// codeNoRows: there are column names but no rows.
	//
	//	csv: x,y\n
	codeNoRows Code = "no-rows"

	// codeNotASlice: the value given to FromStructs is not a slice of structs.
	//
	//	go: number in place of a slice
	codeNotASlice Code = "not-a-slice"

	// codeReadFailed: the source itself failed; the cause is wrapped.
	//
	//	go: failing reader
	codeReadFailed Code = "read-failed"

	// codeRowLength: a row has more or fewer cells than the header.
	//
	//	csv: x,y\n1,2\n3\n
	codeRowLength Code = "row-length"

	// codeStrayQuote: a double quote stands inside a cell that does not begin
	// with one, or text follows a closing quote.
	//
	//	csv: x,y\n1,a\"b\n
	//	csv: x,y\n1,\"a\"b\n
	codeStrayQuote Code = "stray-quote"

	// codeStrayReturn: a carriage return outside quotes is not part of a line end.
	//
	//	csv: x,y\r1,2\r
	codeStrayReturn Code = "stray-return"

	// codeTooLarge: the data go beyond a limit.
	//
	//	go: more bytes than MaxBytes
	codeTooLarge Code = "too-large"

	// codeUnclosedQuote: a quoted cell does not end.
	//
	//	csv: x,y\n1,\"a\n2,b\n
	codeUnclosedQuote Code = "unclosed-quote"

	// codeUnequalLengths: columns, or a column and its missing mask, differ in length.
	//
	//	go: columns of two lengths
	codeUnequalLengths Code = "unequal-lengths"

	// codeUnmadeColumn: a Column is the zero value.
	//
	//	go: zero Column
	codeUnmadeColumn Code = "unmade-column"

	// codeUnsupportedType: a field or a query column has a type that is neither
	// number, true/false nor text.
	//
	//	go: slice field
	codeUnsupportedType Code = "unsupported-type"
)

// Refusals while a model is compiled, checked or applied to a table.
const (
	// codeBadCount: a count is negative or not whole.
	//
	//	csv: x,y,m\n1,2,1\n2,3,1.5\n3,5,2\n
	//	model: y ~ x counted m
	codeBadCount Code = "bad-count"

	// codeBadWeight: a weight is negative or not finite.
	//
	//	csv: x,y,w\n1,2,1\n2,3,-1\n3,5,2\n
	//	model: y ~ x weighted w
	codeBadWeight Code = "bad-weight"

	// codeCoincidingKnots: two knots of a spline fall on one value.
	//
	//	csv: x,y\n1,2\n1,3\n1,4\n1,5\n1,6\n2,7\n3,8\n
	//	model: y ~ spline(x, 3)
	codeCoincidingKnots Code = "coinciding-knots"

	// codeCombinedList: a category of several columns has in or a reference level.
	//
	//	csv: a,b,y\nA,1,2\nA,2,3\nB,1,4\n
	//	model: y ~ cat(a, b against 'A')
	codeCombinedList Code = "combined-list"

	// codeConflictingCategory: two mentions of one category differ in levels or coding.
	//
	//	csv: m,x,y\nA,1,2\nA,2,3\nB,1,4\nB,2,6\nA,3,3\n
	//	model: y ~ cat(m against 'B') + x by cat(m against mean)
	codeConflictingCategory Code = "conflicting-category"

	// codeConstantBasis: the argument of a basis has one value in all fitted rows.
	//
	//	csv: x,y\n1,2\n1,3\n1,4\n
	//	model: y ~ legendre(x, 2)
	codeConstantBasis Code = "constant-basis"

	// codeDependentColumns: columns of the model are linear combinations of others.
	//
	//	csv: a,b,y\n1,0,2\n1,0,3\n0,1,4\n0,1,5\n
	//	model: y ~ a + b
	codeDependentColumns Code = "dependent-columns"

	// codeDomain: arithmetic gives no finite number in some rows.
	//
	//	csv: x,y\n0,2\n1,3\n2,4\n
	//	model: y ~ log(x)
	codeDomain Code = "domain"

	// codeEmptyCells: a product of categories has combinations without rows.
	//
	//	csv: a,b,y\nA,S,2\nA,T,3\nB,S,4\nB,S,5\n
	//	model: y ~ cat(a) * cat(b)
	codeEmptyCells Code = "empty-cells"

	// codeEmptyLevel: a listed level has no fitted rows.
	//
	//	csv: m,y\nA,2\nB,3\nA,4\n
	//	model: y ~ cat(m in ('A', 'B', 'C'))
	codeEmptyLevel Code = "empty-level"

	// codeMissingValues: used columns have missing or non-finite cells.
	//
	//	csv: x,y\n1,2\n,3\n3,NaN\n
	//	model: y ~ x
	codeMissingValues Code = "missing-values"

	// codeNoColumns: nothing is left to fit.
	//
	//	csv: x,y\n1,2\n2,3\n3,5\n
	//	model: y ~ x - x - intercept
	codeNoColumns Code = "no-columns"

	// codeNotATerm: something cannot stand as a term at this place.
	//
	//	go: known inside a sum
	codeNotATerm Code = "not-a-term"

	// codeNotNestable: inside joins things that cannot be nested.
	//
	//	csv: m,h,x,y\nA,1,1,2\nA,2,2,3\nB,1,3,4\n
	//	model: y ~ (x + cat(h)) inside cat(m)
	codeNotNestable Code = "not-nestable"

	// codeNothingToRemove: a removed term is not in the model.
	//
	//	csv: x,z,y\n1,1,2\n2,4,3\n3,2,5\n
	//	model: y ~ x - z
	codeNothingToRemove Code = "nothing-to-remove"

	// codeNumericByItself: a numeric term is multiplied by itself.
	//
	//	csv: x,z,y\n1,1,2\n2,4,3\n3,2,5\n
	//	model: y ~ (x + z) * x
	codeNumericByItself Code = "numeric-by-itself"

	// codeOneLevel: a category has a single level.
	//
	//	csv: m,x,y\nA,1,2\nA,2,3\nA,3,4\n
	//	model: y ~ x + cat(m)
	codeOneLevel Code = "one-level"

	// codeParameterColumn: a parameter of an equation is named like a column.
	//
	//	csv: x,y,k\n1,2,1\n2,3,1\n3,5,1\n
	//	model: y = k*x fitting k
	codeParameterColumn Code = "parameter-column"

	// codeRepeatedColumn: a category names a column twice.
	//
	//	csv: m,x,y\nA,1,2\nB,2,3\nA,3,4\n
	//	model: y ~ cat(m, m)
	codeRepeatedColumn Code = "repeated-column"

	// codeRepeatedLevel: a level is listed twice.
	//
	//	csv: m,x,y\nA,1,2\nB,2,3\nA,3,4\n
	//	model: y ~ cat(m in ('A', 'B', 'A'))
	codeRepeatedLevel Code = "repeated-level"

	// codeResponseDomain: the response breaks a rule of its kind.
	//
	//	csv: k,n,x\n1,2,1\n3,2,2\n1,4,3\n
	//	model: k out of n ~ x as binomial
	codeResponseDomain Code = "response-domain"

	// codeTextColumn: a text column stands where numbers are needed.
	//
	//	csv: m,y\nA,2\nB,3\nA,4\n
	//	model: y ~ m
	codeTextColumn Code = "text-column"

	// codeTextResponse: the response, weight or count holds text.
	//
	//	csv: x,y\n1,2\n2,off\n3,4\n
	//	model: y ~ x
	codeTextResponse Code = "text-response"

	// codeTooFewRows: there are fewer rows than columns.
	//
	//	csv: x,y\n1,2\n2,3\n
	//	model: y ~ powers(x, 2)
	codeTooFewRows Code = "too-few-rows"

	// codeUnknownColumn: a name is no column of the data.
	//
	//	csv: hold,y\n1,2\n2,3\n3,5\n
	//	model: y ~ holt
	codeUnknownColumn Code = "unknown-column"

	// codeUnknownReference: the reference after against is no level of the fitted rows.
	//
	//	csv: m,y\nA,2\nB,3\nA,4\n
	//	model: y ~ cat(m against 'C')
	codeUnknownReference Code = "unknown-reference"

	// codeUnlistedLevel: a value is not among the levels listed after in.
	//
	//	csv: m,y\nA,2\nB,3\nC,4\nB,4\n
	//	model: y ~ cat(m in ('A', 'B'))
	codeUnlistedLevel Code = "unlisted-level"

	// codeUnseenLevel: a row to predict has a level that no fitted row had.
	//
	//	go: level never seen
	codeUnseenLevel Code = "unseen-level"

	// codeWrongKind: a column of another table is of another kind than when the
	// model was compiled.
	//
	//	go: text where numbers were
	codeWrongKind Code = "wrong-kind"

	// codeWrongLevelType: a level is of another type than its column.
	//
	//	csv: m,y\n1,2\n2,3\n1,4\n
	//	model: y ~ cat(m in ('1', '2'))
	codeWrongLevelType Code = "wrong-level-type"
)

// Codes lists every code of this package. The slice is the caller's.
func Codes() []Code {
	return []Code{
		codeBadCell,
		codeBadOption,
		codeDateColumn,
		codeDuplicateColumn,
		codeEmptyColumnName,
		codeInvalidUTF8,
		codeMixedColumn,
		codeNilElement,
		codeNoHeader,
		codeNoRows,
		codeNotASlice,
		codeReadFailed,
		codeRowLength,
		codeStrayQuote,
		codeStrayReturn,
		codeTooLarge,
		codeUnclosedQuote,
		codeUnequalLengths,
		codeUnmadeColumn,
		codeUnsupportedType,
		codeBadCount,
		codeBadWeight,
		codeCoincidingKnots,
		codeCombinedList,
		codeConflictingCategory,
		codeConstantBasis,
		codeDependentColumns,
		codeDomain,
		codeEmptyCells,
		codeEmptyLevel,
		codeMissingValues,
		codeNoColumns,
		codeNotATerm,
		codeNotNestable,
		codeNothingToRemove,
		codeNumericByItself,
		codeOneLevel,
		codeParameterColumn,
		codeRepeatedColumn,
		codeRepeatedLevel,
		codeResponseDomain,
		codeTextColumn,
		codeTextResponse,
		codeTooFewRows,
		codeUnknownColumn,
		codeUnknownReference,
		codeUnlistedLevel,
		codeUnseenLevel,
		codeWrongKind,
		codeWrongLevelType,
	}
}
