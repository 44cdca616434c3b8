package factored

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

// made is a form of n rows with two numeric columns, the second with low parts,
// and three categories, one of them by bits.
func made(n int) *Form {
	r := rand.New(rand.NewPCG(3, uint64(n)))
	f := &Form{N: n, Nums: []Num{{Hi: make([]float64, n)}, {Hi: make([]float64, n), Lo: make([]float64, n)}},
		Cats: []Cat{{Levels: 3, Codes: make([]int32, n)}, {Levels: 2, Bits: make([]bool, n), Level: []int32{1, 0}},
			{Levels: 2, Codes: make([]int32, n), Level: []int32{1, 0, 1}}}}
	for i := range n {
		f.Nums[0].Hi[i] = 100 + r.NormFloat64()
		f.Nums[1].Hi[i] = r.NormFloat64()
		f.Nums[1].Lo[i] = f.Nums[1].Hi[i] * 0x1p-55
		f.Cats[0].Codes[i], f.Cats[1].Bits[i], f.Cats[2].Codes[i] = int32(r.IntN(3)), r.IntN(2) == 1, int32(r.IntN(3))
	}
	a, b := []int8{-1, 0, 1}, []int8{1, 0}
	f.Cols = []Col{{Num: -1}, {Num: 0}, {Num: 1, Cells: []Cell{{0, a}}}, {Num: -1, Cells: []Cell{{0, a}, {1, b}}},
		{Num: 1, Cells: []Cell{{2, b}, {1, b}, {0, a}}}}
	return f
}

// TestColumns compares whole columns, from any row on, with single elements.
func TestColumns(t *testing.T) {
	f := made(1500)
	for _, from := range []int{0, 1, 511, 700} {
		hi, lo := make([]float64, f.N-from), make([]float64, f.N-from)
		for j := range f.Cols {
			f.ColumnTo(hi, lo, j, from)
			for i := range hi {
				if v := f.At(from+i, j); v.Hi != hi[i] || v.Lo != lo[i] {
					t.Fatalf("row %d column %d is %g + %g, want %v", from+i, j, hi[i], lo[i], v)
				}
			}
		}
	}
}

// TestMeans compares with sums of rationals.
func TestMeans(t *testing.T) {
	f := made(1100)
	b, blo := []float64{1, -0.01, 3, 1e-3, 7}, []float64{0, 1e-19, 0, 0, 0}
	known := make([]float64, 1000)
	for i := range known {
		known[i] = float64(i)
	}
	mean, grad := make([]float64, 1000), make([]float64, 5000)
	f.MeanTo(mean, grad, b, blo, known, 100)
	rat := func(v float64) *big.Rat { return new(big.Rat).SetFloat64(v) }
	for i := range mean {
		sum := rat(known[i])
		for j := range b {
			v := f.At(100+i, j)
			x := new(big.Rat).Add(rat(v.Hi), rat(v.Lo))
			sum.Add(sum, x.Mul(x, new(big.Rat).Add(rat(b[j]), rat(blo[j]))))
			if grad[i*5+j] != v.Float() {
				t.Fatalf("gradient in row %d column %d is %g, want %g", i, j, grad[i*5+j], v.Float())
			}
		}
		if want, _ := sum.Float64(); mean[i] != want {
			t.Fatalf("mean in row %d is %.17g, want %.17g", i, mean[i], want)
		}
	}
	if n := testing.AllocsPerRun(10, func() { f.MeanTo(mean, grad, b, blo, known, 100) }); n != 0 {
		t.Errorf("%g allocations", n)
	}
}

// TestMoments compares the streamed moments, over several blocks, with plain sums
// of each cell in high precision; column 0 has a spread of a millionth of its
// size, and row 0 of some cell is far out.
func TestMoments(t *testing.T) {
	n := 2*blockRows + 77
	f := made(n)
	y := make([]float64, n)
	w := make([]float64, n)
	for i := range n {
		f.Nums[0].Hi[i] = 1e6 + f.Nums[0].Hi[i]
		y[i] = f.Nums[1].Hi[i] + float64(i%5)
		w[i] = 0.5 + float64(i%3)
	}
	y[0] = 1e5
	c := &Cells{Form: f, Count: f.CountCells(100), Weights: w, Workers: 2}
	m, err := c.Sum(y)
	if err != nil || c.Count != 12 {
		t.Fatal(err, c.Count)
	}
	entries, scratch := make([]int8, len(f.Cols)), make([]int32, 3)
	for cell := range c.Count {
		var mass float64
		var mean [3]big.Float
		var rows []int
		for i := range n {
			var l [3]int32
			for k := range f.Cats {
				f.Cats[k].LevelsTo(l[k:k+1], i)
			}
			if int(l[0]*4+l[1]*2+l[2]) == cell {
				rows = append(rows, i)
			}
		}
		f.EntriesTo(entries, cell, scratch)
		for j, e := range entries {
			v := f.At(rows[0], j).Hi
			if k := f.Cols[j].Num; k >= 0 {
				v /= f.Nums[k].Hi[rows[0]]
			}
			if float64(e) != v {
				t.Fatalf("cell %d has entry %d in column %d, want %g", cell, e, j, v)
			}
		}
		at := func(i, a int) *big.Float {
			v := [3]float64{f.Nums[0].Hi[i], f.Nums[1].Hi[i], y[i]}[a]
			return new(big.Float).SetPrec(200).SetFloat64(v)
		}
		times := func(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(200).Mul(a, b) }
		for _, i := range rows {
			mass += w[i]
			for a := range mean {
				mean[a].SetPrec(200).Add(&mean[a], times(at(i, a), big.NewFloat(w[i])))
			}
		}
		for a := range mean {
			mean[a].Quo(&mean[a], big.NewFloat(mass))
		}
		k := 0
		var diag [3]float64
		for a := range 3 {
			for b := range a + 1 {
				sum := new(big.Float).SetPrec(200)
				for _, i := range rows {
					da, db := at(i, a), at(i, b)
					da.Sub(da, &mean[a])
					db.Sub(db, &mean[b])
					sum.Add(sum, times(times(da, db), big.NewFloat(w[i])))
				}
				want, _ := sum.Float64()
				size := math.Abs(want)
				if a == b {
					diag[a] = want
				} else {
					size = math.Sqrt(diag[b]) * math.Sqrt(diagOf(at, &mean[a], rows, w, a))
				}
				if got := m.M2[cell*6+k]; !(math.Abs(got-want) <= 1e-13*size) {
					t.Errorf("cell %d moment %d,%d is %.17g, want %.17g", cell, a, b, got, want)
				}
				k++
			}
			// A mean is carried less the first value of its cell, and rounded as that.
			if want, _ := mean[a].Float64(); !(math.Abs(m.MeanOf(cell, a).Float()-want) <= 0x1p-51*(math.Abs(want)+math.Abs(m.Mean[cell*3+a]))) {
				t.Errorf("cell %d mean %d is %.17g, want %.17g", cell, a, m.MeanOf(cell, a).Float(), want)
			}
		}
		if m.Mass[cell] != mass {
			t.Errorf("cell %d mass %g, want %g", cell, m.Mass[cell], mass)
		}
	}
}

func diagOf(at func(i, a int) *big.Float, mean *big.Float, rows []int, w []float64, a int) float64 {
	s := 0.0
	for _, i := range rows {
		d, _ := new(big.Float).Sub(at(i, a), mean).Float64()
		s += w[i] * d * d
	}
	return s
}

// TestScorer: sums by level give the rows' products that the plain pass over
// columns gives, without allocating.
func TestScorer(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 5))
	const n = 3000
	f := &Form{N: n}
	num := func(low bool) Num {
		v := Num{Hi: make([]float64, n)}
		if low {
			v.Lo = make([]float64, n)
		}
		for i := range n {
			v.Hi[i] = rng.NormFloat64()
			if low {
				v.Lo[i] = v.Hi[i] * 0x1p-60
			}
		}
		return v
	}
	f.Nums = []Num{num(false), num(true)}
	for _, levels := range []int{3, 4} {
		c := Cat{Levels: levels, Codes: make([]int32, n)}
		for i := range n {
			c.Codes[i] = int32(rng.IntN(levels))
		}
		f.Cats = append(f.Cats, c)
	}
	entry := func(e ...int8) []int8 { return e }
	f.Cols = []Col{
		{Num: -1}, {Num: 0}, {Num: 1},
		{Num: -1, Cells: []Cell{{0, entry(-1, 1, 0)}}}, {Num: -1, Cells: []Cell{{0, entry(-1, 0, 1)}}},
		{Num: 1, Cells: []Cell{{1, entry(0, 1, 1, 1)}}}, {Num: 1, Cells: []Cell{{1, entry(0, 0, 1, 1)}}},
		{Num: 0, Cells: []Cell{{1, entry(0, 1, 0, 0)}, {0, entry(0, 0, 1)}}}, {Num: 0, Cells: []Cell{{0, entry(0, 1, 0)}, {1, entry(0, 0, 0, 1)}}},
	}
	b, blo := make([]float64, len(f.Cols)), make([]float64, len(f.Cols))
	for j := range b {
		b[j] = rng.NormFloat64()
		blo[j] = b[j] * 0x1p-58
	}
	known := num(false).Hi
	want, got := make([]float64, n-100), make([]float64, n-100)
	f.MeanTo(want, nil, b, blo, known[100:], 100)
	s := NewScorer(f, b, blo)
	s.MeanTo(got, known[100:], f, 100)
	for i := range got {
		// Both sum in double-double; the last rounding may differ by one unit.
		if d := got[i] - want[i]; d > 2e-16*(1+abs(want[i])) || -d > 2e-16*(1+abs(want[i])) {
			t.Fatalf("row %d: %v, want %v", i, got[i], want[i])
		}
	}
	if a := testing.AllocsPerRun(10, func() { s.MeanTo(got, nil, f, 100) }); a != 0 {
		t.Errorf("%v allocations", a)
	}
}

func abs(x float64) float64 { return max(x, -x) }
