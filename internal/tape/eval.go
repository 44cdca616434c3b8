package tape

import (
	"math"
	"slices"
)

// A Scratch holds the blocks of one evaluation; make one for each goroutine.
type Scratch struct {
	p    *Program
	val  [][]float64   // by op
	der  [][][]float64 // by op, by place in its active list
	sec  [][][]float64 // by op, by pair (a, b <= a) of places
	d, h []float64
}

// NewScratch returns scratch; second derivatives cost room only when wanted.
func (p *Program) NewScratch(second bool) *Scratch {
	s := &Scratch{p: p, val: make([][]float64, len(p.ops)), der: make([][][]float64, len(p.ops)),
		sec: make([][][]float64, len(p.ops)), d: make([]float64, Block), h: make([]float64, Block)}
	for i := range p.ops {
		s.val[i] = make([]float64, Block)
		a := len(p.ops[i].active)
		s.der[i] = make([][]float64, a)
		for k := range a {
			s.der[i][k] = make([]float64, Block)
		}
		if second {
			s.sec[i] = make([][]float64, a*(a+1)/2)
			for k := range s.sec[i] {
				s.sec[i][k] = make([]float64, Block)
			}
		}
	}
	return s
}

// Eval evaluates m rows (at most Block). parts[k] holds the values of part k
// and params[q] those of parameter q in these rows. It returns the values; when
// order is 1 or 2, First and Second give the derivatives. The slices are valid
// until the next call. It does not allocate.
func (s *Scratch) Eval(parts, params [][]float64, m, order int) []float64 {
	for i := range s.p.ops {
		s.step(i, parts, params, m, order)
	}
	return s.val[len(s.p.ops)-1][:m]
}

// First is the derivative with respect to parameter q; nil when it is 0
// everywhere.
func (s *Scratch) First(q int) []float64 {
	last := len(s.p.ops) - 1
	if k := place(s.p.ops[last].active, q); k >= 0 {
		return s.der[last][k]
	}
	return nil
}

// Second is the derivative with respect to parameters q and r; nil when it is 0
// everywhere.
func (s *Scratch) Second(q, r int) []float64 {
	last := len(s.p.ops) - 1
	a, b := place(s.p.ops[last].active, q), place(s.p.ops[last].active, r)
	if a < 0 || b < 0 {
		return nil
	}
	return s.sec[last][pairAt(a, b)]
}

func pairAt(a, b int) int {
	if a < b {
		a, b = b, a
	}
	return a*(a+1)/2 + b
}

func place(list []int, q int) int {
	for k, v := range list {
		if v == q {
			return k
		}
	}
	return -1
}

// first is the derivative of op i with respect to parameter q, nil when 0.
func (s *Scratch) first(i, q int) []float64 {
	if k := place(s.p.ops[i].active, q); k >= 0 {
		return s.der[i][k]
	}
	return nil
}

func (s *Scratch) second(i, q, r int) []float64 {
	a, b := place(s.p.ops[i].active, q), place(s.p.ops[i].active, r)
	if a < 0 || b < 0 {
		return nil
	}
	return s.sec[i][pairAt(a, b)]
}

func (s *Scratch) step(i int, parts, params [][]float64, m, order int) {
	o := &s.p.ops[i]
	out := s.val[i][:m]
	switch o.kind {
	case opConst:
		for k := range out {
			out[k] = o.value
		}
	case opColumn:
		copy(out, parts[o.slot])
	case opParam:
		copy(out, params[o.slot])
		if order > 0 {
			one := s.der[i][0][:m]
			for k := range one {
				one[k] = 1
			}
			if order > 1 {
				clear(s.sec[i][0][:m])
			}
		}
	case opNeg:
		x := s.val[o.args[0]]
		for k := range out {
			out[k] = -x[k]
		}
		s.linear(i, m, order, -1, o.args[0], 0, -1)
	case opAdd, opSub:
		x, y, sign := s.val[o.args[0]], s.val[o.args[1]], 1.0
		if o.kind == opSub {
			sign = -1
		}
		for k := range out {
			out[k] = x[k] + sign*y[k]
		}
		s.linear(i, m, order, 1, o.args[0], sign, o.args[1])
	case opMul:
		x, y := s.val[o.args[0]], s.val[o.args[1]]
		for k := range out {
			out[k] = x[k] * y[k]
		}
		s.product(i, m, order)
	case opDiv:
		x, y := s.val[o.args[0]], s.val[o.args[1]]
		for k := range out {
			out[k] = x[k] / y[k]
		}
		s.quotient(i, m, order)
	case opFunc:
		x := s.val[o.args[0]]
		f := *o.fn
		for k := range out {
			out[k], s.d[k], s.h[k] = f(x[k])
		}
		s.chain(i, o.args[0], m, order)
	case opPow:
		x, y := s.val[o.args[0]], s.val[o.args[1]]
		for k := range out {
			v := y[k]
			out[k] = math.Pow(x[k], v)
			s.d[k], s.h[k] = 0, 0
			if v != 0 {
				s.d[k] = v * math.Pow(x[k], v-1)
			}
			if v != 0 && v != 1 {
				s.h[k] = v * (v - 1) * math.Pow(x[k], v-2)
			}
		}
		s.chain(i, o.args[0], m, order)
	case opExpY:
		s.general(i, m, order)
	case opMin, opMax, opIf:
		s.choose(i, m, order)
	case opCmp:
		x, y := s.val[o.args[0]], s.val[o.args[1]]
		for k := range out {
			yes := false
			switch o.cmp {
			case "=":
				yes = x[k] == y[k]
			case "<>":
				yes = x[k] != y[k]
			case "<":
				yes = x[k] < y[k]
			case "<=":
				yes = x[k] <= y[k]
			case ">":
				yes = x[k] > y[k]
			case ">=":
				yes = x[k] >= y[k]
			}
			switch {
			case x[k] != x[k] || y[k] != y[k]:
				out[k] = math.NaN()
			case yes:
				out[k] = 1
			default:
				out[k] = 0
			}
		}
	}
}

// each visits the derivatives of op i: first with r = -1, then second.
func (s *Scratch) each(i, m, order int, do func(out []float64, q, r int)) {
	active := s.p.ops[i].active
	if order > 0 {
		for a, q := range active {
			do(s.der[i][a][:m], q, -1)
		}
	}
	if order > 1 {
		for a, q := range active {
			for b, r := range active[:a+1] {
				do(s.sec[i][pairAt(a, b)][:m], q, r)
			}
		}
	}
}

// of is a derivative of op i: first when r < 0, else second.
func (s *Scratch) of(i, q, r int) []float64 {
	if r < 0 {
		return s.first(i, q)
	}
	return s.second(i, q, r)
}

// linear: cx times argument x plus cy times argument y (y < 0: none).
func (s *Scratch) linear(i, m, order int, cx float64, x int, cy float64, y int) {
	s.each(i, m, order, func(out []float64, q, r int) {
		clear(out)
		if d := s.of(x, q, r); d != nil {
			for k := range out {
				out[k] = cx * d[k]
			}
		}
		if y >= 0 {
			if d := s.of(y, q, r); d != nil {
				for k := range out {
					out[k] += cy * d[k]
				}
			}
		}
	})
}

// addProduct adds u·v; a nil factor is 0.
func addProduct(out, u, v []float64) {
	if u == nil || v == nil {
		return
	}
	for k := range out {
		out[k] += u[k] * v[k]
	}
}

func (s *Scratch) product(i, m, order int) {
	x, y := s.p.ops[i].args[0], s.p.ops[i].args[1]
	s.each(i, m, order, func(out []float64, q, r int) {
		clear(out)
		addProduct(out, s.of(x, q, r), s.val[y])
		addProduct(out, s.val[x], s.of(y, q, r))
		if r >= 0 {
			addProduct(out, s.first(x, q), s.first(y, r))
			addProduct(out, s.first(x, r), s.first(y, q))
		}
	})
}

// quotient: w = x/y, so w_q = (x_q - w y_q)/y and
// w_qr = (x_qr - w_q y_r - w_r y_q - w y_qr)/y.
func (s *Scratch) quotient(i, m, order int) {
	x, y := s.p.ops[i].args[0], s.p.ops[i].args[1]
	w, v := s.val[i], s.val[y]
	subtract := func(out, a, b []float64) {
		if a == nil || b == nil {
			return
		}
		for k := range out {
			out[k] -= a[k] * b[k]
		}
	}
	s.each(i, m, order, func(out []float64, q, r int) {
		clear(out)
		if d := s.of(x, q, r); d != nil {
			copy(out, d)
		}
		subtract(out, w, s.of(y, q, r))
		if r >= 0 {
			subtract(out, s.first(i, q), s.first(y, r))
			subtract(out, s.first(i, r), s.first(y, q))
		}
		for k := range out {
			out[k] /= v[k]
		}
	})
}

// chain: out = f(x) with f' in s.d and f” in s.h.
func (s *Scratch) chain(i, x, m, order int) {
	s.each(i, m, order, func(out []float64, q, r int) {
		clear(out)
		addProduct(out, s.d, s.of(x, q, r))
		if r >= 0 {
			a, b := s.first(x, q), s.first(x, r)
			if a != nil && b != nil {
				for k := range out {
					if t := a[k] * b[k]; t != 0 {
						out[k] += s.h[k] * t
					}
				}
			}
		}
	})
}

// general: w = x^y with parameters in y (and perhaps in x). With l = log w =
// y log x: l_q = y_q log x + y x_q/x, w_q = w l_q, w_qr = w (l_q l_r + l_qr).
func (s *Scratch) general(i, m, order int) {
	x, y := s.p.ops[i].args[0], s.p.ops[i].args[1]
	u, v, w := s.val[x], s.val[y], s.val[i][:m]
	for k := range w {
		w[k] = math.Pow(u[k], v[k])
	}
	at := func(d []float64, k int) float64 {
		if d == nil {
			return 0
		}
		return d[k]
	}
	s.each(i, m, order, func(out []float64, q, r int) {
		xq, yq := s.first(x, q), s.first(y, q)
		if r < 0 {
			for k := range out {
				lq := at(yq, k)*math.Log(u[k]) + v[k]*at(xq, k)/u[k]
				if w[k] == 0 && u[k] == 0 {
					lq = 0 // 0^y stays 0 for y > 0
				}
				out[k] = w[k] * lq
			}
			return
		}
		xr, yr, xqr, yqr := s.first(x, r), s.first(y, r), s.second(x, q, r), s.second(y, q, r)
		for k := range out {
			if w[k] == 0 && u[k] == 0 {
				out[k] = 0
				continue
			}
			l := math.Log(u[k])
			lq := at(yq, k)*l + v[k]*at(xq, k)/u[k]
			lr := at(yr, k)*l + v[k]*at(xr, k)/u[k]
			lqr := at(yqr, k)*l + (at(yq, k)*at(xr, k)+at(yr, k)*at(xq, k)+v[k]*at(xqr, k))/u[k] - v[k]*at(xq, k)*at(xr, k)/(u[k]*u[k])
			out[k] = w[k] * (lq*lr + lqr)
		}
	})
}

// choose: min, max and if take value and derivatives from one argument.
func (s *Scratch) choose(i, m, order int) {
	o := &s.p.ops[i]
	one, two := o.args[0], o.args[1]
	if o.kind == opIf {
		one, two = o.args[1], o.args[2]
	}
	x, y, pick := s.val[one], s.val[two], s.d[:m]
	for k := range pick {
		switch o.kind {
		case opIf:
			pick[k] = s.val[o.args[0]][k]
		case opMin:
			pick[k] = truth(x[k] <= y[k] || x[k] != x[k])
		default:
			pick[k] = truth(x[k] >= y[k] || x[k] != x[k])
		}
		switch {
		case pick[k] != pick[k]:
			s.val[i][k] = math.NaN()
		case pick[k] != 0:
			s.val[i][k] = x[k]
		default:
			s.val[i][k] = y[k]
		}
	}
	s.each(i, m, order, func(out []float64, q, r int) {
		a, b := s.of(one, q, r), s.of(two, q, r)
		for k := range out {
			d := a
			if pick[k] == 0 {
				d = b
			}
			out[k] = 0
			if d != nil {
				out[k] = d[k]
			}
		}
	})
}

func truth(b bool) float64 {
	if b {
		return 1
	}
	return 0
}

// Affine finds parameters in which the equation is jointly affine: f is a sum of
// each of them times something free of all of them, and a rest. The parameters
// nearest the root of the equation are tried first, whatever the order of their
// declaration; never says which must not be taken.
func (p *Program) Affine(never []bool) []bool {
	in := make([]bool, len(p.params))
	depth := make([]int, len(p.ops))
	order := make([]int, len(p.params))
	near := make([]int, len(p.params))
	for q := range order {
		order[q], near[q] = q, len(p.ops)+1
	}
	for i := len(p.ops) - 1; i >= 0; i-- {
		o := &p.ops[i]
		if o.kind == opParam {
			near[o.slot] = depth[i]
		}
		for _, a := range o.args {
			if depth[a] == 0 || depth[i]+1 < depth[a] {
				depth[a] = depth[i] + 1
			}
		}
	}
	slices.SortStableFunc(order, func(a, b int) int { return near[a] - near[b] })
	for _, q := range order {
		if never != nil && never[q] {
			continue
		}
		in[q] = true
		if p.degree(in) > 1 || place(p.ops[len(p.ops)-1].active, q) < 0 {
			in[q] = false
		}
	}
	return in
}

// degree is the degree of the equation as a polynomial in the parameters of the
// set: 0, 1, or 2 for anything else.
func (p *Program) degree(in []bool) int {
	deg := make([]int, len(p.ops))
	for i := range p.ops {
		o := &p.ops[i]
		most := 0
		for _, a := range o.args {
			most = max(most, deg[a])
		}
		switch o.kind {
		case opParam:
			if in[o.slot] {
				deg[i] = 1
			}
		case opNeg, opAdd, opSub:
			deg[i] = most
		case opMul:
			deg[i] = min(2, deg[o.args[0]]+deg[o.args[1]])
		case opDiv:
			deg[i] = deg[o.args[0]]
			if deg[o.args[1]] > 0 {
				deg[i] = 2
			}
		case opIf:
			deg[i] = max(deg[o.args[1]], deg[o.args[2]])
			if deg[o.args[0]] > 0 {
				deg[i] = 2
			}
		case opCmp:
			if most > 0 {
				deg[i] = 2
			}
		default:
			if most > 0 {
				deg[i] = 2
			}
		}
	}
	return deg[len(deg)-1]
}
