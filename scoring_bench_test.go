package trammel_test

import (
	"context"
	"fmt"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/linfit"
)

// BenchmarkPredictTo scores rows of one slope per level of 50 levels.
func BenchmarkPredictTo(b *testing.B) {
	for _, n := range []int{1_000, 100_000} {
		x, y, m := make([]float64, n), scatter(n, 1), make([]string, n)
		for i := range n {
			x[i], m[i] = float64(i%97), fmt.Sprint("M", i%50)
		}
		table, err := design.NewTable(design.Numbers("x", x), design.Numbers("y", y), design.Texts("m", m))
		if err != nil {
			b.Fatal(err)
		}
		r, err := linfit.Fit(context.Background(), "y ~ x * cat(m)", table, nil)
		if err != nil {
			b.Fatal(err)
		}
		dst := make([]float64, n)
		b.Run(fmt.Sprintf("n=%d/p=100", n), func(b *testing.B) {
			b.ReportAllocs()
			b.SetBytes(int64(8 * n))
			for b.Loop() {
				if err := trammel.PredictTo(dst, r, table); err != nil {
					b.Fatal(err)
				}
			}
		})
		// The baseline reads one column and writes as many numbers.
		b.Run(fmt.Sprintf("baseline: copy n=%d", n), func(b *testing.B) {
			b.SetBytes(int64(8 * n))
			for b.Loop() {
				copy(dst, x)
			}
		})
	}
}
