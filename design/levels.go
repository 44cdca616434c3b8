package design

import (
	"cmp"
	"math"
	"slices"
	"strings"

	"example.com/trammel/formula"
)

// A value is one column's value at a level of a category.
type value struct {
	kind Kind
	num  float64
	text string
	bit  bool
}

// source writes the value as the model language has it.
func (v value) source() string {
	switch v.kind {
	case NumberColumn:
		return signedText(v.num)
	case BoolColumn:
		if v.bit {
			return "true"
		}
		return "false"
	}
	return formula.QuoteLevel(v.text)
}

// plain writes the value for reading, without quotes.
func (v value) plain() string {
	if v.kind == TextColumn {
		return v.text
	}
	return v.source()
}

func signedText(x float64) string {
	if x < 0 {
		return "-" + formula.FormatNumber(-x)
	}
	return formula.FormatNumber(x)
}

// compareValues is the order of levels: numbers by value; false, true; text by
// compareText.
func compareValues(a, b value) int {
	switch a.kind {
	case NumberColumn:
		return cmp.Compare(a.num, b.num)
	case BoolColumn:
		switch {
		case a.bit == b.bit:
			return 0
		case b.bit:
			return -1
		}
		return 1
	}
	return compareText(a.text, b.text)
}

// compareText compares text split into runs of digits, by value, and other
// runs, by code point; ties by fewer leading zeros, then by code point. So F2
// stands before F10.
func compareText(a, b string) int {
	zeros := 0
	x, y := a, b
	for x != "" && y != "" {
		xr, yr := run(x), run(y)
		xd, yd := digit(xr[0]), digit(yr[0])
		if xd && yd {
			xt, yt := strings.TrimLeft(xr, "0"), strings.TrimLeft(yr, "0")
			if c := cmp.Or(cmp.Compare(len(xt), len(yt)), strings.Compare(xt, yt)); c != 0 {
				return c
			}
			if zeros == 0 {
				zeros = cmp.Compare(len(xr), len(yr))
			}
		} else if c := strings.Compare(xr, yr); c != 0 {
			return c
		}
		x, y = x[len(xr):], y[len(yr):]
	}
	return cmp.Or(cmp.Compare(len(x), len(y)), zeros, strings.Compare(a, b))
}

func digit(c byte) bool { return c >= '0' && c <= '9' }

// run is the longest start of s, not empty, that is all digits or has none.
func run(s string) string {
	d := digit(s[0])
	i := 1
	for i < len(s) && digit(s[i]) == d {
		i++
	}
	return s[:i]
}

// valueOf turns a level of the model text into a value.
func valueOf(l *formula.Level) value {
	switch l.Kind {
	case formula.NumberLevel:
		return value{kind: NumberColumn, num: l.Number + 0} // -0 is 0
	case formula.BoolLevel:
		return value{kind: BoolColumn, bit: l.Bool}
	}
	return value{kind: TextColumn, text: l.Text}
}

// distinct lists the values of a column that occur, in level order, and gives
// each row the number of its value (codes, or bits with level). Missing cells
// must not be left in the column.
func distinct(c *column) (values []value, codes []int32, level []int32) {
	switch c.kind {
	case BoolColumn:
		var has [2]bool
		for _, b := range c.bits {
			if b {
				has[1] = true
			} else {
				has[0] = true
			}
			if has[0] && has[1] {
				break
			}
		}
		level = []int32{-1, -1}
		for k, bit := range []bool{false, true} {
			if has[k] {
				level[k] = int32(len(values))
				values = append(values, value{kind: BoolColumn, bit: bit})
			}
		}
		return values, nil, level
	case TextColumn:
		used := make([]bool, len(c.dict))
		left := len(used)
		for _, k := range c.codes {
			if k >= 0 && !used[k] {
				used[k] = true
				if left--; left == 0 {
					break
				}
			}
		}
		for k, t := range c.dict {
			if used[k] {
				values = append(values, value{kind: TextColumn, text: t})
			}
		}
		slices.SortFunc(values, compareValues)
		place := make(map[string]int32, len(values))
		for i, v := range values {
			place[v.text] = int32(i)
		}
		level = make([]int32, len(c.dict))
		for k, t := range c.dict {
			level[k] = -1
			if used[k] {
				level[k] = place[t]
			}
		}
		return values, c.codes, level
	}
	codes = make([]int32, len(c.num))
	seen := make(map[float64]int32)
	last, lastCode := math.NaN(), int32(0)
	for i, x := range c.num {
		x += 0 // -0 is 0
		if x != last {
			k, ok := seen[x]
			if !ok {
				k = int32(len(values))
				seen[x] = k
				values = append(values, value{kind: NumberColumn, num: x})
			}
			last, lastCode = x, k
		}
		codes[i] = lastCode
	}
	order := slices.Clone(values)
	slices.SortFunc(order, compareValues)
	level = make([]int32, len(values))
	for i, v := range order {
		level[seen[v.num]] = int32(i)
	}
	return order, codes, level
}
