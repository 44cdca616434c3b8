package house

import (
	"bytes"
	"context"
	"io"
	"os"
	"regexp"
	"strings"
	"testing"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/linfit"
)

// fiveLines is the Go of the README, run as it stands there.
func fiveLines(ctx context.Context, file io.Reader, out io.Writer, tomorrow *design.Table) (*trammel.Predictions, []error) {
	// README begins
	table, err1 := design.ReadCSV(file, nil)
	result, err2 := linfit.Fit(ctx, "porosity ~ hold * cat(furnace)", table, nil)
	summary, err3 := trammel.Summarize(result, nil)
	err4 := summary.WriteReport(out)
	predicted, err5 := trammel.Predict(result, tomorrow, nil)
	// README ends
	return predicted, []error{err1, err2, err3, err4, err5}
}

// TestREADME holds that the README's Go is the code of fiveLines and does what
// it says, and that the refusal it shows is the real one.
func TestREADME(t *testing.T) {
	readme := read(t, "README.md")
	source := read(t, "internal/house/readme_test.go")
	_, body, _ := strings.Cut(source, "// README begins\n")
	body, _, _ = strings.Cut(body, "\t// README ends")
	want := strings.ReplaceAll(body, "\t", "")
	if got := block(t, readme, "```go\n"); got != want {
		t.Errorf("the Go of the README is\n%swant\n%s", got, want)
	}

	file := strings.NewReader(read(t, "testdata/furnaces.csv"))
	tomorrow, err := design.NewTable(design.Texts("furnace", []string{"F1", "F3"}), design.Numbers("hold", []float64{15, 15}))
	if err != nil {
		t.Fatal(err)
	}
	var out bytes.Buffer
	predicted, errs := fiveLines(context.Background(), file, &out, tomorrow)
	for _, err := range errs {
		if err != nil {
			t.Fatal(err)
		}
	}
	if len(predicted.Rows) != 2 || !strings.Contains(out.String(), "hold by furnace='F3'") {
		t.Errorf("predictions %v, report\n%s", predicted, &out)
	}

	table, err := design.ReadCSV(strings.NewReader(read(t, "testdata/furnaces.csv")), nil)
	if err != nil {
		t.Fatal(err)
	}
	_, err = linfit.Fit(context.Background(), "porosity ~ hold + oven_1 + oven_2 + oven_3 + oven_4", table, nil)
	if err == nil {
		t.Fatal("the full set of indicators is fitted")
	}
	if got := block(t, readme, "<!-- refusal: kept equal to the real text by TestREADME -->\n```\n"); got != err.Error()+"\n" {
		t.Errorf("the README shows\n%swant\n%v", got, err)
	}

	// The two commands stand alone, and .ci/run reads the second from here.
	commands := regexp.MustCompile(`(?m)^    (go .*)$`).FindAllStringSubmatch(readme, 2)
	if len(commands) != 2 || commands[0][1] != "go run ./examples/furnaces" || commands[1][1] != "go test ./..." {
		t.Errorf("the README's first commands are %q", commands)
	}
}

// block is the text between a mark and the next fence.
func block(t *testing.T, text, mark string) string {
	t.Helper()
	_, after, ok := strings.Cut(text, mark)
	if !ok {
		t.Fatalf("the README has no block %q", mark)
	}
	inside, _, _ := strings.Cut(after, "```")
	return inside
}

// TestNoMachinePaths holds that no file names a folder of the machine it was
// written on.
func TestNoMachinePaths(t *testing.T) {
	home, err := os.Getwd()
	if err != nil {
		t.Fatal(err)
	}
	home = strings.TrimSuffix(home, "/internal/house")
	for _, name := range []string{"README.md", "DEVELOPERS.md", "testdata/README.md", ".ci/run"} {
		if strings.Contains(read(t, name), home) {
			t.Errorf("%s names %s", name, home)
		}
	}
}
