// Command fitfile fits one model to one data file and prints a report, or JSON.
//
//	go run ./examples/fitfile [-json] [-level 0.95] [-set-aside] [-seed 0] [-budget 0] -data FILE.csv 'MODEL TEXT'
//
// Terms are fitted by package linfit, equations by package nlfit.
// Refusals go to standard error, the plain sentence first, with exit status 1.
package main

import (
	"context"
	"errors"
	"flag"
	"fmt"
	"io"
	"os"
	"os/signal"
	"strings"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/linfit"
	"example.com/trammel/nlfit"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	code := run(ctx, os.Args[1:], os.Stdout, os.Stderr)
	stop()
	os.Exit(code)
}

const usage = "usage: fitfile [-json] [-level 0.95] [-set-aside] [-seed 0] [-budget 0] -data FILE.csv 'MODEL TEXT'\n"

// run does all the work and returns the exit status.
func run(ctx context.Context, args []string, stdout, stderr io.Writer) int {
	flags := flag.NewFlagSet("fitfile", flag.ContinueOnError)
	flags.SetOutput(io.Discard) // refusals are worded here
	asJSON := flags.Bool("json", false, "print JSON instead of a report")
	level := flags.Float64("level", 0.95, "confidence level of the intervals, in (0, 1)")
	seed := flags.Uint64("seed", 0, "equations: chooses the starts that the search tries")
	budget := flags.Int("budget", 0, "equations: evaluations the search may use; 0 for the default")
	setAside := flags.Bool("set-aside", false, "leave incomplete rows out instead of refusing them")
	data := flags.String("data", "", "CSV file with a header line")
	fail := func(err error) int {
		fmt.Fprintln(stderr, err)
		return 1
	}
	misused := func(format string, args ...any) int {
		fmt.Fprintf(stderr, "fitfile: "+format+"\n"+usage, args...)
		return 1
	}
	if err := flags.Parse(args); err != nil {
		if errors.Is(err, flag.ErrHelp) {
			fmt.Fprint(stdout, usage)
			flags.SetOutput(stdout)
			flags.PrintDefaults()
			return 0
		}
		return misused("%s", flagFault(err.Error()))
	}
	switch {
	case *data == "":
		return misused("no data file was named; write -data FILE.csv")
	case flags.NArg() == 0:
		return misused("no model was given; write it in single quotes after the flags")
	case flags.NArg() > 1:
		return misused("one model was expected and %d arguments follow the flags; put the model in single quotes, after all flags", flags.NArg())
	case !(*level > 0 && *level < 1):
		return misused("-level is %v; it must be above 0 and below 1, such as 0.95", *level)
	}
	table, err := readTable(*data)
	if err != nil {
		return fail(err)
	}
	model, err := formula.Parse(flags.Arg(0))
	if err != nil {
		return fail(err)
	}
	var result trammel.Result
	if model.Equation != nil {
		result, err = nlfit.Fit(ctx, flags.Arg(0), table, &nlfit.Options{SetAside: *setAside, Seed: *seed, Budget: *budget})
	} else {
		result, err = linfit.Fit(ctx, flags.Arg(0), table, &linfit.Options{SetAside: *setAside})
	}
	// An early-ended fit gives both a partial result and an error.
	if result != nil {
		if werr := write(stdout, result, *level, *asJSON); werr != nil && err == nil {
			err = werr
		}
	}
	if err != nil {
		return fail(err)
	}
	return 0
}

// flagFault words what is wrong with the flags; the flag library gives only its
// own text.
func flagFault(text string) string {
	if name, ok := strings.CutPrefix(text, "flag provided but not defined: "); ok {
		return "there is no flag " + name
	}
	if name, ok := strings.CutPrefix(text, "flag needs an argument: "); ok {
		return name + " needs a value after it"
	}
	if value, ok := strings.CutPrefix(text, "invalid value "); ok {
		if value, name, ok := strings.Cut(value, " for flag "); ok {
			name, _, _ = strings.Cut(name, ":")
			return name + " is " + value + ", which is no number it can take"
		}
	}
	return "the flags cannot be read; write them before the model, as below"
}

func readTable(path string) (*design.Table, error) {
	file, err := os.Open(path)
	if err != nil {
		var perr *os.PathError
		if errors.As(err, &perr) {
			err = perr.Err
		}
		return nil, fmt.Errorf("fitfile: the file %s cannot be read: %w", path, err)
	}
	defer file.Close()
	if info, err := file.Stat(); err == nil && info.IsDir() {
		return nil, fmt.Errorf("fitfile: %s is a folder; name a CSV file", path)
	}
	return design.ReadCSV(file, nil)
}

func write(w io.Writer, result trammel.Result, level float64, asJSON bool) error {
	summary, err := trammel.Summarize(result, &trammel.SummaryOptions{Level: level})
	if err != nil {
		return err
	}
	if asJSON {
		return summary.WriteJSON(w)
	}
	return summary.WriteReport(w)
}
