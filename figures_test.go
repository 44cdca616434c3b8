package trammel_test

import (
	"math"
	"testing"

	"example.com/trammel"
)

// TestFigures shows how numbers are rounded for people; the expected texts are
// worked out by hand.
func TestFigures(t *testing.T) {
	for _, c := range []struct{ got, want string }{
		{trammel.Fixed(41.4392, -3), "41.439"},
		{trammel.Fixed(-0.0004, -3), "0.000"},
		{trammel.Fixed(-0.0006, -3), "-0.001"},
		{trammel.Fixed(123456, 2), "123500"},
		{trammel.Fixed(1.23456e12, 9), "1.235e+12"},
		{trammel.Fixed(1.23456e-12, -15), "1.235e-12"},
		{trammel.Fixed(0, -2), "0.00"},
		{trammel.Fixed(math.NaN(), -2), "–"},
		{trammel.Fixed(math.Inf(-1), -2), "–"},
		{trammel.Figure(0.3723456, 4), "0.3723"},
		{trammel.Figure(9.99996, 4), "10.00"},
		{trammel.Figure(0, 4), "0"},
		{trammel.Figure(math.Inf(1), 4), "–"},
		{trammel.Figure(-155679.6, 5), "-155680"},
		{trammel.Figure(2.5e-13, 3), "2.50e-13"},
		{trammel.Probability(0.0321), "0.032"},
		{trammel.Probability(0.00094), "9.4e-04"},
		{trammel.Probability(0.00099), "0.001"},
		{trammel.Probability(1e-16), "1.0e-16"},
		{trammel.Probability(0.9e-16), "< 1e-16"},
		{trammel.Probability(0), "< 1e-16"},
		{trammel.Probability(1), "1.000"},
		{trammel.Probability(math.NaN()), "–"},
		{trammel.Percent(0.9746), "97.5 %"},
		{trammel.Percent(0.99996), "99.996 %"},
		{trammel.Percent(1), "100.0 %"},
		{trammel.Percent(0.002), "0.2 %"},
		{trammel.Percent(math.NaN()), "–"},
	} {
		if c.got != c.want {
			t.Errorf("got %q, want %q", c.got, c.want)
		}
	}
}
