package trammel

import "math"

// Goodness says how well a model describes the fitted rows. N is the sum of
// counts, p the number of coefficients. NaN stands for what is not defined.
type Goodness struct {
	// RSquared is 1 - ResidualSS/TotalSS. When Corrected, TotalSS is about the
	// (weighted) mean, because the columns span the constant; else it is about 0,
	// and RSquared must not be compared with a corrected one.
	RSquared         float64
	AdjustedRSquared float64 // 1 - (ResidualSS/Freedom)/(TotalSS/(N-1)), N in place of N-1 when not Corrected
	Corrected        bool

	ResidualSS float64 // sum of count·weight·residual²
	ResidualSD float64 // square root of ResidualSS/Freedom
	TotalSS    float64

	// LogLikelihood is maximal over coefficients and dispersion. It has no bound
	// when the fit is exact or has no freedom, and is then NaN, as are the
	// criteria made of it. With k estimated parameters, the dispersion included:
	LogLikelihood float64
	AIC           float64 // 2k - 2·LogLikelihood (H. Akaike, IEEE Trans. Automat. Control 19 (1974) 716-723)
	AICc          float64 // AIC + 2k(k+1)/(N-k-1) (C. M. Hurvich and C.-L. Tsai, Biometrika 76 (1989) 297-307); NaN for N-k-1 <= 0
	BIC           float64 // k·log N - 2·LogLikelihood (G. Schwarz, Ann. Statist. 6 (1978) 461-464)
	Parameters    int     // k

	Deviance     float64 // generalized linear models, else NaN
	NullDeviance float64
	Pearson      float64
	Dispersion   float64 // variance of a row of weight 1: ResidualSS/Freedom for normal errors
}

func (r *result) Goodness() Goodness {
	f := r.f
	g := Goodness{
		RSquared: f.RSquared, AdjustedRSquared: math.NaN(), Corrected: f.Corrected,
		ResidualSS: f.ResidualSS, ResidualSD: math.NaN(), TotalSS: f.TotalSS,
		LogLikelihood: math.NaN(), AIC: math.NaN(), AICc: math.NaN(), BIC: math.NaN(), Parameters: f.Parameters,
		Deviance: f.Deviance, NullDeviance: f.NullDeviance, Pearson: f.Pearson, Dispersion: f.Dispersion,
	}
	if f.Freedom <= 0 {
		return g
	}
	freedom := float64(f.Freedom)
	cases := freedom + float64(len(f.Estimates))
	about := cases
	if f.Corrected {
		about--
	}
	g.ResidualSD = math.Sqrt(f.ResidualSS / freedom)
	g.AdjustedRSquared = 1 - (f.ResidualSS/freedom)/(f.TotalSS/about)
	if f.ExactFit {
		return g
	}
	k := float64(f.Parameters)
	g.LogLikelihood = f.LogLik
	g.AIC = 2*k - 2*f.LogLik
	if left := cases - k - 1; left > 0 {
		g.AICc = g.AIC + 2*k*(k+1)/left
	}
	g.BIC = k*math.Log(cases) - 2*f.LogLik
	return g
}
