package design

import (
	"errors"
	"math"
	"reflect"
	"slices"
	"testing"
	"unsafe"
)

func mustTable(t *testing.T, columns ...Column) *Table {
	t.Helper()
	table, err := NewTable(columns...)
	if err != nil {
		t.Fatalf("NewTable: %v", err)
	}
	return table
}

// wantCode fails unless err is an *Error of that code.
func wantCode(t *testing.T, err error, code Code) *Error {
	t.Helper()
	var e *Error
	if !errors.As(err, &e) || !errors.Is(err, code) {
		t.Fatalf("got %v (%T), want a refusal of code %s", err, err, code)
	}
	return e
}

func TestNewTable(t *testing.T) {
	hold := []float64{1, math.NaN(), 3}
	table := mustTable(t, Numbers("hold", hold), Bools("open", []bool{true, false, true}),
		Texts("Oven no.", []string{"b", "a", "b"}))
	if table.Rows() != 3 || !slices.Equal(table.Names(), []string{"hold", "open", "Oven no."}) {
		t.Errorf("rows %d, names %q", table.Rows(), table.Names())
	}
	if c := table.column("hold"); unsafe.SliceData(c.num) != unsafe.SliceData(hold) || c.miss != nil {
		t.Error("Numbers copied its slice, or took NaN for missing")
	}
	c := table.column("Oven no.")
	if !slices.Equal(c.dict, []string{"b", "a"}) || !slices.Equal(c.codes, []int32{0, 1, 0}) {
		t.Errorf("dict %q, codes %v", c.dict, c.codes)
	}
	oven, ok := table.Column("Oven no.")
	if !ok || oven.Kind() != TextColumn || oven.Len() != 3 || oven.Name() != "Oven no." ||
		!slices.Equal(oven.Texts(), []string{"b", "a", "b"}) || oven.Floats() != nil || oven.Bools() != nil || oven.Mask() != nil {
		t.Errorf("column Oven no. reads back wrongly: %+v", oven)
	}
	if _, ok := table.Column("oven no."); ok {
		t.Error("names are compared without regard to case")
	}
	table.Names()[0] = "changed"
	held, _ := table.Column("hold")
	held.Floats()[0] = 99
	if table.Names()[0] != "hold" || hold[0] != 1 {
		t.Error("Names or Floats lends the table's own slice")
	}
}

func TestNewTableWithoutRows(t *testing.T) {
	if table := mustTable(t); table.Rows() != 0 || len(table.Names()) != 0 {
		t.Error("the table of nothing is not empty")
	}
	table := mustTable(t, Numbers("x", nil), Bools("b", nil), Texts("s", nil).Missing(nil))
	if table.Rows() != 0 || len(table.Names()) != 3 {
		t.Errorf("rows %d, names %q", table.Rows(), table.Names())
	}
	if got := table.column("s").kind; got != TextColumn {
		t.Errorf("an empty text column became %v", got)
	}
}

func TestMissing(t *testing.T) {
	values := []float64{1, 2, 3}
	mask := []bool{false, true, false}
	once := Numbers("x", values).Missing(mask)
	twice := once.Missing([]bool{true, false, false})
	mask[0] = true // must not matter
	table := mustTable(t, once)
	x := table.column("x")
	if x.num[0] != 1 || !math.IsNaN(x.num[1]) || !slices.Equal(x.miss, []bool{false, true, false}) {
		t.Errorf("values %v, missing %v", x.num, x.miss)
	}
	if values[1] != 2 {
		t.Error("Missing wrote into the caller's slice")
	}
	if got := twice.Mask(); !slices.Equal(got, []bool{true, true, false}) {
		t.Errorf("missing twice gives %v", got)
	}
	if got := Numbers("x", values).Missing(make([]bool, 3)).Mask(); got != nil {
		t.Errorf("a mask without true gives %v, want nil", got)
	}
	// A value that stands only in missing cells is not a value of the column.
	s := Texts("s", []string{"gone", "b", "a", "b"}).Missing([]bool{true, false, false, false}).c
	if !slices.Equal(s.dict, []string{"b", "a"}) || !slices.Equal(s.codes, []int32{-1, 0, 1, 0}) {
		t.Errorf("dict %q, codes %v", s.dict, s.codes)
	}
	b := Bools("b", []bool{true, true}).Missing([]bool{true, false})
	if !slices.Equal(b.Bools(), []bool{false, true}) || !slices.Equal(b.Mask(), []bool{true, false}) {
		t.Errorf("bools %v, missing %v", b.Bools(), b.Mask())
	}
	// Text that is not UTF-8 is refused, unless its cell is missing.
	bad := Texts("s", []string{"\xff", "a"})
	_, err := NewTable(bad)
	wantCode(t, err, codeInvalidUTF8)
	mustTable(t, bad.Missing([]bool{true, false}))
	_, err = NewTable(bad.Missing([]bool{false, true}))
	wantCode(t, err, codeInvalidUTF8)
	// The first fault is the one reported.
	_, err = NewTable(Numbers("x", values).Missing(mask[:2]).Missing([]bool{true}))
	wantCode(t, err, codeUnequalLengths)
}

func TestZeroColumn(t *testing.T) {
	var c Column
	c = c.Missing([]bool{true})
	if c.Name() != "" || c.Len() != 0 || c.Kind() != NumberColumn || c.Floats() != nil || c.Bools() != nil || c.Texts() != nil || c.Mask() != nil {
		t.Errorf("the zero Column is not empty: %+v", c)
	}
	_, err := NewTable(c)
	wantCode(t, err, codeUnmadeColumn)
}

func TestTake(t *testing.T) {
	table := mustTable(t,
		Numbers("x", []float64{1, 2, 3, 4}).Missing([]bool{false, true, false, false}),
		Bools("b", []bool{true, false, true, false}),
		Texts("s", []string{"F1", "F2", "F3", "F2"}).Missing([]bool{true, false, false, false}))
	got := table.take([]int{3, 2, 3, 1}, []string{"s", "absent", "x", "b"})
	if got.Rows() != 4 || !slices.Equal(got.Names(), []string{"s", "x", "b"}) {
		t.Fatalf("rows %d, names %q", got.Rows(), got.Names())
	}
	s, x, b := got.column("s"), got.column("x"), got.column("b")
	if !slices.Equal(s.dict, []string{"F2", "F3"}) || !slices.Equal(s.codes, []int32{0, 1, 0, 0}) || s.miss != nil {
		t.Errorf("s: dict %q, codes %v, missing %v", s.dict, s.codes, s.miss)
	}
	if x.num[0] != 4 || x.num[1] != 3 || !math.IsNaN(x.num[3]) || !slices.Equal(x.miss, []bool{false, false, false, true}) {
		t.Errorf("x: %v, missing %v", x.num, x.miss)
	}
	if !slices.Equal(b.bits, []bool{false, true, false, false}) {
		t.Errorf("b: %v", b.bits)
	}
	s = table.take([]int{0, 2}, []string{"s"}).column("s")
	if !slices.Equal(s.dict, []string{"F3"}) || !slices.Equal(s.codes, []int32{-1, 0}) || !slices.Equal(s.miss, []bool{true, false}) {
		t.Errorf("s: dict %q, codes %v, missing %v", s.dict, s.codes, s.miss)
	}
	all := table.take([]int{0, 1, 2, 3}, table.Names())
	if !sameTable(all, table) {
		t.Error("taking everything changes the table")
	}
	if none := table.take(nil, []string{"x"}); none.Rows() != 0 || none.column("x").len() != 0 {
		t.Error("taking no rows gives some")
	}
}

// TestBuilderLimit reaches the limit on distinct texts by lowering it.
func TestBuilderLimit(t *testing.T) {
	for limit, ok := range map[int]bool{2: false, 3: true} {
		b := newBuilder("s")
		b.maxDict = limit
		b.become(TextColumn)
		for _, v := range []string{"a", "b", "a", "c"} {
			b.addText(v)
		}
		_, err := b.finish()
		if ok != (err == nil) {
			t.Errorf("limit %d on 3 distinct texts: %v", limit, err)
		}
	}
}

// sameTable compares tables cell by cell; NaN equals NaN, and where a column
// turned to text does not matter.
func sameTable(a, b *Table) bool {
	if a.rows != b.rows || !reflect.DeepEqual(a.index, b.index) || len(a.cols) != len(b.cols) {
		return false
	}
	for j, c := range a.cols {
		d := b.cols[j]
		same := func(x, y float64) bool { return math.Float64bits(x) == math.Float64bits(y) || x != x && y != y }
		if c.name != d.name || c.kind != d.kind || c.len() != a.rows || d.len() != a.rows ||
			!slices.EqualFunc(c.num, d.num, same) || !slices.Equal(c.bits, d.bits) ||
			!slices.Equal(c.codes, d.codes) || !slices.Equal(c.dict, d.dict) || !slices.Equal(c.miss, d.miss) {
			return false
		}
	}
	return true
}
