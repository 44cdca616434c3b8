package lsq

import (
	"encoding/csv"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"example.com/trammel/internal/dd"
	"example.com/trammel/internal/digits"
)

// The sets are NIST Statistical Reference Datasets; the answers compared with
// are those of the float64_input block of certified.json (see
// testdata/strd/README.md): exact rational arithmetic on the data as float64.

type strdAnswer struct {
	Estimates  []string `json:"estimates"`
	SDs        []string `json:"standard_deviations"`
	ResidualSD string   `json:"residual_sd"`
	R2         string   `json:"r_squared"`
	Residual   struct {
		SS string `json:"ss"`
	} `json:"residual"`
	Regression struct {
		SS string `json:"ss"`
	} `json:"regression"`
	Between struct {
		SS string `json:"ss"`
	} `json:"between"`
	Within struct {
		SS string `json:"ss"`
	} `json:"within"`
	LevelMeans []string `json:"level_means"`
}

type strdSet struct {
	Name      string     `json:"name"`
	Kind      string     `json:"kind"`
	File      string     `json:"file"`
	Design    []string   `json:"design"`
	Levels    []string   `json:"levels"`
	Intercept bool       `json:"intercept"`
	N         int        `json:"n"`
	DF        int        `json:"df"`
	Answer    strdAnswer `json:"float64_input"`
}

const strdDir = "../../testdata/strd"

func strdSets(t testing.TB, kind string) []strdSet {
	t.Helper()
	text, err := os.ReadFile(filepath.Join(strdDir, "certified.json"))
	if err != nil {
		t.Fatal(err)
	}
	var all struct {
		Datasets []json.RawMessage `json:"datasets"`
	}
	if err := json.Unmarshal(text, &all); err != nil {
		t.Fatal(err)
	}
	var out []strdSet
	for _, raw := range all.Datasets {
		var head struct {
			Kind string `json:"kind"`
		}
		if err := json.Unmarshal(raw, &head); err != nil {
			t.Fatal(err)
		}
		if head.Kind != kind {
			continue
		}
		var s strdSet
		if err := json.Unmarshal(raw, &s); err != nil {
			t.Fatal(err)
		}
		out = append(out, s)
	}
	return out
}

// strdRows reads the two columns of a set, the second as text.
func strdRows(t testing.TB, file string) [][]string {
	t.Helper()
	r, err := os.Open(filepath.Join(strdDir, file))
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	rows, err := csv.NewReader(r).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	return rows[1:]
}

func number(t testing.TB, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// strdProblem builds the design with exact powers of x as hi + lo pairs.
func strdProblem(t testing.TB, s strdSet) *Problem {
	rows := strdRows(t, s.File)
	n, p := len(rows), len(s.Design)
	pr := &Problem{N: n, P: p, X: make([]float64, n*p), XLo: make([]float64, n*p), Y: make([]float64, n)}
	for i, row := range rows {
		pr.Y[i] = number(t, row[0])
		x := number(t, row[1])
		for j, d := range s.Design {
			k := 1
			if d == "1" {
				k = 0
			} else if _, e, ok := strings.Cut(d, "^"); ok {
				k = int(number(t, e))
			}
			v := dd.Of(x).PowInt(k)
			pr.X[j*n+i], pr.XLo[j*n+i] = v.Hi, v.Lo
		}
	}
	return pr
}

// totalSS is Σ(y - shift)², the shift the dd mean or zero.
func totalSS(y []float64, centred bool) dd.Num {
	var mean, sum dd.Num
	if centred {
		for _, v := range y {
			mean = mean.AddF(v)
		}
		mean = mean.Div(dd.Of(float64(len(y))))
	}
	for _, v := range y {
		d := dd.Of(v).Sub(mean)
		sum = sum.Add(d.Mul(d))
	}
	return sum
}

func TestReferenceRegression(t *testing.T) {
	sets := strdSets(t, "linear")
	if len(sets) != 8 {
		t.Fatalf("%d linear sets, want 8", len(sets))
	}
	for _, s := range sets {
		t.Run(s.Name, func(t *testing.T) {
			p := strdProblem(t, s)
			f := Factorize(p, nil)
			if f.Rank() != p.P {
				t.Fatalf("rank %d of %d, pivots %v", f.Rank(), p.P, f.Pivots())
			}
			var sol Solution
			f.Solve(p.Y, nil, &sol)
			worst := 16.0
			check := func(what string, got float64, want string) {
				t.Helper()
				d := digits.AgreeString(got, want)
				worst = min(worst, d)
				if !(d >= 15) {
					t.Errorf("%s = %.17g, want %s: %.1f digits", what, got, want, d)
				}
			}
			diag := f.InverseDiag(nil)
			for j := range p.P {
				check("estimate "+s.Design[j], sol.B[j], s.Answer.Estimates[j])
			}
			estimates := worst
			worst = 16
			for j := range p.P {
				check("standard error "+s.Design[j], math.Sqrt(diag[j]*sol.RSS.Float()/float64(s.DF)), s.Answer.SDs[j])
			}
			errs := worst
			check("residual SS", sol.RSS.Float(), s.Answer.Residual.SS)
			tss := totalSS(p.Y, s.Intercept)
			check("R²", dd.Of(1).Sub(sol.RSS.Div(tss)).Float(), s.Answer.R2)
			check("regression SS", tss.Sub(sol.RSS).Float(), s.Answer.Regression.SS)
			t.Logf("digits: estimates %.1f, standard errors %.1f, all %.1f; condition %.3g; passes %d; last pivot %.2g",
				estimates, errs, worst, f.Condition(), sol.Passes, f.Pivots()[p.P-1])
		})
	}
}
