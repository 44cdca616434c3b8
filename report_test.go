package trammel_test

import (
	"bytes"
	"errors"
	"io"
	"os"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
)

// frozenDiscs are those of the furnaces scenario as they once were: reports stay the
// same when the scenario gets another seed.
const frozenDiscs = "testdata/report_discs.csv"

// TestReports compares whole reports with testdata/report_*.txt. TRAMMEL_UPDATE=1
// writes the files anew; the numbers in them are checked by TestConformance.
func TestReports(t *testing.T) {
	file, err := os.Open(frozenDiscs)
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	discs, err := design.ReadCSV(file, nil)
	if err != nil {
		t.Fatal(err)
	}
	scenarioTable := func(name string) *design.Table {
		for _, sc := range scenarios {
			if sc.name == name {
				return tableOf(t, sc.data, true)
			}
		}
		t.Fatal("no scenario ", name)
		return nil
	}
	// A report shows three digits of standard errors, which every platform agrees on.
	for _, c := range []struct {
		name, model string
		table       *design.Table
		level       float64
		setAside    bool
	}{
		{"furnaces", "porosity ~ hold * cat(furnace)", discs, 0.95, false},
		{"mean", "log(porosity) ~ hold + cat(furnace against mean) + known(disc/1000)", discs, 0.99, false},
		{"origin", "porosity ~ hold - intercept", discs, 0.95, false},
		{"saturated", "porosity ~ " + furnaceTerms, scenarioTable("n = p"), 0.95, false},
		{"exact", "porosity ~ hold * cat(furnace)", scenarioTable("exact fit"), 0.95, false},
		{"aside", "porosity ~ hold + cat(furnace) weighted w counted m", scenarioTable("rows set aside"), 0.9, true},
		{"bent", "porosity ~ legendre(hold, 2) * cat(supplier)", discs, 0.95, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			r, err := exactFit(c.model, c.table, c.setAside)
			if err != nil {
				t.Fatal(err)
			}
			s, err := trammel.Summarize(r, &trammel.SummaryOptions{Level: c.level})
			if err != nil {
				t.Fatal(err)
			}
			var got bytes.Buffer
			if err := s.WriteReport(&got); err != nil {
				t.Fatal(err)
			}
			name := "testdata/report_" + c.name + ".txt"
			if os.Getenv("TRAMMEL_UPDATE") == "1" {
				if err := os.WriteFile(name, got.Bytes(), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(name)
			if err != nil {
				t.Fatal(err)
			}
			if line, a, b := firstDifference(got.String(), string(want)); line > 0 {
				t.Errorf("%s, line %d:\ngot  %s\nwant %s", name, line, a, b)
			}
		})
	}
}

func firstDifference(got, want string) (line int, a, b string) {
	if got == want {
		return 0, "", ""
	}
	g, w := strings.Split(got, "\n"), strings.Split(want, "\n")
	for i := 0; ; i++ {
		switch {
		case i == len(g):
			return i + 1, "", w[i]
		case i == len(w):
			return i + 1, g[i], ""
		case g[i] != w[i]:
			return i + 1, g[i], w[i]
		}
	}
}

// TestWriteErrors passes the writer's error on.
func TestWriteErrors(t *testing.T) {
	r, err := exactFit("porosity ~ hold", tableOf(t, plain, true), false)
	if err != nil {
		t.Fatal(err)
	}
	s, err := trammel.Summarize(r, nil)
	if err != nil {
		t.Fatal(err)
	}
	broken, w := io.Pipe()
	broken.Close()
	for _, write := range []func(io.Writer) error{s.WriteReport, s.WriteJSON} {
		if err := write(w); !errors.Is(err, io.ErrClosedPipe) {
			t.Errorf("got %v", err)
		}
	}
}

// TestSkipChecks leaves out the checks and says so.
func TestSkipChecks(t *testing.T) {
	x, y := line()
	y[10] += 9
	table, err := design.NewTable(design.Numbers("x", x), design.Numbers("y", y))
	if err != nil {
		t.Fatal(err)
	}
	r, err := exactFit("y ~ x", table, false)
	if err != nil {
		t.Fatal(err)
	}
	s, err := trammel.Summarize(r, &trammel.SummaryOptions{SkipChecks: true})
	if err != nil {
		t.Fatal(err)
	}
	var b strings.Builder
	if err := s.WriteReport(&b); err != nil {
		t.Fatal(err)
	}
	if len(s.Findings) > 0 || !strings.Contains(b.String(), "No checks were made") {
		t.Errorf("findings %v in\n%s", s.Findings, b.String())
	}
}
