package design

import (
	"database/sql"
	"math"
	"slices"
	"testing"
	"time"
)

type samplePlace struct {
	Site string `trammel:"site"`
}

type sampleMachine struct {
	samplePlace
	Oven  int8
	Label string
}

type sampleGrade string

type sampleReading struct {
	Hold     float64 `trammel:"hold"`
	Count    int
	Big      uint64
	Small    float32
	Open     bool
	Grade    sampleGrade `trammel:"Grade of steel"`
	Limit    *float64    `trammel:"limit"`
	Note     *string
	Skipped  []int          `trammel:"-"`
	private  complex128     //lint:ignore U1000 shows that unexported fields are passed over
	Supplier sql.NullString `trammel:"supplier"`
	Area     sql.Null[float32]
	Shift    *sql.NullInt16
	Ok       sql.NullBool
	sampleMachine
}

func TestFromStructs(t *testing.T) {
	limit, note := 2.5, "late"
	rows := []sampleReading{
		{Hold: 1.5, Count: -3, Big: math.MaxUint64, Small: 0.1, Open: true, Grade: "A",
			Supplier: sql.NullString{String: "north", Valid: true}, Area: sql.Null[float32]{V: 2, Valid: true},
			Shift: &sql.NullInt16{Int16: 3, Valid: true}, Ok: sql.NullBool{Bool: true, Valid: true},
			sampleMachine: sampleMachine{samplePlace{"Bern"}, 7, "x"}},
		{Hold: math.NaN(), Limit: &limit, Note: &note, Shift: &sql.NullInt16{}, Grade: "B", sampleMachine: sampleMachine{samplePlace{"Bern"}, -8, ""}},
	}
	// 2^64-1 is rounded to 2^64; 0.1 in float32 is exactly 13421773/2^27.
	const want = "hold:number 1.5 NaN\nCount:number -3 0\nBig:number 1.8446744073709552e+19 0\n" +
		"Small:number 0.10000000149011612 0\nOpen:true/false true false\nGrade of steel:text \"A\" \"B\"\n" +
		"limit:number - 2.5\nNote:text - \"late\"\nsupplier:text \"north\" -\nArea:number 2 -\nShift:number 3 -\n" +
		"Ok:true/false true -\nsite:text \"Bern\" \"Bern\"\nOven:number 7 -8\nLabel:text \"x\" \"\"\n"
	table, err := FromStructs(rows)
	if err != nil {
		t.Fatal(err)
	}
	if got := render(table); got != want {
		t.Errorf("got\n%swant\n%s", got, want)
	}
	checkSound(t, table)
	if table.column("hold").miss != nil {
		t.Error("NaN in a float field is taken for a missing cell")
	}
	if small := table.column("Small").num[0]; small != 13421773/float64(1<<27) {
		t.Errorf("float32 0.1 became %v", small)
	}
	for name, slice := range map[string]any{"pointers": []*sampleReading{&rows[0], &rows[1]}, "array": [2]sampleReading{rows[0], rows[1]}} {
		other, err := FromStructs(slice)
		if err != nil || !sameTable(table, other) {
			t.Errorf("%s: %v, or another table", name, err)
		}
	}
}

type (
	level4 struct{ A, B, C float64 }
	level3 struct {
		level4
		D, G float64
	}
	level2 struct {
		level3
		E float64
	}
	level1 struct {
		level2
		F float64
	}
)

// TestFromStructsDeep checks that the paths to deep fields do not share memory.
func TestFromStructsDeep(t *testing.T) {
	table, err := FromStructs([]struct{ level1 }{{level1{level2{level3{level4{1, 2, 3}, 4, 7}, 5}, 6}}})
	if err != nil {
		t.Fatal(err)
	}
	const want = "A:number 1\nB:number 2\nC:number 3\nD:number 4\nG:number 7\nE:number 5\nF:number 6\n"
	if got := render(table); got != want {
		t.Errorf("got\n%swant\n%s", got, want)
	}
}

func TestFromStructsEmpty(t *testing.T) {
	for _, slice := range []any{[]sampleReading{}, []sampleReading(nil), []*sampleReading{}} {
		table, err := FromStructs(slice)
		if err != nil || table.Rows() != 0 || len(table.Names()) != 15 {
			t.Fatalf("%T: %v", slice, err)
		}
		if c := table.column("supplier"); c.kind != TextColumn || c.len() != 0 {
			t.Errorf("%T: supplier is %v with %d rows", slice, c.kind, c.len())
		}
	}
}

func TestFromStructsRefusals(t *testing.T) {
	type id struct{ X float64 }
	for _, c := range []struct {
		name  string
		slice any
		code  Code
		names []string
	}{
		{"nil", nil, codeNotASlice, nil},
		{"struct", sampleReading{}, codeNotASlice, nil},
		{"pointer to slice", &[]sampleReading{}, codeNotASlice, nil},
		{"slice of numbers", []float64{1}, codeNotASlice, nil},
		{"slice of times", []time.Time{{}}, codeNotASlice, nil},
		{"slice of any", []any{sampleReading{}}, codeNotASlice, nil},
		{"pointers to pointers", []**sampleReading{}, codeNotASlice, nil},
		{"map", map[string]sampleReading{}, codeNotASlice, nil},
		{"nil element", []*sampleReading{{}, nil}, codeNilElement, nil},
		{"time", []struct{ Day time.Time }{}, codeDateColumn, []string{"Day"}},
		{"time pointer", []struct {
			Day *time.Time `trammel:"day"`
		}{}, codeDateColumn, []string{"day"}},
		{"null time", []struct{ Day sql.NullTime }{}, codeDateColumn, []string{"Day"}},
		{"generic null time", []struct{ Day sql.Null[time.Time] }{}, codeDateColumn, []string{"Day"}},
		{"embedded time", []struct{ time.Time }{}, codeDateColumn, []string{"Time"}},
		{"duration", []struct{ Hold time.Duration }{}, codeUnsupportedType, []string{"Hold"}},
		{"bytes", []struct{ B []byte }{}, codeUnsupportedType, []string{"B"}},
		{"complex", []struct{ C complex128 }{}, codeUnsupportedType, []string{"C"}},
		{"interface", []struct{ A any }{}, codeUnsupportedType, []string{"A"}},
		{"pointer to pointer", []struct{ P **int }{}, codeUnsupportedType, []string{"P"}},
		{"named struct field", []struct{ M sampleMachine }{}, codeUnsupportedType, []string{"M"}},
		{"null of a pointer", []struct{ P sql.Null[*int] }{}, codeUnsupportedType, []string{"P"}},
		{"embedded pointer", []struct{ *sampleMachine }{}, codeUnsupportedType, []string{"sampleMachine"}},
		{"tag on a hidden field", []struct {
			x int `trammel:"x"` //lint:ignore U1000 read by reflection only
		}{}, codeUnsupportedType, []string{"x"}},
		{"one name twice", []struct {
			X float64 `trammel:"x"`
			Y float64 `trammel:"x"`
		}{}, codeDuplicateColumn, []string{"x"}},
		{"shadowed", []struct {
			id
			X int
		}{}, codeDuplicateColumn, []string{"X"}},
		{"text not UTF-8", []samplePlace{{"ok"}, {"\xff"}}, codeInvalidUTF8, []string{"site"}},
		{"name not UTF-8", []struct {
			X int "trammel:\"\\xff\""
		}{}, codeInvalidUTF8, []string{"\xff"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			table, err := FromStructs(c.slice)
			e := wantCode(t, err, c.code)
			if table != nil || !slices.Equal(e.Names, c.names) {
				t.Errorf("names %q, want %q: %v", e.Names, c.names, err)
			}
		})
	}
}
