package design

import "example.com/trammel/formula"

type numericKind uint8

const (
	exprKind numericKind = iota
	legendreKind
	splineKind
	hingeKind
	harmonicsKind
)

// A numericSpec is a numeric factor as the text declares it: one column of
// arithmetic, or a basis of several columns that counts as one factor.
type numericSpec struct {
	kind      numericKind
	text      string       // canonical; equal texts are equal factors
	expr      formula.Expr // the column, or the basis' argument
	k         int          // legendre, spline, harmonics: the order
	constants []float64    // hinge: where the line bends; harmonics: the period
	bare      string       // the column's name when the factor is a plain column
}

// exprText is the canonical text of arithmetic as a term or a part of a
// coefficient's name: a comparison keeps its parentheses.
func exprText(e formula.Expr) string {
	if _, ok := e.(*formula.Compare); ok {
		return "(" + e.String() + ")"
	}
	return e.String()
}

func exprSpec(e formula.Expr) *numericSpec {
	if c, ok := e.(*formula.Call); ok && c.Func == "num" {
		e = c.Args[0]
	}
	s := &numericSpec{kind: exprKind, text: exprText(e), expr: e}
	if n, ok := e.(*formula.Name); ok {
		s.bare = n.Name
	}
	return s
}

func basisSpec(c *formula.Call) *numericSpec {
	s := &numericSpec{text: c.String(), expr: c.Args[0]}
	switch c.Func {
	case "legendre":
		s.kind, s.k = legendreKind, whole(c.Args[1])
	case "spline":
		s.kind, s.k = splineKind, whole(c.Args[1])
	case "hinge":
		s.kind = hingeKind
		for _, a := range c.Args[1:] {
			s.constants = append(s.constants, signed(a))
		}
	case "harmonics":
		s.kind, s.k = harmonicsKind, whole(c.Args[2])
		s.constants = []float64{signed(c.Args[1])}
	}
	return s
}

// signed reads a numeric constant that the parser has checked.
func signed(e formula.Expr) float64 {
	switch e := e.(type) {
	case *formula.Number:
		return e.Value
	case *formula.Unary:
		return -signed(e.X)
	}
	return 0
}

// source is the factor's text as a term of a model.
func (s *numericSpec) source() string {
	if s.kind != exprKind || s.bare != "" {
		return s.text
	}
	if _, ok := s.expr.(*formula.Call); ok {
		return s.text
	}
	return "num(" + s.expr.String() + ")"
}

// parts names the factor's columns: canonical expressions, or the basis with
// the number of the column in brackets.
func (s *numericSpec) parts() []string {
	switch s.kind {
	case legendreKind, splineKind:
		out := make([]string, s.k)
		for i := range out {
			out[i] = s.text + "[" + formula.FormatNumber(float64(i+1)) + "]"
		}
		return out
	case hingeKind:
		out := make([]string, len(s.constants))
		for i, c := range s.constants {
			out[i] = (&formula.Call{Func: "max", Args: []formula.Expr{
				&formula.Number{}, plus(s.expr, -c)}}).String()
		}
		return out
	case harmonicsKind:
		out := make([]string, 0, 2*s.k)
		for j := 1; j <= s.k; j++ {
			angle := &formula.Binary{Op: '/',
				X: &formula.Binary{Op: '*',
					X: &formula.Binary{Op: '*', X: &formula.Number{Value: float64(2 * j)}, Y: &formula.Pi{}},
					Y: s.expr},
				Y: &formula.Number{Value: s.constants[0]}}
			for _, f := range []string{"cos", "sin"} {
				out = append(out, (&formula.Call{Func: f, Args: []formula.Expr{angle}}).String())
			}
		}
		return out
	}
	return []string{s.text}
}

// plus is x + c, written x - |c| for a negative c.
func plus(x formula.Expr, c float64) formula.Expr {
	switch {
	case c == 0:
		return x
	case c < 0:
		return &formula.Binary{Op: '-', X: x, Y: &formula.Number{Value: -c}}
	}
	return &formula.Binary{Op: '+', X: x, Y: &formula.Number{Value: c}}
}
