package linfit

import (
	"sync"

	"example.com/trammel/design"
	"example.com/trammel/internal/factored"
)

// A scoring gives mean responses from coefficients that are summed by level on
// the first call.
type scoring struct {
	once   sync.Once
	scorer *factored.Scorer
}

func (s *scoring) meanTo(mean, grad, b, blo []float64, m *design.Matrix, known []float64, from, to int) {
	if known != nil {
		known = known[from:to]
	}
	f := m.Form()
	if grad == nil {
		s.once.Do(func() { s.scorer = factored.NewScorer(f, b, blo) })
		if s.scorer != nil {
			s.scorer.MeanTo(mean[:to-from], known, f, from)
			return
		}
	}
	f.MeanTo(mean[:to-from], grad, b, blo, known, from)
}
