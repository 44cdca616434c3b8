package dist

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"

	"example.com/trammel/internal/digits"
)

// TestReference compares with testdata/distributions.csv (computed with 40 to
// 50 digits by two methods): 12 digits relative, tails included.
func TestReference(t *testing.T) {
	file, err := os.Open("../../testdata/distributions.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows, err := csv.NewReader(file).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	worst := make(map[string]float64)
	count := make(map[string]int)
	for _, row := range rows[1:] {
		args := make(map[string]float64)
		for _, a := range strings.Split(row[1], ";") {
			name, text, _ := strings.Cut(a, "=")
			v, err := strconv.ParseFloat(text, 64)
			if err != nil {
				t.Fatal(err)
			}
			args[name] = v
		}
		var got float64
		switch row[0] {
		case "normal_quantile":
			got = NormalQuantile(args["p"])
		case "normal_upper_tail":
			got = NormalUpper(args["z"])
		case "t_quantile":
			got = TQuantile(args["p"], args["df"])
		case "t_upper_tail":
			got = TUpper(args["t"], args["df"])
		case "chi2_quantile":
			got = ChiQuantile(args["p"], args["df"])
		case "chi2_upper_quantile":
			got = ChiUpperQuantile(args["p"], args["df"])
		case "chi2_upper_tail":
			got = ChiUpper(args["x"], args["df"])
		case "f_quantile":
			got = FQuantile(args["p"], args["df1"], args["df2"])
		case "f_upper_quantile":
			got = FUpperQuantile(args["p"], args["df1"], args["df2"])
		case "f_upper_tail":
			got = FUpper(args["x"], args["df1"], args["df2"])
		case "studentized_range_quantile", "studentized_range_upper_tail":
			continue // not part of this package
		default:
			t.Fatalf("unknown function %s", row[0])
		}
		d := digits.AgreeString(got, row[2])
		if count[row[0]]++; count[row[0]] == 1 || d < worst[row[0]] {
			worst[row[0]] = d
		}
		if !(d >= 12) {
			t.Errorf("%s %s is %.17g, want %s: %.1f digits", row[0], row[1], got, row[2], d)
		}
	}
	for name, n := range count {
		t.Logf("%s: %d figures, at least %.1f digits", name, n, worst[name])
	}
	if len(count) != 10 || math.IsNaN(worst["t_quantile"]) {
		t.Errorf("families %v", count)
	}
}
