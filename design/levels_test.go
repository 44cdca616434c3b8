package design

import (
	"math/rand/v2"
	"slices"
	"testing"
)

// TestLevelOrder holds the order of text levels: digit runs by value, other
// runs by code point, ties by fewer leading zeros, then by code point.
func TestLevelOrder(t *testing.T) {
	want := []string{"", "1", "01", "001", "2", "2a", "10", "F", "F1", "F01", "F2", "F2b", "F2b1", "F10", "F10a", "Fa", "f1", "Ä1", "é"}
	got := slices.Clone(want)
	rng := rand.New(rand.NewPCG(1, 1))
	for range 20 {
		rng.Shuffle(len(got), func(i, j int) { got[i], got[j] = got[j], got[i] })
		slices.SortFunc(got, compareText)
		if !slices.Equal(got, want) {
			t.Fatalf("got %q\nwant %q", got, want)
		}
	}
	for _, a := range want {
		for _, b := range want {
			if c := compareText(a, b); c != -compareText(b, a) || (c == 0) != (a == b) {
				t.Errorf("compareText(%q, %q) = %d and %d", a, b, c, compareText(b, a))
			}
		}
	}
}

// TestLevels compiles categories of all kinds and reads their levels and
// columns.
func TestLevels(t *testing.T) {
	table, err := NewTable(
		Texts("furnace", []string{"F10", "F2", "F1", "F2", "F10", "F1"}),
		Numbers("head", []float64{3, 1, 2, -1, 3, 1}),
		Bools("open", []bool{true, false, true, true, false, false}),
		Texts("site", []string{"A", "B", "A", "B", "A", "B"}),
		Numbers("y", []float64{1, 2, 3, 4, 5, 7}),
	)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		model   string
		columns []string
	}{
		{"y ~ cat(furnace)", []string{"intercept", "furnace='F2'", "furnace='F10'"}},
		{"y ~ cat(furnace against 'F2')", []string{"intercept", "furnace='F1'", "furnace='F10'"}},
		{"y ~ cat(furnace against mean)", []string{"intercept", "furnace='F2' against mean", "furnace='F10' against mean"}},
		{"y ~ cat(furnace in ('F2', 'F1', 'F10') against previous)", []string{"intercept", "furnace='F1' against 'F2'", "furnace='F10' against 'F1'"}},
		{"y ~ cat(furnace in ('F10', others))", []string{"intercept", "furnace=others"}},
		{"y ~ cat(furnace) - intercept", []string{"furnace='F1'", "furnace='F2'", "furnace='F10'"}},
		{"y ~ cat(head)", []string{"intercept", "head=1", "head=2", "head=3"}},
		{"y ~ cat(head in (3, 2, others))", []string{"intercept", "head=2", "head=others"}},
		{"y ~ cat(open)", []string{"intercept", "open=true"}},
		{"y ~ cat(open in (true, false))", []string{"intercept", "open=false"}},
		{"y ~ cat(furnace, site)", []string{"intercept", "(furnace='F1', site='B')", "(furnace='F2', site='B')", "(furnace='F10', site='A')"}},
		{"y ~ cat(site) + num(furnace='F2')", []string{"intercept", "site='B'", "(furnace='F2')"}},
		{"y ~ open by cat(site)", []string{"intercept", "open by site='A'", "open by site='B'"}},
	} {
		f, err := Prepare(parse(t, c.model), table, &Options{NoRankCheck: true})
		if err != nil {
			t.Errorf("%s: %v", c.model, err)
			continue
		}
		var got []string
		for _, col := range f.Plan.Columns() {
			got = append(got, col.Name)
		}
		if !slices.Equal(got, c.columns) {
			t.Errorf("%s: columns %q, want %q", c.model, got, c.columns)
		}
	}
}

// TestDecode holds the tables of the three codings as published for these
// contrasts (reference level, sum to zero, successive differences).
func TestDecode(t *testing.T) {
	table := completeData(t)
	for _, c := range []struct {
		model string
		want  [][]int
	}{
		{"y ~ cat(b)", [][]int{{0, 0}, {1, 0}, {0, 1}}},
		{"y ~ cat(b against 'B2')", [][]int{{1, 0}, {0, 0}, {0, 1}}},
		{"y ~ cat(b against mean)", [][]int{{-1, -1}, {1, 0}, {0, 1}}},
		{"y ~ cat(b against previous)", [][]int{{0, 0}, {1, 0}, {1, 1}}},
		{"y ~ cat(b against mean) - intercept", [][]int{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}},
	} {
		p, err := Compile(parse(t, c.model), table, nil)
		if err != nil {
			t.Fatal(err)
		}
		d := p.Decode()
		if len(d) != 1 || !slices.EqualFunc(d[0].Entries, c.want, slices.Equal) || len(d[0].Columns) != len(c.want[0]) {
			t.Errorf("%s: %v, want %v", c.model, d, c.want)
		}
	}
}
