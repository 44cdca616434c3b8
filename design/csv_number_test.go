package design

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"regexp"
	"strings"
	"testing"
)

func TestParseNumeral(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for _, c := range []struct {
		cell  string
		value float64
		class numeral
	}{
		{"0", 0, plainNumeral},
		{"-0", math.Copysign(0, -1), plainNumeral},
		{"+5", 5, plainNumeral},
		{"5.", 5, plainNumeral},
		{".5", 0.5, plainNumeral},
		{"-.5e1", -5, plainNumeral},
		{"0.5", 0.5, plainNumeral},
		{"0e1", 0, plainNumeral},
		{"0.", 0, plainNumeral},
		{"1E+3", 1000, plainNumeral},
		{"1e-3", 1e-3, plainNumeral},
		{"1e22", 1e22, plainNumeral},
		{"9007199254740993", 9007199254740992, plainNumeral}, // 2^53+1, a tie that goes to even
		{"9007199254740995", 9007199254740996, plainNumeral},
		{"18446744073709551617", 0x1p64, plainNumeral}, // 2^64+1, twenty digits
		{"5e-324", 5e-324, plainNumeral},
		{"2e-324", 0, plainNumeral}, // below half the least positive float64
		{"1e999", inf, plainNumeral},
		{"-1e999", -inf, plainNumeral},
		{"1e99999999999999999999", inf, plainNumeral},
		{"0e99999999999999999999", 0, plainNumeral},
		{"1e-99999999999999999999", 0, plainNumeral},
		{"0." + strings.Repeat("0", 2000) + "1e2001", 1, plainNumeral},
		{"1" + strings.Repeat("0", 2000) + "e-2000", 1, plainNumeral},
		{"0." + strings.Repeat("0", 200000) + "1e200001", 1, plainNumeral},
		{"-1" + strings.Repeat("0", 200000) + "e-200000", -1, plainNumeral},
		{"-0." + strings.Repeat("0", 2000), math.Copysign(0, -1), plainNumeral},
		{"1" + strings.Repeat("0", 2000), inf, plainNumeral},
		{"1" + strings.Repeat("0", 2000) + "e-99999999999999999999", 0, plainNumeral},
		{"." + strings.Repeat("0", 2000) + "1", 0, plainNumeral},
		// Halfway between 1 and the next float64 but for the last of 2000 digits.
		{"1.00000000000000011102230246251565404236316680908203125" + strings.Repeat("0", 2000), 1, plainNumeral},
		{"1.00000000000000011102230246251565404236316680908203125" + strings.Repeat("0", 2000) + "1", 1 + 0x1p-52, plainNumeral},
		{"100000000000000011102230246251565404236316680908203125" + strings.Repeat("0", 2000) + "1e-2054", 1 + 0x1p-52, plainNumeral},
		{strings.Repeat("0", 2000) + "12.5", 12.5, codedNumeral},
		{"NaN", nan, plainNumeral},
		{"nan", nan, plainNumeral},
		{"-NAN", nan, plainNumeral},
		{"Inf", inf, plainNumeral},
		{"+INF", inf, plainNumeral},
		{"-inf", -inf, plainNumeral},
		{"007", 7, codedNumeral},
		{"01", 1, codedNumeral},
		{"-01", -1, codedNumeral},
		{"+007", 7, codedNumeral},
		{"00", 0, codedNumeral},
		{"00.5", 0.5, codedNumeral},
		{"01e2", 100, codedNumeral},
	} {
		v, class := parseNumeral([]byte(c.cell))
		if class != c.class || math.Float64bits(v) != math.Float64bits(c.value) && !(v != v && c.value != c.value) {
			t.Errorf("parseNumeral(%.40q) = %v, class %d; want %v, class %d", c.cell, v, class, c.value, c.class)
		}
	}
	for _, cell := range []string{
		"", "+", "-", ".", "e1", ".e1", "1e", "1e+", "1e-", "++1", "+-1", "--1", "1.2.3", "1,2", "1_000", "0x10", "0x1p3",
		"0b1", "0o7", "1e1.5", "1 ", " 1", "1e1 ", "1f", "1d3", "infinity", "nanx", "nann", "in", "na", "i nf", "+ 1", "１", "١", "1e²",
		"−1", "true", "12 min", "2024-01-05", "ınf", "\x4e\x41", "N/A",
	} {
		if v, class := parseNumeral([]byte(cell)); class != notNumeral {
			t.Errorf("parseNumeral(%q) = %v, class %d; want no number", cell, v, class)
		}
	}
}

// TestParseNumeralRounding holds values against exact rationals: Float64 of a
// big.Rat is the nearest float64, ties to even, by its documentation.
func TestParseNumeralRounding(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for k := range 20000 {
		cell := fmt.Sprintf("%d", rng.Uint64()>>rng.IntN(64))
		if rng.IntN(2) == 0 {
			cell += "." + fmt.Sprintf("%0*d", 1+rng.IntN(12), rng.IntN(1000))
		}
		if rng.IntN(2) == 0 {
			cell += fmt.Sprintf("e%d", rng.IntN(80)-40)
		}
		if k%20 == 0 { // long ones, about as large as 1
			whole, part := rng.IntN(1500), rng.IntN(1500)
			cell = fmt.Sprintf("%d%0*d.%0*de%d", 1+rng.IntN(9), whole, rng.IntN(10), part, rng.IntN(10), rng.IntN(40)-20-whole)
		}
		r, ok := new(big.Rat).SetString(cell)
		if !ok {
			t.Fatalf("seed 1,1: %q is no rational", cell)
		}
		want, _ := r.Float64()
		if got, _ := parseNumeral([]byte(cell)); got != want {
			t.Errorf("seed 1,1: parseNumeral(%q) = %v, want %v", cell, got, want)
		}
	}
}

// TestParseNumeralLong writes 1 with every number of digits about the limits
// of strconv, before and after the point.
func TestParseNumeralLong(t *testing.T) {
	for n := range 1000 {
		zeros := strings.Repeat("0", n)
		for _, cell := range []string{fmt.Sprintf("1%se-%d", zeros, n), fmt.Sprintf("0.%s1e%d", zeros, n+1), "1." + zeros} {
			if v, class := parseNumeral([]byte(cell)); v != 1 || class != plainNumeral {
				t.Errorf("1 written with %d zeros is %v, class %d", n, v, class)
			}
		}
	}
}

// TestParseNumeralSyntax holds the accepted texts against a plain regular
// expression, on random texts over the letters that matter.
func TestParseNumeralSyntax(t *testing.T) {
	plain := regexp.MustCompile(`^[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$|^[+-]?(?i:nan|inf)$`)
	coded := regexp.MustCompile(`^[+-]?0\d`)
	const letters = "00127.eE+-naif _x"
	rng := rand.New(rand.NewPCG(2, 1))
	found := [3]int{}
	for range 200000 {
		cell := make([]byte, rng.IntN(8))
		for i := range cell {
			cell[i] = letters[rng.IntN(len(letters))]
		}
		want := notNumeral
		if plain.Match(cell) {
			want = plainNumeral
			if coded.Match(cell) {
				want = codedNumeral
			}
		}
		found[want]++
		if _, got := parseNumeral(cell); got != want {
			t.Fatalf("seed 2,1: parseNumeral(%q) has class %d, want %d", cell, got, want)
		}
	}
	for class, n := range found {
		if n < 1000 {
			t.Errorf("only %d of the random texts are of class %d; the test shows little", n, class)
		}
	}
}

func TestParseTruth(t *testing.T) {
	for cell, want := range map[string]bool{"true": true, "TRUE": true, "True": true, "tRuE": true, "false": false, "FALSE": false, "False": false} {
		if got, ok := parseTruth([]byte(cell)); !ok || got != want {
			t.Errorf("parseTruth(%q) = %v, %v; want %v", cell, got, ok, want)
		}
	}
	for _, cell := range []string{"", "t", "yes", "1", "0", "true ", " true", "trux", "falsy", "TRU\x05", "\x14rue"} {
		if _, ok := parseTruth([]byte(cell)); ok {
			t.Errorf("parseTruth(%q) is ok; want not", cell)
		}
	}
}
