package formula

import (
	"strings"
	"testing"
)

func BenchmarkParse(b *testing.B) {
	for name, text := range map[string]string{
		"terms":      "porosity ~ hold*cat(furnace) + powers(temp, 3) + num(1/(temp + 273.15)) as gamma link log weighted w",
		"equation":   "shrink = limit*(1 - exp(-k*hold)) fitting limit > 0, k by cat(furnace)",
		"sum=64KiB":  "y ~ x" + strings.Repeat(" + x", 9999),
		"deep":       "y ~ " + strings.Repeat("(", 200) + "x" + strings.Repeat(")", 200),
		"refused=30": "y ~ a" + strings.Repeat("*b", 29),
	} {
		b.Run(name, func(b *testing.B) {
			b.ReportAllocs()
			b.SetBytes(int64(len(text)))
			for b.Loop() {
				_, _ = Parse(text)
			}
		})
	}
}
