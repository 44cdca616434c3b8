package search

import (
	"math"
	"slices"
)

// Hold minimises with parameter j held at a value, walking from theta: one point of
// a profile. ok is false when the model is not finite there.
func Hold(p *Problem, j int, value float64, theta []float64, budget int) (at []float64, rss float64, ok bool) {
	q := *p
	q.Low, q.High = slices.Clone(p.Low), slices.Clone(p.High)
	if q.Low == nil {
		q.Low, q.High = make([]float64, p.P), make([]float64, p.P)
		for k := range q.Low {
			q.Low[k], q.High[k] = math.Inf(-1), math.Inf(1)
		}
	}
	q.Low[j], q.High[j] = value, value
	// A held parameter is found by no projection.
	q.Linear = slices.Clone(p.Linear)
	q.Linear[j] = false
	s := &solver{p: &q, o: &Options{}, budget: budget}
	from := slices.Clone(theta)
	from[j] = value
	w := s.refine(from, budget, true)
	if w == nil {
		return nil, math.Inf(1), false
	}
	s.polish(w)
	return w.theta, w.rss, true
}
