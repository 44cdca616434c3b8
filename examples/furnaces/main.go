// Command furnaces does the main job on the plant's invented data: it asks which
// sintering furnace differs from which, in offset and in rate, whether the
// powder supplier matters, and shows how a model with a full set of hand-made
// indicator columns is refused. It writes nothing but its report.
package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/linfit"
)

func main() {
	path := "testdata/furnaces.csv"
	if len(os.Args) > 1 {
		path = os.Args[1]
	}
	if err := run(context.Background(), path, os.Stdout); err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(1)
	}
}

func run(ctx context.Context, path string, w io.Writer) error {
	file, err := os.Open(path)
	if err != nil {
		return fmt.Errorf("furnaces: %w; run it from the root of the repository, or name a CSV file", err)
	}
	defer file.Close()
	table, err := design.ReadCSV(file, nil)
	if err != nil {
		return err
	}

	fmt.Fprintf(w, "1. Which furnace differs, in offset or in rate?\n\n")
	lines, err := linfit.Fit(ctx, "porosity ~ hold * cat(furnace)", table, nil)
	if err != nil {
		return err
	}
	if err := report(lines, w); err != nil {
		return err
	}

	fmt.Fprintf(w, "\n2. Does the powder supplier matter, in offset or in rate?\n\n")
	supplied, err := linfit.Fit(ctx, "porosity ~ hold * cat(furnace) + hold * cat(supplier)", table, nil)
	if err != nil {
		return err
	}
	tests, err := trammel.Terms(supplied)
	if err != nil {
		return err
	}
	for _, t := range tests {
		if t.Term == "cat(supplier)" || t.Term == "hold by cat(supplier)" {
			verdict := "no sign that it matters"
			if t.P < 0.05 {
				verdict = "it matters"
			}
			fmt.Fprintf(w, "%-22s  F = %.2f on %d and %d, p = %.3f: %s\n", t.Term, t.Stat, t.DF, supplied.Freedom(), t.P, verdict)
		}
	}

	fmt.Fprintf(w, "\n3. A full set of hand-made 0/1 columns beside the intercept is refused:\n\n")
	_, err = linfit.Fit(ctx, "porosity ~ hold + oven_1 + oven_2 + oven_3 + oven_4", table, nil)
	var refusal *design.Error
	if !errors.As(err, &refusal) {
		return fmt.Errorf("furnaces: the full indicator set was not refused: %v", err)
	}
	fmt.Fprintln(w, refusal)
	return nil
}

func report(r trammel.Result, w io.Writer) error {
	summary, err := trammel.Summarize(r, nil)
	if err != nil {
		return err
	}
	return summary.WriteReport(w)
}
