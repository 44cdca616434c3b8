package formula

import "slices"

// reserved holds the words that never stand for a column unless quoted.
var reserved = wordSet("as", "against", "by", "counted", "fitting", "in", "inside", "intercept", "link", "out", "of",
	"others", "per", "random", "start", "weighted", "true", "false", "pi")

// families lists the error families; dispersed marks those whose variance has
// a dispersion of its own.
var families = []string{"normal", "binomial", "poisson", "gamma", "inverse_gaussian", "negative_binomial"}

var dispersed = wordSet("normal", "gamma", "inverse_gaussian")

var links = []string{"identity", "log", "logit", "probit", "cloglog", "reciprocal", "reciprocal_square", "sqrt", "power"}

var parLinks = []string{"log", "logit", "reciprocal"}

// arithmetic holds the functions of arithmetic with the least and the greatest
// number of arguments; -1 is no limit.
var arithmetic = map[string][2]int{
	"log": {1, 1}, "log10": {1, 1}, "log1p": {1, 1}, "exp": {1, 1}, "expm1": {1, 1}, "sqrt": {1, 1}, "abs": {1, 1},
	"sin": {1, 1}, "cos": {1, 1}, "tan": {1, 1}, "atan": {1, 1}, "tanh": {1, 1}, "erf": {1, 1},
	"min": {2, -1}, "max": {2, -1}, "if": {3, 3}, "coded": {3, 3},
}

// termOnly holds the functions that make terms and are no arithmetic, with the
// number of their arguments. cat and upto have a form of their own.
var termOnly = map[string][2]int{
	"num": {1, 1}, "powers": {2, 2}, "legendre": {2, 2}, "spline": {2, 2}, "hinge": {2, -1}, "harmonics": {3, 3},
	"quadratic": {1, -1}, "known": {1, 1}, "cat": {1, -1}, "upto": {2, 2},
}

// usage shows how a call is written.
var usage = map[string]string{
	"min": "min(x, z)", "max": "max(x, z)", "if": "if(x > 0, x, 0)", "coded": "coded(x, 10, 30)",
	"num": "num(x^2)", "powers": "powers(x, 2)", "legendre": "legendre(x, 3)", "spline": "spline(x, 4)",
	"hinge": "hinge(x, 5)", "harmonics": "harmonics(t, 24, 2)", "quadratic": "quadratic(x, z)", "known": "known(x)",
	"upto": "upto(2, x + z)",
}

// functionNames lists the functions of arithmetic in alphabetical order.
func functionNames() []string {
	names := make([]string, 0, len(arithmetic))
	for name := range arithmetic {
		if name != "coded" {
			names = append(names, name)
		}
	}
	slices.Sort(names)
	return names
}

// callNames lists, in alphabetical order, what may stand before "(": in
// arithmetic, or as a term.
func callNames(asTerm bool) []string {
	names := append(functionNames(), "coded")
	if asTerm {
		for name := range termOnly {
			names = append(names, name)
		}
	}
	slices.Sort(names)
	return names
}

func wordSet(words ...string) map[string]bool {
	set := make(map[string]bool, len(words))
	for _, w := range words {
		set[w] = true
	}
	return set
}
