package trammel

import (
	"fmt"
	"io"
	"math"
	"strings"
	"unicode"
	"unicode/utf8"

	"example.com/trammel/internal/errtext"
)

// Widths of a report, in characters.
const (
	reportWidth = 100
	nameWidth   = 38 // longer names of coefficients and terms get a line of their own
)

// WriteReport writes the summary as text for people, at most 100 characters
// wide but for names that are longer: the model, the rows used, each coefficient
// with what it means, its interval and then its p-value, whole terms, goodness
// in words, and last what to look at. Estimates and intervals are shown to the
// third digit of the standard error. Errors are those of w.
func (s *Summary) WriteReport(w io.Writer) error {
	var b strings.Builder
	s.head(&b)
	s.effects(&b, "What each coefficient says", s.Coefficients)
	s.effects(&b, "Effects that follow from them", s.Derived)
	s.whole(&b)
	s.describes(&b)
	s.look(&b)
	_, err := io.WriteString(w, b.String())
	return err
}

func (s *Summary) head(b *strings.Builder) {
	labelled(b, "Model", s.Model)
	labelled(b, "Data", s.rowsText())
	fit := fmt.Sprintf("%s, %s: %s, %s", s.Fitter, s.Path,
		errtext.Count(len(s.Coefficients), "coefficient"), degrees(s.Freedom))
	labelled(b, "Fit", fit)
	if s.Robust != "" {
		labelled(b, "Errors", "robust standard errors, "+s.Robust+"; intervals and p-values use them")
	}
	if s.End.Reason != "solved" {
		labelled(b, "End", fmt.Sprintf("%s, after %s", s.End.Reason, errtext.Count(s.End.Iterations, "iteration")))
	}
}

func degrees(freedom int) string {
	if freedom == 1 {
		return "1 degree of freedom"
	}
	return fmt.Sprintf("%d degrees of freedom", freedom)
}

func (s *Summary) rowsText() string {
	r := s.Rows
	text := errtext.Count(r.Given, "row")
	if r.Used == r.Given {
		text += ", all fitted"
	} else {
		text += fmt.Sprintf(", %d fitted", r.Used)
	}
	if r.Cases > float64(r.Used) {
		text += fmt.Sprintf(", standing for %.0f cases", r.Cases)
	}
	if n := len(r.SetAside); n > 0 {
		text += "; set aside as incomplete: " + errtext.Rows(r.SetAside, n)
	}
	if n := len(r.Zero); n > 0 {
		text += "; not fitted for weight or count 0: " + errtext.Rows(r.Zero, n)
	}
	return text
}

// effects lists coefficients: a line of numbers, and below it the meaning.
func (s *Summary) effects(b *strings.Builder, title string, list []Coefficient) {
	if len(list) == 0 {
		return
	}
	fmt.Fprintf(b, "\n%s\n\n", title)
	rows := make([][]string, len(list))
	for i, c := range list {
		rows[i] = c.cells()
	}
	head := []string{"coefficient", "estimate", fmt.Sprintf("%s %% interval", trimmed(100*s.Level)), "std. error", "p"}
	g := newGrid(append(rows, head))
	g.line(b, head)
	for i, c := range list {
		g.line(b, rows[i])
		wrap(b, c.Meaning, "      ", "      ")
	}
}

// trimmed shows a level in percent without binary rounding: 95, 99.9.
func trimmed(x float64) string { return fmt.Sprintf("%.10g", x) }

func (c *Coefficient) cells() []string {
	place, ok := lastPlace(c.StdError, 3)
	if !ok || c.StdError < 1e-15*math.Abs(c.Estimate) {
		return []string{c.Name, figure(c.Estimate, 7), interval(c, 7), figure(c.StdError, 3), probability(c.P)}
	}
	ends := undefined
	if c.Low <= c.High {
		ends = fixed(c.Low, place) + " to " + fixed(c.High, place)
	}
	return []string{c.Name, fixed(c.Estimate, place), ends, fixed(c.StdError, place), probability(c.P)}
}

func interval(c *Coefficient, digits int) string {
	if !(c.Low <= c.High) {
		return undefined
	}
	return figure(c.Low, digits) + " to " + figure(c.High, digits)
}

// whole lists the tests of whole terms.
func (s *Summary) whole(b *strings.Builder) {
	if len(s.Terms) == 0 {
		return
	}
	b.WriteString("\nDoes each term matter, given all others that do not contain it?\n\n")
	statistic := "F"
	switch {
	case s.Terms[0].Chi2:
		statistic = "chi-square"
	case s.Robust != "":
		statistic = "robust F"
	}
	head := []string{"term", "columns", "sum of squares", statistic, "p"}
	rows := make([][]string, len(s.Terms))
	for i, t := range s.Terms {
		rows[i] = []string{t.Term, fmt.Sprint(t.DF), figure(t.SS, 5), figure(t.Stat, 4), probability(t.P)}
	}
	g := newGrid(append(rows, head))
	g.line(b, head)
	for _, row := range rows {
		g.line(b, row)
	}
}

// describes says in words how well the model describes the data.
func (s *Summary) describes(b *strings.Builder) {
	b.WriteString("\nHow well the model describes the data\n\n")
	g := &s.Goodness
	if s.Freedom <= 0 {
		wrap(b, "The model has as many coefficients as cases: it passes through all of them, and nothing is left to judge it by.", "  ", "  ")
		return
	}
	var text []string
	if !math.IsNaN(g.ResidualSD) {
		cases := "Single cases"
		if s.weighted {
			cases = "Single cases of weight 1"
		}
		text = append(text, fmt.Sprintf("%s scatter about it with a standard deviation of %s (%s, sum of squares %s).",
			cases, figure(g.ResidualSD, 4), degrees(s.Freedom), figure(g.ResidualSS, 5)))
	}
	if !math.IsNaN(g.RSquared) {
		what := "the variation of " + s.Response + " about its mean"
		if !g.Corrected {
			what = "the sum of squares of " + s.Response + " about 0"
		}
		sentence := fmt.Sprintf("It accounts for %s of %s (R² %s, adjusted %s).", percent(g.RSquared), what, share(g.RSquared), share(g.AdjustedRSquared))
		if !g.Corrected {
			sentence += " This R² is uncorrected, because the columns do not span a constant: do not compare it with one about the mean."
		}
		text = append(text, sentence)
	}
	if s.Exact {
		text = append(text, "The fit is exact up to rounding: tests and likelihood say nothing here.")
	} else if !math.IsNaN(g.LogLikelihood) {
		aicc := figure(g.AICc, 6)
		if math.IsNaN(g.AICc) {
			aicc = "not defined with so few cases"
		}
		text = append(text, fmt.Sprintf("Log-likelihood %s; AIC %s, AICc %s, BIC %s, counting %d estimated parameters.",
			figure(g.LogLikelihood, 6), figure(g.AIC, 6), aicc, figure(g.BIC, 6), g.Parameters))
	}
	if t := s.LackOfFit; t != nil {
		text = append(text, fmt.Sprintf("Lack of fit, against the scatter of repeated rows: F = %s on %d and %d, p %s.",
			figure(t.F, 4), t.DF, t.PureDF, probabilityText(t.P)))
	}
	for _, sentence := range text {
		wrap(b, sentence, "  ", "  ")
	}
}

// share shows R² with the digits of percent.
func share(x float64) string {
	text, ok := strings.CutSuffix(percent(x), " %")
	if !ok {
		return undefined
	}
	decimals := 2 + len(text) - strings.IndexByte(text, '.') - 1
	return unsignedZero(fmt.Sprintf("%.*f", decimals, x))
}

// look says what to look at.
func (s *Summary) look(b *strings.Builder) {
	b.WriteString("\nWhat to look at\n\n")
	for _, list := range [][]Note{s.Notes, s.Findings} {
		for _, n := range list {
			switch n.Code {
			case noteRobust, noteZero, noteUncorrected, noteExact, noteSaturated: // said above
			default:
				item(b, n.Text)
			}
		}
	}
	switch {
	case len(s.Findings) > 0:
	case !s.Checked || s.Freedom <= 0:
		item(b, "No checks were made for influential rows, near-dependencies, curvature and uneven scatter.")
	case s.Exact:
		item(b, "Without scatter, there are no influential rows, no curvature and no uneven scatter to look for.")
	default:
		item(b, "Nothing stands out among the rows and columns: no undue influence, no near-dependency, no curvature, no uneven scatter.")
	}
}

func item(b *strings.Builder, text string) { wrap(b, text, "  - ", "    ") }

func labelled(b *strings.Builder, label, text string) {
	const indent = "         "
	wrap(b, text, label+indent[len(label):], indent)
}

// wrap writes text in lines of at most reportWidth characters, the first led by
// first, the others by rest. It breaks at spaces and keeps those within a line,
// which may belong to a quoted name; a control character becomes a space.
func wrap(b *strings.Builder, text, first, rest string) {
	b.WriteString(first)
	width := utf8.RuneCountInString(first)
	for i, word := range strings.Split(plainLine(text), " ") {
		n := utf8.RuneCountInString(word)
		switch {
		case i == 0:
		case width+1+n > reportWidth:
			b.WriteString("\n" + rest)
			width = utf8.RuneCountInString(rest)
		default:
			b.WriteByte(' ')
			width++
		}
		b.WriteString(word)
		width += n
	}
	b.WriteByte('\n')
}

// plainLine replaces control characters, which a column's name may hold.
func plainLine(text string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) {
			return ' '
		}
		return r
	}, text)
}

// A grid sets rows in columns: the first to the left, the others to the right.
type grid struct{ widths []int }

func newGrid(rows [][]string) grid {
	widths := make([]int, len(rows[0]))
	for _, row := range rows {
		for j, cell := range row {
			if n := utf8.RuneCountInString(cell); j > 0 || n <= nameWidth {
				widths[j] = max(widths[j], n)
			}
		}
	}
	return grid{widths}
}

// line writes one row. A first cell that is wider than its column stands on a
// line of its own.
func (g grid) line(b *strings.Builder, row []string) {
	b.WriteString("  " + plainLine(row[0]))
	width := utf8.RuneCountInString(row[0])
	if width > g.widths[0] {
		b.WriteString("\n  ")
		width = 0
	}
	b.WriteString(strings.Repeat(" ", g.widths[0]-width))
	for j, cell := range row[1:] {
		b.WriteString(strings.Repeat(" ", 3+g.widths[j+1]-utf8.RuneCountInString(cell)) + cell)
	}
	b.WriteByte('\n')
}
