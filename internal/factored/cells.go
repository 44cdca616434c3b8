package factored

import (
	"math"
	"sync"

	"example.com/trammel/internal/dd"
)

// Cells divides the rows of a form into cells, the combinations of levels of
// all its categories, within which every column of the form is a constant times
// one numeric column. Passes over the rows work in blocks of fixed size whose
// sums are merged in the order of the blocks, so that no result depends on the
// number of workers.
type Cells struct {
	Form    *Form
	Count   int       // number of cells, empty ones included
	Weights []float64 // by row; nil for 1
	Counts  []float64 // by row; nil for 1
	Workers int
	// Step is called between groups of blocks with the number of rows done; an
	// error ends the pass. May be nil.
	Step func(done int) error
}

// blockRows is the number of rows whose sums are merged as one.
const blockRows = 1 << 16

// CountCells is the number of cells of the form, at most limit+1.
func (f *Form) CountCells(limit int) int {
	k := 1
	for i := range f.Cats {
		if f.Cats[i].Levels > 0 && k > limit/f.Cats[i].Levels {
			return limit + 1
		}
		k *= f.Cats[i].Levels
	}
	return k
}

// numbersTo writes the cell numbers of rows [from, from+len(dst)) to dst.
func (f *Form) numbersTo(dst, scratch []int32, from int) {
	if len(f.Cats) == 0 {
		clear(dst)
		return
	}
	f.Cats[0].LevelsTo(dst, from)
	for k := 1; k < len(f.Cats); k++ {
		s := scratch[:len(dst)]
		f.Cats[k].LevelsTo(s, from)
		levels := int32(f.Cats[k].Levels)
		for i, l := range s {
			dst[i] = dst[i]*levels + l
		}
	}
}

// levels writes the level of each category in a cell to dst.
func (f *Form) levels(dst []int32, cell int) {
	for k := len(f.Cats) - 1; k >= 0; k-- {
		dst[k] = int32(cell % f.Cats[k].Levels)
		cell /= f.Cats[k].Levels
	}
}

// EntriesTo writes to dst the constant by which each column's numeric column is
// multiplied in a cell: -1, 0 or 1.
func (f *Form) EntriesTo(dst []int8, cell int, scratch []int32) {
	levels := scratch[:len(f.Cats)]
	f.levels(levels, cell)
	for j := range f.Cols {
		e := int8(1)
		for _, c := range f.Cols[j].Cells {
			e *= c.Entry[levels[c.Cat]]
		}
		dst[j] = e
	}
}

// Moments are weighted first and second moments by cell of the numeric columns
// and a response, V = len(Nums)+1 variables.
type Moments struct {
	V    int
	Mass []float64 // by cell: sum of weight times count
	// Shift is a value of each variable in the cell, and Mean the mean less that,
	// so that a mean far from 0 costs no digits.
	Shift []float64 // cell·V
	Mean  []float64 // cell·V
	M2    []float64 // cell·V(V+1)/2: sums of products about the mean, lower triangle by rows
}

func newMoments(cells, v int) *Moments {
	t := v * (v + 1) / 2
	all := make([]float64, cells*(1+v+t))
	return &Moments{V: v, Mass: all[:cells], Mean: all[cells : cells*(1+v)], M2: all[cells*(1+v):]}
}

// MeanOf is the mean of variable a in a cell.
func (m *Moments) MeanOf(cell, a int) dd.Num {
	s, e := dd.TwoSum(m.Shift[cell*m.V+a], m.Mean[cell*m.V+a])
	return dd.Num{Hi: s, Lo: e}
}

// merge adds the moments o of other rows: T. F. Chan, G. H. Golub and R. J.
// LeVeque, "Updating formulae and a pairwise algorithm for computing sample
// variances", COMPSTAT 1982, 30-41.
func (m *Moments) merge(o *Moments) {
	v, t := m.V, m.V*(m.V+1)/2
	for c, w := range o.Mass {
		if w == 0 {
			continue
		}
		mean, other := m.Mean[c*v:(c+1)*v], o.Mean[c*v:(c+1)*v]
		m2, o2 := m.M2[c*t:(c+1)*t], o.M2[c*t:(c+1)*t]
		old := m.Mass[c]
		total := old + w
		k := 0
		for a := range v {
			da := other[a] - mean[a]
			for b := range a + 1 {
				m2[k] += o2[k] + da*(other[b]-mean[b])*(old/total*w)
				k++
			}
		}
		for a := range v {
			mean[a] += (other[a] - mean[a]) * (w / total)
		}
		m.Mass[c] = total
	}
}

// worker is the scratch of one goroutine.
type worker struct {
	cell, levels []int32
	m            *Moments
	base         []float64 // cell·V: the fixed shift, shared
	shift        []float64 // cell·V: shift of the block beside it
	d            []float64 // V
	g            []float64 // cell·V
	rss          float64
}

func (c *Cells) newWorker(v int) *worker {
	rows := min(blockRows, c.Form.N)
	codes := make([]int32, 2*rows)
	return &worker{cell: codes[:rows], levels: codes[rows:], m: newMoments(c.Count, v),
		shift: make([]float64, c.Count*v), d: make([]float64, v), g: make([]float64, c.Count*v)}
}

// each runs do for every block and then, in the order of the blocks, merge.
func (c *Cells) each(v int, do func(w *worker, from, to int), merge func(w *worker, from, to int)) error {
	n := c.Form.N
	workers := make([]*worker, max(1, min(c.Workers, (n+blockRows-1)/blockRows)))
	for i := range workers {
		workers[i] = c.newWorker(v)
	}
	for from := 0; from < n; from += len(workers) * blockRows {
		var all sync.WaitGroup
		for i, w := range workers {
			a := from + i*blockRows
			if a >= n {
				break
			}
			run := func() {
				b := min(n, a+blockRows)
				c.Form.numbersTo(w.cell[:b-a], w.levels, a)
				do(w, a, b)
			}
			if len(workers) == 1 {
				run()
				continue
			}
			all.Go(run)
		}
		all.Wait()
		for i, w := range workers {
			if a := from + i*blockRows; a < n {
				merge(w, a, min(n, a+blockRows))
			}
		}
		if c.Step != nil {
			if err := c.Step(min(n, from+len(workers)*blockRows)); err != nil {
				return err
			}
		}
	}
	return nil
}

// mass is weight times count of row i.
func (c *Cells) mass(i int) float64 {
	w := 1.0
	if c.Weights != nil {
		w = c.Weights[i]
	}
	if c.Counts != nil {
		w *= c.Counts[i]
	}
	return w
}

// Sum forms the moments of the numeric columns and y, a response of n rows.
func (c *Cells) Sum(y []float64) (*Moments, error) {
	v := len(c.Form.Nums) + 1
	total := newMoments(c.Count, v)
	total.Shift = c.firstValues(v, y)
	err := c.each(v, func(w *worker, from, to int) { w.base = total.Shift; c.sumBlock(w, y, from, to) },
		func(w *worker, _, _ int) { total.merge(w.m) })
	return total, err
}

// firstValues are the variables in the first row of each cell.
func (c *Cells) firstValues(v int, y []float64) []float64 {
	out, seen, left := make([]float64, c.Count*v), make([]bool, c.Count), c.Count
	var codes, levels [span]int32
	for from := 0; from < c.Form.N && left > 0; from += span {
		part := codes[:min(span, c.Form.N-from)]
		c.Form.numbersTo(part, levels[:], from)
		for i, k := range part {
			if seen[k] {
				continue
			}
			seen[k] = true
			left--
			for a := range c.Form.Nums {
				out[int(k)*v+a] = c.Form.Nums[a].Hi[from+i]
			}
			out[int(k)*v+v-1] = y[from+i]
		}
	}
	return out
}

// sumBlock forms the moments of one block about the fixed shift; where that lies
// too far from the mean to leave enough digits, once more about the means.
func (c *Cells) sumBlock(w *worker, y []float64, from, to int) {
	clear(w.shift)
	v := w.m.V
	c.accumulate(w, y, from, to)
	if w.cancels() {
		for k, m := range w.m.Mass {
			for a := range v {
				if m > 0 {
					w.shift[k*v+a] += w.m.Mean[k*v+a] / m
				}
			}
		}
		c.accumulate(w, y, from, to)
	}
	t := v * (v + 1) / 2
	for k, m := range w.m.Mass {
		if m == 0 {
			continue
		}
		s1, s2 := w.m.Mean[k*v:(k+1)*v], w.m.M2[k*t:(k+1)*t]
		i := 0
		for a := range v {
			for b := range a + 1 {
				s2[i] -= s1[a] * s1[b] / m
				i++
			}
			s2[i-1] = max(s2[i-1], 0)
		}
		for a := range v {
			s1[a] = w.shift[k*v+a] + s1[a]/m
		}
	}
}

// cancels reports whether a sum of squares would lose more than some three
// digits when it is brought to the mean.
func (w *worker) cancels() bool {
	v := w.m.V
	t := v * (v + 1) / 2
	for k, m := range w.m.Mass {
		if m == 0 {
			continue
		}
		for a := range v {
			s1, s2 := w.m.Mean[k*v+a], w.m.M2[k*t+a*(a+1)/2+a]
			if s2-s1*s1/m < 1e-3*s2 {
				return true
			}
		}
	}
	return false
}

// accumulate leaves mass, and first and second sums about w.shift, in w.m.
func (c *Cells) accumulate(w *worker, y []float64, from, to int) {
	clear(w.m.Mass)
	clear(w.m.Mean)
	clear(w.m.M2)
	if len(c.Form.Nums) == 1 && c.Weights == nil && c.Counts == nil {
		w.accumulateLine(c.Form.Nums[0].Hi[from:to], y[from:to])
		return
	}
	v, nums := w.m.V, c.Form.Nums
	t := v * (v + 1) / 2
	for i, k := range w.cell[:to-from] {
		cell := int(k)
		mass := c.mass(from + i)
		base, shift := w.base[cell*v:(cell+1)*v], w.shift[cell*v:(cell+1)*v]
		for a := range nums {
			w.d[a] = nums[a].Hi[from+i] - base[a] - shift[a]
		}
		w.d[v-1] = y[from+i] - base[v-1] - shift[v-1]
		w.m.Mass[cell] += mass
		s1, s2 := w.m.Mean[cell*v:(cell+1)*v], w.m.M2[cell*t:(cell+1)*t]
		j := 0
		for a, da := range w.d {
			da *= mass
			s1[a] += da
			for _, db := range w.d[:a+1] {
				s2[j] += da * db
				j++
			}
		}
	}
}

// accumulateLine is accumulate for one numeric column without weights.
func (w *worker) accumulateLine(x, y []float64) {
	cells := w.cell[:len(x)]
	y = y[:len(x)]
	for i, k := range cells {
		c := int(k)
		dx, dy := x[i]-w.base[2*c]-w.shift[2*c], y[i]-w.base[2*c+1]-w.shift[2*c+1]
		w.m.Mass[c]++
		s1 := w.m.Mean[2*c : 2*c+2]
		s1[0] += dx
		s1[1] += dy
		s2 := w.m.M2[3*c : 3*c+3]
		s2[0] += dx * dx
		s2[1] += dx * dy
		s2[2] += dy * dy
	}
}

// Lines are coefficients by cell: the residual of a row is
// Level + (y - mean of y) - Σ Slope[a]·(z_a - mean of z_a).
type Lines struct {
	Level []float64 // cell
	Slope []float64 // cell·(V-1)
}

// Lines gives the coefficients by cell of the model with coefficients b + blo
// for the columns of form, which has the numeric columns and categories of
// c.Form.
func (c *Cells) Lines(m *Moments, form *Form, b, blo []float64) *Lines {
	z := m.V - 1
	l := &Lines{Level: make([]float64, c.Count), Slope: make([]float64, c.Count*z)}
	entries, scratch := make([]int8, len(form.Cols)), make([]int32, len(form.Cats))
	sums := make([]dd.Num, z)
	for cell, mass := range m.Mass {
		if mass == 0 {
			continue
		}
		form.EntriesTo(entries, cell, scratch)
		clear(sums)
		level := m.MeanOf(cell, z)
		for j, e := range entries {
			if e == 0 {
				continue
			}
			v := dd.Num{Hi: float64(e) * b[j], Lo: float64(e) * blo[j]}
			if a := form.Cols[j].Num; a >= 0 {
				sums[a] = sums[a].Add(v)
			} else {
				level = level.Sub(v)
			}
		}
		for a, s := range sums {
			l.Slope[cell*z+a] = s.Float()
			level = level.Sub(dd.Of(s.Float()).Mul(m.MeanOf(cell, a)))
		}
		l.Level[cell] = level.Float()
	}
	return l
}

// residuals calls do for each row of a block with its cell, its residual and,
// in w.d, the numeric columns less their means.
func (c *Cells) residuals(w *worker, m *Moments, l *Lines, y, ylo []float64, from, to int, do func(i, cell int, r float64)) {
	v, nums := m.V, c.Form.Nums
	z := v - 1
	for i, k := range w.cell[:to-from] {
		cell := int(k)
		base, mean := m.Shift[cell*v:(cell+1)*v], m.Mean[cell*v:(cell+1)*v]
		dy := y[from+i] - base[z] - mean[z]
		if ylo != nil {
			dy += ylo[from+i]
		}
		r := dy + l.Level[cell]
		for a := range nums {
			d := nums[a].Hi[from+i] - base[a] - mean[a]
			if nums[a].Lo != nil {
				d += nums[a].Lo[from+i]
			}
			w.d[a] = d
			r = math.FMA(-l.Slope[cell*z+a], d, r)
		}
		do(from+i, cell, r)
	}
}

// Gradient forms, by cell, the weighted sums of residuals (first) and of their
// products with the centred numeric columns, and the weighted sum of squared
// residuals.
func (c *Cells) Gradient(m *Moments, l *Lines, y, ylo []float64) (g []float64, rss float64, err error) {
	v := m.V
	sums := make([]dd.Num, c.Count*v)
	var total dd.Num
	line := v == 2 && c.Weights == nil && c.Counts == nil && c.Form.Nums[0].Lo == nil && ylo == nil
	err = c.each(v, func(w *worker, from, to int) {
		clear(w.g)
		w.rss = 0
		if line {
			w.gradientLine(m, l, c.Form.Nums[0].Hi[from:to], y[from:to])
			return
		}
		c.residuals(w, m, l, y, ylo, from, to, func(i, cell int, r float64) {
			wr := c.mass(i) * r
			w.rss += wr * r
			g := w.g[cell*v : (cell+1)*v]
			g[0] += wr
			for a, d := range w.d[:v-1] {
				g[1+a] += wr * d
			}
		})
	}, func(w *worker, _, _ int) {
		for i, x := range w.g {
			sums[i] = sums[i].AddF(x)
		}
		total = total.AddF(w.rss)
	})
	g = make([]float64, len(sums))
	for i, s := range sums {
		g[i] = s.Float()
	}
	return g, total.Float(), err
}

// gradientLine is Gradient's block for one numeric column without weights.
func (w *worker) gradientLine(m *Moments, l *Lines, x, y []float64) {
	cells := w.cell[:len(x)]
	y = y[:len(x)]
	rss := 0.0
	for i, k := range cells {
		c := int(k)
		d := x[i] - m.Shift[2*c] - m.Mean[2*c]
		r := math.FMA(-l.Slope[c], d, y[i]-m.Shift[2*c+1]-m.Mean[2*c+1]+l.Level[c])
		rss += r * r
		g := w.g[2*c : 2*c+2]
		g[0] += r
		g[1] += r * d
	}
	w.rss = rss
}

// Residuals calls do for each row, in order, with its cell, its residual and the
// centred numeric columns.
func (c *Cells) Residuals(m *Moments, l *Lines, y, ylo []float64, do func(i, cell int, r float64, z []float64)) {
	w := c.newWorker(m.V)
	for from := 0; from < c.Form.N; from += blockRows {
		to := min(c.Form.N, from+blockRows)
		c.Form.numbersTo(w.cell[:to-from], w.levels, from)
		c.residuals(w, m, l, y, ylo, from, to, func(i, cell int, r float64) { do(i, cell, r, w.d[:m.V-1]) })
	}
}
