package formula

import (
	"math"
	"math/rand/v2"
	"strconv"
	"testing"
)

func TestQuoteName(t *testing.T) {
	for name, want := range map[string]string{
		"hold": "hold", "_x1": "_x1", "größe": "größe", "温度": "温度", "Hold time (min)": `"Hold time (min)"`, `3" pipe`: `"3"" pipe"`,
		"1st": `"1st"`, "as": `"as"`, "pi": `"pi"`, "AS": "AS", "mean": "mean", "": `""`, "a.b": `"a.b"`, "x\u200b": "\"x\u200b\"", "\u0301x": "\"\u0301x\"",
	} {
		if got := QuoteName(name); got != want {
			t.Errorf("QuoteName(%q) = %s, want %s", name, got, want)
		}
		if name == "" {
			continue // refused as a name
		}
		m, err := Parse("y ~ " + QuoteName(name))
		if err != nil {
			t.Error(err)
		} else if n, ok := m.Terms.Items[0].Term.(*Name); !ok || n.Name != name {
			t.Errorf("%q comes back as %v", name, m.Terms)
		}
	}
	for word := range reserved {
		if got := QuoteName(word); got != `"`+word+`"` {
			t.Errorf("the reserved word %s is not quoted", word)
		}
	}
	for _, level := range []string{"", "F2", "it's", "''", "\n", `\`, `"`} {
		c, err := ParseCoef("m=" + QuoteLevel(level))
		if err != nil {
			t.Error(err)
		} else if got := c.Parts[0].Cell[0].Level; got.Kind != TextLevel || got.Text != level {
			t.Errorf("%q comes back as %q", level, got.Text)
		}
	}
}

func TestFormatNumber(t *testing.T) {
	for _, c := range []struct {
		x    float64
		want string
	}{
		{0, "0"}, {1, "1"}, {-2.5, "-2.5"}, {1000, "1000"}, {1e6, "1e6"}, {123456789, "123456789"}, {0.001, "0.001"}, {1e-7, "1e-7"},
		{273.15, "273.15"}, {1e100, "1e100"}, {1.5e-10, "1.5e-10"}, {math.MaxFloat64, "1.7976931348623157e308"},
		{math.SmallestNonzeroFloat64, "5e-324"}, {0.30000000000000004, "0.30000000000000004"}, {math.Copysign(0, -1), "-0"},
	} {
		if got := FormatNumber(c.x); got != c.want {
			t.Errorf("FormatNumber(%g) = %s, want %s", c.x, got, c.want)
		}
	}
	// Any finite number is a literal that gives the number back.
	r := rand.New(rand.NewPCG(1, 1))
	for range 20000 {
		x := math.Abs(math.Float64frombits(r.Uint64()))
		if math.IsNaN(x) || math.IsInf(x, 0) {
			continue
		}
		s := FormatNumber(x)
		if kind, n, e := scanOne(s, 0); kind != tokenNumber || n != len(s) || e != nil {
			t.Fatalf("%s is no literal", s)
		}
		if back, err := strconv.ParseFloat(s, 64); err != nil || back != x {
			t.Fatalf("%s comes back as %g, %v", s, back, err)
		}
	}
}
