package errtext

import (
	"strings"
	"unicode"

	"golang.org/x/text/unicode/norm"
)

// Alike says in what two different texts differ when it is only "case",
// "spaces" or "Unicode form"; several are joined by "and". It is empty when
// they differ in more, or not at all.
func Alike(a, b string) string {
	if a == b {
		return ""
	}
	noSpace := func(s string) string {
		return strings.Map(func(r rune) rune {
			if unicode.IsSpace(r) || unicode.Is(unicode.Cf, r) {
				return -1
			}
			return r
		}, s)
	}
	fold := func(s string) string { return strings.ToLower(strings.ToUpper(s)) }
	steps := []struct {
		name string
		do   func(string) string
	}{
		{"Unicode form", norm.NFKC.String},
		{"case", fold},
		{"spaces", noSpace},
	}
	all := func(s string, skip int) string {
		for k, st := range steps {
			if k != skip {
				s = st.do(s)
			}
		}
		return s
	}
	if all(a, -1) != all(b, -1) {
		return ""
	}
	var words []string
	for k, st := range steps {
		if all(a, k) != all(b, k) {
			words = append(words, st.name)
		}
	}
	if words == nil {
		// Two steps each mend the difference, as for a no-break space.
		return "spaces or Unicode form"
	}
	return And(words)
}
