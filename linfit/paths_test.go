package linfit

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"testing"

	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/internal/handover"
)

// plant makes n rows of the sintering plant: hold time, temperature, furnace of
// levels, supplier, a weight, a count and the lot that clusters rows.
func plant(t testing.TB, n, levels int) *design.Table {
	t.Helper()
	r := rand.New(rand.NewPCG(7, uint64(n)))
	hold, temp, y, w, m := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	furnace, supplier, lot := make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range n {
		furnace[i] = float64(r.IntN(levels))
		supplier[i] = float64(r.IntN(3))
		hold[i] = 1000 + 10*r.Float64()
		temp[i] = 5 * r.NormFloat64()
		w[i], m[i], lot[i] = 0.5+r.Float64(), float64(1+r.IntN(3)), float64(r.IntN(17))
		y[i] = 3 + 0.2*hold[i] - temp[i] + 0.1*temp[i]*temp[i] + 0.01*furnace[i]*hold[i] + 2*supplier[i] + r.NormFloat64()*(1+0.2*math.Abs(temp[i]))
	}
	table, err := design.NewTable(design.Numbers("hold", hold), design.Numbers("temp", temp), design.Numbers("y", y),
		design.Numbers("w", w), design.Numbers("m", m), design.Numbers("furnace", furnace), design.Numbers("supplier", supplier), design.Numbers("lot", lot))
	if err != nil {
		t.Fatal(err)
	}
	return table
}

func prepared(t testing.TB, text string, table *design.Table) *design.Frame {
	t.Helper()
	m, err := formula.Parse(text)
	if err != nil {
		t.Fatal(err)
	}
	f, err := design.Prepare(m, table, &design.Options{NoRankCheck: true})
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func runOf(f *design.Frame, robust Robust, workers int) *run {
	return &run{opts: Options{Robust: robust}, frame: f, form: f.Matrix.Form(), workers: workers}
}

// near checks that a and b agree to 12 digits of size.
func near(t *testing.T, what string, a, b []float64, size float64) {
	t.Helper()
	if len(a) != len(b) {
		t.Fatalf("%s: %d and %d values", what, len(a), len(b))
	}
	worst := 0.0
	for i := range a {
		scale := size
		if scale == 0 {
			scale = math.Abs(b[i])
		}
		if math.IsNaN(a[i]) && math.IsNaN(b[i]) {
			continue // the same answer: not defined
		}
		if a[i] != b[i] {
			worst = max(worst, math.Abs(a[i]-b[i])/scale)
		}
		if math.IsNaN(a[i]) != math.IsNaN(b[i]) {
			worst = math.Inf(1)
		}
	}
	if !(worst <= 1e-12) {
		t.Errorf("%s: the paths differ by %.2g", what, worst)
	}
}

func terms(f *design.Frame) [][]int {
	var out [][]int
	var with []int
	for k := range f.Plan.Terms() {
		with = append(with, k)
		if k > 0 {
			out = append(out, append([]int(nil), with...))
		}
	}
	return out
}

// TestPathsAgree compares the streamed path with the refined QR, which is held
// to exact answers elsewhere.
func TestPathsAgree(t *testing.T) {
	table := plant(t, 2000, 5)
	for _, text := range []string{
		"y ~ hold * cat(furnace)",
		"y ~ hold * cat(furnace) weighted w counted m",
		"y ~ powers(temp, 2) + cat(furnace) * cat(supplier) weighted w",
		"y ~ cat(furnace against mean) + hold by cat(furnace) - intercept counted m",
		"y ~ temp + hold + temp by m + cat(supplier) + known(0.2*hold)",
		"y ~ temp - intercept",
		"y ~ cat(furnace)",
	} {
		f := prepared(t, text, table)
		lots, refusal := clustersOf("lot", table, f)
		if refusal != nil {
			t.Fatal(refusal)
		}
		for _, kind := range []Robust{Ordinary, HC0, HC1, HC2, HC3, "clustered"} {
			t.Run(text+" "+string(kind), func(t *testing.T) {
				var c *clusters
				if kind == "clustered" {
					c, kind = lots, Ordinary
				}
				r := runOf(f, kind, 1)
				a, err := solveStreamed(r, c)
				if err != nil || a == nil {
					t.Fatal(a, err)
				}
				b, err := solveDirect(r, c)
				if err != nil {
					t.Fatal(err)
				}
				for j := range a.b {
					near(t, fmt.Sprint("estimate ", j), a.b[j:j+1], b.b[j:j+1], max(math.Abs(b.b[j]), b.rootDiag[j]))
				}
				near(t, "errors", a.rootDiag, b.rootDiag, 0)
				near(t, "RSS, TSS", []float64{a.rss.Float(), a.tss.Float()}, []float64{b.rss.Float(), b.tss.Float()}, 0)
				if a.corrected != b.corrected {
					t.Errorf("corrected %v and %v", a.corrected, b.corrected)
				}
				disp := b.rss.Float() / (f.Cases() - float64(len(b.b)))
				a.engine.setDispersion(disp)
				b.engine.setDispersion(disp)
				va, vb := a.engine.Covariance(), b.engine.Covariance()
				p := len(b.b)
				for i := range p {
					for j := range p {
						near(t, "covariance", va[i*p+j:i*p+j+1], vb[i*p+j:i*p+j+1], math.Sqrt(vb[i*p+i]*vb[j*p+j]))
					}
				}
				ra, _ := a.engine.Rows()
				rb, _ := b.engine.Rows()
				near(t, "residuals", ra.Residual, rb.Residual, math.Sqrt(disp))
				// Fitted values and leverages pass through 0; their own scales are the
				// spread of the response and the mean leverage.
				near(t, "fitted", ra.Fitted, rb.Fitted, math.Sqrt(b.tss.Float()/f.Cases()))
				near(t, "leverages", ra.Leverage, rb.Leverage, float64(p)/f.Cases())
				for _, with := range terms(f) {
					ta, err := a.engine.Nested(with)
					if err != nil {
						t.Fatal(err)
					}
					tb, err := b.engine.Nested(with)
					if err != nil {
						t.Fatal(err)
					}
					near(t, fmt.Sprint("test of ", with), []float64{float64(ta.DF), ta.SS, ta.Stat}, []float64{float64(tb.DF), tb.SS, tb.Stat}, 0)
				}
				extra := [][]float64{make([]float64, len(f.Y)), make([]float64, len(f.Y)), make([]float64, len(f.Y))}
				for i := range f.Y {
					extra[0][i] = math.Sin(float64(i))
					extra[1][i] = 2 * extra[0][i]
					extra[2][i] = float64(i % 7)
				}
				da, sa, _ := a.engine.ExtraSS(extra)
				db, sb, _ := b.engine.ExtraSS(extra)
				if da != db || da != 2 {
					t.Errorf("extra columns: %d and %d independent, want 2", da, db)
				}
				near(t, "extra SS", []float64{sa}, []float64{sb}, b.rss.Float())
			})
		}
	}
}

// TestFallsBack: hold lies between 1000 and 1010, so temp by hold is nearly a
// multiple of temp and moments would not do.
func TestFallsBack(t *testing.T) {
	f := prepared(t, "y ~ temp + hold + temp by hold", plant(t, 2000, 5))
	if s, err := solveStreamed(runOf(f, Ordinary, 1), nil); s != nil || err != nil {
		t.Error("the streamed path took columns that are nearly dependent", err)
	}
}

// TestWorkersAgree holds that one worker and several give the same bits.
func TestWorkersAgree(t *testing.T) {
	f := prepared(t, "y ~ hold * cat(furnace) weighted w", plant(t, 300_000, 20))
	var first *solved
	var rows *handover.RowStats
	for _, workers := range []int{1, 2, 3, 7} {
		s, err := solveStreamed(runOf(f, HC1, workers), nil)
		if err != nil || s == nil {
			t.Fatal(s, err)
		}
		st, _ := s.engine.Rows()
		if first == nil {
			first, rows = s, st
			continue
		}
		for j := range s.b {
			if s.b[j] != first.b[j] || s.rootDiag[j] != first.rootDiag[j] || s.rss != first.rss || s.tss != first.tss {
				t.Fatalf("%d workers differ from 1 in coefficient %d", workers, j)
			}
		}
		for i := range st.Residual {
			if st.Residual[i] != rows.Residual[i] || st.Leverage[i] != rows.Leverage[i] {
				t.Fatalf("%d workers differ from 1 in row %d", workers, i)
			}
		}
	}
}

// TestStreamedMemory counts the bytes that the streamed path allocates: nothing
// of the size of rows times columns, 40 here.
func TestStreamedMemory(t *testing.T) {
	const n = 400_000
	f := prepared(t, "y ~ hold * cat(furnace)", plant(t, n, 20))
	count := func(do func()) float64 {
		var a, b runtime.MemStats
		runtime.ReadMemStats(&a)
		do()
		runtime.ReadMemStats(&b)
		return float64(b.TotalAlloc-a.TotalAlloc) / n
	}
	var e engine
	perRow := count(func() {
		r, err := FitFrame(context.Background(), f, &Options{Workers: 2})
		if err != nil {
			t.Fatal(err)
		}
		if r.Path() != "streamed cell sums" {
			t.Fatalf("the path is %s", r.Path())
		}
	})
	if perRow > 8 {
		t.Errorf("the fit allocates %.1f bytes a row", perRow)
	}
	s, err := solveStreamed(runOf(f, HC3, 2), nil)
	if err != nil {
		t.Fatal(err)
	}
	e = s.engine
	e.setDispersion(1)
	later := count(func() {
		e.Rows()
		e.Covariance()
		for _, with := range terms(f) {
			if _, err := e.Nested(with); err != nil {
				t.Fatal(err)
			}
		}
	})
	if later > 32 { // three vectors of n are asked for
		t.Errorf("leverages, term tests and the robust covariance allocate %.1f bytes a row", later)
	}
	t.Logf("bytes a row: fit %.2f, the rest %.2f", perRow, later)
}

// TestExactOnBothPaths: lines without scatter, in whole numbers and in decimals
// that are rounded, are reported as exact on both paths; scatter of 1e-9 is not.
func TestExactOnBothPaths(t *testing.T) {
	const n = 600
	for _, c := range []struct {
		name  string
		y     func(x, f float64) float64
		exact bool
	}{
		{"whole", func(x, f float64) float64 { return 1e6 + 3*x + f*x }, true},
		{"decimals", func(x, f float64) float64 { return 0.1 + 0.3*x + 0.7*f*x }, true},
		{"scatter", func(x, f float64) float64 { return 0.1 + 0.3*x + 0.7*f*x + 1e-9*math.Sin(100*x) }, false},
	} {
		x, f, y := make([]float64, n), make([]float64, n), make([]float64, n)
		for i := range n {
			x[i], f[i] = float64(i%37), float64(i%3)
			y[i] = c.y(x[i], f[i])
		}
		table, err := design.NewTable(design.Numbers("x", x), design.Numbers("f", f), design.Numbers("y", y))
		if err != nil {
			t.Fatal(err)
		}
		frame := prepared(t, "y ~ x * cat(f)", table)
		for path, solve := range map[string]func(*run, *clusters) (*solved, error){"direct": solveDirect, "streamed": solveStreamed} {
			r := runOf(frame, Ordinary, 1)
			s, err := solve(r, nil)
			if err != nil || s == nil {
				t.Fatal(s, err)
			}
			out := &handover.Fit{Freedom: n - len(s.b)}
			if err := finish(out, r, s, nil); err != nil {
				t.Fatal(err)
			}
			if out.ExactFit != c.exact {
				t.Errorf("%s, %s: exact is %v; RSS %g beside %g", c.name, path, out.ExactFit, out.ResidualSS, s.size)
			}
		}
	}
}
