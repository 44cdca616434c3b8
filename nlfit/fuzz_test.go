package nlfit_test

import (
	"context"
	"errors"
	"strings"
	"testing"

	"example.com/trammel/design"
	"example.com/trammel/formula"
	"example.com/trammel/nlfit"
)

// FuzzEquation fits any equation to a small table within a small budget: a result,
// or a typed refusal; never a panic, never a hang.
func FuzzEquation(f *testing.F) {
	for _, text := range []string{
		"y = a*(1 - exp(-k*x)) fitting a > 0, k",
		"y = a + b*x^c + z*d fitting a, b, c in (0, 3), d",
		"log(y) = a/x + if(x > 2, b, c*sin(x)) weighted z fitting a, b, c",
		"y = top/(1 + exp(k*(m - x))) fitting top by cat(f), k ~ z, log(m) ~ cat(f against mean)",
		"y = min(a*x, b) + max(c, x/a)^2 fitting a start 2, b, c = 1.5",
		"y = tan(a*x)/erf(b) - atan(c)*coded(x*a, 1, 4) fitting a, b, c",
		"y = a^b^x fitting a, b counted f2",
	} {
		f.Add(text)
	}
	const csv = "x,z,f,f2,y\n1,2,A,1,3\n2,1,B,2,4\n3,5,A,1,4.5\n4,3,B,1,6\n5,8,A,2,5\n6,1,B,1,9\n"
	table, err := design.ReadCSV(strings.NewReader(csv), nil)
	if err != nil {
		f.Fatal(err)
	}
	f.Fuzz(func(t *testing.T, text string) {
		if len(text) > 600 {
			return
		}
		r, err := nlfit.Fit(context.Background(), text, table, &nlfit.Options{Budget: 60, Workers: 1})
		if err == nil {
			if r == nil {
				t.Fatalf("%q: neither a result nor an error", text)
			}
			return
		}
		var own *nlfit.Error
		var designed *design.Error
		var parsed *formula.Error
		if !errors.As(err, &own) && !errors.As(err, &designed) && !errors.As(err, &parsed) {
			t.Fatalf("%q: %T: %v", text, err, err)
		}
	})
}
