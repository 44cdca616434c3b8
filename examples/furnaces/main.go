// Command furnaces does the main job on the plant's invented data: it asks which
// sintering furnace differs from which, in offset and in rate, whether the
// powder supplier matters, shows how a model with a full set of hand-made
// indicator columns is refused, and fits the law by which discs shrink, with one
// rate for all furnaces and with a rate for each. It writes nothing but its report.
package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/linfit"
	"example.com/trammel/nlfit"
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
	table, err := readTable(path)
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

	fmt.Fprintf(w, "\n4. Shrinkage approaches a limit: has each furnace a rate of its own?\n\n")
	discs, err := readTable(filepath.Join(filepath.Dir(path), "shrinkage.csv"))
	if err != nil {
		return err
	}
	common, err := nlfit.Fit(ctx, "shrink = limit*(1 - exp(-k*hold)) fitting limit > 0, k > 0", discs, nil)
	if err != nil {
		return err
	}
	own, err := nlfit.Fit(ctx, "shrink = limit*(1 - exp(-k*hold)) fitting limit > 0, k by cat(furnace) > 0", discs, nil)
	if err != nil {
		return err
	}
	c, err := trammel.Compare(common, own)
	if err != nil {
		return err
	}
	fmt.Fprintf(w, "A rate for each furnace against one rate for all: F = %.2f on %d and %d, p = %.2g.\n\n", c.Stat, c.DF, own.Freedom(), c.P)
	return report(own, w)
}

func readTable(path string) (*design.Table, error) {
	file, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("furnaces: %w; run it from the root of the repository, or name a CSV file", err)
	}
	defer file.Close()
	return design.ReadCSV(file, nil)
}

func report(r trammel.Result, w io.Writer) error {
	summary, err := trammel.Summarize(r, nil)
	if err != nil {
		return err
	}
	return summary.WriteReport(w)
}
