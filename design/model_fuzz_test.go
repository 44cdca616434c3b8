package design

import (
	"errors"
	"math"
	"strings"
	"testing"

	"example.com/trammel/formula"
)

// FuzzModel compiles any model text against any CSV text: it must give a plan
// whose matrix is finite and whose names are distinct, or a typed refusal;
// never a panic.
func FuzzModel(f *testing.F) {
	for name, csv := range refusalData {
		_ = name
		for _, model := range []string{
			"porosity ~ hold * cat(furnace)",
			"porosity ~ cat(head) inside cat(machine)",
			"log(porosity) ~ spline(hold, 2) by cat(furnace against mean) weighted w counted m",
			"porosity ~ upto(2, hold + cat(furnace) + cat(supplier)) - intercept",
			"rejects out of inspected ~ harmonics(hold, 24, 2) + hinge(hold, 3) as binomial",
			"porosity ~ oven_1 + oven_2 + quadratic(hold, temp) + known(hold)",
		} {
			f.Add(model, csv)
		}
	}
	f.Fuzz(func(t *testing.T, text, csv string) {
		if len(text) > 2000 || len(csv) > 4000 {
			return
		}
		table, err := ReadCSV(strings.NewReader(csv), nil)
		if err != nil {
			var e *Error
			if !errors.As(err, &e) {
				t.Fatalf("the table is refused by a %T: %v", err, err)
			}
			return
		}
		m, err := formula.Parse(text)
		if err != nil {
			return
		}
		for _, aside := range []bool{false, true} {
			frame, err := Prepare(m, table, &Options{SetAside: aside})
			if err != nil {
				var e *Error
				if !errors.As(err, &e) || e.Message == "" {
					t.Fatalf("the model is refused by a %T: %v", err, err)
				}
				if strings.ContainsAny(strings.SplitN(e.Error(), "\n", 2)[0], "\r") {
					t.Errorf("the first line is broken: %q", e.Error())
				}
				continue
			}
			n, p := frame.Matrix.Dims()
			if n < p || n != len(frame.Y) || p != len(frame.Plan.Columns()) {
				t.Fatalf("%d rows, %d columns, %d responses, %d names", n, p, len(frame.Y), len(frame.Plan.Columns()))
			}
			seen := make(map[string]bool)
			for j, c := range frame.Plan.Columns() {
				if seen[c.Name] || c.Meaning == "" {
					t.Fatalf("column %d: name %q is not new, or it has no meaning", j, c.Name)
				}
				seen[c.Name] = true
			}
			for i := range min(n, 20) {
				for j := range p {
					if v := frame.Matrix.At(i, j); math.IsNaN(v) || math.IsInf(v, 0) {
						t.Fatalf("entry %d, %d is %v", i, j, v)
					}
				}
			}
			again, err := frame.Plan.Frame(table, &Options{SetAside: aside})
			if err != nil {
				t.Fatalf("the plan refuses the rows it was made from: %v", err)
			}
			for i := range min(n, 20) {
				for j := range p {
					if frame.Matrix.At(i, j) != again.Matrix.At(i, j) {
						t.Fatalf("entry %d, %d is %v, and %v when made again", i, j, frame.Matrix.At(i, j), again.Matrix.At(i, j))
					}
				}
			}
		}
	})
}
