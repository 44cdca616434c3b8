package trammel_test

import (
	"math"
	"math/big"
	"strconv"
	"strings"
	"testing"

	"example.com/trammel/design"
)

// The scenarios of the conformance suite. Each has its data, its model text, and
// the same model written out by hand as a rational problem, so that the expected
// answers owe nothing to the module. Degrees of freedom are even, which the
// closed forms of closedform_test.go need.

// A disc is one row of invented plant data. An empty cell is missing.
type disc struct{ furnace, hold, temp, w, m, porosity string }

// plain is the data behind most scenarios; settings repeat.
var plain = []disc{
	{"F1", "10", "1.5", "1", "1", "38.4"}, {"F1", "10", "1.5", "2", "2", "38.1"}, {"F1", "20", "1.5", "0.5", "1", "35.6"},
	{"F1", "30", "1.5", "1.5", "3", "32.9"}, {"F1", "30", "1.5", "1", "1", "32.2"},
	{"F2", "10", "1.75", "4", "1", "39.3"}, {"F2", "20", "1.75", "1", "1", "36.8"}, {"F2", "20", "1.75", "2.5", "2", "36.1"},
	{"F2", "30", "1.75", "1", "1", "33.1"}, {"F2", "40", "1.75", "0.25", "1", "31.2"},
	{"F3", "10", "2.5", "1", "2", "37.8"}, {"F3", "20", "2.5", "3", "1", "34.0"}, {"F3", "30", "2.5", "1", "1", "31.4"},
	{"F3", "30", "2.5", "1", "2", "30.2"},
}

// A scenario is a model, its data and the same model by hand.
type scenario struct {
	name     string
	model    string
	data     []disc
	setAside bool
	fitted   []int // indices into data of the fitted rows; nil for all

	row      func(d disc) []float64 // the columns, all exact in float64
	names    []string
	terms    []handTerm
	derived  []handDerived
	response func(d disc) float64
	known    func(d disc) float64
	weighted bool
	counted  bool

	corrected bool
	saturated bool // n = p
	exact     bool
	log       bool
}

// A handTerm is one term with its columns and those it is tested against.
type handTerm struct {
	text            string
	columns         []int
	given, sequence []int
}

type handDerived struct {
	name    string
	weights []float64
}

func value(cell string) float64 {
	v, err := strconv.ParseFloat(cell, 64)
	if err != nil {
		panic(err)
	}
	return v
}

// byFurnace is hold * cat(furnace against mean) with F1 as the reference.
func byFurnace(d disc) []float64 {
	h := value(d.hold)
	switch d.furnace {
	case "F1":
		return []float64{1, h, -1, -1, -h, -h}
	case "F2":
		return []float64{1, h, 1, 0, h, 0}
	}
	return []float64{1, h, 0, 1, 0, h}
}

const furnaceTerms = "hold*cat(furnace against mean)"

var furnaceNames = []string{"intercept", "hold", "furnace='F2' against mean", "furnace='F3' against mean",
	"hold by furnace='F2' against mean", "hold by furnace='F3' against mean"}

var furnaceHand = []handTerm{
	{"hold", []int{1}, []int{0, 2, 3}, []int{0}},
	{"cat(furnace against mean)", []int{2, 3}, []int{0, 1}, []int{0, 1}},
	{"hold by cat(furnace against mean)", []int{4, 5}, []int{0, 1, 2, 3}, []int{0, 1, 2, 3}},
}

var furnaceDerived = []handDerived{
	{"furnace='F1' against mean", []float64{0, 0, -1, -1, 0, 0}},
	{"hold by furnace='F1' against mean", []float64{0, 0, 0, 0, -1, -1}},
}

func porosity(d disc) float64 { return value(d.porosity) }

// furnaces is a scenario of the furnace model with some things changed.
func furnaces(name, response, clauses string, change func(s *scenario)) scenario {
	s := scenario{name: name, model: response + " ~ " + furnaceTerms + clauses, data: plain, row: byFurnace,
		names: furnaceNames, terms: furnaceHand, derived: furnaceDerived, response: porosity, corrected: true}
	if change != nil {
		change(&s)
	}
	return s
}

// linear is the response of the exact scenario; the cells hold porosity without
// scatter, exact in binary.
func linear() []disc {
	data := append([]disc(nil), plain...)
	for i := range data {
		h := value(data[i].hold)
		y := map[string]float64{"F1": 40 - h/4, "F2": 42 - h/4, "F3": 40 - h/2}[data[i].furnace]
		data[i].porosity = strconv.FormatFloat(y, 'g', -1, 64)
	}
	return data
}

var scenarios = []scenario{
	furnaces("plain", "porosity", "", nil),
	furnaces("weighted", "porosity", " weighted w", func(s *scenario) { s.weighted = true }),
	furnaces("counted", "porosity", " counted m", func(s *scenario) { s.counted = true }),
	furnaces("weighted, counted and known", "porosity", " + known(temp/8) weighted w counted m", func(s *scenario) {
		s.weighted, s.counted = true, true
		s.known = func(d disc) float64 { return value(d.temp) / 8 }
	}),
	furnaces("transformed response", "log(porosity)", "", func(s *scenario) {
		s.response = func(d disc) float64 { return math.Log(value(d.porosity)) }
		s.log = true
	}),
	{
		name: "through the origin", model: "porosity ~ hold + temp - intercept", data: plain,
		row:   func(d disc) []float64 { return []float64{value(d.hold), value(d.temp)} },
		names: []string{"hold", "temp"},
		terms: []handTerm{{"hold", []int{0}, []int{1}, nil}, {"temp", []int{1}, []int{0}, []int{0}}}, response: porosity,
	},
	furnaces("n = p", "porosity", "", func(s *scenario) {
		s.data = []disc{plain[0], plain[3], plain[5], plain[8], plain[10], plain[12]}
		s.saturated = true
	}),
	furnaces("exact fit", "porosity", "", func(s *scenario) { s.data, s.exact = linear(), true }),
	furnaces("rows set aside", "porosity", "", func(s *scenario) {
		s.data = append([]disc{{"F2", "10", "1.75", "1", "1", ""}}, plain...)
		s.data = append(s.data, disc{"F3", "", "2.5", "1", "1", "33.3"})
		s.setAside = true
		s.fitted = span(1, 15)
	}),
	furnaces("weight 0", "porosity", " weighted w", func(s *scenario) {
		s.data = append([]disc{{"F2", "15", "1.75", "0", "1", "99"}}, plain...)
		s.weighted = true
		s.fitted = span(1, 15)
	}),
}

func span(from, to int) []int {
	var out []int
	for i := from; i < to; i++ {
		out = append(out, i)
	}
	return out
}

// tableOf makes the table; without the response when it is to be predicted.
func tableOf(t *testing.T, data []disc, response bool) *design.Table {
	t.Helper()
	var b strings.Builder
	b.WriteString("furnace,hold,temp,w,m")
	if response {
		b.WriteString(",porosity")
	}
	b.WriteString("\n")
	for _, d := range data {
		cells := []string{d.furnace, d.hold, d.temp, d.w, d.m}
		if response {
			cells = append(cells, d.porosity)
		}
		b.WriteString(strings.Join(cells, ",") + "\n")
	}
	table, err := design.ReadCSV(strings.NewReader(b.String()), nil)
	if err != nil {
		t.Fatal(err)
	}
	return table
}

// An oracle answers by rational arithmetic on the model by hand.
type oracle struct {
	scenario
	used  []disc
	rows  []int      // table row numbers
	p     *problem   // with y less the known terms
	y     []*big.Rat // the response itself
	s     *solution
	cases int
	df    int
}

func newOracle(sc scenario) *oracle {
	o := &oracle{scenario: sc}
	if sc.fitted == nil {
		sc.fitted = span(0, len(sc.data))
	}
	o.p = &problem{}
	for _, i := range sc.fitted {
		d := sc.data[i]
		o.used = append(o.used, d)
		o.rows = append(o.rows, i+1)
		o.p.x = append(o.p.x, rats(sc.row(d)))
		o.y = append(o.y, rats([]float64{sc.response(d)})[0])
		o.p.y = append(o.p.y, new(big.Rat).Sub(o.y[len(o.y)-1], o.knownAt(d)))
		o.p.w = append(o.p.w, new(big.Rat).Mul(o.weight(d), o.count(d)))
		o.cases += int(float(o.count(d)))
	}
	o.s = o.p.solve()
	o.df = o.cases - len(sc.names)
	return o
}

func rats(v []float64) []*big.Rat {
	out := make([]*big.Rat, len(v))
	for i := range v {
		out[i] = new(big.Rat).SetFloat64(v[i])
	}
	return out
}

func (o *oracle) knownAt(d disc) *big.Rat {
	if o.known == nil {
		return new(big.Rat)
	}
	return rats([]float64{o.known(d)})[0]
}

func (o *oracle) weight(d disc) *big.Rat {
	if !o.weighted {
		return big.NewRat(1, 1)
	}
	return rats([]float64{value(d.w)})[0]
}

func (o *oracle) count(d disc) *big.Rat {
	if !o.counted {
		return big.NewRat(1, 1)
	}
	return rats([]float64{value(d.m)})[0]
}

// dispersion is RSS/df, exactly.
func (o *oracle) dispersion() *big.Rat {
	return new(big.Rat).Quo(o.s.rss, big.NewRat(int64(o.df), 1))
}

// rssOf is the residual sum of squares with some of the columns only.
func (o *oracle) rssOf(columns []int) *big.Rat {
	sub := &problem{w: o.p.w, y: o.p.y}
	for _, row := range o.p.x {
		var x []*big.Rat
		for _, j := range columns {
			x = append(x, row[j])
		}
		sub.x = append(sub.x, x)
	}
	return sub.solve().rss
}

// without is the solution with one case of row i left out.
func (o *oracle) without(i int) *solution {
	q := &problem{x: o.p.x, y: o.p.y, w: append([]*big.Rat(nil), o.p.w...)}
	q.w[i] = new(big.Rat).Sub(q.w[i], o.weight(o.used[i]))
	return q.solve()
}

func root(r *big.Rat) float64 {
	f, _ := new(big.Float).Sqrt(new(big.Float).SetPrec(bits).SetRat(r)).Float64()
	return f
}

func mul(a ...*big.Rat) *big.Rat {
	out := big.NewRat(1, 1)
	for _, x := range a {
		out.Mul(out, x)
	}
	return out
}
