package formula

import (
	"reflect"
	"testing"
)

// roundTrips are texts of all forms with their canonical text.
var roundTrips = []struct{ text, canonical string }{
	{"y ~ hold*cat(furnace)", "y ~ hold*cat(furnace)"},
	{"porosity ~ hold * cat(furnace)  # lines", "porosity ~ hold*cat(furnace)"},
	{"y = vmax*conc/(km+conc) fitting vmax>0,km > 0", "y = vmax*conc/(km + conc) fitting vmax > 0, km > 0"},
	{"log(k)~hold", "log(k) ~ hold"},
	{"rejects out of inspected ~ hold + cat(supplier) as binomial", "rejects out of inspected ~ hold + cat(supplier) as binomial"},
	{"inclusions per area ~ cat(furnace) as overdispersed poisson", "inclusions per area ~ cat(furnace) as overdispersed poisson"},
	{"shrink = limit * (1 - exp(-k * hold))\n fitting limit > 0, k by cat(furnace)", "shrink = limit*(1 - exp(-k*hold)) fitting limit > 0, k by cat(furnace)"},
	{"y ~ a counted m weighted w+1 as normal", "y ~ a as normal weighted w + 1 counted m"},
	{"y ~ cat(furnace against 'F2')", "y ~ cat(furnace against 'F2')"},
	{"y ~ cat(furnace against mean)", "y ~ cat(furnace against mean)"},
	{"y ~ cat(grade in ('low','mid','high') against previous)", "y ~ cat(grade in ('low', 'mid', 'high') against previous)"},
	{"y ~ cat(grade in ('low','it''s', others))", "y ~ cat(grade in ('low', 'it''s', others))"},
	{"y ~ cat(machine in (1, -2, 3.50e0) against -2)", "y ~ cat(machine in (1, -2, 3.5) against -2)"},
	{"y ~ cat(open in (false, true) against true)", "y ~ cat(open in (false, true) against true)"},
	{"y ~ cat(site, machine)", "y ~ cat(site, machine)"},
	{"y ~ num(1/(temp+273.15))", "y ~ num(1/(temp + 273.15))"},
	{"y ~ num(hold^2) + num(hold) + num(furnace = 'F2')", "y ~ num(hold^2) + num(hold) + num(furnace='F2')"},
	{"y ~ log(dose) + if(x > 2, x, -x)", "y ~ log(dose) + if(x>2, x, -x)"},
	{"y ~ coded(x, 10, 30)*coded(z, -1.5, 1e3)", "y ~ coded(x, 10, 30)*coded(z, -1.5, 1000)"},
	{"y ~ powers(x,3)+legendre(x/10,2)+spline(t,4)+hinge(x,5,-7)+harmonics(t,24,2)", "y ~ powers(x, 3) + legendre(x/10, 2) + spline(t, 4) + hinge(x, 5, -7) + harmonics(t, 24, 2)"},
	{"y ~ upto(2, a + b - c)", "y ~ upto(2, a + b - c)"},
	{"y ~ quadratic(x, z) + known(3*t)", "y ~ quadratic(x, z) + known(3*t)"},
	{"y ~ a - b - intercept", "y ~ a - b - intercept"},
	{"y ~ -intercept + x", "y ~ -intercept + x"},
	{"y ~ intercept", "y ~ intercept"},
	{"y ~ (a + b) + c", "y ~ a + b + c"},
	{"y ~ a + (b + c)", "y ~ a + (b + c)"},
	{"y ~ a - (b + c)*d", "y ~ a - (b + c)*d"},
	{"y ~ ((a + b))*(((c)))", "y ~ (a + b)*c"},
	{"y ~ (-a + b)*c", "y ~ (-a + b)*c"},
	{"y ~ (a*b)*c + a*(b*c)", "y ~ (a*b)*c + a*(b*c)"},
	{"y ~ x by cat(a) by cat(b)*z", "y ~ x by cat(a) by cat(b)*z"},
	{"y ~ x by (cat(a)*cat(b))", "y ~ x by (cat(a)*cat(b))"},
	{"y ~ cat(h) inside cat(m) + cat(p) inside (cat(a) by cat(b))", "y ~ cat(h) inside cat(m) + cat(p) inside (cat(a) by cat(b))"},
	{"y ~ cat(c) inside cat(b) inside cat(a)", "y ~ cat(c) inside cat(b) inside cat(a)"},
	{"\"Hold time (min)\" ~ \"as\" + \"say \"\"x\"\"\" + \"x\"", "\"Hold time (min)\" ~ \"as\" + \"say \"\"x\"\"\" + x"},
	{"größe ~ 温度 + _a1", "größe ~ 温度 + _a1"},
	{"y ~ x as gamma link power(-0.5)", "y ~ x as gamma link power(-0.5)"},
	{"y ~ x as inverse_gaussian link reciprocal_square", "y ~ x as inverse_gaussian link reciprocal_square"},
	{"k per e ~ x as negative_binomial link sqrt", "k per e ~ x as negative_binomial link sqrt"},
	{"y = a + b*x fitting a start 2, b in (-1, 5 ) start 0.3", "y = a + b*x fitting a start 2, b in (-1, 5) start 0.3"},
	{"y = a + b*x fitting a = -3, b < 1e9", "y = a + b*x fitting a = -3, b < 1e9"},
	{"y = k*x fitting k ~ hold + cat(furnace) start 3", "y = k*x fitting k ~ hold + cat(furnace) start 3"},
	{"y = k*x + c fitting log(k) ~ num(1/(temp+273.15)), c", "y = k*x + c fitting log(k) ~ num(1/(temp + 273.15)), c"},
	{"y = \"the rate\"*x fitting logit(\"the rate\") ~ t start 0.5", "y = \"the rate\"*x fitting logit(\"the rate\") ~ t start 0.5"},
	{"y = -x^2 + (-x)^2 + x^-k^2 + (x^k)^2 fitting k", "y = -x^2 + (-x)^2 + x^-k^2 + (x^k)^2 fitting k"},
	{"y = a - (b - c) - (d + e) + a/(b/c)/(d*e) fitting a", "y = a - (b - c) - (d + e) + a/(b/c)/(d*e) fitting a"},
	{"y = k*(x>2)*(x<>3) + pi + true - false fitting k", "y = k*(x>2)*(x<>3) + pi + true - false fitting k"},
	{"y = k*min(x, z, 3) + --x - -x fitting k", "y = k*min(x, z, 3) + --x - -x fitting k"},
	{"y = k*((x > 2) = (z >= 3)) fitting k", "y = k*((x>2)=(z>=3)) fitting k"},
	{"(y = 2) ~ x as binomial", "(y=2) ~ x as binomial"},
	{"(y = 2) out of (n = 3) ~ x as binomial", "(y=2) out of (n=3) ~ x as binomial"},
	{"y ~ x weighted (z > 2) counted (z > 3)", "y ~ x weighted (z>2) counted (z>3)"},
	{"y = (k > x) fitting k", "y = (k>x) fitting k"},
	{"log(y/x) ~ x", "log(y/x) ~ x"},
	{"y ~ (-a + b) + c", "y ~ (-a + b) + c"},
	{"k ~ x weighted w as overdispersed poisson", "k ~ x as overdispersed poisson weighted w"},
	{"k out of n ~ x weighted w as overdispersed binomial", "k out of n ~ x as overdispersed binomial weighted w"},
	{"y ~ x weighted w as inverse_gaussian link identity", "y ~ x as inverse_gaussian link identity weighted w"},
	{"mean ~ previous + overdispersed + normal", "mean ~ previous + overdispersed + normal"},
}

// sameTree compares two trees without their places and texts.
func sameTree(a, b any) bool {
	return reflect.DeepEqual(stripped(reflect.ValueOf(a)), stripped(reflect.ValueOf(b)))
}

// stripped renders a tree as nested values without spans.
func stripped(v reflect.Value) any {
	switch v.Kind() {
	case reflect.Pointer, reflect.Interface:
		if v.IsNil() {
			return nil
		}
		return stripped(v.Elem())
	case reflect.Slice:
		out := []any{v.Type().String()}
		for i := range v.Len() {
			out = append(out, stripped(v.Index(i)))
		}
		return out
	case reflect.Struct:
		out := []any{v.Type().String()}
		for i := range v.NumField() {
			if f := v.Type().Field(i); f.Type != reflect.TypeFor[Span]() && (f.Name != "Text" || v.Type() != reflect.TypeFor[Model]()) {
				out = append(out, stripped(v.Field(i)))
			}
		}
		return out
	}
	return v.Interface()
}

func TestRoundTrip(t *testing.T) {
	for _, c := range roundTrips {
		m, err := Parse(c.text)
		if err != nil {
			t.Errorf("%v", err)
			continue
		}
		if got := m.String(); got != c.canonical {
			t.Errorf("%s\nprints as %s\nwant      %s", c.text, got, c.canonical)
		}
		again, err := Parse(m.String())
		if err != nil {
			t.Errorf("printed text of %s:\n%v", c.text, err)
			continue
		}
		if !sameTree(m, again) {
			t.Errorf("%s: the printed text parses to another tree: %s", c.text, again)
		}
	}
	a, _ := Parse("y ~ a + (b + c)")
	b, _ := Parse("y ~ a + b + c")
	if a == nil || b == nil || sameTree(a, b) {
		t.Error("sameTree does not tell two trees apart")
	}
}

// coefNames are names of coefficients, each its own canonical text.
var coefNames = []string{
	"intercept", "hold", "hold^2", "1/(temp + 273.15)", "max(0, hold - 5)", "coded(hold, 10, 30)", "cos(2*pi*t/24)",
	"sin(4*pi*t/24)", "(furnace='F2')", "(machine=2)", "grade=others", "legendre(hold, 3)[2]", "spline(hold, 4)[3]",
	"furnace='F2'", "head=2", "head=-2.5", "open=true", "furnace='F2' against mean", "grade='mid' against 'low'",
	"grade='mid' against previous", "head=2 inside machine='M1'", "head=2 inside (site='A', machine='M2')",
	"(site='A', machine='M2')", "(site='A', machine='M2') against mean", "hold by furnace='F2'",
	"a + b by furnace='F2' by (x>2)", "k[furnace='F1']", "k[intercept]", "log(k)[intercept]", "logit(k)[hold by furnace='F2']",
	"reciprocal(\"the rate\")[x]", "\"as\"", "\"Hold time\"='it''s'", "log(k)", "-x", "(a + b)*c", "(a + b)*(c + d)", "k[legendre(x, 2)[1]]",
	"(site=others, machine='M2')", "legendre", "spline by x", "((x>2)=(z>3))",
}

func TestCoefRoundTrip(t *testing.T) {
	for _, text := range coefNames {
		c, err := ParseCoef(text)
		if err != nil {
			t.Errorf("%v", err)
			continue
		}
		if c.String() != text {
			t.Errorf("%s prints as %s", text, c)
		}
		again, err := ParseCoef(c.String())
		if err != nil || !sameTree(c, again) {
			t.Errorf("%s: printed and parsed again it is another tree (%v)", text, err)
		}
	}
	for text, want := range map[string]string{"(a)": "a", " hold  by furnace = 'F2'": "hold by furnace='F2'", "x^02.0": "x^2"} {
		if c, err := ParseCoef(text); err != nil || c.String() != want {
			t.Errorf("%s prints as %v (%v), want %s", text, c, err, want)
		}
	}
}

// TestTermText holds the texts by which terms are equal.
func TestTermText(t *testing.T) {
	for _, c := range []struct{ term, want string }{
		{"num(hold)", "hold"}, {"num(hold^2)", "hold^2"}, {"num(a + b)", "a + b"}, {"num(furnace = 'F2')", "(furnace='F2')"},
		{"log(dose)", "log(dose)"}, {"num((a > 2)*b) by cat(furnace)", "(a>2)*b by cat(furnace)"}, {"powers(x/10, 2)", "powers(x/10, 2)"},
		{"cat(furnace against 'F2')", "cat(furnace against 'F2')"}, {"intercept", "intercept"},
	} {
		m, err := Parse("y ~ " + c.term)
		if err != nil {
			t.Error(err)
			continue
		}
		if got := m.Terms.Items[0].Term.TermText(); got != c.want {
			t.Errorf("the term text of %s is %s, want %s", c.term, got, c.want)
		}
	}
}
