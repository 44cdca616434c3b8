package trammel

import (
	"encoding/json"
	"io"
	"math"
	"strconv"
)

// A number is a float64 in JSON: the shortest text that reads back as the same
// value, null when it is not defined or not finite.
type number float64

func (x number) MarshalJSON() ([]byte, error) {
	v := float64(x)
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return []byte("null"), nil
	}
	return strconv.AppendFloat(nil, v, 'g', -1, 64), nil
}

type jsonSummary struct {
	Model  string `json:"model"`
	Fitter string `json:"fitter"`
	Path   string `json:"path"`
	Rows   struct {
		Given    int   `json:"given"`
		Used     int   `json:"used"`
		SetAside []int `json:"set_aside"`
	} `json:"rows"`
	Coefficients     []jsonCoefficient `json:"coefficients"`
	Derived          []jsonCoefficient `json:"derived"`
	Freedom          int               `json:"freedom"`
	ResidualSD       number            `json:"residual_sd"`
	ResidualSS       number            `json:"residual_ss"`
	RSquared         number            `json:"r_squared"`
	AdjustedRSquared number            `json:"adjusted_r_squared"`
	LogLikelihood    number            `json:"log_likelihood"`
	AIC              number            `json:"aic"`
	AICc             number            `json:"aicc"`
	BIC              number            `json:"bic"`
	Terms            []jsonTerm        `json:"terms"`
	Deviance         number            `json:"deviance"`
	NullDeviance     number            `json:"null_deviance"`
	Pearson          number            `json:"pearson"`
	Dispersion       number            `json:"dispersion"`
	End              struct {
		Reason     string `json:"reason"`
		Iterations int    `json:"iterations"`
		Measure    number `json:"measure"`
		Tolerance  number `json:"tolerance"`
	} `json:"end"`
	Minima *[]jsonMinimum `json:"minima,omitempty"` // of a search only
	Notes  []string       `json:"notes"`
}

type jsonMinimum struct {
	ResidualSS number            `json:"residual_ss"`
	Parameters map[string]number `json:"parameters"`
	Starts     int               `json:"starts"`
}

type jsonCoefficient struct {
	Name     string `json:"name"`
	Meaning  string `json:"meaning"`
	Estimate number `json:"estimate"`
	StdError number `json:"std_error"`
	Low      number `json:"low"`
	High     number `json:"high"`
	P        number `json:"p"`
}

type jsonTerm struct {
	Term string `json:"term"`
	DF   int    `json:"df"`
	SS   number `json:"ss"`
	F    number `json:"f"`
	Chi2 number `json:"chi2"`
	P    number `json:"p"`
}

// WriteJSON writes the summary as one indented JSON object. Every key is always
// present; what is not defined is null. Numbers read back as the same float64.
// "coefficients" are the fitted columns in order, "terms" each term given all
// others that do not contain it, "notes" the sentences of Notes and then of
// Findings. Errors are those of w.
func (s *Summary) WriteJSON(w io.Writer) error {
	g := &s.Goodness
	out := jsonSummary{
		Model: s.Model, Fitter: s.Fitter, Path: s.Path,
		Coefficients: jsonCoefficients(s.Coefficients), Derived: jsonCoefficients(s.Derived), Freedom: s.Freedom,
		ResidualSD: number(g.ResidualSD), ResidualSS: number(g.ResidualSS),
		RSquared: number(g.RSquared), AdjustedRSquared: number(g.AdjustedRSquared),
		LogLikelihood: number(g.LogLikelihood), AIC: number(g.AIC), AICc: number(g.AICc), BIC: number(g.BIC),
		Terms: make([]jsonTerm, len(s.Terms)), Notes: []string{},
		Deviance: number(g.Deviance), NullDeviance: number(g.NullDeviance), Pearson: number(g.Pearson), Dispersion: number(g.Dispersion),
	}
	out.Rows.Given, out.Rows.Used = s.Rows.Given, s.Rows.Used
	out.Rows.SetAside = append([]int{}, s.Rows.SetAside...)
	for i, t := range s.Terms {
		nan := number(math.NaN())
		row := jsonTerm{Term: t.Term, DF: t.DF, SS: number(t.SS), F: nan, Chi2: nan, P: number(t.P)}
		if t.Chi2 {
			row.Chi2 = number(t.Stat)
		} else {
			row.F = number(t.Stat)
		}
		out.Terms[i] = row
	}
	out.End.Reason, out.End.Iterations = s.End.Reason, s.End.Iterations
	out.End.Measure, out.End.Tolerance = number(s.End.Measure), number(s.End.Tolerance)
	if s.Minima != nil {
		list := make([]jsonMinimum, len(s.Minima))
		for i, m := range s.Minima {
			list[i] = jsonMinimum{number(m.ResidualSS), make(map[string]number), m.Starts}
			for j, v := range m.Estimates {
				list[i].Parameters[s.Coefficients[j].Name] = number(v)
			}
		}
		out.Minima = &list
	}
	for _, list := range [][]Note{s.Notes, s.Findings} {
		for _, n := range list {
			out.Notes = append(out.Notes, n.Text)
		}
	}
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	return e.Encode(out)
}

func jsonCoefficients(list []Coefficient) []jsonCoefficient {
	out := make([]jsonCoefficient, len(list))
	for i, c := range list {
		out[i] = jsonCoefficient{c.Name, c.Meaning, number(c.Estimate), number(c.StdError), number(c.Low), number(c.High), number(c.P)}
	}
	return out
}
