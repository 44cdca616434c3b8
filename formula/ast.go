package formula

// A Span is a half-open range of byte offsets into the text of a model.
// The zero Span means "no place in the text".
type Span struct{ Start, End int }

// A node is any part of a parsed model. Nodes carry the names of the grammar's
// productions. They are made by [Parse] and [ParseCoef] only and must not be
// modified; they may be shared between goroutines. Every node has these methods.
type node interface {
	// Span tells where the node stands in the text it was parsed from.
	Span() Span
	// String prints canonical text: spaces round + and - only, the fewest
	// parentheses, the shortest numbers, ", " between arguments.
	String() string
	node()
}

// A Term is a node of the right side of a terms-form model: *Terms, *Cross,
// *By, *Inside, *Intercept, *Name, *Call or *Category. Nodes are made by
// [Parse] only, must not be modified and may be shared between goroutines.
type Term interface {
	// Span tells where the term stands in the text it was parsed from.
	Span() Span
	// String prints canonical text that parses to the same term.
	String() string
	// TermText gives the canonical text by which terms are equal and which
	// names them in tables: as String, but num(…) is replaced by its arithmetic,
	// so that num(hold^2) and the square of powers(hold, 2) are both "hold^2". A
	// comparison keeps parentheses: "(furnace='F2')".
	TermText() string
	node()
	term()
}

// An Expr is a node of arithmetic: *Number, *Bool, *Pi, *Name, *Call, *Unary,
// *Binary, *Compare, or, beside a comparison sign only, *Level. Nodes are made
// by [Parse] and [ParseCoef] only, must not be modified and may be shared
// between goroutines.
type Expr interface {
	// Span tells where the expression stands in the text it was parsed from.
	Span() Span
	// String prints canonical text that parses to the same expression.
	String() string
	node()
	expr()
}

// A Model is one parsed model text, in the terms form (Terms is set) or in the
// equation form (Equation is set).
type Model struct {
	Pos      Span
	Text     string    // the text as given to Parse
	Response *Response // the left side
	Terms    *Terms    // right side of "~"; nil in the equation form
	Equation Expr      // right side of "="; nil in the terms form
	Errors   *Errors   // "as …"; nil when not written
	Weighted Expr      // "weighted …"; nil when not written
	Counted  Expr      // "counted …"; nil when not written
	Params   []*Param  // "fitting …"; empty in the terms form
}

// A Response is the left side of a model: Value, "Value out of OutOf" or
// "Value per Per". At most one of OutOf and Per is set.
type Response struct {
	Pos   Span
	Value Expr
	OutOf Expr
	Per   Expr
}

// Terms is a sum of terms; the operators act from left to right.
type Terms struct {
	Pos   Span
	Items []SignedTerm // at least one
}

// A SignedTerm is one summand of [Terms]; Minus says that it is removed.
type SignedTerm struct {
	Minus bool
	Term  Term
}

// Cross is a * b * …: the factors and all their interactions.
type Cross struct {
	Pos     Span
	Factors []Term // at least two
}

// By is a by b by …: the interaction alone.
type By struct {
	Pos     Span
	Factors []Term // at least two
}

// Inside is "b inside a": b nested in a. A chain "c inside b inside a" has
// three factors, innermost category first.
type Inside struct {
	Pos     Span
	Factors []Term // at least two
}

// Intercept is the word "intercept" as a term.
type Intercept struct{ Pos Span }

// A Name names a column (or, in an equation, a parameter). Name is the plain
// name, without quotes.
type Name struct {
	Pos  Span
	Name string
}

// A Call is a function applied to arguments. As a term it is num, coded,
// powers, legendre, spline, hinge, harmonics, upto, quadratic, known or a
// function of arithmetic standing alone; as an expression it is a function of
// arithmetic. upto has Order and Terms, every other call has Args.
type Call struct {
	Pos     Span
	FuncPos Span // the function's name
	Func    string
	Order   *Number // upto only
	Terms   *Terms  // upto only
	Args    []Expr
}

// A Category is cat(…).
type Category struct {
	Pos     Span
	Columns []*Name  // at least one
	In      []*Level // listed levels in order; nil when not written
	Others  bool     // "others" ended the list
	Against *Base    // nil when not written
}

// A Base is what follows "against": exactly one of Level, Mean and Previous.
type Base struct {
	Pos      Span
	Level    *Level
	Mean     bool
	Previous bool
}

// A Level is one value of a category. Kind says which field holds it.
type Level struct {
	Pos    Span
	Kind   LevelKind
	Text   string  // TextLevel: without quotes
	Number float64 // NumberLevel
	Bool   bool    // BoolLevel
}

// A LevelKind is the type of a level's value.
type LevelKind uint8

// The kinds of level.
const (
	TextLevel LevelKind = iota + 1
	NumberLevel
	BoolLevel
)

// A Number is an unsigned numeric literal.
type Number struct {
	Pos   Span
	Value float64
}

// A Bool is the word true or false: 1 or 0 in arithmetic.
type Bool struct {
	Pos   Span
	Value bool
}

// Pi is the word pi: 3.14159….
type Pi struct{ Pos Span }

// A Unary is -X.
type Unary struct {
	Pos Span
	X   Expr
}

// A Binary is X Op Y, with Op one of + - * / ^.
type Binary struct {
	Pos   Span
	OpPos Span
	Op    byte
	X, Y  Expr
}

// A Compare is X Op Y, worth 1 or 0, with Op one of = <> < <= > >=. Y is a
// *Level of kind TextLevel when a text column is compared.
type Compare struct {
	Pos   Span
	OpPos Span
	Op    string
	X, Y  Expr
}

// Errors is "as …": the family of errors, and the link when written.
type Errors struct {
	Pos           Span
	Overdispersed bool
	Family        string   // normal, binomial, poisson, gamma, inverse_gaussian, negative_binomial
	Link          string   // "" when not written
	Power         *float64 // of link power(p)
}

// A Param is one declaration after "fitting". Exactly one of these shapes:
// held (Held set), a value (Terms nil) with optional By, Bounds and Start, or a
// model of its own (Terms set, ParLink "" or log, logit, reciprocal).
type Param struct {
	Pos     Span
	Name    *Name
	Held    *float64  // k = 0.3
	By      *Category // k by cat(…)
	Low     *float64  // k > low, or k in (low, high)
	High    *float64  // k < high, or k in (low, high)
	ParLink string    // log(k) ~ …
	Terms   *Terms    // k ~ …
	Start   *float64  // start 0.3
}

// A Coef is the parsed name of a coefficient. Either Parts is set, read as
// parts joined by "by", or the name belongs to a parameter of an equation:
// Param[Index], with ParLink for log(Param)[Index] and the like.
type Coef struct {
	Pos     Span
	Parts   []*Part
	Param   *Name
	ParLink string
	Index   *Coef
}

// A Part is one factor of a coefficient's name. Exactly one of Intercept,
// Value, Basis and Cell is set.
type Part struct {
	Pos       Span
	Intercept bool
	Value     Expr    // a canonical expression: hold, hold^2, (furnace='F2')
	Basis     *Call   // legendre(hold, 3)[2]: the call
	Index     int     // … and which column of it, from 1
	Cell      []Equal // furnace='F2', or (site='A', machine='M2')
	Against   *Base   // … against mean, … against 'low'
	Inside    []Equal // … inside machine='M1': the enclosing levels
}

// An Equal is Column=Level in the name of a coefficient.
type Equal struct {
	Pos    Span
	Column *Name
	Level  *Level // nil when Others
	Others bool   // column=others: the pooled level
}
