package formula

import (
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// QuoteName writes a column or parameter name as it stands in a model text:
// bare when it is a plain name and not reserved, else in double quotes with
// quotes inside doubled.
func QuoteName(name string) string {
	if isPlainName(name) && !reserved[name] {
		return name
	}
	return `"` + strings.ReplaceAll(name, `"`, `""`) + `"`
}

// QuoteLevel writes a level of a text column as it stands in a model text: in
// single quotes, with quotes inside doubled.
func QuoteLevel(level string) string {
	return "'" + strings.ReplaceAll(level, "'", "''") + "'"
}

// FormatNumber writes a finite number with the fewest digits that parse to the
// same value, as a literal of the language (digits[.digits][e[-]digits], after a
// "-" when negative). Plain decimals are preferred unless the form with an
// exponent is more than three characters shorter. NaN and infinities have no
// literal; they come out as strconv writes them.
func FormatNumber(x float64) string {
	plain := strconv.FormatFloat(x, 'f', -1, 64)
	short := strconv.FormatFloat(x, 'e', -1, 64)
	digits, exp, ok := strings.Cut(short, "e")
	if !ok {
		return plain
	}
	sign := ""
	if exp[0] == '-' {
		sign = "-"
	}
	short = digits + "e" + sign + strings.TrimLeft(exp[1:], "0")
	if len(plain) <= len(short)+3 {
		return plain
	}
	return short
}

func isNameStart(r rune) bool {
	return r == '_' || r != utf8.RuneError && unicode.IsLetter(r)
}

func isNamePart(r rune) bool {
	return isNameStart(r) || unicode.IsMark(r) || unicode.IsDigit(r)
}

func isPlainName(s string) bool {
	for i, r := range s {
		if !isNamePart(r) || i == 0 && !isNameStart(r) {
			return false
		}
	}
	return s != ""
}
