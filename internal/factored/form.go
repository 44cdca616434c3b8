// Package factored holds a design matrix as it is made: a few numeric columns
// and the level numbers of categories. Column j of the matrix is one numeric
// column (or the constant 1) times entries -1, 0 or 1 looked up by level.
// Nothing of size rows × columns exists unless a caller asks for it.
package factored

import "example.com/trammel/internal/dd"

// A Form is a matrix of N rows and len(Cols) columns in factored form. It is
// immutable and may be shared between goroutines.
type Form struct {
	N    int
	Nums []Num // numeric columns: products of the terms' numeric factors
	Cats []Cat // level numbers of categories
	Cols []Col // the columns of the matrix
}

// A Num is one numeric column of N rows, Hi + Lo. Lo is nil when all its low
// parts are zero. Both may be slices of a table's own columns.
type Num struct{ Hi, Lo []float64 }

// A Cat gives each row the number of its level, in [0, Levels). Exactly one of
// Codes and Bits is set: level = Level[Codes[i]], or Codes[i] itself when Level
// is nil; with Bits, Level[0] for false and Level[1] for true.
type Cat struct {
	Levels int
	Codes  []int32
	Bits   []bool
	Level  []int32
}

// A Col is one column: Num (an index into Nums, -1 for the constant 1) times
// the entries of Cells.
type Col struct {
	Num   int
	Cells []Cell
}

// A Cell multiplies a column by Entry[level of Cats[Cat]], each -1, 0 or 1.
// Entry has one value per level and is shared between columns.
type Cell struct {
	Cat   int
	Entry []int8
}

// LevelsTo writes the level numbers of rows [from, from+len(dst)) to dst.
func (c *Cat) LevelsTo(dst []int32, from int) {
	if c.Bits != nil {
		for i, b := range c.Bits[from : from+len(dst)] {
			k := c.Level[0]
			if b {
				k = c.Level[1]
			}
			dst[i] = k
		}
		return
	}
	codes := c.Codes[from : from+len(dst)]
	if c.Level == nil {
		copy(dst, codes)
		return
	}
	for i, k := range codes {
		dst[i] = c.Level[k]
	}
}

// At is the value in row i and column j, both from 0, as hi + lo.
func (f *Form) At(i, j int) dd.Num {
	col := &f.Cols[j]
	sign := int8(1)
	for _, c := range col.Cells {
		var level [1]int32
		f.Cats[c.Cat].LevelsTo(level[:], i)
		sign *= c.Entry[level[0]]
	}
	switch {
	case sign == 0:
		return dd.Num{}
	case col.Num < 0:
		return dd.Of(float64(sign))
	}
	num := &f.Nums[col.Num]
	v := dd.Of(num.Hi[i])
	if num.Lo != nil {
		v.Lo = num.Lo[i]
	}
	if sign < 0 {
		v = v.Neg()
	}
	return v
}
