// Package scenario makes the invented data of the examples: a plant that
// sinters metal filter discs on several furnaces from several powder
// suppliers. Everything is drawn from a fixed seed, so the files in testdata
// can be made again to the byte.
package scenario

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
)

// The true values behind testdata/furnaces.csv, in percent porosity and
// percent per minute of hold time. Furnace F2 differs from F1 in offset only,
// F3 in rate only, F4 not at all; the suppliers do not differ.
const (
	TrueOffset   = 41.5  // porosity at hold 0, furnace F1
	TrueRate     = -0.30 // change per minute of hold, furnace F1
	TrueOffsetF2 = 0.90  // F2 against F1, at every hold time
	TrueRateF3   = -0.06 // F3 against F1, per minute
	TrueScatter  = 0.35  // standard deviation of a disc about its line
)

// Furnaces is the text of testdata/furnaces.csv: one row per disc, with the
// furnace, the powder supplier, the hold time at temperature in minutes, four
// hand-made 0/1 columns that say again which furnace it was, and the porosity
// in percent.
func Furnaces() []byte {
	rng := rand.New(rand.NewPCG(7, 13))
	var b strings.Builder
	b.WriteString("disc,furnace,supplier,hold,oven_1,oven_2,oven_3,oven_4,porosity\n")
	disc := 0
	for _, hold := range []float64{10, 13.5, 17, 20.5, 24, 27.5} {
		for furnace := 1; furnace <= 4; furnace++ {
			for supplier := range 3 {
				for range 2 {
					disc++
					y := TrueOffset + TrueRate*hold + TrueScatter*rng.NormFloat64()
					switch furnace {
					case 2:
						y += TrueOffsetF2
					case 3:
						y += TrueRateF3 * hold
					}
					var oven [4]int
					oven[furnace-1] = 1
					fmt.Fprintf(&b, "%d,F%d,%s,%g,%d,%d,%d,%d,%.2f\n", disc, furnace,
						[]string{"north", "river", "west"}[supplier], hold, oven[0], oven[1], oven[2], oven[3], math.Round(y*100)/100)
				}
			}
		}
	}
	return []byte(b.String())
}

// The true values behind testdata/shrinkage.csv: the linear shrinkage in percent
// approaches a limit that all furnaces share at a rate per minute of their own;
// F3 sinters faster.
const (
	TrueLimit         = 14.0
	TrueShrinkRateF1  = 0.090
	TrueShrinkRateF2  = 0.090
	TrueShrinkRateF3  = 0.135
	TrueShrinkScatter = 0.25
)

// Shrinkage is the text of testdata/shrinkage.csv: one row per disc, with the
// furnace, the hold time at temperature in minutes and the shrinkage in percent.
func Shrinkage() []byte {
	rng := rand.New(rand.NewPCG(21, 4))
	var b strings.Builder
	b.WriteString("disc,furnace,hold,shrink\n")
	disc := 0
	for _, hold := range []float64{1.5, 3, 5, 7.5, 10.5, 14, 18, 23, 29, 36} {
		for furnace, rate := range []float64{TrueShrinkRateF1, TrueShrinkRateF2, TrueShrinkRateF3} {
			for range 2 {
				disc++
				y := TrueLimit*(1-math.Exp(-rate*hold)) + TrueShrinkScatter*rng.NormFloat64()
				fmt.Fprintf(&b, "%d,F%d,%g,%.2f\n", disc, furnace+1, hold, y)
			}
		}
	}
	return []byte(b.String())
}
