package linfit

import (
	"context"
	"fmt"
	"testing"

	"gonum.org/v1/gonum/mat"

	"example.com/trammel/design"
)

// BenchmarkFitFrame is the fit with standard errors from a prepared frame; the
// baseline is gonum's QR solve of the same matrix without any statistics.
func BenchmarkFitFrame(b *testing.B) {
	for _, c := range []struct {
		name, text string
		n          int
	}{
		{"30x4", "y ~ hold + temp + cat(furnace)", 30},
		{"1e5x20", "y ~ hold * cat(furnace)", 100_000},
	} {
		levels := 2
		if c.n > 100 {
			levels = 10
		}
		f := prepared(b, c.text, plant(b, c.n, levels))
		b.Run(c.name+"/linfit", func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if _, err := FitFrame(context.Background(), f, nil); err != nil {
					b.Fatal(err)
				}
			}
		})
		b.Run(c.name+"/gonum", func(b *testing.B) {
			x := f.Matrix.Expand()
			y := mat.NewVecDense(len(f.Y), f.Y)
			b.ReportAllocs()
			for b.Loop() {
				var qr mat.QR
				qr.Factorize(x)
				var out mat.VecDense
				if err := qr.SolveVecTo(&out, false, y); err != nil {
					b.Log(err) // the condition is reported as an error
				}
			}
		})
	}
}

// BenchmarkTall is the streamed path; the baseline is one pass that sums the
// same columns.
func BenchmarkTall(b *testing.B) {
	for _, n := range []int{1_000_000, 10_000_000} {
		t := plantOf(b, n)
		f := prepared(b, "y ~ hold * cat(furnace)", t)
		b.Run(fmt.Sprintf("%.0e/linfit", float64(n)), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				r, err := FitFrame(context.Background(), f, nil)
				if err != nil || r.Path() != "streamed cell sums" {
					b.Fatal(r, err)
				}
			}
		})
		b.Run(fmt.Sprintf("%.0e/linfit one worker", float64(n)), func(b *testing.B) {
			for b.Loop() {
				if _, err := FitFrame(context.Background(), f, &Options{Workers: 1}); err != nil {
					b.Fatal(err)
				}
			}
		})
		form := f.Matrix.Form()
		b.Run(fmt.Sprintf("%.0e/sum of the columns", float64(n)), func(b *testing.B) {
			levels := make([]int32, 4096)
			for b.Loop() {
				var y, x float64
				var k int
				for from := 0; from < n; from += len(levels) {
					l := levels[:min(len(levels), n-from)]
					form.Cats[0].LevelsTo(l, from)
					ys, xs := f.Y[from:from+len(l)], form.Nums[0].Hi[from:from+len(l)]
					for i, v := range l {
						y += ys[i]
						x += xs[i]
						k += int(v)
					}
				}
				if y+x+float64(k) == 0 {
					b.Fatal("no sum")
				}
			}
		})
	}
}

// plantOf makes the columns hold, furnace (50) and y only.
func plantOf(b *testing.B, n int) *design.Table {
	b.Helper()
	hold, y, furnace := make([]float64, n), make([]float64, n), make([]float64, n)
	s := uint64(1)
	next := func() float64 {
		s = s*6364136223846793005 + 1442695040888963407
		return float64(s>>11) / (1 << 53)
	}
	for i := range n {
		furnace[i] = float64(int(50 * next()))
		hold[i] = 30 * next()
		y[i] = 2 + hold[i]*(1+furnace[i]/50) + next()
	}
	t, err := design.NewTable(design.Numbers("hold", hold), design.Numbers("furnace", furnace), design.Numbers("y", y))
	if err != nil {
		b.Fatal(err)
	}
	return t
}
