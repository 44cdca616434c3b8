package factored

import (
	"fmt"
	"slices"

	"example.com/trammel/internal/dd"
)

// A Scorer gives the product of a form's rows with fixed coefficients. Columns
// that share numeric column and categories are summed into one coefficient by
// level beforehand, so that a row costs one look-up for each such group, however
// many columns the levels make. It is immutable and may be shared.
type Scorer struct{ groups []group }

type group struct {
	num   int
	cats  []int    // ascending
	sizes []int    // levels of each
	coef  []dd.Num // by combination of levels, the last category fastest
}

// maxScorerTable bounds the entries of one group's table, maxScorerWork the
// entries looked at while all tables are made.
const (
	maxScorerTable = 1 << 20
	maxScorerWork  = 20_000_000
)

// NewScorer prepares the coefficients b + blo (blo may be nil) for forms with
// the columns and categories of f. It is nil when the tables would be too large.
func NewScorer(f *Form, b, blo []float64) *Scorer {
	s := &Scorer{}
	index := make(map[string]int)
	work := 0
	for j := range f.Cols {
		col := &f.Cols[j]
		cats := make([]int, 0, len(col.Cells))
		for _, c := range col.Cells {
			cats = append(cats, c.Cat)
		}
		slices.Sort(cats)
		cats = slices.Compact(cats)
		key := fmt.Sprint(col.Num, cats)
		k, ok := index[key]
		if !ok {
			g := group{num: col.Num, cats: cats}
			size := 1
			for _, c := range cats {
				n := f.Cats[c].Levels
				if n == 0 || size > maxScorerTable/n {
					return nil
				}
				size *= n
				g.sizes = append(g.sizes, n)
			}
			g.coef = make([]dd.Num, size)
			k = len(s.groups)
			index[key] = k
			s.groups = append(s.groups, g)
		}
		v := dd.Of(b[j])
		if blo != nil {
			v.Lo = blo[j]
		}
		if work += len(s.groups[k].coef); work > maxScorerWork {
			return nil
		}
		s.groups[k].put(col, v)
	}
	return s
}

// put adds a column's coefficient wherever its entries are not zero.
func (g *group) put(col *Col, v dd.Num) {
	levels := make([]int, len(g.cats))
	place := make([]int, len(col.Cells))
	for i, c := range col.Cells {
		place[i] = slices.Index(g.cats, c.Cat)
	}
	for at := range g.coef {
		sign := int8(1)
		for i, c := range col.Cells {
			sign *= c.Entry[levels[place[i]]]
		}
		switch {
		case sign > 0:
			g.coef[at] = g.coef[at].Add(v)
		case sign < 0:
			g.coef[at] = g.coef[at].Sub(v)
		}
		for k := len(levels) - 1; k >= 0; k-- {
			if levels[k]++; levels[k] < g.sizes[k] {
				break
			}
			levels[k] = 0
		}
	}
}

// MeanTo is Form.MeanTo without the gradient: rows [from, from+len(mean)) of f
// times the coefficients, plus known. It does not allocate.
func (s *Scorer) MeanTo(mean, known []float64, f *Form, from int) {
	var hi, lo [span]float64
	var at, levels [span]int32
	for start := 0; start < len(mean); start += span {
		m := min(span, len(mean)-start)
		row := from + start
		if known != nil {
			copy(hi[:m], known[start:start+m])
		} else {
			clear(hi[:m])
		}
		clear(lo[:m])
		for k := range s.groups {
			g := &s.groups[k]
			clear(at[:m])
			for q, c := range g.cats {
				if q == 0 {
					f.Cats[c].LevelsTo(at[:m], row)
					continue
				}
				f.Cats[c].LevelsTo(levels[:m], row)
				size := int32(g.sizes[q])
				for i, l := range levels[:m] {
					at[i] = at[i]*size + l
				}
			}
			if g.num < 0 {
				for i, l := range at[:m] {
					v := dd.Num{Hi: hi[i], Lo: lo[i]}.Add(g.coef[l])
					hi[i], lo[i] = v.Hi, v.Lo
				}
				continue
			}
			num := &f.Nums[g.num]
			x := num.Hi[row : row+m]
			for i, l := range at[:m] {
				z := dd.Of(x[i])
				if num.Lo != nil {
					z.Lo = num.Lo[row+i]
				}
				v := dd.Num{Hi: hi[i], Lo: lo[i]}.Add(z.Mul(g.coef[l]))
				hi[i], lo[i] = v.Hi, v.Lo
			}
		}
		for i := range m {
			mean[start+i] = hi[i] + lo[i]
		}
	}
}
