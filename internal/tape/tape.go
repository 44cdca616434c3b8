// Package tape evaluates the right side of an equation with exact first and
// second derivatives with respect to its parameters, a block of rows at a time
// (forward accumulation: A. Griewank and A. Walther, Evaluating Derivatives,
// 2nd ed., SIAM 2008, ch. 3). Parts in which no parameter stands are left to
// package expr and enter as columns; equal parts are evaluated once.
package tape

import (
	"fmt"
	"math"
	"slices"

	"example.com/trammel/formula"
)

// Block is the number of rows evaluated at a time.
const Block = 256

type kind uint8

const (
	opConst  kind = iota
	opColumn      // a part without parameters
	opParam
	opNeg
	opAdd
	opSub
	opMul
	opDiv
	opPow  // x^y with y free of parameters
	opExpY // x^y with parameters in y: exp(y log x)
	opFunc
	opMin
	opMax
	opIf
	opCmp
)

type op struct {
	kind   kind
	args   []int
	value  float64 // opConst
	slot   int     // opColumn, opParam
	cmp    string
	fn     *function
	active []int // parameters it depends on, ascending

}

// A Part is a maximal part of an equation without parameters: it is computed
// once for all rows. Guarded tells that it stands inside a branch of if, where
// it need not be defined in every row.
type Part struct {
	Expr    formula.Expr
	Guarded bool
}

// A Program is a compiled equation. It is immutable and may be shared.
type Program struct {
	ops    []op
	parts  []Part
	params []string
	index  map[string]int
	part   map[string]int
}

// Compile compiles an equation whose names in params are parameters and whose
// other names are columns.
func Compile(e formula.Expr, params []string) (*Program, error) {
	p := &Program{params: params, index: make(map[string]int), part: make(map[string]int)}
	if _, err := p.compile(e, false); err != nil {
		return nil, err
	}
	return p, nil
}

// Parts lists the parts without parameters. Shared, do not modify.
func (p *Program) Parts() []Part { return p.parts }

// Params is the number of parameters.
func (p *Program) Params() int { return len(p.params) }

// depends tells whether a parameter stands in e.
func (p *Program) depends(e formula.Expr) bool {
	switch e := e.(type) {
	case *formula.Name:
		return slices.Contains(p.params, e.Name)
	case *formula.Unary:
		return p.depends(e.X)
	case *formula.Binary:
		return p.depends(e.X) || p.depends(e.Y)
	case *formula.Compare:
		return p.depends(e.X) || p.depends(e.Y)
	case *formula.Call:
		return slices.ContainsFunc(e.Args, p.depends)
	}
	return false
}

// add appends an op unless an equal one is there.
func (p *Program) add(key string, o op) int {
	if k, ok := p.index[key]; ok {
		return k
	}
	for _, a := range o.args {
		for _, q := range p.ops[a].active {
			if !slices.Contains(o.active, q) {
				o.active = append(o.active, q)
			}
		}
	}
	slices.Sort(o.active)
	if o.kind == opCmp {
		o.active = nil // constant on both sides of the jump
	}
	p.ops = append(p.ops, o)
	p.index[key] = len(p.ops) - 1
	return len(p.ops) - 1
}

func (p *Program) compile(e formula.Expr, guarded bool) (int, error) {
	key := e.String()
	if n, ok := e.(*formula.Number); ok {
		return p.add(key, op{kind: opConst, value: n.Value}), nil
	}
	if !p.depends(e) {
		k, ok := p.part[key]
		if !ok {
			k = len(p.parts)
			p.part[key] = k
			p.parts = append(p.parts, Part{e, true})
		}
		p.parts[k].Guarded = p.parts[k].Guarded && guarded
		return p.add(key, op{kind: opColumn, slot: k}), nil
	}
	all := func(guards bool, es ...formula.Expr) ([]int, error) {
		out := make([]int, len(es))
		for i, x := range es {
			k, err := p.compile(x, guarded || guards && i > 0)
			if err != nil {
				return nil, err
			}
			out[i] = k
		}
		return out, nil
	}
	switch e := e.(type) {
	case *formula.Name:
		k := slices.Index(p.params, e.Name)
		return p.add(key, op{kind: opParam, slot: k, active: []int{k}}), nil
	case *formula.Unary:
		args, err := all(false, e.X)
		if err != nil {
			return 0, err
		}
		return p.add(key, op{kind: opNeg, args: args}), nil
	case *formula.Binary:
		args, err := all(false, e.X, e.Y)
		if err != nil {
			return 0, err
		}
		k := map[byte]kind{'+': opAdd, '-': opSub, '*': opMul, '/': opDiv, '^': opPow}[e.Op]
		if k == opPow && len(p.ops[args[1]].active) > 0 {
			k = opExpY
		}
		return p.add(key, op{kind: k, args: args}), nil
	case *formula.Compare:
		args, err := all(false, e.X, e.Y)
		if err != nil {
			return 0, err
		}
		return p.add(key, op{kind: opCmp, args: args, cmp: e.Op}), nil
	case *formula.Call:
		args, err := all(e.Func == "if", e.Args...)
		if err != nil {
			return 0, err
		}
		switch e.Func {
		case "if":
			return p.add(key, op{kind: opIf, args: args}), nil
		case "min", "max":
			k := opMin
			if e.Func == "max" {
				k = opMax
			}
			at := args[0]
			for i, a := range args[1:] {
				at = p.add(fmt.Sprintf("%s#%d", key, i), op{kind: k, args: []int{at, a}})
			}
			p.index[key] = at
			return at, nil
		case "coded":
			// 2(x-low)/(high-low) - 1
			low, high := p.ops[args[1]].value, p.ops[args[2]].value
			low, high = constantOf(e.Args[1], low), constantOf(e.Args[2], high)
			scale := p.add(fmt.Sprint("#", 2/(high-low)), op{kind: opConst, value: 2 / (high - low)})
			shift := p.add(fmt.Sprint("#", (high+low)/(high-low)), op{kind: opConst, value: (high + low) / (high - low)})
			product := p.add(key+"#product", op{kind: opMul, args: []int{args[0], scale}})
			return p.add(key, op{kind: opSub, args: []int{product, shift}}), nil
		}
		fn := functions[e.Func]
		if fn == nil || len(args) != 1 {
			return 0, fmt.Errorf("tape: no such function %s", e.Func)
		}
		return p.add(key, op{kind: opFunc, args: args, fn: fn}), nil
	}
	return 0, fmt.Errorf("tape: cannot evaluate %T", e)
}

func constantOf(e formula.Expr, otherwise float64) float64 {
	switch e := e.(type) {
	case *formula.Number:
		return e.Value
	case *formula.Unary:
		return -constantOf(e.X, -otherwise)
	}
	return otherwise
}

// A function gives its value and two derivatives at x.
type function func(x float64) (f, d, dd float64)

var functions = map[string]*function{
	"log": fn(func(x float64) (float64, float64, float64) { return math.Log(x), 1 / x, -1 / (x * x) }),
	"log10": fn(func(x float64) (float64, float64, float64) {
		return math.Log10(x), 1 / (x * math.Ln10), -1 / (x * x * math.Ln10)
	}),
	"log1p": fn(func(x float64) (float64, float64, float64) {
		return math.Log1p(x), 1 / (1 + x), -1 / ((1 + x) * (1 + x))
	}),
	"exp":   fn(func(x float64) (float64, float64, float64) { v := math.Exp(x); return v, v, v }),
	"expm1": fn(func(x float64) (float64, float64, float64) { v := math.Exp(x); return math.Expm1(x), v, v }),
	"sqrt": fn(func(x float64) (float64, float64, float64) {
		v := math.Sqrt(x)
		return v, 0.5 / v, -0.25 / (v * x)
	}),
	"abs": fn(func(x float64) (float64, float64, float64) { return math.Abs(x), math.Copysign(1, x), 0 }),
	"sin": fn(func(x float64) (float64, float64, float64) { s, c := math.Sincos(x); return s, c, -s }),
	"cos": fn(func(x float64) (float64, float64, float64) { s, c := math.Sincos(x); return c, -s, -c }),
	"tan": fn(func(x float64) (float64, float64, float64) {
		v := math.Tan(x)
		return v, 1 + v*v, 2 * v * (1 + v*v)
	}),
	"atan": fn(func(x float64) (float64, float64, float64) {
		d := 1 / (1 + x*x)
		return math.Atan(x), d, -2 * x * d * d
	}),
	"tanh": fn(func(x float64) (float64, float64, float64) {
		v := math.Tanh(x)
		d := 1 / math.Cosh(x)
		d *= d
		return v, d, -2 * v * d
	}),
	"erf": fn(func(x float64) (float64, float64, float64) {
		d := 2 / math.SqrtPi * math.Exp(-x*x)
		return math.Erf(x), d, -2 * x * d
	}),
}

func fn(f function) *function { return &f }
