package linfit

import (
	"fmt"
	"math"

	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/internal/errtext"
)

// adjust turns the weighted residuals d of the frame's rows from row first on
// into the factors of their scores; h holds the leverages of whole rows (all
// copies), used by HC2 and HC3. A row of count m is m scores of 1/m each, whose
// squares sum to 1/m.
func (k Robust) adjust(d, h []float64, f *design.Frame, first int) *Error {
	if k == Ordinary { // clusters: copies of a row are in one cluster
		return nil
	}
	for i := range d {
		m := 1.0
		if f.Counts != nil {
			m = f.Counts[first+i]
		}
		d[i] /= math.Sqrt(m)
		if k != HC2 && k != HC3 {
			continue
		}
		left := 1 - h[i]/m
		if left < 1e-12 {
			row := f.Row(first + i)
			return &Error{Code: codeFullLeverage, Rows: []int{row},
				Message: fmt.Sprintf("row %d alone determines a coefficient, so %s is not defined: it divides by 1 - leverage, here 0", row, k),
				Hint:    "use HC1, or take out the term that only this row informs"}
		}
		if k == HC2 {
			left = math.Sqrt(left)
		}
		d[i] /= left
	}
	return nil
}

// robustFactor is the small-sample factor of a robust covariance. For G
// clusters it is G/(G-1)·(N-1)/(N-p), the clustered covariance itself being that of
// K.-Y. Liang and S. L. Zeger, "Longitudinal data analysis using generalized
// linear models", Biometrika 73 (1986) 13-22.
func robustFactor(k Robust, c *clusters, cases float64, p int) float64 {
	switch {
	case c != nil:
		g := float64(c.count)
		return g / (g - 1) * (cases - 1) / (cases - float64(p))
	case k == HC1:
		return cases / (cases - float64(p))
	}
	return 1
}

// wald is b' V^-1 b divided by the length of b; V is the block of the p×p
// covariance that begins at from. NaN when V is singular, as it is when there
// are fewer clusters than coefficients.
func wald(b, v []float64, p, from int) float64 {
	k := len(b)
	// V = D C D with unit diagonal C, so that units do not matter; C = L L'.
	l, z := make([]float64, k*k), make([]float64, k)
	sum := 0.0
	for i := range k {
		di := math.Sqrt(v[(from+i)*p+from+i])
		z[i] = b[i] / di
		for j := range i + 1 {
			dj := math.Sqrt(v[(from+j)*p+from+j])
			s := v[(from+i)*p+from+j]/di/dj - dot(l[i*k:i*k+j], l[j*k:j*k+j])
			if j < i {
				l[i*k+j] = s / l[j*k+j]
				z[i] -= l[i*k+j] * z[j]
				continue
			}
			if !(s > 1e-12) {
				return math.NaN()
			}
			l[i*k+i] = math.Sqrt(s)
		}
		z[i] /= l[i*k+i]
		sum += z[i] * z[i]
	}
	return sum / float64(k)
}

// clusters number the clusters of the fitted rows.
type clusters struct {
	text  string
	codes []int32
	count int
}

// clustersOf reads "f" or "cat(f, g)" from the table for the rows of the frame.
func clustersOf(text string, t *design.Table, f *design.Frame) (*clusters, *Error) {
	names, err := clusterColumns(text, t)
	if err != nil {
		return nil, err
	}
	c := &clusters{text: text, codes: make([]int32, len(f.Y))}
	for _, name := range names {
		if err := c.split(t, f, name); err != nil {
			return nil, err
		}
	}
	if c.count < 2 {
		return nil, &Error{Code: codeOneCluster, Names: names,
			Message: fmt.Sprintf("%s puts all fitted rows into one cluster, and the scatter between clusters needs two or more", text),
			Hint:    "name a column with several values"}
	}
	return c, nil
}

func clusterColumns(text string, t *design.Table) ([]string, *Error) {
	if _, ok := t.Column(text); ok {
		return []string{text}, nil
	}
	m, err := formula.Parse("response ~ " + text)
	if err == nil && len(m.Terms.Items) == 1 && !m.Terms.Items[0].Minus {
		var names []string
		switch term := m.Terms.Items[0].Term.(type) {
		case *formula.Name:
			names = append(names, term.Name)
		case *formula.Category:
			if term.In != nil || term.Against != nil {
				return nil, &Error{Code: codeUnknownCluster,
					Message: fmt.Sprintf("the option ClusterBy is %q, and levels are not listed there", text),
					Hint:    "write only the columns, such as cat(site, machine)"}
			}
			for _, c := range term.Columns {
				names = append(names, c.Name)
			}
		}
		missing := ""
		for _, name := range names {
			if _, ok := t.Column(name); !ok && missing == "" {
				missing = name
			}
		}
		if names != nil && missing == "" {
			return names, nil
		}
		if missing != "" {
			text = missing
		}
	}
	return nil, &Error{Code: codeUnknownCluster, Names: []string{text},
		Message: fmt.Sprintf("the option ClusterBy asks for %q, and the table has no such column", text),
		Hint:    "name a column, or a category of columns such as cat(site, machine)"}
}

// split divides the clusters by the values of a column.
func (c *clusters) split(t *design.Table, f *design.Frame, name string) *Error {
	col, _ := t.Column(name)
	mask := col.Mask()
	var value func(i int) any
	switch col.Kind() {
	case design.TextColumn:
		v := col.Texts()
		value = func(i int) any { return v[i] }
	case design.BoolColumn:
		v := col.Bools()
		value = func(i int) any { return v[i] }
	default:
		v := col.Floats()
		value = func(i int) any { return v[i] }
	}
	type key struct {
		old int32
		v   any
	}
	codes := make(map[key]int32)
	var missing []int
	for i := range c.codes {
		at := f.Row(i) - 1
		if x, ok := value(at).(float64); mask != nil && mask[at] || ok && math.IsNaN(x) {
			missing = append(missing, at+1)
			continue
		}
		k := key{c.codes[i], value(at)}
		code, ok := codes[k]
		if !ok {
			code = int32(len(codes))
			codes[k] = code
		}
		c.codes[i] = code
	}
	c.count = len(codes)
	if missing != nil {
		return &Error{Code: codeUnknownCluster, Names: []string{name}, Rows: missing[:min(len(missing), 5)],
			Message: fmt.Sprintf("the column %s, which names clusters, is empty in %s", name, errtext.Rows(missing[:min(len(missing), 5)], len(missing))),
			Hint:    "fill the cells, or take the rows out"}
	}
	return nil
}
