package design

import (
	"example.com/trammel/formula"
	"example.com/trammel/internal/factored"
)

// Options says how a model is compiled. Nil means the zero value.
type Options struct {
	// SetAside leaves out the rows in which a used column is missing or not
	// finite, and lists them; by default such rows are refused.
	SetAside bool

	// NoRankCheck leaves the rank check to the caller, who calls
	// [Frame.CheckRank]. Fitters set it because they learn the rank anyway.
	NoRankCheck bool
}

// A Plan is a compiled model: everything learnt from the fitted rows that the
// columns of other rows need (levels, references, basis constants), the
// columns' names and meanings, and the terms they belong to. A Plan is
// immutable; goroutines may share it.
type Plan struct {
	compiled
	model   *formula.Model
	eq      *Equation       // nil for a model in terms
	own     [][]*rawTerm    // the terms of each parameter of an equation
	kinds   map[string]Kind // of the columns used, as in the fitted rows
	columns []PlanColumn
	list    []PlanTerm
	derived []Derived
	backMap *BackMap // nil when there is no way back from the response
}

// compiled is the part of a plan that turns rows into columns. A submodel has
// its own, over the same factors.
type compiled struct {
	text  string
	terms []*term // in coding order
	cats  []*category
	nests []*nesting
	nums  []*numeric
	known []*numeric
	uses  *uses

	coded        []codedColumn
	from         []int // columns of term k are [from[k], from[k+1])
	cols         []factored.Col
	products     [][]numRef
	productIndex map[string]int
	entries      map[[3]int][]int8
}

// A PlanColumn describes one column of the matrix, and so one coefficient.
type PlanColumn struct {
	Name    string // in the model language: "hold by furnace='F2'"
	Meaning string // in words: "change in the slope of hold, F2 against F1"
	Term    int    // index into Plan.Terms
}

// A PlanTerm describes one term of the model in coding order.
type PlanTerm struct {
	Text      string // canonical text; "intercept" for the intercept
	Intercept bool
	From, To  int   // its columns are [From, To); From = To when earlier terms express it all
	Written   int   // its place among the terms as written out, from 0
	Within    []int // indices of the terms that contain it, ascending
}

// A Derived is an effect that has no column of its own but is a combination
// of coefficients: the reference level under "against mean".
type Derived struct {
	Name    string
	Meaning string
	Term    int       // index into Plan.Terms
	Weights []float64 // its value is the sum of Weights[j] times coefficient j
}

// A Decoding is the table that turns the levels of one category, as coded in
// some terms, into its indicator columns: Entries[level][column] is -1, 0 or 1.
type Decoding struct {
	Category string   // canonical text
	Terms    []string // the terms in which it is coded so
	Levels   []string // as written in the model language
	Columns  []string // the category's part of the columns' names
	Entries  [][]int
}

// A Note is a plain remark that does not stop a fit.
type Note struct {
	Code string // kebab-case, such as "code-like-column"
	Text string // one sentence
}

// Model is the parsed text. Shared, do not modify.
func (p *Plan) Model() *formula.Model { return p.model }

// Columns describes the columns in order. Shared, do not modify.
func (p *Plan) Columns() []PlanColumn { return p.columns }

// Terms describes the terms: the intercept first when there is one, then by
// number of factors, then as written. Shared, do not modify.
func (p *Plan) Terms() []PlanTerm { return p.list }

// Derived lists the effects that are combinations of coefficients. Shared, do
// not modify.
func (p *Plan) Derived() []Derived { return p.derived }

// Response is the canonical text of what the model describes: "porosity",
// "log(porosity)".
func (p *Plan) Response() string { return p.model.Response.Value.String() }
