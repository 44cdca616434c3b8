package trammel

import (
	"fmt"
	"math"

	"example.com/trammel/internal/dist"
	"example.com/trammel/internal/handover"
)

// defaultLevel is what a level of 0 stands for.
const defaultLevel = 0.95

func checkLevel(level float64) (float64, error) {
	if level == 0 {
		return defaultLevel, nil
	}
	if !(level > 0 && level < 1) {
		return 0, &Error{Code: codeBadLevel,
			Message: fmt.Sprintf("the confidence level is %v", level),
			Hint:    "give a number above 0 and below 1, such as 0.95"}
	}
	return level, nil
}

// A reference is the distribution that estimates of a fit are judged by:
// Student's t with the residual degrees of freedom where the dispersion is
// estimated, else the normal.
type reference struct {
	df   float64 // +Inf for the normal
	mute bool    // an exact fit: ratios to standard errors mean nothing
}

func referenceOf(f *handover.Fit) reference {
	ref := reference{df: math.Inf(1), mute: f.ExactFit}
	if f.DispersionEstimated {
		ref.df = float64(f.Freedom)
	}
	return ref
}

// factor is the half-width of a two-sided interval in standard errors; NaN
// without degrees of freedom.
func (d reference) factor(level float64) float64 {
	tail := (1 - level) / 2
	switch {
	case math.IsInf(d.df, 1):
		return dist.NormalUpperQuantile(tail)
	case d.df <= 0:
		return math.NaN()
	}
	return dist.TUpperQuantile(tail, d.df)
}

// twoSided is the probability of a ratio at least as far from 0; NaN for NaN and
// without degrees of freedom.
func (d reference) twoSided(t float64) float64 {
	switch {
	case math.IsNaN(t) || d.df <= 0:
		return math.NaN()
	case math.IsInf(d.df, 1):
		return 2 * dist.NormalUpper(math.Abs(t))
	}
	return dist.TTwoSided(t, d.df)
}
