// Package search minimises sums of squares of nonlinear models: many starts
// ranked by variable projection (G. H. Golub and V. Pereyra, SIAM J. Numer. Anal.
// 10 (1973) 413-432), the best refined by a Levenberg-Marquardt method with scaled
// variables (J. J. Moré, in Numerical Analysis, Dundee 1977, ed. G. A. Watson,
// Springer 1978, 105-116), the lowest polished by Newton steps with exact second
// derivatives. It knows numbers only: no formula, no table, and no constant with
// the scale of any particular problem.
package search

import (
	"errors"
	"math"
	"runtime"
	"slices"
	"sync"
)

// A Problem is to minimise Σ Root²·(Y - f(θ))² over θ within bounds.
type Problem struct {
	N, P int
	Y    []float64 // n
	Root []float64 // n square roots of weights; nil for 1

	// Eval computes f (n) at theta; with jac not nil the n×p derivatives,
	// column-major; with hess not nil it adds Σ v[i]·∂²f_i/∂θ∂θ' to hess (p×p). It
	// reports whether f is finite. It is safe for concurrent use.
	Eval func(theta, f, jac, v, hess []float64) bool

	Low, High []float64 // closed bounds; nil for none
	Linear    []bool    // parameters in which f is jointly affine
	Range     []Range   // where the others are sought
	Group     []int     // coefficients of one group begin at one value; nil: each at its own
	Start     []float64 // nil: the search finds its own
}

// A Range is where starts are drawn: evenly, or, with Log, evenly in the logarithm
// of the magnitude; a Log range from -h to h takes magnitudes of five decades up
// to h with both signs. Low = High keeps a parameter there.
type Range struct {
	Low, High float64
	Log       bool
}

// Options says how to search.
type Options struct {
	Seed      uint64
	Budget    int  // evaluations; 0 for the default
	Workers   int  // 0 means GOMAXPROCS
	Elsewhere bool // with a start, look for lower minima too
	Step      func(Progress) error
}

// A Progress says how far a search has come.
type Progress struct {
	Evaluations int
	RSS         float64 // the lowest so far
}

// A Minimum is one distinct minimum.
type Minimum struct {
	Theta  []float64
	RSS    float64
	Starts int
}

// End says how a search ended: "converged", "bound active", "no further
// progress" or "budget". Measure is the relative offset (D. M. Bates and D. G.
// Watts, Technometrics 23 (1981) 179-183).
type End struct {
	Reason      string
	Iterations  int
	Evaluations int
	Measure     float64
	Tolerance   float64
	Bound       []int // parameters that lie on a bound
}

// A Result is the lowest minimum found, and all of them: the one reached from the
// given start first, the others by ascending RSS.
type Result struct {
	Theta  []float64
	RSS    float64
	Minima []Minimum
	End    End
}

// ErrNoFinite says that f was finite at none of the starts.
var ErrNoFinite = errors.New("search: the model is finite at no start")

// offsetTolerance is the relative offset at which a search counts as converged:
// the estimates are then off by less than a thousandth of their standard errors.
const offsetTolerance = 1e-3

const (
	startsPerParameter = 160 // starts ranked for each parameter sought
	mostStarts         = 1200
	tried              = 160 // starts that are walked a few steps
	fewSteps           = 8
	refined            = 24 // starts refined to the end
)

// Solve searches. An error of Step ends the search; the best so far is returned
// beside it.
func Solve(p *Problem, o *Options) (*Result, error) {
	if o == nil {
		o = &Options{}
	}
	s := &solver{p: p, o: o, budget: o.Budget, workers: o.Workers}
	if s.budget == 0 {
		s.budget = 4000 * (p.P + 2)
	}
	if s.workers <= 0 {
		s.workers = runtime.GOMAXPROCS(0)
	}
	var found []*walk
	if p.Start != nil {
		// With and without finding the linear parameters afresh after each step:
		// either may walk past what stops the other.
		share := s.budget / 2
		if o.Elsewhere {
			share = s.budget / 4
		}
		w, other := s.refine(p.Start, share, false), s.refine(p.Start, share, true)
		if w == nil || other != nil && other.rss < w.rss*(1-1e-6) {
			w = other
		}
		if w != nil {
			w.given = true
			found = append(found, w)
		}
		if !o.Elsewhere && w != nil {
			return s.result(found)
		}
	}
	if err := s.step(found); err != nil {
		return s.partial(found, err)
	}
	// What is left of the budget: a quarter for ranking starts, a quarter for a few
	// steps from each, the rest for the walks to the end.
	left := s.budget - s.used()
	if left < 50 && len(found) > 0 {
		return s.result(found)
	}
	starts := s.starts(left / 4)
	ranked := s.rank(starts)
	if len(ranked) == 0 && len(found) == 0 {
		return nil, ErrNoFinite
	}
	if err := s.step(found); err != nil {
		return s.partial(found, err)
	}
	// A few steps from each of the better starts tell more than their sums of
	// squares; the best then go all the way.
	if len(ranked) > refined {
		ranked = ranked[:max(1, min(tried, len(ranked), left/(4*2*fewSteps), max(12, 10_000_000/(p.N*p.P))))]
		s.parallel(len(ranked), func(i int) {
			if w := s.refine(ranked[i].theta, 2*fewSteps, true); w != nil {
				ranked[i] = start{w.theta, w.rss}
			}
		})
		sortStarts(ranked)
		ranked = ranked[:min(refined, len(ranked), max(6, 5_000_000/(p.N*p.P)))]
	}
	if err := s.step(found); err != nil {
		return s.partial(found, err)
	}
	walks := make([]*walk, len(ranked))
	each := max(1, left/2/max(1, len(ranked)))
	s.parallel(len(ranked), func(i int) { walks[i] = s.refine(ranked[i].theta, each, true) })
	for _, w := range walks {
		if w != nil {
			found = append(found, w)
		}
	}
	if err := s.step(found); err != nil {
		return s.partial(found, err)
	}
	if len(found) == 0 {
		return nil, ErrNoFinite
	}
	return s.result(found)
}

type solver struct {
	p       *Problem
	o       *Options
	budget  int
	workers int

	mu    sync.Mutex
	evals int
}

func (s *solver) used() int {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.evals
}

func (s *solver) count() {
	s.mu.Lock()
	s.evals++
	s.mu.Unlock()
}

func (s *solver) step(found []*walk) error {
	if s.o.Step == nil {
		return nil
	}
	best := math.Inf(1)
	for _, w := range found {
		best = math.Min(best, w.rss)
	}
	return s.o.Step(Progress{Evaluations: s.used(), RSS: best})
}

func (s *solver) partial(found []*walk, err error) (*Result, error) {
	if len(found) == 0 {
		return nil, err
	}
	r, _ := s.result(found)
	r.End.Reason = "ended"
	return r, err
}

// parallel runs do for 0 … n-1; each writes its own place only, so the order of
// running says nothing about the outcome.
func (s *solver) parallel(n int, do func(i int)) {
	var wg sync.WaitGroup
	next := make(chan int, n)
	for i := range n {
		next <- i
	}
	close(next)
	for range min(s.workers, n) {
		wg.Go(func() {
			for i := range next {
				do(i)
			}
		})
	}
	wg.Wait()
}

// result gathers the walks' ends into distinct minima, polishes the lowest and
// says how it ended.
func (s *solver) result(found []*walk) (*Result, error) {
	var minima []*walk
	counts := []int{}
	for _, w := range found {
		k := slices.IndexFunc(minima, func(v *walk) bool { return s.same(v, w) })
		if k < 0 {
			minima = append(minima, w)
			counts = append(counts, 1)
			continue
		}
		counts[k]++
		// Of equal minima the lexicographically smallest parameters are reported,
		// whatever the order of starts; the given start keeps its own.
		if !minima[k].given && (w.rss < minima[k].rss*(1-1e-9) || w.rss <= minima[k].rss*(1+1e-9) && slices.Compare(w.theta, minima[k].theta) < 0) {
			w.given = minima[k].given
			minima[k] = w
		}
	}
	order := make([]int, len(minima))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int {
		switch {
		case minima[a].given != minima[b].given:
			if minima[a].given {
				return -1
			}
			return 1
		case minima[a].rss < minima[b].rss:
			return -1
		case minima[a].rss > minima[b].rss:
			return 1
		}
		return 0
	})
	best := minima[order[0]]
	for _, k := range order {
		if minima[k].rss < best.rss*(1-1e-9) {
			best = minima[k]
		}
	}
	if !best.spent || s.used() < s.budget {
		s.polish(best)
	}
	if first := minima[order[0]]; first != best && first.given {
		s.polish(first)
	}
	out := &Result{Theta: best.theta, RSS: best.rss}
	for _, k := range order {
		out.Minima = append(out.Minima, Minimum{Theta: minima[k].theta, RSS: minima[k].rss, Starts: counts[k]})
	}
	out.End = s.end(best)
	return out, nil
}

// same tells that two walks ended in one minimum: equal sums of squares are taken
// as one minimum, for the exchange of equal terms and of signs gives the same fit.
func (s *solver) same(a, b *walk) bool {
	size := s.size()
	return math.Abs(a.rss-b.rss) <= 1e-7*math.Max(a.rss, b.rss)+1e-22*size
}

func (s *solver) size() float64 {
	sum := 0.0
	for i, y := range s.p.Y {
		if s.p.Root != nil {
			y *= s.p.Root[i]
		}
		sum += y * y
	}
	return sum
}

func (s *solver) end(w *walk) End {
	e := End{Reason: "converged", Iterations: w.iterations, Evaluations: s.used(), Measure: w.offset, Tolerance: offsetTolerance}
	for j := range w.theta {
		if s.atBound(w.theta, j) {
			e.Bound = append(e.Bound, j)
		}
	}
	switch {
	case w.spent && !(w.offset <= offsetTolerance):
		e.Reason = "budget"
	case len(e.Bound) > 0:
		e.Reason = "bound active"
	case !(w.offset <= offsetTolerance) && w.rss > 1e-28*s.size():
		e.Reason = "no further progress"
	}
	return e
}

func (s *solver) atBound(theta []float64, j int) bool {
	return s.p.Low != nil && (theta[j] <= s.p.Low[j] || theta[j] >= s.p.High[j])
}

// clip moves theta into the bounds.
func (s *solver) clip(theta []float64) {
	if s.p.Low == nil {
		return
	}
	for j := range theta {
		theta[j] = math.Max(s.p.Low[j], math.Min(s.p.High[j], theta[j]))
	}
}
