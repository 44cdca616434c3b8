package trammel_test

import (
	"context"
	"errors"
	"fmt"
	"log"
	"os"
	"strings"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/linfit"
)

// discs are invented measurements of sintered filter discs.
const discs = `furnace,hold,porosity
F1,10,38.4
F1,15,37.1
F1,20,35.6
F1,25,34.1
F1,30,32.8
F2,10,39.4
F2,15,38.0
F2,20,36.3
F2,25,34.9
F2,30,33.3
`

// fitDiscs fits one model to the discs.
func fitDiscs(model string) trammel.Result {
	table, err := design.ReadCSV(strings.NewReader(discs), nil)
	if err != nil {
		log.Fatal(err)
	}
	r, err := linfit.Fit(context.Background(), model, table, nil)
	if err != nil {
		log.Fatal(err)
	}
	return r
}

func ExampleCoefficients() {
	r := fitDiscs("porosity ~ hold + cat(furnace)")
	list, err := trammel.Coefficients(r, 0.95)
	if err != nil {
		log.Fatal(err)
	}
	for _, c := range list {
		fmt.Printf("%s (%s): %.2f, from %.2f to %.2f\n", c.Name, c.Meaning, c.Estimate, c.Low, c.High)
	}
	// Output:
	// intercept (porosity at hold = 0, F1): 41.50, from 41.22 to 41.78
	// hold (slope of hold): -0.30, from -0.31 to -0.28
	// furnace='F2' (change in porosity, F2 against F1): 0.78, from 0.61 to 0.95
}

func ExampleDerived() {
	r := fitDiscs("porosity ~ hold + cat(furnace against mean)")
	list, err := trammel.Derived(r, 0.95)
	if err != nil {
		log.Fatal(err)
	}
	for _, c := range list {
		fmt.Printf("%s: %.2f, from %.2f to %.2f\n", c.Name, c.Estimate, c.Low, c.High)
	}
	// Output:
	// furnace='F1' against mean: -0.39, from -0.48 to -0.30
}

func ExampleTerms() {
	r := fitDiscs("porosity ~ hold * cat(furnace)")
	tests, err := trammel.Terms(r)
	if err != nil {
		log.Fatal(err)
	}
	for _, t := range tests {
		fmt.Printf("%s: F = %.2f on %d and %d\n", t.Term, t.Stat, t.DF, r.Freedom())
	}
	// Output:
	// hold: F = 7459.29 on 1 and 6
	// cat(furnace): F = 260.74 on 1 and 6
	// hold by cat(furnace): F = 10.37 on 1 and 6
}

func ExamplePredict() {
	r := fitDiscs("log(porosity) ~ hold + cat(furnace)")
	ahead, err := design.ReadCSV(strings.NewReader("furnace,hold\nF1,18\nF2,18\n"), nil)
	if err != nil {
		log.Fatal(err)
	}
	p, err := trammel.Predict(r, ahead, &trammel.PredictOptions{Level: 0.9, Original: true})
	if err != nil {
		log.Fatal(err)
	}
	fmt.Println(p.Quantity)
	for i, row := range p.Rows {
		fmt.Printf("F%d: %.1f; a new disc between %.1f and %.1f\n", i+1, row.Mean, row.NewLow, row.NewHigh)
	}
	// Output:
	// median of porosity, mapped back from log(porosity)
	// F1: 36.1; a new disc between 35.9 and 36.4
	// F2: 36.9; a new disc between 36.7 and 37.2
}

func ExamplePredictTo() {
	r := fitDiscs("porosity ~ hold * cat(furnace)")
	ahead, err := design.ReadCSV(strings.NewReader("furnace,hold\nF1,18\nF2,18\n"), nil)
	if err != nil {
		log.Fatal(err)
	}
	mean := make([]float64, ahead.Rows())
	if err := trammel.PredictTo(mean, r, ahead); err != nil {
		log.Fatal(err)
	}
	fmt.Printf("%.2f\n", mean)
	// Output:
	// [36.17 36.99]
}

func ExampleDiagnose() {
	r := fitDiscs("porosity ~ hold + cat(furnace)")
	d, err := trammel.Diagnose(r)
	if err != nil {
		log.Fatal(err)
	}
	worst := 0
	for i, c := range d.Cook {
		if c > d.Cook[worst] {
			worst = i
		}
	}
	fmt.Printf("row %d moves the estimates most: Cook's distance %.2f\n", d.Row[worst], d.Cook[worst])
	// Output:
	// row 1 moves the estimates most: Cook's distance 0.61
}

func ExampleLackOfFit() {
	_, err := trammel.LackOfFit(fitDiscs("porosity ~ hold + cat(furnace)"))
	fmt.Println(errors.Is(err, trammel.Code("no-repeats")))
	fmt.Println(err)

	test, err := trammel.LackOfFit(fitDiscs("porosity ~ hold"))
	if err != nil {
		log.Fatal(err)
	}
	fmt.Printf("F = %.2f on %d and %d\n", test.F, test.DF, test.PureDF)
	// Output:
	// true
	// trammel: lack of fit cannot be tested: no two rows agree in everything the model uses; repeat some settings, or compare with a richer model such as one with powers
	// F = 0.02 on 3 and 5
}

func ExampleSummarize() {
	r := fitDiscs("porosity ~ hold + cat(furnace)")
	s, err := trammel.Summarize(r, nil)
	if err != nil {
		log.Fatal(err)
	}
	if err := s.WriteReport(os.Stdout); err != nil {
		log.Fatal(err)
	}
	// Output:
	// Model    porosity ~ hold + cat(furnace)
	// Data     10 rows, all fitted
	// Fit      linfit, refined QR: 3 coefficients, 7 degrees of freedom
	//
	// What each coefficient says
	//
	//   coefficient    estimate          95 % interval   std. error         p
	//   intercept        41.500       41.224 to 41.776        0.117   3.7e-16
	//       porosity at hold = 0, F1
	//   hold           -0.29500   -0.30735 to -0.28265      0.00522   1.4e-10
	//       slope of hold
	//   furnace='F2'     0.7800       0.6053 to 0.9547       0.0739   1.5e-05
	//       change in porosity, F2 against F1
	//
	// Does each term matter, given all others that do not contain it?
	//
	//   term           columns   sum of squares       F         p
	//   hold                 1           43.513    3189   1.4e-10
	//   cat(furnace)         1           1.5210   111.5   1.5e-05
	//
	// How well the model describes the data
	//
	//   Single cases scatter about it with a standard deviation of 0.1168 (7 degrees of freedom, sum of
	//   squares 0.095500).
	//   It accounts for 99.8 % of the variation of porosity about its mean (R² 0.998, adjusted 0.997).
	//   Log-likelihood 9.06669; AIC -10.1334, AICc -2.13337, BIC -8.92303, counting 4 estimated
	//   parameters.
	//
	// What to look at
	//
	//   - Nothing stands out among the rows and columns: no undue influence, no near-dependency, no
	//     curvature, no uneven scatter.
}
