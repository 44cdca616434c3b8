package nlfit

import (
	"math"

	"example.com/trammel/internal/search"
)

// Profile gives the interval of coefficient j in which the square root of the
// rise of the least sum of squares, over the residual standard deviation, stays
// within q: -Inf and +Inf where it never gets there, a bound where that comes
// first. NaN when there is no residual freedom.
func (e *engine) Profile(j int, q float64) (low, high float64) {
	if math.IsNaN(e.dispersion) || e.dispersion == 0 {
		return math.NaN(), math.NaN()
	}
	return e.profileEnd(j, q, -1), e.profileEnd(j, q, 1)
}

// profileEnd follows the profile to one side: steps of growing length until the
// target is passed, then halving and secants between the last two.
func (e *engine) profileEnd(j int, q, side float64) float64 {
	base := e.residualSS()
	tau := func(rss float64) float64 { return math.Sqrt(math.Max(0, rss-base) / e.dispersion) }
	// A first step of one standard error, or a fraction of the value.
	step := 0.0
	for k, f := range e.free {
		if f == j {
			e.mu.Lock()
			step = math.Sqrt(e.dispersion) * e.factor.InverseRootDiag(nil)[k]
			e.mu.Unlock()
		}
	}
	if !(step > 0) || math.IsInf(step, 0) {
		step = math.Max(math.Abs(e.theta[j])/10, 1e-8)
	}
	limit := math.Inf(int(side))
	if p := e.search; p.Low != nil {
		if side < 0 {
			limit = p.Low[j]
		} else {
			limit = p.High[j]
		}
	}
	inside, tauIn := e.theta[j], 0.0
	theta := e.theta
	length := step * q / 2
	const most = 80
	for range most {
		at := inside + side*length
		stop := side*at >= side*limit
		if stop {
			at = limit
		}
		next, rss, ok := search.Hold(e.search, j, at, theta, 400)
		t := tau(rss)
		if !ok {
			length /= 4
			if length < 1e-9*step {
				return inside
			}
			continue
		}
		if t >= q {
			return e.between(j, q, inside, tauIn, at, t, theta, tau)
		}
		if stop {
			return limit
		}
		inside, tauIn, theta = at, t, next
		length *= 1.6
	}
	return math.Inf(int(side))
}

// between finds where tau reaches q, from a point inside and one outside: Illinois
// steps (M. Dowell and P. Jarratt, BIT 11 (1971) 168-174).
func (e *engine) between(j int, q, a, ta, b, tb float64, theta []float64, tau func(float64) float64) float64 {
	fa, fb := ta-q, tb-q
	last := 0
	for range 80 {
		if math.Abs(b-a) <= 1e-12*math.Max(math.Abs(a), math.Abs(b)) || fb == 0 {
			break
		}
		c := b - fb*(b-a)/(fb-fa)
		next, rss, ok := search.Hold(e.search, j, c, theta, 400)
		if !ok {
			c = (a + b) / 2
			if next, rss, ok = search.Hold(e.search, j, c, theta, 400); !ok {
				break
			}
		}
		fc := tau(rss) - q
		if fc < 0 {
			a, fa, theta = c, fc, next
			if last == -1 {
				fb /= 2
			}
			last = -1
		} else {
			b, fb = c, fc
			if last == 1 {
				fa /= 2
			}
			last = 1
		}
		if math.Abs(fc) < 1e-11*q {
			return c
		}
	}
	return b
}

func (e *engine) residualSS() float64 {
	sum := 0.0
	for i, r := range e.residual {
		w := weight(e.root, i)
		sum += w * r * r
	}
	return sum
}
