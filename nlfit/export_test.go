package nlfit

import "example.com/trammel/design"

// Residuals gives benchmarks the plain residuals of an equation.
func Residuals(f *design.Frame) func(theta []float64) []float64 {
	m := newModel(f.Plan.Equation(), f.Matrix)
	e := m.evaluator(false)
	return func(theta []float64) []float64 {
		out := make([]float64, m.n)
		e.evaluate(theta, out, nil, 0, nil, nil, 0, m.n)
		for i, v := range out {
			out[i] = f.Y[i] - v
		}
		return out
	}
}

// SumOfSquares gives benchmarks the plain sum of squares of an equation.
func SumOfSquares(f *design.Frame) func(theta []float64) float64 {
	m := newModel(f.Plan.Equation(), f.Matrix)
	e := m.evaluator(false)
	out := make([]float64, m.n)
	return func(theta []float64) float64 {
		e.evaluate(theta, out, nil, 0, nil, nil, 0, m.n)
		sum := 0.0
		for i, v := range out {
			d := f.Y[i] - v
			sum += d * d
		}
		return sum
	}
}
