package trammel

import (
	"example.com/trammel/internal/dist"
	"example.com/trammel/internal/factored"
	"example.com/trammel/internal/handover"
)

// A LackOfFitTest compares how far the means of repeated rows are from the
// model with how far repeats are from their means.
type LackOfFitTest struct {
	DF     int     // distinct rows less coefficients
	SS     float64 // between the repeats' means and the model
	PureDF int     // cases less distinct rows
	PureSS float64 // of the repeats about their means
	Groups int     // distinct rows
	F, P   float64 // F = (SS/DF)/(PureSS/PureDF), and the probability of at least F when the model is right
}

// LackOfFit tests the model against the scatter of repeated rows: rows that
// agree in every numeric column and level the model uses, and in its known
// terms. Without repeats, or when the model has a coefficient for every
// distinct row, or when all repeats agree to rounding, the test is not defined
// and the question is refused by an [*Error]. A row that stands for several
// cases (counted) is as many equal repeats. It assumes an even scatter, up to
// weights, also when the covariance is robust.
//
// Source: N. R. Draper and H. Smith, Applied Regression Analysis, 3rd ed., Wiley
// 1998, sec. 2.1 and 2.2.
func LackOfFit(r Result) (*LackOfFitTest, error) {
	f, err := fitOf(r)
	if err != nil {
		return nil, err
	}
	stats, err := rowsOf(f)
	if err != nil {
		return nil, err
	}
	group, groups := repeats(f)
	p := len(f.Estimates)
	t := &LackOfFitTest{Groups: groups, DF: groups - p, PureDF: f.Freedom + p - groups}
	switch {
	case t.PureDF <= 0:
		return nil, &Error{Code: codeNoRepeats, Message: "lack of fit cannot be tested: no two rows agree in everything the model uses",
			Hint: "repeat some settings, or compare with a richer model such as one with powers"}
	case t.DF <= 0:
		return nil, &Error{Code: codeSaturated, Message: "lack of fit cannot be tested: the model has a coefficient for every distinct row",
			Hint: "take terms out to test the smaller model"}
	}
	t.SS, t.PureSS = splitResiduals(f, stats.Residual, group, groups)
	// Rounding leaves about one unit in the last place of the response per row.
	if pureIsRounding(f, t.PureSS) {
		return nil, &Error{Code: codeExactRepeats, Message: "lack of fit cannot be tested: repeated rows agree to rounding, so there is no scatter to compare with",
			Hint: "check that repeats are separate measurements, not copies"}
	}
	t.F = (t.SS / float64(t.DF)) / (t.PureSS / float64(t.PureDF))
	t.P = dist.FUpper(t.F, float64(t.DF), float64(t.PureDF))
	return t, nil
}

// splitResiduals splits the residual sum of squares into that of the groups'
// means and that about them; within a group the fitted value is the same, so
// residuals serve in place of responses.
func splitResiduals(f *handover.Fit, residual []float64, group []int32, groups int) (between, within float64) {
	weight := make([]float64, groups)
	mean := make([]float64, groups)
	each := func(i int) float64 {
		w := 1.0
		if f.Frame.Weights != nil {
			w *= f.Frame.Weights[i]
		}
		if f.Frame.Counts != nil {
			w *= f.Frame.Counts[i]
		}
		return w
	}
	for i, g := range group {
		w := each(i)
		weight[g] += w
		mean[g] += w * residual[i]
	}
	for g := range mean {
		mean[g] /= weight[g]
		between += weight[g] * mean[g] * mean[g]
	}
	for i, g := range group {
		d := residual[i] - mean[g]
		within += each(i) * d * d
	}
	return between, within
}

func pureIsRounding(f *handover.Fit, within float64) bool {
	sum := 0.0
	for i, y := range f.Frame.Y {
		w := 1.0
		if f.Frame.Weights != nil {
			w *= f.Frame.Weights[i]
		}
		if f.Frame.Counts != nil {
			w *= f.Frame.Counts[i]
		}
		sum += w * y * y
	}
	const unit = 1.0 / (1 << 52)
	return within <= 4*unit*unit*sum
}

// repeats numbers the distinct rows of a fit in order of first appearance and
// gives each row its number. Columns are taken in one after the other, each
// splitting the groups so far.
func repeats(f *handover.Fit) (group []int32, groups int) {
	form := f.Frame.Matrix.Form()
	s := splitter{group: make([]int32, form.N), groups: min(1, form.N)}
	for k := range form.Cats {
		s.byLevel(&form.Cats[k])
	}
	for k := range form.Nums {
		s.byValue(form.Nums[k].Hi, form.Nums[k].Lo)
	}
	for _, part := range f.Frame.Matrix.Parts() {
		s.byValue(part, nil)
	}
	if f.Frame.Known != nil {
		s.byValue(f.Frame.Known, f.Frame.KnownLo)
	}
	return s.group, s.groups
}

type splitter struct {
	group  []int32
	groups int
}

type splitKey struct {
	group  int32
	hi, lo float64
}

func (s *splitter) byValue(hi, lo []float64) {
	if s.groups == len(s.group) {
		return
	}
	index := make(map[splitKey]int32, s.groups)
	for i, g := range s.group {
		key := splitKey{group: g, hi: hi[i]} // 0 and -0 are one key
		if lo != nil {
			key.lo = lo[i]
		}
		s.group[i] = place(index, key)
	}
	s.groups = len(index)
}

func (s *splitter) byLevel(c *factored.Cat) {
	if s.groups == len(s.group) {
		return
	}
	index := make(map[splitKey]int32, s.groups)
	var levels [1024]int32
	for from := 0; from < len(s.group); from += len(levels) {
		part := levels[:min(len(levels), len(s.group)-from)]
		c.LevelsTo(part, from)
		for i, level := range part {
			g := &s.group[from+i]
			*g = place(index, splitKey{group: *g, hi: float64(level)})
		}
	}
	s.groups = len(index)
}

func place(index map[splitKey]int32, key splitKey) int32 {
	k, ok := index[key]
	if !ok {
		k = int32(len(index))
		index[key] = k
	}
	return k
}
