package trammel_test

import (
	"fmt"
	"math"
	"runtime"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/internal/handover"
)

// rowEngine knows the rows of a large fit and nothing else: what it answers to
// the other questions is of no interest to TestLarge.
type rowEngine struct {
	handover.Engine
	stats handover.RowStats
	p     int
	asked int // calls of ExtraSS
}

func (e *rowEngine) Covariance() []float64            { return make([]float64, e.p*e.p) }
func (e *rowEngine) Rows() (*handover.RowStats, bool) { return &e.stats, true }
func (e *rowEngine) Nested([]int) (handover.NestedTest, error) {
	return handover.NestedTest{DF: 1}, nil
}
func (e *rowEngine) ExtraSS([][]float64) (int, float64, error) { e.asked++; return 1, 0, nil }

// TestLarge holds that the checks of a summary stay within a few numbers per row:
// nothing of the size of rows × columns is made.
func TestLarge(t *testing.T) {
	const n, levels = 400_000, 50
	x, y, furnace := make([]float64, n), make([]float64, n), make([]string, n)
	e := &rowEngine{p: 2 * levels}
	e.stats = handover.RowStats{Fitted: make([]float64, n), Residual: scatter(n, 1), Leverage: make([]float64, n)}
	for i := range n {
		x[i] = math.Mod(float64(i)*0.618, 7)
		furnace[i] = fmt.Sprint("F", i%levels)
		e.stats.Fitted[i] = x[i]
		e.stats.Leverage[i] = float64(e.p) / n
		y[i] = x[i] + e.stats.Residual[i]
	}
	table, err := design.NewTable(design.Numbers("x", x), design.Numbers("y", y), design.Texts("furnace", furnace))
	if err != nil {
		t.Fatal(err)
	}
	m, err := formula.Parse("y ~ x * cat(furnace)")
	if err != nil {
		t.Fatal(err)
	}
	frame, err := design.Prepare(m, table, nil)
	if err != nil {
		t.Fatal(err)
	}
	r := trammel.NewResult(&handover.Fit{Plan: frame.Plan, Frame: frame, Engine: e, Estimates: make([]float64, e.p),
		StdErrors: make([]float64, e.p), Freedom: n - e.p, Dispersion: 1, DispersionEstimated: true, ResidualSS: n})
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	s, err := trammel.Summarize(r, nil)
	if err != nil {
		t.Fatal(err)
	}
	runtime.ReadMemStats(&after)
	bytes := after.TotalAlloc - before.TotalAlloc
	t.Logf("%.0f bytes per row", float64(bytes)/n)
	if most := uint64(64 * n); bytes > most {
		t.Errorf("a summary allocates %d bytes, more than %d; rows × columns would be %d", bytes, most, n*2*levels*8)
	}
	if e.asked != 2 || !s.Checked {
		t.Errorf("curvature was asked for %d times, want for x and for the fitted values", e.asked)
	}
}
