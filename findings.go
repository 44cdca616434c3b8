package trammel

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"example.com/trammel/internal/dist"
	"example.com/trammel/internal/errtext"
	"example.com/trammel/internal/handover"
)

// The checks of a summary. Each gives plain sentences on what to look at, and
// none when nothing stands out. Limits are chosen so that a sound model of a
// hundred rows rarely gets a sentence.
const (
	shown = 5 // rows named in one sentence

	// outlier: a row is named when its residual, judged without the row, has a
	// p-value below outlier/N (Bonferroni's bound for the largest of N; Cook and
	// Weisberg 1982, sec. 2.2.2).
	outlier = 0.05

	// pull: a row is named when its leverage exceeds pull·p/N. The mean is p/N;
	// D. C. Hoaglin and R. E. Welsch, Amer. Statist. 32 (1978) 17-22, look from 2p/N.
	pull = 3

	// nearIndex and nearShare: columns are named when a condition index exceeds
	// nearIndex and two or more of them have a larger share of variance on it than
	// nearShare (Belsley, Kuh and Welsch 1980, sec. 3.2).
	nearIndex, nearShare = 30, 0.5

	// doubt is the p-value below which curvature or unequal spread is named,
	// divided by the number of tests of the kind.
	doubt = 0.01

	// most bounds the work of the search for curvature (rows × columns × tests) and
	// for near-dependencies (rows × columns²) to some seconds, mostColumns the
	// columns for the latter, whose work also grows with their third power, and
	// mostRows the rows that are searched for repeats, which takes some
	// hundred bytes for each.
	most        = 1e9
	mostColumns = 500
	mostRows    = 1_000_000
)

// findings runs all checks.
func findings(f *handover.Fit) []Note {
	if f.Frame == nil || f.Freedom <= 0 {
		return nil
	}
	stats, ok := f.Engine.Rows()
	if !ok {
		return nil
	}
	var out []Note
	if !f.ExactFit {
		out = append(out, influential(f, stats)...)
	}
	out = append(out, nearDependencies(f)...)
	out = append(out, bent(f)...)
	if !f.ExactFit && normalErrors(f) {
		out = append(out, curvature(f, stats)...)
		out = append(out, unequalSpread(f, stats)...)
	}
	return out
}

// A standout is a row with the number that makes it stand out.
type standout struct {
	row   int
	value float64
}

// keep puts s among the largest few, in descending order.
func keep(list []standout, s standout) []standout {
	k, _ := slices.BinarySearchFunc(list, s.value, func(a standout, v float64) int {
		if a.value >= v {
			return -1
		}
		return 1
	})
	if k == shown {
		return list
	}
	list = slices.Insert(list, k, s)
	return list[:min(len(list), shown)]
}

func rowsText(list []standout, total int, format string) string {
	parts := make([]string, len(list))
	for i, s := range list {
		parts[i] = fmt.Sprintf("%d ("+format+")", s.row, s.value)
	}
	if more := total - len(list); more > 0 {
		parts = append(parts, fmt.Sprintf("%d more", more))
	}
	if total == 1 {
		return "row " + parts[0]
	}
	return "rows " + errtext.And(parts)
}

// influential names rows that move the estimates, rows far from the model and
// rows far out in the columns. It keeps a few rows, not all.
func influential(f *handover.Fit, stats *handover.RowStats) []Note {
	p, df := float64(len(f.Estimates)), float64(f.Freedom)
	cases := p + df
	// Cook (1977) compares his distance with the F distribution: at its median the
	// estimates move to the edge of a 50 % confidence region.
	moved := dist.FUpperQuantile(0.5, p, df)
	far := math.Inf(1)
	if df > 1 {
		far = dist.TUpperQuantile(outlier/cases/2, df-1)
	}
	var cooks, outliers, levers, sole []standout
	var nCook, nOut, nLever, nSole int
	in := newInfluence(f)
	for i, h := range stats.Leverage {
		row := f.Frame.Row(i)
		if 1-h <= alone {
			nSole++
			sole = keep(sole, standout{row, 1})
			continue
		}
		_, t, cook := in.of(stats, i)
		if cook > moved {
			nCook++
			cooks = keep(cooks, standout{row, cook})
		}
		if math.Abs(t) > far {
			nOut++
			outliers = keep(outliers, standout{row, math.Abs(t)})
		}
		if h > pull*p/cases {
			nLever++
			levers = keep(levers, standout{row, h})
		}
	}
	var out []Note
	if nCook > 0 {
		out = append(out, Note{"influential-rows", fmt.Sprintf(
			"The estimates rest heavily on %s: fit once without, and compare.", rowsText(cooks, nCook, "Cook's distance %.2f"))})
	}
	if nOut > 0 {
		check := "Check how they were measured."
		if nOut == 1 {
			check = "Check how it was measured."
		}
		out = append(out, Note{"far-rows", fmt.Sprintf(
			"Far from the model, judged by the scatter of the others: %s. %s", rowsText(outliers, nOut, "%.1f standard deviations"), check)})
	}
	if nLever > 0 {
		out = append(out, Note{"high-leverage", fmt.Sprintf(
			"Far out in the columns, and so strong in the fit: %s, where the mean is %.2g.", rowsText(levers, nLever, "leverage %.2f"), p/cases)})
	}
	if nSole > 0 {
		rows := make([]int, len(sole))
		for i, s := range sole {
			rows[i] = s.row
		}
		slices.Sort(rows)
		what := "each determine"
		if nSole == 1 {
			what = "determines"
		}
		text := errtext.Rows(rows, nSole) + " " + what + " a coefficient alone: nothing in the data can contradict it."
		out = append(out, Note{"sole-rows", strings.ToUpper(text[:1]) + text[1:]})
	}
	return out
}

// bent warns of intervals that a curved equation makes rough.
func bent(f *handover.Fit) []Note {
	if f.Plan.Equation() == nil || f.ExactFit {
		return nil
	}
	c, err := CurvatureOf(&result{f})
	if err != nil || !(c.ParameterEffects > c.Limit || c.Intrinsic > c.Limit) {
		return nil
	}
	return []Note{{"curved-equation", fmt.Sprintf(
		"The equation bends strongly over the uncertainty of its constants (parameter-effects curvature %.2g, intrinsic %.2g, to be held against %.2g): intervals from standard errors are rough; ask for profile intervals.",
		c.ParameterEffects, c.Intrinsic, c.Limit)}}
}

// confounded names the pairs of an equation's coefficients whose estimates are
// correlated beyond nearConfounded: the data hardly tell them apart.
func confounded(f *handover.Fit) []Note {
	const nearConfounded = 0.99
	v := f.Engine.Covariance()
	if v == nil {
		return nil
	}
	p := len(f.Estimates)
	columns := f.Plan.Columns()
	var pairs []string
	for i := range p {
		for j := range i {
			r := v[i*p+j] / math.Sqrt(v[i*p+i]*v[j*p+j])
			if math.Abs(r) > nearConfounded && len(pairs) < shown {
				pairs = append(pairs, fmt.Sprintf("%s and %s (correlation %.4f)", columns[j].Name, columns[i].Name, r))
			}
		}
	}
	if pairs == nil {
		return nil
	}
	return []Note{{"near-dependency", fmt.Sprintf("Nearly confounded: %s. The data can hardly tell them apart; predictions within the data do not suffer.", errtext.And(pairs))}}
}

// nearDependencies names columns that are nearly combinations of each other.
func nearDependencies(f *handover.Fit) []Note {
	p := len(f.Estimates)
	if p < 2 {
		return nil
	}
	if f.Plan.Equation() != nil {
		return confounded(f)
	}
	if p > mostColumns || float64(len(f.Frame.Y))*float64(p)*float64(p) > most {
		return []Note{{"not-checked", "Near-dependencies were not looked for: the fit is too large to take its columns apart."}}
	}
	c, err := f.Frame.Collinearity()
	if err != nil {
		return nil
	}
	columns := f.Plan.Columns()
	var out []Note
	for k := p - 1; k >= 0 && c.Indices[k] > nearIndex; k-- {
		var names []string
		for j, share := range c.Proportions[k] {
			if share > nearShare {
				names = append(names, columns[j].Name)
			}
		}
		if len(names) < 2 {
			continue
		}
		mend := "The data can hardly tell their effects apart; predictions within the data do not suffer."
		if len(names) == 2 && names[0] == "intercept" {
			mend += " Counting " + names[1] + " from a value within the data would separate them."
		}
		if len(names) > 6 {
			names = append(names[:6:6], fmt.Sprintf("%d more", len(names)-6))
		}
		out = append(out, Note{"near-dependency", fmt.Sprintf(
			"Nearly dependent (condition index %s): %s. %s", figure(c.Indices[k], 2), errtext.And(names), mend)})
	}
	return out
}

// curvature looks for bends that the model leaves in the residuals: for each
// numeric column whether its square would help, and for the fitted values
// likewise (J. W. Tukey, "One degree of freedom for non-additivity", Biometrics
// 5 (1949) 232-242). F has the added columns' and the remaining degrees of
// freedom.
func curvature(f *handover.Fit, stats *handover.RowStats) []Note {
	bends := bendable(f)
	tests := len(bends) + 1
	n, p := f.Frame.Matrix.Dims()
	if float64(n)*float64(p)*float64(tests) > most {
		return []Note{{"not-checked", "Curvature was not looked for: the fit is too large to try squares of its columns."}}
	}
	var out []Note
	square := make([]float64, n)
	test := func(x []float64) (float64, bool) {
		squareTo(square, x)
		df, ss, err := f.Engine.ExtraSS([][]float64{square})
		left := f.Freedom - df
		if err != nil || df == 0 || left <= 0 {
			return 0, false
		}
		rest := math.Max(f.ResidualSS-ss, 0) / float64(left)
		prob := dist.FUpper(ss/float64(df)/rest, float64(df), float64(left))
		return prob, prob < doubt/float64(tests)
	}
	for _, b := range bends {
		if prob, found := test(f.Frame.Matrix.Form().Nums[b.num].Hi); found {
			out = append(out, Note{"curvature", fmt.Sprintf(
				"The residuals bend along %s (p %s for its square): try powers(%s, 2) or a spline, or a transformed response.",
				b.name, probabilityText(prob), b.name)})
		}
	}
	if len(out) == 0 {
		if prob, found := test(stats.Fitted); found {
			out = append(out, Note{"curvature", fmt.Sprintf(
				"The residuals bend along the fitted values (p %s for their square): effects may not add up on this scale; try interactions or a transformed response.",
				probabilityText(prob))})
		}
	}
	return out
}

// A bend is a plain numeric column whose square can be tried.
type bend struct {
	num  int
	name string
}

// bendable lists the numeric columns of terms with one numeric factor. Powers
// and columns of a basis have a shape of their own and are left out.
func bendable(f *handover.Fit) []bend {
	form := f.Frame.Matrix.Form()
	columns := f.Plan.Columns()
	terms := f.Plan.Terms()
	var out []bend
	seen := make([]bool, len(form.Nums))
	for j, c := range form.Cols {
		if c.Num < 0 || seen[c.Num] {
			continue
		}
		// The numeric factors of a term are those without levels.
		var numeric []string
		for _, part := range strings.Split(terms[columns[j].Term].Text, " by ") {
			if !strings.HasPrefix(part, "cat(") {
				numeric = append(numeric, part)
			}
		}
		if len(numeric) != 1 || shaped(numeric[0]) {
			continue
		}
		seen[c.Num] = true
		out = append(out, bend{c.Num, numeric[0]})
	}
	return out
}

// shaped tells that the text of a numeric factor is a power or a basis.
func shaped(text string) bool {
	for _, basis := range []string{"legendre(", "spline(", "hinge(", "harmonics("} {
		if strings.HasPrefix(text, basis) {
			return true
		}
	}
	return strings.Contains(text, "^")
}

// squareTo writes the squares of x about its middle, in units of half its
// range, so that no square over- or underflows.
func squareTo(dst, x []float64) {
	low, high := slices.Min(x), slices.Max(x)
	middle, half := low/2+high/2, high/2-low/2
	if half == 0 {
		half = 1
	}
	for i, v := range x {
		u := (v - middle) / half
		dst[i] = u * u
	}
}

// unequalSpread tests whether squared residuals grow or shrink along the fitted
// values: N·R² of the regression of count-weighted w·e² on the fitted value,
// chi-square with 1 degree of freedom when the spread is even (R. Koenker, "A note
// on studentizing a test for heteroscedasticity", J. Econometrics 17 (1981)
// 107-112, for the score test of T. S. Breusch and A. R. Pagan, Econometrica 47
// (1979) 1287-1294).
func unequalSpread(f *handover.Fit, stats *handover.RowStats) []Note {
	stat, slope := koenker(f, stats)
	prob := dist.ChiUpper(stat, 1)
	if !(prob < doubt) {
		return nil
	}
	how := "grows"
	if slope < 0 {
		how = "shrinks"
	}
	mend := "consider weights, a transformed response such as log, or robust standard errors"
	if f.Robust != "" {
		mend = "the standard errors given are robust against it, prediction intervals for new observations are not"
	}
	return []Note{{"unequal-spread", fmt.Sprintf("The scatter %s with the fitted value (p %s): %s.", how, probabilityText(prob), mend)}}
}

// koenker returns the statistic, NaN when the fitted values or the squared
// residuals are all the same, and the sign of the slope.
func koenker(f *handover.Fit, stats *handover.RowStats) (stat, slope float64) {
	count := func(i int) float64 {
		if f.Frame.Counts != nil {
			return f.Frame.Counts[i]
		}
		return 1
	}
	squared := func(i int) float64 {
		u := stats.Residual[i] * stats.Residual[i] / f.Dispersion
		if f.Frame.Weights != nil {
			u *= f.Frame.Weights[i]
		}
		return u
	}
	var cases, meanX, meanU float64
	for i, x := range stats.Fitted {
		m := count(i)
		cases += m
		meanX += m * x
		meanU += m * squared(i)
	}
	meanX /= cases
	meanU /= cases
	var xx, xu, uu, about float64
	for i, x := range stats.Fitted {
		m, dx, du := count(i), x-meanX, squared(i)-meanU
		xx += m * dx * dx
		xu += m * dx * du
		uu += m * du * du
		about += m * x * x
	}
	// Fitted values that differ by rounding only say nothing.
	if xx <= 1e-24*about || uu == 0 {
		return math.NaN(), 0
	}
	return cases * (xu / xx) * (xu / uu), xu
}
