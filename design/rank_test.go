package design

import (
	"errors"
	"fmt"
	"math/big"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"example.com/trammel/formula"
)

func parse(t testing.TB, text string) *formula.Model {
	t.Helper()
	m, err := formula.Parse(text)
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	return m
}

// checkDependent compiles a model whose columns must be dependent and checks
// the refusal: each identity holds exactly in rationals, together they span
// the null space, and each mend, pasted back, compiles.
func checkDependent(t *testing.T, text string, table *Table) *Error {
	t.Helper()
	_, err := Compile(parse(t, text), table, nil)
	var e *Error
	if !errors.As(err, &e) || e.Code != codeDependentColumns {
		t.Fatalf("%s: got %v, want dependent columns", text, err)
	}
	f, err := Prepare(parse(t, text), table, &Options{NoRankCheck: true})
	if err != nil {
		t.Fatal(err)
	}
	place := make(map[string]int)
	for j, c := range f.Plan.Columns() {
		if _, twice := place[c.Name]; twice {
			t.Errorf("%s: two columns are named %s", text, c.Name)
		}
		place[c.Name] = j
	}
	n, p := f.Matrix.Dims()
	var rows [][]int64
	for _, id := range e.Identities {
		if !id.Exact {
			t.Errorf("%s: %s is not exact", text, id)
		}
		sum := make([]*big.Rat, n)
		for i := range sum {
			sum[i] = new(big.Rat)
		}
		row := make([]int64, p)
		for k, name := range id.Names {
			j, ok := place[name]
			if !ok {
				t.Fatalf("%s: the identity %s names an unknown column %s", text, id, name)
			}
			coef := new(big.Rat)
			coef.SetFloat64(id.Coefs[k])
			row[j] = int64(id.Coefs[k])
			for i := range n {
				v := f.Matrix.form.At(i, j)
				x := new(big.Rat).SetFloat64(v.Hi)
				x.Add(x, new(big.Rat).SetFloat64(v.Lo))
				sum[i].Add(sum[i], x.Mul(x, coef))
			}
		}
		rows = append(rows, row)
		for i := range sum {
			if sum[i].Sign() != 0 {
				t.Errorf("%s: %s does not hold in row %d: the difference is %s", text, id, i+1, sum[i].FloatString(3))
				break
			}
		}
	}
	if deficit := p - rankExact(wholeColumns(t, f.Matrix)); len(rows) != deficit || rankExact(rows) != deficit {
		t.Errorf("%s: %d identities of rank %d, the null space has %d dimensions\n%v", text, len(rows), rankExact(rows), deficit, e)
	}
	if len(e.Mends) == 0 {
		t.Errorf("%s: no mend for %v", text, e)
	}
	for _, mend := range e.Mends {
		if _, err := Compile(parse(t, mend), table, nil); err != nil {
			t.Errorf("%s: the mend %s does not compile: %v", text, mend, err)
		}
	}
	return e
}

// TestRankPlanted plants whole-number dependencies of 2 to 6 columns in 500
// random designs, also through interactions, powers and under weights.
func TestRankPlanted(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 1))
	for trial := range 500 {
		n := 30
		k := 2 + rng.IntN(5)
		cols := make([][]float64, k)
		names := make([]string, k)
		var table []Column
		for j := range cols {
			names[j] = fmt.Sprintf("x%d", j+1)
			cols[j] = make([]float64, n)
			for i := range cols[j] {
				cols[j][i] = float64(rng.IntN(19) - 9)
			}
		}
		text := strings.Join(names, " + ")
		// What the dependent column is made of.
		made := slices.Clone(cols)
		switch rng.IntN(4) {
		case 1: // a product of two
			p := make([]float64, n)
			for i := range p {
				p[i] = cols[0][i] * cols[1][i]
			}
			made = append(made, p)
			text += " + x1 by x2"
		case 2: // a power
			p := make([]float64, n)
			for i := range p {
				p[i] = cols[0][i] * cols[0][i]
			}
			made = append(made, p)
			text += " + powers(x1, 2)"
		}
		sum := make([]float64, n)
		used := 0
		for _, m := range made {
			c := float64(rng.IntN(7) - 3)
			if used == 0 && c == 0 {
				c = 1
			}
			if c == 0 || used == 5 {
				continue
			}
			used++
			for i := range sum {
				sum[i] += c * m[i]
			}
		}
		if rng.IntN(3) == 0 {
			for i := range sum {
				sum[i] += 4
			}
		}
		y, w := make([]float64, n), make([]float64, n)
		for i := range y {
			y[i], w[i] = rng.NormFloat64(), 0.1+rng.Float64()
		}
		for j, name := range names {
			table = append(table, Numbers(name, cols[j]))
		}
		table = append(table, Numbers("total", sum), Numbers("y", y), Numbers("w", w))
		tb, err := NewTable(table...)
		if err != nil {
			t.Fatal(err)
		}
		at := "y ~ " + text + " + total"
		if rng.IntN(2) == 0 {
			at = "y ~ total + " + text
		}
		if rng.IntN(3) == 0 {
			at += " weighted w"
		}
		checkDependent(t, at, tb)
		if t.Failed() {
			t.Fatalf("trial %d", trial)
		}
	}
}

// TestRankNatural holds the wording of the common cases.
func TestRankNatural(t *testing.T) {
	table := completeData(t)
	n := table.Rows()
	one := func(name, column, level string) Column {
		v := make([]float64, n)
		c := table.column(column)
		for i, k := range c.codes {
			if c.dict[k] == level {
				v[i] = 1
			}
		}
		return Numbers(name, v)
	}
	x, z := table.column("x").num, table.column("z").num
	sum, tiny := make([]float64, n), make([]float64, n)
	for i := range sum {
		sum[i] = x[i] + z[i]
		tiny[i] = z[i] * 1e-18
	}
	text := func(name string) Column {
		c, _ := table.Column(name)
		return Texts(name, c.Texts())
	}
	alias := make([]string, n)
	for i, k := range table.column("b").codes {
		alias[i] = []string{"low", "mid", "high"}[k]
	}
	tb, err := NewTable(one("oven_1", "b", "B1"), one("oven_2", "b", "B2"), one("oven_3", "b", "B3"),
		Numbers("x", x), Numbers("again", x), Numbers("z", z), Numbers("total", sum), Numbers("tiny", tiny),
		text("a"), text("b"), text("h"), Texts("line", alias), Numbers("y", table.column("y").num))
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ model, identity, mend string }{
		{"y ~ oven_1 + oven_2 + oven_3", "oven_1 + oven_2 + oven_3 = intercept", "y ~ oven_2 + oven_3"},
		{"y ~ x + oven_1 + oven_2 + oven_3", "oven_1 + oven_2 + oven_3 = intercept", "y ~ x + oven_2 + oven_3"},
		{"y ~ x + again", "x = again", "y ~ x"},
		{"y ~ x + z + total", "x + z = total", "y ~ x + z"},
		{"y ~ cat(b) + cat(line)", "", "y ~ cat(b)"},
		{"y ~ x*cat(b) + x by cat(line)", "", ""},
		{"y ~ cat(a) + oven_1*cat(b)", "", ""},
	} {
		e := checkDependent(t, c.model, tb)
		if c.identity != "" && e.Identities[0].String() != c.identity {
			t.Errorf("%s: the identity is %s, want %s", c.model, e.Identities[0], c.identity)
		}
		if c.mend != "" && (len(e.Mends) == 0 || e.Mends[0] != c.mend) {
			t.Errorf("%s: the mends are %q, want %s first", c.model, e.Mends, c.mend)
		}
	}
	if _, err := Compile(parse(t, "y ~ x + tiny"), tb, nil); err != nil {
		t.Errorf("a column in units of 1e-18 is refused: %v", err)
	}
}
