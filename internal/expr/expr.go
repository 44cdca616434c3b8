// Package expr evaluates the arithmetic of the model language over columns, a
// block of rows at a time, in double-double: sums, differences, products,
// quotients and whole powers of columns carry hi + lo parts (about 31 digits),
// so that a column such as x^10 is known beyond its rounding to float64.
// Functions (log, exp, …) are evaluated in float64.
package expr

import (
	"fmt"
	"math"

	"example.com/trammel/formula"
	"example.com/trammel/internal/dd"
)

// Block is the number of rows evaluated at a time.
const Block = 1024

// A Var is one column as the program reads it: exactly one of Num, Bits and
// Codes is set. Nothing is copied.
type Var struct {
	Num   []float64
	Bits  []bool
	Codes []int32 // index into Dict
	Dict  []string
}

// A Program is a compiled expression. It is immutable and may be shared.
type Program struct {
	root  *op
	names []string
	depth int // scratch blocks needed
	exact bool
}

// Names returns the columns the program reads, in order of first appearance.
// Shared, do not modify.
func (p *Program) Names() []string { return p.names }

// HasLow tells whether results can have low parts that are not zero.
func (p *Program) HasLow() bool { return !p.exact }

// Bare returns the name of the column when the program is nothing but a
// column.
func (p *Program) Bare() (string, bool) {
	if p.root.kind == opVar {
		return p.names[p.root.v], true
	}
	return "", false
}

type opKind uint8

const (
	opConst opKind = iota
	opVar
	opNeg
	opAdd
	opSub
	opMul
	opDiv
	opPowInt
	opPow
	opFunc
	opMin
	opMax
	opIf
	opCmp
	opText // text column against a level
	opCoded
)

type op struct {
	kind opKind
	c    dd.Num
	v    int
	k    int // power, comparison code
	f    func(float64) float64
	name string
	text string
	args []*op
}

// Compile turns an expression into a program. Every name in it must be a
// column; text columns may stand only beside = or <> and a level (the caller
// has checked both against its table).
func Compile(e formula.Expr) (*Program, error) {
	p := &Program{}
	root, err := p.compile(e)
	if err != nil {
		return nil, err
	}
	p.root = root
	p.depth = root.depth()
	p.exact = root.exact()
	return p, nil
}

func (o *op) depth() int {
	d := 0
	for i, a := range o.args {
		d = max(d, i+a.depth())
	}
	return d + 1
}

// exact tells that the op's low parts are always zero.
func (o *op) exact() bool {
	switch o.kind {
	case opVar, opCmp, opText:
		return true
	case opFunc:
		return o.name != "sqrt" && (o.name != "abs" || o.args[0].exact())
	case opConst:
		return o.c.Lo == 0
	case opNeg, opMin, opMax:
		for _, a := range o.args {
			if !a.exact() {
				return false
			}
		}
		return true
	case opIf:
		return o.args[1].exact() && o.args[2].exact()
	case opPow:
		return true
	}
	return false
}

func (p *Program) slot(name string) int {
	for i, n := range p.names {
		if n == name {
			return i
		}
	}
	p.names = append(p.names, name)
	return len(p.names) - 1
}

func (p *Program) compileAll(es ...formula.Expr) ([]*op, error) {
	out := make([]*op, len(es))
	for i, e := range es {
		o, err := p.compile(e)
		if err != nil {
			return nil, err
		}
		out[i] = o
	}
	return out, nil
}

var functions = map[string]func(float64) float64{
	"log": math.Log, "log10": math.Log10, "log1p": math.Log1p, "exp": math.Exp, "expm1": math.Expm1,
	"sqrt": math.Sqrt, "abs": math.Abs, "sin": math.Sin, "cos": math.Cos, "tan": math.Tan,
	"atan": math.Atan, "tanh": math.Tanh, "erf": math.Erf,
}

// Func returns the arithmetic function of one argument with that name, or nil.
func Func(name string) func(float64) float64 { return functions[name] }

func (p *Program) compile(e formula.Expr) (*op, error) {
	switch e := e.(type) {
	case *formula.Number:
		return &op{kind: opConst, c: dd.Of(e.Value)}, nil
	case *formula.Pi:
		// The low part of pi is exact to 106 bits.
		return &op{kind: opConst, c: dd.Num{Hi: math.Pi, Lo: 1.2246467991473515e-16}}, nil
	case *formula.Bool:
		v := 0.0
		if e.Value {
			v = 1
		}
		return &op{kind: opConst, c: dd.Of(v)}, nil
	case *formula.Name:
		return &op{kind: opVar, v: p.slot(e.Name)}, nil
	case *formula.Unary:
		args, err := p.compileAll(e.X)
		if err != nil {
			return nil, err
		}
		return &op{kind: opNeg, args: args}, nil
	case *formula.Binary:
		if e.Op == '^' {
			if k, ok := wholePower(e.Y); ok {
				args, err := p.compileAll(e.X)
				if err != nil {
					return nil, err
				}
				return &op{kind: opPowInt, k: k, args: args}, nil
			}
		}
		args, err := p.compileAll(e.X, e.Y)
		if err != nil {
			return nil, err
		}
		kinds := map[byte]opKind{'+': opAdd, '-': opSub, '*': opMul, '/': opDiv, '^': opPow}
		k, ok := kinds[e.Op]
		if !ok {
			return nil, fmt.Errorf("expr: no such operator %q", e.Op)
		}
		return &op{kind: k, args: args}, nil
	case *formula.Compare:
		code, ok := map[string]int{"=": 0, "<>": 1, "<": 2, "<=": 3, ">": 4, ">=": 5}[e.Op]
		if !ok {
			return nil, fmt.Errorf("expr: no such comparison %q", e.Op)
		}
		if l, isLevel := e.Y.(*formula.Level); isLevel && l.Kind == formula.TextLevel {
			n, isName := e.X.(*formula.Name)
			if !isName {
				return nil, fmt.Errorf("expr: a level is compared with something that is no column")
			}
			return &op{kind: opText, v: p.slot(n.Name), k: code, text: l.Text}, nil
		}
		args, err := p.compileAll(e.X, e.Y)
		if err != nil {
			return nil, err
		}
		return &op{kind: opCmp, k: code, args: args}, nil
	case *formula.Level:
		v := e.Number
		if e.Kind == formula.BoolLevel && e.Bool {
			v = 1
		}
		return &op{kind: opConst, c: dd.Of(v)}, nil
	case *formula.Call:
		args, err := p.compileAll(e.Args...)
		if err != nil {
			return nil, err
		}
		switch e.Func {
		case "min":
			return &op{kind: opMin, args: args}, nil
		case "max":
			return &op{kind: opMax, args: args}, nil
		case "if":
			return &op{kind: opIf, args: args}, nil
		case "coded":
			return &op{kind: opCoded, args: args}, nil
		case "num":
			return args[0], nil
		}
		f, ok := functions[e.Func]
		if !ok || len(args) != 1 {
			return nil, fmt.Errorf("expr: no such function %s", e.Func)
		}
		return &op{kind: opFunc, f: f, name: e.Func, args: args}, nil
	}
	return nil, fmt.Errorf("expr: cannot evaluate %T", e)
}

// wholePower recognises an exponent that is a whole number of modest size, so
// that the power can be formed by products.
func wholePower(e formula.Expr) (int, bool) {
	sign := 1
	if u, ok := e.(*formula.Unary); ok {
		sign, e = -1, u.X
	}
	n, ok := e.(*formula.Number)
	if !ok || n.Value != math.Trunc(n.Value) || n.Value > 64 {
		return 0, false
	}
	return sign * int(n.Value), true
}

// Scratch holds the blocks an evaluation needs; make one per goroutine with
// NewScratch.
type Scratch struct{ blocks []block }

type block struct{ hi, lo []float64 }

// NewScratch returns scratch space for the program.
func (p *Program) NewScratch() *Scratch {
	s := &Scratch{blocks: make([]block, p.depth+1)}
	for i := range s.blocks {
		buf := make([]float64, 2*Block)
		s.blocks[i] = block{buf[:Block], buf[Block:]}
	}
	return s
}

// Eval evaluates the program for all n rows into hi and lo (each of length n;
// lo may be nil when the low parts are not wanted). vars stand in the order of
// Names.
func (p *Program) Eval(hi, lo []float64, vars []Var, n int) {
	s := p.NewScratch()
	for from := 0; from < n; from += Block {
		to := min(n, from+Block)
		p.EvalBlock(hi[from:to], lowPart(lo, from, to), vars, from, s)
	}
}

func lowPart(lo []float64, from, to int) []float64 {
	if lo == nil {
		return nil
	}
	return lo[from:to]
}

// EvalBlock evaluates rows [from, from+len(hi)), at most Block of them, without
// allocating.
func (p *Program) EvalBlock(hi, lo []float64, vars []Var, from int, s *Scratch) {
	m := len(hi)
	b := block{s.blocks[p.depth].hi[:m], s.blocks[p.depth].lo[:m]}
	p.root.eval(b, vars, from, s, 0)
	if lo == nil {
		for i := range hi {
			hi[i] = b.hi[i] + b.lo[i]
		}
		return
	}
	copy(hi, b.hi)
	copy(lo, b.lo)
}

func (o *op) eval(out block, vars []Var, from int, s *Scratch, level int) {
	m := len(out.hi)
	zero := func() { clear(out.lo) }
	// The first argument is evaluated straight into out.
	first := func() { o.args[0].eval(out, vars, from, s, level) }
	// second is evaluated into a scratch block that the first does not use.
	second := func(k int) block {
		b := block{s.blocks[level].hi[:m], s.blocks[level].lo[:m]}
		o.args[k].eval(b, vars, from, s, level+1)
		return b
	}
	switch o.kind {
	case opConst:
		for i := range out.hi {
			out.hi[i], out.lo[i] = o.c.Hi, o.c.Lo
		}
	case opVar:
		v := vars[o.v]
		switch {
		case v.Num != nil:
			copy(out.hi, v.Num[from:from+m])
		case v.Bits != nil:
			for i, b := range v.Bits[from : from+m] {
				out.hi[i] = 0
				if b {
					out.hi[i] = 1
				}
			}
		default:
			for i := range out.hi {
				out.hi[i] = math.NaN()
			}
		}
		zero()
	case opNeg:
		first()
		for i := range out.hi {
			out.hi[i], out.lo[i] = -out.hi[i], -out.lo[i]
		}
	case opAdd, opSub, opMul, opDiv, opPow, opCmp:
		first()
		b := second(1)
		o.binary(out, b)
	case opPowInt:
		first()
		for i := range out.hi {
			v := dd.Num{Hi: out.hi[i], Lo: out.lo[i]}.PowInt(o.k)
			out.hi[i], out.lo[i] = v.Hi, v.Lo
		}
	case opFunc:
		first()
		switch o.name {
		case "sqrt":
			for i := range out.hi {
				v := dd.Num{Hi: out.hi[i], Lo: out.lo[i]}.Sqrt()
				out.hi[i], out.lo[i] = v.Hi, v.Lo
			}
		case "abs":
			for i := range out.hi {
				v := dd.Num{Hi: out.hi[i], Lo: out.lo[i]}.Abs()
				out.hi[i], out.lo[i] = v.Hi, v.Lo
			}
		default:
			for i := range out.hi {
				out.hi[i] = o.f(out.hi[i] + out.lo[i])
			}
			zero()
		}
	case opMin, opMax:
		first()
		for k := 1; k < len(o.args); k++ {
			b := second(k)
			for i := range out.hi {
				x, y := dd.Num{Hi: out.hi[i], Lo: out.lo[i]}, dd.Num{Hi: b.hi[i], Lo: b.lo[i]}
				less := y.Cmp(x) < 0
				if math.IsNaN(y.Hi) || (o.kind == opMin && less) || (o.kind == opMax && !less && !math.IsNaN(x.Hi)) {
					out.hi[i], out.lo[i] = y.Hi, y.Lo
				}
			}
		}
	case opIf:
		first()
		// Both branches are evaluated; only the one taken is kept, so a
		// failure in the other one does not count.
		yes := block{s.blocks[level].hi[:m], s.blocks[level].lo[:m]}
		o.args[1].eval(yes, vars, from, s, level+1)
		no := block{s.blocks[level+1].hi[:m], s.blocks[level+1].lo[:m]}
		o.args[2].eval(no, vars, from, s, level+2)
		for i := range out.hi {
			switch c := out.hi[i] + out.lo[i]; {
			case math.IsNaN(c):
				out.hi[i], out.lo[i] = c, 0
			case c != 0:
				out.hi[i], out.lo[i] = yes.hi[i], yes.lo[i]
			default:
				out.hi[i], out.lo[i] = no.hi[i], no.lo[i]
			}
		}
	case opText:
		v := vars[o.v]
		want := int32(-1)
		for i, t := range v.Dict {
			if t == o.text {
				want = int32(i)
			}
		}
		for i := range out.hi {
			eq := v.Codes[from+i] == want
			out.hi[i] = 0
			if eq == (o.k == 0) {
				out.hi[i] = 1
			}
		}
		zero()
	case opCoded:
		// 2(x-low)/(high-low) - 1
		first()
		low, high := o.args[1].constant(), o.args[2].constant()
		span := high.Sub(low)
		for i := range out.hi {
			v := dd.Num{Hi: out.hi[i], Lo: out.lo[i]}.Sub(low).MulF(2).Div(span).AddF(-1)
			out.hi[i], out.lo[i] = v.Hi, v.Lo
		}
	}
}

func (o *op) constant() dd.Num {
	switch o.kind {
	case opConst:
		return o.c
	case opNeg:
		return o.args[0].constant().Neg()
	}
	return dd.Of(math.NaN())
}

func (o *op) binary(out, b block) {
	for i := range out.hi {
		x, y := dd.Num{Hi: out.hi[i], Lo: out.lo[i]}, dd.Num{Hi: b.hi[i], Lo: b.lo[i]}
		var v dd.Num
		switch o.kind {
		case opAdd:
			v = x.Add(y)
		case opSub:
			v = x.Sub(y)
		case opMul:
			v = x.Mul(y)
		case opDiv:
			v = x.Div(y)
		case opPow:
			v = dd.Of(math.Pow(x.Float(), y.Float()))
		case opCmp:
			if math.IsNaN(x.Hi) || math.IsNaN(y.Hi) {
				v = dd.Of(math.NaN())
				break
			}
			c, yes := x.Cmp(y), false
			switch o.k {
			case 0:
				yes = c == 0
			case 1:
				yes = c != 0
			case 2:
				yes = c < 0
			case 3:
				yes = c <= 0
			case 4:
				yes = c > 0
			case 5:
				yes = c >= 0
			}
			if yes {
				v = dd.Of(1)
			}
		}
		if math.IsInf(v.Hi, 0) || math.IsNaN(v.Hi) {
			v.Lo = 0
		}
		out.hi[i], out.lo[i] = v.Hi, v.Lo
	}
}
