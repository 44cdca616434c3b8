package design

import (
	"errors"
	"fmt"
	"os"
	"strings"
	"testing"

	"example.com/trammel/formula"
)

// refusalData are the tables of TestModelRefusals.
var refusalData = map[string]string{
	"plant": "furnace,supplier,hold,temp,machine,day,open,porosity,batch,w,m,oven_1,oven_2\n" +
		"F1,north,10,900,1,a,true,4,10,1,1,1,0\n" +
		"F1,river,12,910,2,b,false,5,10,2,2,1,0\n" +
		"F2,north,14,905,1,a,true,7,10,1,1,0,1\n" +
		"F2,river,16,920,2,b,false,6,10,1,3,0,1\n" +
		"F10,north,18,915,1,a,true,9,10,3,1,0,0\n" +
		"F10,river,20,925,2,b,false,8,10,1,1,0,0\n",
	"holes":   "hold,porosity,furnace\n10,4,F1\n,5,F1\n14,NaN,F2\n16,,F2\n18,inf,F2\n20,6,\n22,9,F1\n24,8,F2\n",
	"gaps":    "furnace,supplier,hold,porosity\nF1,north,1,4\nF1,river,2,5\nF2,north,3,6\nF2,north,4,8\nF1,north,5,7\n",
	"text":    "hold,porosity\n10,4\n12,off\n14,5\n",
	"weights": "hold,porosity,w,m\n10,4,1,1\n12,5,-1,1.5\n14,5,2,-1\n16,7,0,0\n",
	"few":     "hold,porosity\n10,4\n12,5\n",
	"zero":    "hold,porosity,w\n10,4,0\n12,5,0\n",
	"ties":    "hold,porosity\n1,4\n1,5\n1,6\n1,5\n1,3\n2,7\n3,9\n4,9\n",
	"counts":  "rejects,inspected,area,hold\n1,10,2,1\n3,2,0,2\n2,10,1,3\n1.5,10,4,4\n",
	"near":    "Furnace,hold time,grade,porosity\nF1,10,low,4\nF2,11,Low ,5\nF1,12,low,6\nF2,13,mid,7\n",
	"heads":   "machine,head,hold,porosity\nM1,1,1,4\nM1,2,2,5\nM2,1,3,6\nM2,2,5,8\nM1,1,5,7\n",
}

// TestModelRefusals compares the whole texts of the refusals of models with
// testdata/refusals_model.txt; TRAMMEL_UPDATE=1 writes that file anew. paste is
// the text that the message tells to write: it stands in the message, and it,
// or the model it belongs in, compiles.
func TestModelRefusals(t *testing.T) {
	var got strings.Builder
	seen := make(map[Code]bool)
	for _, c := range []struct {
		data, model string
		paste       string // must stand in the message …
		mended      string // … and this model compiles; "" means paste itself
	}{
		{"plant", "porosity ~ furnace", "cat(furnace)", "porosity ~ cat(furnace)"},
		{"plant", "porosity ~ hold + holdd", "hold", "porosity ~ hold"},
		{"plant", "porosity ~ F2", "cat(furnace)", "porosity ~ cat(furnace)"},
		{"plant", "porosity ~ F2 + hold", "num(furnace='F2')", "porosity ~ num(furnace='F2') + hold"},
		{"plant", "porosity ~ Hold", "hold", "porosity ~ hold"},
		{"near", "porosity ~ cat(furnace)", "Furnace", "porosity ~ cat(Furnace)"},
		{"near", "porosity ~ holdtime", `"hold time"`, `porosity ~ "hold time"`},
		{"plant", "porosity ~ alpha + beta + gamma", "", ""},
		{"plant", "furnace ~ hold", "", ""},
		{"text", "porosity ~ hold", "", ""},
		{"holes", "porosity ~ hold", "", ""},
		{"holes", "porosity ~ hold + cat(furnace)", "", ""},
		{"plant", "porosity ~ cat(batch)", "", "porosity ~ intercept"},
		{"plant", "porosity ~ hold + hold by cat(batch)", "", "porosity ~ hold"},
		{"plant", "porosity ~ cat(furnace in ('F1', 'F2'))", "in ('F1', 'F2', 'F10')", "porosity ~ cat(furnace in ('F1', 'F2', 'F10'))"},
		{"plant", "porosity ~ cat(furnace in ('F1', 'F2', 'F10', 'F20'))", "", "porosity ~ cat(furnace in ('F1', 'F2', 'F10'))"},
		{"plant", "porosity ~ cat(furnace in ('F1', 'F2', 'F1', others))", "", "porosity ~ cat(furnace in ('F1', 'F2', others))"},
		{"plant", "porosity ~ cat(furnace in ('F1', 'F2', 'F10', others))", "take others out", "porosity ~ cat(furnace in ('F1', 'F2', 'F10'))"},
		{"plant", "porosity ~ cat(furnace in (1, 2))", "'1'", ""},
		{"plant", "porosity ~ cat(machine in ('1', '2'))", "write 1", "porosity ~ cat(machine in (1, 2))"},
		{"plant", "porosity ~ cat(open against 'true')", "true or false", "porosity ~ cat(open against true)"},
		{"plant", "porosity ~ cat(furnace against 'F3')", "'F", "porosity ~ cat(furnace against 'F2')"},
		{"plant", "porosity ~ cat(furnace against 'F2') + hold by cat(furnace against mean)", "cat(furnace)", "porosity ~ cat(furnace against 'F2') + hold by cat(furnace)"},
		{"plant", "porosity ~ cat(furnace, supplier against 'north')", "cat(furnace, supplier)", "porosity ~ cat(furnace, supplier)"},
		{"plant", "porosity ~ cat(furnace, furnace)", "", "porosity ~ cat(furnace)"},
		{"near", "porosity ~ cat(grade in ('low', 'mid'))", "spaces", ""},
		{"plant", "porosity ~ num(furnace='F2') + num(machine='1')", "without quotes", "porosity ~ num(furnace='F2') + num(machine=1)"},
		{"plant", "porosity ~ num(furnace=1)", "'1'", "porosity ~ num(furnace='F1')"},
		{"plant", "porosity ~ (hold + temp) * hold", "powers(hold, 2)", "porosity ~ hold + temp + powers(hold, 2)"},
		{"plant", "porosity ~ hold - temp", "", "porosity ~ hold"},
		{"plant", "porosity ~ hold + (temp - intercept)", "- intercept", "porosity ~ hold + temp - intercept"},
		{"plant", "porosity ~ hold - intercept - hold", "porosity ~ intercept", ""},
		{"heads", "porosity ~ cat(head against mean) inside cat(machine)", "take out against", "porosity ~ cat(head) inside cat(machine)"},
		{"heads", "porosity ~ cat(head) inside cat(head)", "", "porosity ~ cat(head) inside cat(machine)"},
		{"plant", "porosity ~ log(hold - 10)", "", "porosity ~ log(hold)"},
		{"plant", "log(porosity - 4) ~ hold", "", "log(porosity) ~ hold"},
		{"plant", "porosity ~ num(1/(hold - 14))", "", "porosity ~ num(1/hold)"},
		{"plant", "porosity ~ legendre(batch, 2)", "take the term out", "porosity ~ intercept"},
		{"plant", "porosity ~ spline(batch, 2)", "take the term out", "porosity ~ intercept"},
		{"ties", "porosity ~ spline(hold, 3)", "powers(hold, 2)", "porosity ~ powers(hold, 2)"},
		{"weights", "porosity ~ hold weighted w", "", ""},
		{"weights", "porosity ~ hold counted m", "weighted", ""},
		{"zero", "porosity ~ hold weighted w", "", ""},
		{"few", "porosity ~ powers(hold, 2)", "", "porosity ~ hold"},
		{"counts", "rejects out of inspected ~ hold as binomial", "", ""},
		{"counts", "rejects per area ~ hold as poisson", "", ""},
		{"counts", "rejects ~ hold as binomial", "out of", ""},
		{"gaps", "porosity ~ cat(furnace)*cat(supplier)", "porosity ~ cat(furnace, supplier)", ""},
		{"gaps", "porosity ~ hold + cat(furnace) by cat(supplier)", "porosity ~ hold + cat(furnace, supplier)", ""},
		{"plant", "porosity ~ cat(furnace) + cat(supplier) + cat(machine)", "", ""},
		{"plant", "porosity ~ num(furnace='F1') + num(furnace='F2') + num(furnace='F10')", "", ""},
		{"plant", "porosity ~ hold + num(2*hold + 3)", "porosity ~ hold", ""},
		{"plant", "porosity ~ hold + num(hold/3 + temp/7) + temp", "", ""},
		{"plant", "porosity = a*exp(-k*hold) + b fitting a, k", "fitting b", "porosity = a*exp(-k*hold) + b fitting a, k, b"},
		{"plant", "porosity = a*exp(-k*holt) fitting a, k", "hold", "porosity = a*exp(-k*hold) fitting a, k"},
		{"plant", "porosity = a*exp(-temp*hold) fitting a, temp", "another name", "porosity = a*exp(-k*hold) fitting a, k"},
		{"plant", "porosity = a*furnace fitting a", "", ""},
		{"plant", "porosity = a*exp(-k*hold) fitting a, k ~ oven_1 + num(2*oven_1)", "model of k", "porosity = a*exp(-k*hold) fitting a, k ~ oven_1"},
		{"plant", "porosity = a*log(hold - 10) fitting a", "", "porosity = a*log(hold) fitting a"},
	} {
		table, err := ReadCSV(strings.NewReader(refusalData[c.data]), nil)
		if err != nil {
			t.Fatal(err)
		}
		m, err := formula.Parse(c.model)
		if err != nil {
			t.Errorf("%s: %v", c.model, err)
			continue
		}
		_, err = Compile(m, table, nil)
		var e *Error
		if !errors.As(err, &e) {
			t.Errorf("%s: got %v, want a refusal", c.model, err)
			continue
		}
		seen[e.Code] = true
		fmt.Fprintf(&got, "== %s: %s\n%s\n", c.data, e.Code, e)
		if !strings.Contains(e.Error(), c.paste) {
			t.Errorf("%s: the message does not say %q:\n%v", c.model, c.paste, e)
		}
		mended := c.mended
		if mended == "" && strings.Contains(c.paste, "~") {
			mended = c.paste
		}
		for _, text := range append([]string{mended}, e.Mends...) {
			if text == "" {
				continue
			}
			if _, err := Compile(parse(t, text), table, nil); err != nil {
				t.Errorf("%s: the mended model %s is refused:\n%v", c.model, text, err)
			}
		}
	}
	for _, c := range Codes()[20:] {
		if !seen[c] && c != codeNotATerm && c != codeUnseenLevel && c != codeWrongKind {
			t.Errorf("no refusal shows the code %s", c)
		}
	}
	compareGolden(t, "testdata/refusals_model.txt", got.String())
}

// TestPredictionRefusals holds the texts of refusals of rows to predict.
func TestPredictionRefusals(t *testing.T) {
	table, err := ReadCSV(strings.NewReader(refusalData["plant"]), nil)
	if err != nil {
		t.Fatal(err)
	}
	var got strings.Builder
	for _, c := range []struct{ model, rows string }{
		{"porosity ~ hold + cat(furnace)", "furnace,hold\nF1,3\nF3,4\nF3,5\n"},
		{"porosity ~ hold + cat(furnace)", "furnace,hold\nF1,3\nf2,4\n"},
		{"porosity ~ cat(furnace, machine)", "furnace,machine\nF1,1\nF1,3\n"},
		{"porosity ~ cat(supplier) inside cat(machine)", "furnace,machine,supplier\nF1,1,east\n"},
		{"porosity ~ hold + cat(furnace)", "furnace\nF1\n"},
		{"porosity ~ hold + cat(furnace)", "furnace,hold\nF1,low\n"},
		{"porosity ~ hold + cat(furnace)", "furnace,hold\nF1,\nF2,3\n"},
		{"porosity ~ log(hold)", "hold\n3\n0\n-1\n"},
	} {
		p, err := Prepare(parse(t, c.model), table, &Options{NoRankCheck: true})
		if err != nil {
			t.Fatal(err)
		}
		rows, err := ReadCSV(strings.NewReader(c.rows), nil)
		if err != nil {
			t.Fatal(err)
		}
		_, err = p.Plan.Matrix(rows)
		var e *Error
		if !errors.As(err, &e) {
			t.Errorf("%s for\n%s: got %v, want a refusal", c.model, c.rows, err)
			continue
		}
		fmt.Fprintf(&got, "== %s: %s\n%s\n", strings.ReplaceAll(c.rows, "\n", " "), e.Code, e)
	}
	compareGolden(t, "testdata/refusals_prediction.txt", got.String())
}

// compareGolden compares text with a golden file line by line; TRAMMEL_UPDATE=1
// writes the file anew.
func compareGolden(t *testing.T, path, got string) {
	t.Helper()
	if os.Getenv("TRAMMEL_UPDATE") != "" {
		if err := os.WriteFile(path, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	gotLines, wantLines := strings.Split(got, "\n"), strings.Split(string(want), "\n")
	for i := range max(len(gotLines), len(wantLines)) {
		g, w := "(end)", "(end)"
		if i < len(gotLines) {
			g = gotLines[i]
		}
		if i < len(wantLines) {
			w = wantLines[i]
		}
		if g != w {
			t.Fatalf("%s, line %d:\n got %s\nwant %s", path, i+1, g, w)
		}
	}
}
