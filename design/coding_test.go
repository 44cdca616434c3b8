package design

import (
	"fmt"
	"math/big"
	"math/bits"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"example.com/trammel/formula"
)

// completeData is a table in which every combination of a, b and c occurs, h
// is nested in a (two or three heads in each), and x and z take values of no
// pattern, so that whatever dependency a model has is the model's own.
func completeData(t testing.TB) *Table {
	t.Helper()
	rng := rand.New(rand.NewPCG(3, 5))
	var a, b, c, h []string
	var x, z, y []float64
	for rep := range 3 {
		for i := range 2 {
			for j := range 3 {
				for k := range 2 {
					for l := range 2 + i {
						a = append(a, fmt.Sprintf("A%d", i+1))
						b = append(b, fmt.Sprintf("B%d", j+1))
						c = append(c, fmt.Sprintf("C%d", k+1))
						h = append(h, fmt.Sprintf("%d", l+1))
						x = append(x, float64(rng.IntN(97)+rep))
						z = append(z, float64(rng.IntN(89)-40))
						y = append(y, rng.NormFloat64())
					}
				}
			}
		}
	}
	table, err := NewTable(Texts("a", a), Texts("b", b), Texts("c", c), Texts("h", h), Numbers("x", x), Numbers("z", z), Numbers("y", y))
	if err != nil {
		t.Fatal(err)
	}
	return table
}

const prime = 1<<61 - 1

func mulMod(a, b uint64) uint64 {
	hi, lo := bits.Mul64(a, b)
	s := (lo & prime) + (lo>>61 | hi<<3)
	for s >= prime {
		s -= prime
	}
	return s
}

func powMod(a uint64, k uint64) uint64 {
	r := uint64(1)
	for ; k > 0; k >>= 1 {
		if k&1 == 1 {
			r = mulMod(r, a)
		}
		a = mulMod(a, a)
	}
	return r
}

// rankMod is the rank of whole-number columns over the field of 2^61-1
// elements: never above the rational rank, and below it only if the prime
// happens to divide every minor of that size.
func rankMod(cols [][]int64) int {
	rows := make([][]uint64, len(cols))
	for j, c := range cols {
		rows[j] = make([]uint64, len(c))
		for i, v := range c {
			if v < 0 {
				v += prime
			}
			rows[j][i] = uint64(v)
		}
	}
	rank := 0
	if len(cols) == 0 {
		return 0
	}
	for i := range cols[0] {
		k := rank
		for k < len(rows) && rows[k][i] == 0 {
			k++
		}
		if k == len(rows) {
			continue
		}
		rows[rank], rows[k] = rows[k], rows[rank]
		inv := powMod(rows[rank][i], prime-2)
		for k := rank + 1; k < len(rows); k++ {
			if rows[k][i] == 0 {
				continue
			}
			f := prime - mulMod(rows[k][i], inv)
			for q := i; q < len(rows[k]); q++ {
				if s := rows[k][q] + mulMod(f, rows[rank][q]); s >= prime {
					rows[k][q] = s - prime
				} else {
					rows[k][q] = s
				}
			}
		}
		if rank++; rank == len(rows) {
			break
		}
	}
	return rank
}

// rankExact is the rank by fraction-free elimination over the integers (E. H.
// Bareiss, Math. Comp. 22 (1968) 565-578).
func rankExact(cols [][]int64) int {
	rows := make([][]*big.Int, len(cols))
	for j, c := range cols {
		for _, v := range c {
			rows[j] = append(rows[j], big.NewInt(v))
		}
	}
	rank := 0
	prev := big.NewInt(1)
	for i := 0; len(cols) > 0 && i < len(cols[0]) && rank < len(rows); i++ {
		k := rank
		for k < len(rows) && rows[k][i].Sign() == 0 {
			k++
		}
		if k == len(rows) {
			continue
		}
		rows[rank], rows[k] = rows[k], rows[rank]
		pivot := rows[rank][i]
		for k := rank + 1; k < len(rows); k++ {
			f := rows[k][i]
			for q := i + 1; q < len(rows[k]); q++ {
				v := new(big.Int).Mul(rows[k][q], pivot)
				v.Sub(v, new(big.Int).Mul(f, rows[rank][q]))
				rows[k][q] = v.Quo(v, prev)
			}
			rows[k][i] = new(big.Int)
		}
		prev = pivot
		rank++
	}
	return rank
}

// wholeColumns expands a matrix whose entries are whole numbers.
func wholeColumns(t testing.TB, m *Matrix) [][]int64 {
	n, p := m.Dims()
	col := make([]float64, n)
	out := make([][]int64, p)
	for j := range p {
		m.ColumnTo(col, nil, j)
		out[j] = make([]int64, n)
		for i, v := range col {
			if v != float64(int64(v)) {
				t.Fatalf("entry %v is not whole", v)
			}
			out[j][i] = int64(v)
		}
	}
	return out
}

// naive is the plainest matrix that says what the terms say: every term as the
// product of its numeric columns with the full indicators of all its
// categories. It knows nothing of the coding rule.
func naive(table *Table, terms [][]string, intercept bool) [][]int64 {
	n := table.Rows()
	var out [][]int64
	if intercept {
		one := make([]int64, n)
		for i := range one {
			one[i] = 1
		}
		out = append(out, one)
	}
	for _, t := range terms {
		groups := make(map[string][]int64)
		var order []string
		for i := range n {
			key, value := "", int64(1)
			for _, f := range t {
				c := table.column(f)
				if c.kind == TextColumn {
					key += c.dict[c.codes[i]] + "|"
				} else {
					value *= int64(c.num[i])
				}
			}
			if groups[key] == nil {
				groups[key] = make([]int64, n)
				order = append(order, key)
			}
			groups[key][i] = value
		}
		for _, k := range order {
			out = append(out, groups[k])
		}
	}
	return out
}

// TestCodingRandomModels holds that 2,400 random models over complete data get
// as many columns as the space they speak of has dimensions, and span it.
func TestCodingRandomModels(t *testing.T) {
	table := completeData(t)
	rng := rand.New(rand.NewPCG(1, 2))
	bases := map[string][]string{
		"a": {"", " against mean", " against previous", " against 'A2'"},
		"b": {"", " against mean", " against previous", " against 'B2'", " in ('B3', 'B1', 'B2')"},
		"c": {"", " against mean", " against 'C2'"},
	}
	nested := 0
	for trial := range 2400 {
		spec := make(map[string]string)
		for _, name := range []string{"a", "b", "c"} {
			spec[name] = "cat(" + name + bases[name][rng.IntN(len(bases[name]))] + ")"
		}
		var texts []string
		var terms [][]string
		for range 1 + rng.IntN(4) {
			var parts, factors []string
			for _, f := range []string{"a", "b", "c", "x", "z"} {
				if rng.IntN(5) < 2 {
					factors = append(factors, f)
				}
			}
			rng.Shuffle(len(factors), func(i, j int) { factors[i], factors[j] = factors[j], factors[i] })
			if rng.IntN(4) == 0 {
				// h inside a, with whatever else but a.
				factors = slices.DeleteFunc(factors, func(f string) bool { return f == "a" })
				at := rng.IntN(len(factors) + 1)
				factors = slices.Insert(factors, at, "h", "a")
				nested++
			}
			if len(factors) == 0 {
				continue
			}
			for i, f := range factors {
				switch {
				case f == "h":
					parts = append(parts, "cat(h) inside "+spec["a"])
				case f == "a" && i > 0 && factors[i-1] == "h":
				case spec[f] != "":
					parts = append(parts, spec[f])
				default:
					parts = append(parts, f)
				}
			}
			texts = append(texts, strings.Join(parts, " by "))
			terms = append(terms, factors)
		}
		intercept := rng.IntN(3) > 0
		if len(terms) == 0 {
			if !intercept {
				continue
			}
			texts = append(texts, "intercept")
		}
		text := "y ~ " + strings.Join(texts, " + ")
		if !intercept {
			text += " - intercept"
		}
		m, err := formula.Parse(text)
		if err != nil {
			t.Fatalf("%s: %v", text, err)
		}
		f, err := Prepare(m, table, &Options{NoRankCheck: true})
		if err != nil {
			t.Fatalf("trial %d: %s: %v", trial, text, err)
		}
		coded := wholeColumns(t, f.Matrix)
		plain := naive(table, terms, intercept)
		rank := rankMod
		if trial%100 == 0 {
			rank = rankExact
		}
		p, want := len(coded), rank(plain)
		if got := rank(coded); got != p || p != want || rank(slices.Concat(coded, plain)) != want {
			t.Errorf("trial %d: %s: %d columns of rank %d; the terms span %d dimensions, %d together",
				trial, text, p, got, want, rank(slices.Concat(coded, plain)))
		}
		if err := f.CheckRank(); err != nil {
			t.Errorf("trial %d: %s: the rank check refuses it: %v", trial, text, err)
		}
	}
	if nested < 300 {
		t.Errorf("only %d nested terms were tried", nested)
	}
}
