package formula

// Span tells where the node stands in the text it was parsed from.
func (n *Model) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Response) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Terms) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Cross) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *By) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Inside) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Intercept) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Name) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Call) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Category) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Base) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Level) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Number) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Bool) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Pi) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Unary) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Binary) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Compare) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Errors) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Param) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Coef) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Part) Span() Span { return n.Pos }

// Span tells where the node stands in the text it was parsed from.
func (n *Equal) Span() Span { return n.Pos }

// TermText gives the text by which terms are equal, see [Term].
func (n *Terms) TermText() string { return termText(n) }

// TermText gives the text by which terms are equal, see [Term].
func (n *Cross) TermText() string { return termText(n) }

// TermText gives the text by which terms are equal, see [Term].
func (n *By) TermText() string { return termText(n) }

// TermText gives the text by which terms are equal, see [Term].
func (n *Inside) TermText() string { return termText(n) }

// TermText gives the text by which terms are equal, see [Term].
func (n *Intercept) TermText() string { return termText(n) }

// TermText gives the text by which terms are equal, see [Term].
func (n *Name) TermText() string { return termText(n) }

// TermText gives the text by which terms are equal, see [Term].
func (n *Call) TermText() string { return termText(n) }

// TermText gives the text by which terms are equal, see [Term].
func (n *Category) TermText() string { return termText(n) }

func (*Model) node()     {}
func (*Response) node()  {}
func (*Terms) node()     {}
func (*Cross) node()     {}
func (*By) node()        {}
func (*Inside) node()    {}
func (*Intercept) node() {}
func (*Name) node()      {}
func (*Call) node()      {}
func (*Category) node()  {}
func (*Base) node()      {}
func (*Level) node()     {}
func (*Number) node()    {}
func (*Bool) node()      {}
func (*Pi) node()        {}
func (*Unary) node()     {}
func (*Binary) node()    {}
func (*Compare) node()   {}
func (*Errors) node()    {}
func (*Param) node()     {}
func (*Coef) node()      {}
func (*Part) node()      {}
func (*Equal) node()     {}

func (*Terms) term()     {}
func (*Cross) term()     {}
func (*By) term()        {}
func (*Inside) term()    {}
func (*Intercept) term() {}
func (*Name) term()      {}
func (*Call) term()      {}
func (*Category) term()  {}

func (*Number) expr()  {}
func (*Bool) expr()    {}
func (*Pi) expr()      {}
func (*Name) expr()    {}
func (*Call) expr()    {}
func (*Unary) expr()   {}
func (*Binary) expr()  {}
func (*Compare) expr() {}
func (*Level) expr()   {}
