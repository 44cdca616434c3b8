package digits

import (
	"math"
	"testing"
)

func TestAgree(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for _, c := range []struct {
		name            string
		got, want, have float64
	}{
		{"equal", 3, 3, 16},
		{"one in a thousand", 1.001, 1, 3},
		{"one in a thousand, negative", -999, -1000, 3},
		{"double", 2, 1, 0},
		{"eleven times", 11, 1, -1},
		{"sign", -1, 1, -math.Log10(2)},
		{"want zero", 1e-5, 0, 5},
		{"want zero, got zero", 0, 0, 16},
		{"want zero, got tiny", 1e-300, 0, 16},
		{"got zero", 0, 5, 0},
		{"neighbour", math.Nextafter(1, 2), 1, 52 * math.Log10(2)},
		{"tiny", 1.01e-320, 1e-320, -math.Log10(20.0 / 2024)}, // in units of the least float64,
		{"overflowing difference", math.MaxFloat64, -math.MaxFloat64, -math.Log10(2)},
		{"overflowing ratio", 1e300, 1e-300, -600},
		{"infinities", inf, inf, 16},
		{"opposite infinities", inf, -inf, -inf},
		{"got infinite", inf, 1, -inf},
		{"want infinite", 1, inf, -inf},
		{"two NaN", nan, nan, 16},
		{"got NaN", nan, 1, -inf},
		{"want NaN", 1, nan, -inf},
	} {
		// The score itself is a logarithm of a rounded quotient whose operands
		// (1.001, say) are rounded too: 1e-12 covers 1e-16/1e-3 of a digit.
		if s := Agree(c.got, c.want); s != c.have && !(math.Abs(s-c.have) < 1e-12) {
			t.Errorf("%s: Agree(%g, %g) = %v, want %v", c.name, c.got, c.want, s, c.have)
		}
	}
}

func TestAgreeString(t *testing.T) {
	inf := math.Inf(1)
	for _, c := range []struct {
		got  float64
		want string
		have float64
	}{
		{1, "1", 16},
		{1, "1.0010010010010010010e+00", 3},
		{0.1, "0.1", 16}, // 17 significant digits agree, the score is capped
		{0, "0", 16},
		{1e-7, "0", 7},
		{0, "1.5e-3", 0},
		{inf, "inf", 16},
		{-inf, "-inf", 16},
		{-inf, "inf", -inf},
		{1, "inf", -inf},
		{inf, "1", -inf},
		{math.NaN(), "1", -inf},
		// A string beyond the float64 range keeps its meaning.
		{1e308, "1e309", -math.Log10(0.9)},
		{1, "1e-400", -400},
		// The digits past the 17th count: want is 2^-60 above 1, so rounding it
		// first would report full agreement where 2^-60 relative is 18 digits
		// (capped), and 1 against 1 + 2^-52 + 2^-60 is not 52 bits but a little less.
		{1, "1.000000000000000223912093141", -math.Log10(2.23912093141e-16)},
	} {
		// As in TestAgree.
		if s := AgreeString(c.got, c.want); s != c.have && !(math.Abs(s-c.have) < 1e-9) {
			t.Errorf("AgreeString(%g, %q) = %v, want %v", c.got, c.want, s, c.have)
		}
	}
	if s := AgreeString(1, "one"); !math.IsNaN(s) {
		t.Errorf("AgreeString of a word = %v, want NaN", s)
	}
}
