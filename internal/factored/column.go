package factored

// span is the number of rows handled at a time by passes that look up levels.
const span = 512

// HasLow reports whether column j has low parts.
func (f *Form) HasLow(j int) bool {
	k := f.Cols[j].Num
	return k >= 0 && f.Nums[k].Lo != nil
}

// ColumnTo writes rows [from, from+len(hi)) of column j to hi and the low
// parts to lo, of the same length; lo may be nil when they are not wanted.
func (f *Form) ColumnTo(hi, lo []float64, j, from int) {
	col := &f.Cols[j]
	n := len(hi)
	if col.Num < 0 {
		for i := range hi {
			hi[i] = 1
		}
		clear(lo)
	} else {
		num := &f.Nums[col.Num]
		copy(hi, num.Hi[from:from+n])
		if lo != nil {
			if num.Lo != nil {
				copy(lo, num.Lo[from:from+n])
			} else {
				clear(lo)
			}
		}
	}
	var levels [span]int32
	for _, c := range col.Cells {
		for at := 0; at < n; at += span {
			end := min(at+span, n)
			part := levels[:end-at]
			f.Cats[c.Cat].LevelsTo(part, from+at)
			signTo(hi[at:end], c.Entry, part)
			if lo != nil {
				signTo(lo[at:end], c.Entry, part)
			}
		}
	}
}

// signTo multiplies v by the entries of its levels; 0 gives a true 0 whatever
// v holds.
func signTo(v []float64, entry []int8, levels []int32) {
	for i, l := range levels {
		switch entry[l] {
		case 0:
			v[i] = 0
		case -1:
			v[i] = -v[i]
		}
	}
}
