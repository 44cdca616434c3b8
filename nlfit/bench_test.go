package nlfit_test

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"path/filepath"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/optimize"

	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/internal/digits"
	"example.com/trammel/nlfit"
)

// BenchmarkStarted is the fit of the certified sets from their published starts,
// the look for lower minima elsewhere included. The baseline is gonum's
// minimisation of the same sum of squares from the same start by BFGS with
// difference gradients, and the textbook's damped least squares; "hits" is the share of the sets whose estimates it gets to 4
// digits (the fit: to 10).
func BenchmarkStarted(b *testing.B) {
	t := &testing.T{}
	sets := certifiedSets(t)
	type job struct {
		s     certifiedSet
		table *design.Table
		frame *design.Frame
		start []float64
	}
	var jobs []job
	for _, s := range sets {
		table := readTable(b, filepath.Join("../testdata/strd/nonlinear", s.Name+".csv"))
		for start := 1; start <= 2; start++ {
			m, err := formula.Parse(s.text(start))
			if err != nil {
				b.Fatal(err)
			}
			f, err := design.Prepare(m, table, nil)
			if err != nil {
				b.Fatal(err)
			}
			v := make([]float64, len(s.Parameters))
			for k := range v {
				v[k], _ = strconv.ParseFloat(s.Starts[start-1][k], 64)
			}
			jobs = append(jobs, job{s, table, f, v})
		}
	}
	hits := func(got []float64, s certifiedSet, need float64) float64 {
		for j, v := range got {
			if digits.AgreeString(v, s.Exact.Estimates[j]) < need {
				return 0
			}
		}
		return 1
	}
	b.Run("nlfit", func(b *testing.B) {
		share := 0.0
		for b.Loop() {
			share = 0
			for _, j := range jobs {
				r, err := nlfit.FitFrame(context.Background(), j.frame, nil)
				if err != nil {
					b.Fatal(err)
				}
				share += hits(r.Estimates(), j.s, 10) / float64(len(jobs))
			}
		}
		b.ReportMetric(share, "hits")
	})
	b.Run("gonum_BFGS", func(b *testing.B) {
		share, evaluations := 0.0, 0.0
		for b.Loop() {
			share, evaluations = 0, 0
			for _, j := range jobs {
				sum := nlfit.SumOfSquares(j.frame)
				p := optimize.Problem{Func: sum, Grad: func(grad, x []float64) {
					h := append([]float64(nil), x...)
					for k := range x {
						d := 1e-6 * math.Max(math.Abs(x[k]), 1e-9)
						h[k] = x[k] + d
						up := sum(h)
						h[k] = x[k] - d
						grad[k] = (up - sum(h)) / (2 * d)
						h[k] = x[k]
					}
				}}
				r, err := optimize.Minimize(p, j.start, nil, &optimize.BFGS{})
				if err == nil || r != nil {
					share += hits(r.X, j.s, 4) / float64(len(jobs))
					evaluations += float64(r.FuncEvaluations + 2*len(j.start)*r.GradEvaluations)
				}
			}
		}
		b.ReportMetric(share, "hits")
		b.ReportMetric(evaluations/float64(len(jobs)), "evals/fit")
	})
	b.Run("plain_Marquardt", func(b *testing.B) {
		share := 0.0
		for b.Loop() {
			share = 0
			for _, j := range jobs {
				share += hits(plainMarquardt(nlfit.Residuals(j.frame), j.start), j.s, 4) / float64(len(jobs))
			}
		}
		b.ReportMetric(share, "hits")
	})
}

// plainMarquardt is the textbook method: normal equations, difference derivatives,
// a damping that is divided or multiplied by ten.
func plainMarquardt(f func(theta []float64) []float64, theta []float64) []float64 {
	p := len(theta)
	r := f(theta)
	sum := func(r []float64) float64 {
		s := 0.0
		for _, v := range r {
			s += v * v
		}
		return s
	}
	lambda := 1e-3
	for range 500 {
		n := len(r)
		jac := make([][]float64, p)
		for j := range jac {
			h := append([]float64(nil), theta...)
			d := 1e-7 * math.Max(math.Abs(h[j]), 1e-9)
			h[j] += d
			up := f(h)
			jac[j] = make([]float64, n)
			for i := range up {
				jac[j][i] = (r[i] - up[i]) / d
			}
		}
		a := make([][]float64, p)
		for i := range p {
			a[i] = make([]float64, p+1)
			for j := range p {
				for k := range n {
					a[i][j] += jac[i][k] * jac[j][k]
				}
			}
			for k := range n {
				a[i][p] += jac[i][k] * r[k]
			}
			a[i][i] *= 1 + lambda
		}
		for j := range p {
			for i := range p {
				if i == j || a[j][j] == 0 {
					continue
				}
				c := a[i][j] / a[j][j]
				for k := range p + 1 {
					a[i][k] -= c * a[j][k]
				}
			}
		}
		next := append([]float64(nil), theta...)
		for j := range p {
			next[j] += a[j][p] / a[j][j]
		}
		rn := f(next)
		if s := sum(rn); s < sum(r) {
			done := sum(r)-s < 1e-12*s
			theta, r = next, rn
			lambda /= 10
			if done {
				break
			}
		} else if lambda *= 10; lambda > 1e12 {
			break
		}
	}
	return theta
}

// BenchmarkFree compares the search without starts with a started fit.
func BenchmarkFree(b *testing.B) {
	t := &testing.T{}
	for start := range 2 {
		b.Run([]string{"free", "started"}[start], func(b *testing.B) {
			for b.Loop() {
				for _, s := range certifiedSets(t) {
					table := readTable(b, filepath.Join("../testdata/strd/nonlinear", s.Name+".csv"))
					if _, err := nlfit.Fit(context.Background(), s.text(start), table, &nlfit.Options{StayLocal: start == 1}); err != nil && s.Name != "MGH10" && s.Name[:4] != "Lanc" {
						b.Fatal(s.Name, err)
					}
				}
			}
		})
	}
}

// BenchmarkLevels fits three parameters by 20 levels to 1e4 and 1e5 rows, without
// starts: the time grows in proportion to the rows.
func BenchmarkLevels(b *testing.B) {
	for _, n := range []int{10_000, 100_000} {
		rng := rand.New(rand.NewPCG(5, 5))
		m := make([]string, n)
		x, y := make([]float64, n), make([]float64, n)
		for i := range n {
			k := rng.IntN(20)
			m[i] = fmt.Sprintf("M%d", k+1)
			x[i] = 1 + 29*rng.Float64()
			y[i] = 2 + 0.1*float64(k) + (14+float64(k))*(1-math.Exp(-(0.08+0.004*float64(k))*x[i])) + 0.2*rng.NormFloat64()
		}
		table, err := design.NewTable(design.Texts("m", m), design.Numbers("x", x), design.Numbers("y", y))
		if err != nil {
			b.Fatal(err)
		}
		b.Run(fmt.Sprintf("n=%d", n), func(b *testing.B) {
			for b.Loop() {
				r, err := nlfit.Fit(context.Background(), "y = c + a*(1 - exp(-k*x)) fitting c by cat(m), a by cat(m), k by cat(m)", table, nil)
				if err != nil {
					b.Fatal(err)
				}
				if k := r.Estimates()[59]; math.Abs(k-0.156) > 0.02 {
					b.Fatalf("the last rate is %g", k)
				}
			}
		})
	}
}
