package design

import (
	"fmt"
	"testing"

	"example.com/trammel/formula"
)

// BenchmarkParseCompile measures text to rank-checked plan, for 30 and for
// 10,000 rows.
func BenchmarkParseCompile(b *testing.B) {
	for _, n := range []int{30, 10_000} {
		b.Run(fmt.Sprintf("rows=%d", n), func(b *testing.B) {
			furnace := make([]string, n)
			hold, y := make([]float64, n), make([]float64, n)
			for i := range n {
				furnace[i] = fmt.Sprintf("F%d", i%3+1)
				hold[i], y[i] = float64(i%7), float64(i%11)
			}
			table, err := NewTable(Texts("furnace", furnace), Numbers("hold", hold), Numbers("y", y))
			if err != nil {
				b.Fatal(err)
			}
			b.ReportAllocs()
			for b.Loop() {
				m, err := formula.Parse("y ~ hold * cat(furnace)")
				if err != nil {
					b.Fatal(err)
				}
				if _, err := Compile(m, table, nil); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
