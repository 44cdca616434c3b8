package nlfit_test

import (
	"context"
	"fmt"
	"log"
	"math"
	"strings"

	"example.com/trammel"
	"example.com/trammel/design"
	"example.com/trammel/nlfit"
)

// The laws of the trade, each fitted without starting values to invented data of
// the plant: the constants behind the data stand in the comments, a small pattern
// of deviations is added.

// law prints the constants of an equation fitted to rows made by truth.
func law(equation string, xs []float64, truth func(x float64) float64) {
	var b strings.Builder
	b.WriteString("x,y\n")
	for i, x := range xs {
		wiggle := 1 + 0.001*math.Sin(float64(7*i)+1)
		fmt.Fprintf(&b, "%g,%.17g\n", x, truth(x)*wiggle)
	}
	table, err := design.ReadCSV(strings.NewReader(b.String()), nil)
	if err != nil {
		log.Fatal(err)
	}
	r, err := nlfit.Fit(context.Background(), equation, table, nil)
	if err != nil {
		log.Fatal(err)
	}
	coefs, err := trammel.Coefficients(r, 0.95)
	if err != nil {
		log.Fatal(err)
	}
	for _, c := range coefs {
		fmt.Printf("%s %.2g\n", c.Name, c.Estimate)
	}
}

func span(from, to float64, n int) []float64 {
	xs := make([]float64, n)
	for i := range xs {
		xs[i] = from + (to-from)*float64(i)/float64(n-1)
	}
	return xs
}

// Exponential approach: shrinkage nears a limit, here 14 % at 0.09 per minute.
func Example_exponentialApproach() {
	law("y = limit*(1 - exp(-k*x)) fitting limit > 0, k > 0", span(2, 40, 15), func(x float64) float64 { return 14 * (1 - math.Exp(-0.09*x)) })
	// Output:
	// limit 14
	// k 0.09
}

// Michaelis-Menten: uptake saturates with concentration, vmax 5, km 2.
func Example_michaelisMenten() {
	law("y = vmax*x/(km + x) fitting vmax > 0, km > 0", span(0.3, 12, 14), func(x float64) float64 { return 5 * x / (2 + x) })
	// Output:
	// vmax 5
	// km 2
}

// Logistic growth to 80, half way at time 12, rate 0.4.
func Example_logisticGrowth() {
	law("y = top/(1 + exp(-k*(x - mid))) fitting top > 0, k > 0, mid", span(0, 30, 16), func(x float64) float64 { return 80 / (1 + math.Exp(-0.4*(x-12))) })
	// Output:
	// top 80
	// k 0.4
	// mid 12
}

// Power law: pressure drop grows as flow to the 1.7.
func Example_powerLaw() {
	law("y = a*x^b fitting a > 0, b", span(1, 9, 12), func(x float64) float64 { return 0.6 * math.Pow(x, 1.7) })
	// Output:
	// a 0.6
	// b 1.7
}

// Arrhenius: a rate constant against temperature in degrees Celsius; the
// parameter's own model is linear in the reciprocal of the absolute temperature,
// centred at 900 °C. Ea/R = 12,000 K, the rate at 900 °C is 0.05.
func Example_arrhenius() {
	law("y = k fitting log(k) ~ num(1/(x + 273.15) - 1/1173.15)", span(820, 980, 9), func(x float64) float64 {
		return 0.05 * math.Exp(-12000*(1/(x+273.15)-1/1173.15))
	})
	// Output:
	// log(k)[intercept] -3
	// log(k)[1/(x + 273.15) - 1/1173.15] -1.2e+04
}

// Hill: a response that rises steeply about a concentration of 4, exponent 3.
func Example_hill() {
	law("y = top*x^n/(half^n + x^n) fitting top > 0, n in (0.2, 12), half > 0", span(0.5, 15, 18), func(x float64) float64 {
		return 9 * math.Pow(x, 3) / (64 + math.Pow(x, 3))
	})
	// Output:
	// top 9
	// n 3
	// half 4
}

// Gompertz growth to 60.
func Example_gompertz() {
	law("y = top*exp(-b*exp(-k*x)) fitting top > 0, b > 0, k > 0", span(0, 25, 16), func(x float64) float64 { return 60 * math.Exp(-4*math.Exp(-0.25*x)) })
	// Output:
	// top 60
	// b 4
	// k 0.25
}

// A lag before onset: nothing happens before minute 6, then shrinkage approaches
// 10 %.
func Example_lagBeforeOnset() {
	law("y = base + limit*(1 - exp(-k*max(0, x - lag))) fitting base, limit, k > 0, lag", span(0, 40, 33), func(x float64) float64 {
		return 1 + 10*(1-math.Exp(-0.15*math.Max(0, x-6)))
	})
	// Output:
	// base 1
	// limit 10
	// k 0.15
	// lag 6
}

// Two parallel processes, a fast and a slow one.
func Example_twoParallelProcesses() {
	law("y = a*exp(-fast*x) + b*exp(-slow*x) fitting a, fast in (0.2, 5), b, slow in (0.001, 0.2)", span(0, 40, 30), func(x float64) float64 {
		return 7*math.Exp(-0.6*x) + 3*math.Exp(-0.05*x)
	})
	// Output:
	// a 7
	// fast 0.6
	// b 3
	// slow 0.05
}
