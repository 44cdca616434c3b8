package formula

import (
	"strconv"
	"strings"
)

// String prints the model as canonical text on one line. Parsing it gives the
// same tree.
func (n *Model) String() string { return text(n) }

// String prints canonical text.
func (n *Response) String() string { return text(n) }

// String prints canonical text.
func (n *Terms) String() string { return text(n) }

// String prints canonical text.
func (n *Cross) String() string { return text(n) }

// String prints canonical text.
func (n *By) String() string { return text(n) }

// String prints canonical text.
func (n *Inside) String() string { return text(n) }

// String prints canonical text.
func (n *Intercept) String() string { return text(n) }

// String prints canonical text.
func (n *Name) String() string { return text(n) }

// String prints canonical text.
func (n *Call) String() string { return text(n) }

// String prints canonical text.
func (n *Category) String() string { return text(n) }

// String prints canonical text.
func (n *Base) String() string { return text(n) }

// String prints canonical text.
func (n *Level) String() string { return text(n) }

// String prints canonical text.
func (n *Number) String() string { return text(n) }

// String prints canonical text.
func (n *Bool) String() string { return text(n) }

// String prints canonical text.
func (n *Pi) String() string { return text(n) }

// String prints canonical text.
func (n *Unary) String() string { return text(n) }

// String prints canonical text.
func (n *Binary) String() string { return text(n) }

// String prints canonical text.
func (n *Compare) String() string { return text(n) }

// String prints canonical text.
func (n *Errors) String() string { return text(n) }

// String prints canonical text.
func (n *Param) String() string { return text(n) }

// String prints the name; parsing and printing it again changes nothing.
func (n *Coef) String() string { return text(n) }

// String prints canonical text.
func (n *Part) String() string { return text(n) }

// String prints canonical text.
func (n *Equal) String() string { return text(n) }

func termText(t Term) string {
	p := printer{bare: true}
	p.node(t)
	return p.String()
}

func text(n node) string {
	var p printer
	p.node(n)
	return p.String()
}

// A printer writes into one buffer, so that long sums print in linear time.
type printer struct {
	strings.Builder
	bare bool // num(…) without num
}

func (p *printer) put(parts ...string) {
	for _, s := range parts {
		p.WriteString(s)
	}
}

// How tightly arithmetic binds; what binds less than its place demands gets
// parentheses.
const (
	bindCompare = iota
	bindSum
	bindProduct
	bindUnary
	bindPower
	bindPrimary
)

// The same for terms.
const (
	bindTerms = iota
	bindCross
	bindBy
	bindInside
	bindFactor
)

func binding(n node) int {
	switch n := n.(type) {
	case *Compare:
		return bindCompare
	case *Binary:
		switch n.Op {
		case '+', '-':
			return bindSum
		case '*', '/':
			return bindProduct
		}
		return bindPower
	case *Unary:
		return bindUnary
	case *Terms:
		return bindTerms
	case *Cross:
		return bindCross
	case *By:
		return bindBy
	case *Inside:
		return bindInside
	}
	return max(bindPrimary, bindFactor)
}

func (p *printer) within(n node, least int) {
	if binding(n) >= least {
		p.node(n)
		return
	}
	p.put("(")
	p.node(n)
	p.put(")")
}

func list[N node](p *printer, nodes []N, separator string, least int) {
	for i, n := range nodes {
		if i > 0 {
			p.put(separator)
		}
		p.within(n, least)
	}
}

func (p *printer) node(n node) {
	switch n := n.(type) {
	case *Model:
		p.model(n)
	case *Response:
		p.within(n.Value, bindSum)
		if n.OutOf != nil {
			p.put(" out of ")
			p.within(n.OutOf, bindSum)
		}
		if n.Per != nil {
			p.put(" per ")
			p.within(n.Per, bindSum)
		}
	case *Terms:
		p.terms(n)
	case *Cross:
		list(p, n.Factors, "*", bindBy)
	case *By:
		list(p, n.Factors, " by ", bindInside)
	case *Inside:
		list(p, n.Factors, " inside ", bindFactor)
	case *Intercept:
		p.put("intercept")
	case *Name:
		p.put(QuoteName(n.Name))
	case *Call:
		p.call(n)
	case *Category:
		p.category(n)
	case *Base:
		switch {
		case n.Mean:
			p.put("mean")
		case n.Previous:
			p.put("previous")
		default:
			p.node(n.Level)
		}
	case *Level:
		switch n.Kind {
		case NumberLevel:
			p.put(FormatNumber(n.Number))
		case BoolLevel:
			p.put(strconv.FormatBool(n.Bool))
		default:
			p.put(QuoteLevel(n.Text))
		}
	case *Number:
		p.put(FormatNumber(n.Value))
	case *Bool:
		p.put(strconv.FormatBool(n.Value))
	case *Pi:
		p.put("pi")
	case *Unary:
		p.put("-")
		p.within(n.X, bindUnary)
	case *Binary:
		p.binary(n)
	case *Compare:
		p.within(n.X, bindSum)
		p.put(n.Op)
		p.within(n.Y, bindSum)
	case *Errors:
		p.errors(n)
	case *Param:
		p.param(n)
	case *Coef:
		p.coef(n)
	case *Part:
		p.part(n)
	case *Equal:
		p.node(n.Column)
		p.put("=")
		if n.Others {
			p.put("others")
		} else {
			p.node(n.Level)
		}
	}
}

func (p *printer) model(n *Model) {
	p.node(n.Response)
	if n.Terms != nil {
		p.put(" ~ ")
		p.node(n.Terms)
	} else {
		p.put(" = ")
		p.within(n.Equation, bindSum)
	}
	if n.Errors != nil {
		p.put(" as ")
		p.node(n.Errors)
	}
	if n.Weighted != nil {
		p.put(" weighted ")
		p.within(n.Weighted, bindSum)
	}
	if n.Counted != nil {
		p.put(" counted ")
		p.within(n.Counted, bindSum)
	}
	if len(n.Params) > 0 {
		p.put(" fitting ")
		list(p, n.Params, ", ", 0)
	}
}

func (p *printer) terms(n *Terms) {
	for i, it := range n.Items {
		switch {
		case it.Minus && i == 0:
			p.put("-")
		case it.Minus:
			p.put(" - ")
		case i > 0:
			p.put(" + ")
		}
		p.within(it.Term, bindCross)
	}
}

func (p *printer) binary(n *Binary) {
	switch n.Op {
	case '+', '-':
		p.within(n.X, bindSum)
		p.put(" ", string(n.Op), " ")
		p.within(n.Y, bindProduct)
	case '*', '/':
		p.within(n.X, bindProduct)
		p.put(string(n.Op))
		p.within(n.Y, bindUnary)
	default: // x^y^z is x^(y^z), and the exponent may carry a sign
		p.within(n.X, bindPrimary)
		p.put("^")
		p.within(n.Y, bindUnary)
	}
}

func (p *printer) call(n *Call) {
	if p.bare && n.Func == "num" && len(n.Args) == 1 {
		p.within(n.Args[0], bindSum)
		return
	}
	p.put(n.Func, "(")
	if n.Terms != nil {
		p.node(n.Order)
		p.put(", ")
		p.node(n.Terms)
	}
	list(p, n.Args, ", ", 0)
	p.put(")")
}

func (p *printer) category(n *Category) {
	p.put("cat(")
	list(p, n.Columns, ", ", 0)
	if n.In != nil {
		p.put(" in (")
		list(p, n.In, ", ", 0)
		if n.Others {
			p.put(", others")
		}
		p.put(")")
	}
	if n.Against != nil {
		p.put(" against ")
		p.node(n.Against)
	}
	p.put(")")
}

func (p *printer) errors(n *Errors) {
	if n.Overdispersed {
		p.put("overdispersed ")
	}
	p.put(n.Family)
	if n.Link != "" {
		p.put(" link ", n.Link)
	}
	if n.Power != nil {
		p.put("(", FormatNumber(*n.Power), ")")
	}
}

// head prints the name before a declaration or an index: k, log(k).
func (p *printer) head(link string, name *Name) {
	if link == "" {
		p.node(name)
		return
	}
	p.put(link, "(")
	p.node(name)
	p.put(")")
}

func (p *printer) param(n *Param) {
	p.head(n.ParLink, n.Name)
	if n.Held != nil {
		p.put(" = ", FormatNumber(*n.Held))
	}
	if n.Terms != nil {
		p.put(" ~ ")
		p.node(n.Terms)
	}
	if n.By != nil {
		p.put(" by ")
		p.node(n.By)
	}
	switch {
	case n.Low != nil && n.High != nil:
		p.put(" in (", FormatNumber(*n.Low), ", ", FormatNumber(*n.High), ")")
	case n.Low != nil:
		p.put(" > ", FormatNumber(*n.Low))
	case n.High != nil:
		p.put(" < ", FormatNumber(*n.High))
	}
	if n.Start != nil {
		p.put(" start ", FormatNumber(*n.Start))
	}
}

func (p *printer) coef(n *Coef) {
	if n.Param == nil {
		list(p, n.Parts, " by ", 0)
		return
	}
	p.head(n.ParLink, n.Param)
	if n.Index != nil {
		p.put("[")
		p.node(n.Index)
		p.put("]")
	}
}

func (p *printer) part(n *Part) {
	switch {
	case n.Intercept:
		p.put("intercept")
	case n.Value != nil:
		p.within(n.Value, bindSum)
	case n.Basis != nil:
		p.node(n.Basis)
		p.put("[", strconv.Itoa(n.Index), "]")
	default:
		p.cell(n.Cell)
	}
	if n.Against != nil {
		p.put(" against ")
		p.node(n.Against)
	}
	if n.Inside != nil {
		p.put(" inside ")
		p.cell(n.Inside)
	}
}

// cell writes one equality bare and several in parentheses.
func (p *printer) cell(equals []Equal) {
	if len(equals) == 1 {
		p.node(&equals[0])
		return
	}
	p.put("(")
	for i := range equals {
		if i > 0 {
			p.put(", ")
		}
		p.node(&equals[i])
	}
	p.put(")")
}
