// Package errtext lays out the text of every refusal in one way and finds near
// misses. The first line stands alone: package, line:column, sentence, remedy.
// When the refusal concerns a place in a model text, the source line and a
// caret line follow.
package errtext

import (
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// maxSnippet is the longest source line shown, in characters; longer lines are
// cut around the place.
const maxSnippet = 120

// Position turns a byte offset in text into a line and a column in characters,
// both from 1. An offset outside the text gives the nearest place in it.
func Position(text string, offset int) (line, col int) {
	offset = max(0, min(offset, len(text)))
	head := text[:offset]
	line = 1 + strings.Count(head, "\n")
	head = head[strings.LastIndexByte(head, '\n')+1:]
	return line, 1 + utf8.RuneCountInString(head)
}

// Format lays out a refusal. text is the model text, start and end the
// half-open byte span in it; an empty text or start = end = 0 with no caret
// wanted is given as start = -1.
func Format(pkg, text string, start, end int, message, hint string) string {
	var b strings.Builder
	b.WriteString(pkg)
	b.WriteString(": ")
	place := start >= 0 && text != ""
	if place {
		line, col := Position(text, start)
		b.WriteString(strconv.Itoa(line) + ":" + strconv.Itoa(col) + ": ")
	}
	message, hint = visible(message), visible(hint)
	b.WriteString(message)
	if hint != "" {
		if !strings.HasSuffix(message, ".") && !strings.HasSuffix(message, "?") {
			b.WriteString(";")
		}
		b.WriteString(" ")
		b.WriteString(hint)
	}
	if place {
		b.WriteString(snippet(text, start, end))
	}
	return b.String()
}

// visible keeps a sentence on one line: control and format characters, which
// a quoted name or level may hold, are written as escapes.
func visible(s string) string {
	if !strings.ContainsFunc(s, hidden) {
		return s
	}
	var b strings.Builder
	for _, r := range s {
		if hidden(r) {
			q := strconv.QuoteRuneToASCII(r)
			b.WriteString(q[1 : len(q)-1])
		} else {
			b.WriteRune(r)
		}
	}
	return b.String()
}

// hidden tells of characters that print nothing, or break or turn a line.
func hidden(r rune) bool {
	return r == utf8.RuneError || unicode.In(r, unicode.Cc, unicode.Cf, unicode.Zl, unicode.Zp)
}

// snippet returns "\n    line\n    ^^^" for the span, marks as wide as the
// characters above them.
func snippet(text string, start, end int) string {
	start = max(0, min(start, len(text)))
	end = max(start, min(end, len(text)))
	from := strings.LastIndexByte(text[:start], '\n') + 1
	to := len(text)
	if k := strings.IndexByte(text[start:], '\n'); k >= 0 {
		to = start + k
	}
	line := strings.TrimSuffix(text[from:to], "\r")
	runes := []rune(line)
	first := utf8.RuneCountInString(text[from:start])
	last := first + utf8.RuneCountInString(text[start:min(end, to)])
	first = min(first, len(runes))
	last = max(first+1, min(last, len(runes)))
	lead, tail := "", ""
	if len(runes) > maxSnippet {
		lo := max(0, min(first-maxSnippet/3, len(runes)-maxSnippet))
		hi := min(len(runes), lo+maxSnippet)
		if lo > 0 {
			lead = "…"
		}
		if hi < len(runes) {
			tail = "…"
		}
		runes = runes[lo:hi]
		first, last = first-lo, min(last-lo, hi-lo)
		last = max(first+1, last)
	}
	var src, mark strings.Builder
	src.WriteString(lead)
	mark.WriteString(strings.Repeat(" ", utf8.RuneCountInString(lead)))
	for i := 0; i < max(len(runes), last); i++ {
		w := 1
		if i < len(runes) {
			r := runes[i]
			if hidden(r) {
				r = ' '
			}
			src.WriteRune(r)
			w = width(r)
		}
		c := " "
		if i >= first && i < last {
			c = "^"
		}
		if i < last {
			mark.WriteString(strings.Repeat(c, w))
		}
	}
	src.WriteString(tail)
	return "\n    " + strings.TrimRight(src.String(), " ") + "\n    " + mark.String()
}

// width is 2 for characters that terminals show in two cells, 0 for combining
// marks, else 1 (the East Asian Wide ranges of Unicode Standard Annex 11, in
// outline).
func width(r rune) int {
	switch {
	case r >= 0x0300 && r <= 0x036F, r == 0x200D, r >= 0xFE00 && r <= 0xFE0F:
		return 0
	case r >= 0x1100 && r <= 0x115F, r >= 0x2E80 && r <= 0xA4CF, r >= 0xAC00 && r <= 0xD7A3,
		r >= 0xF900 && r <= 0xFAFF, r >= 0xFE30 && r <= 0xFE6F, r >= 0xFF00 && r <= 0xFF60,
		r >= 0xFFE0 && r <= 0xFFE6, r >= 0x1F300 && r <= 0x1FAFF, r >= 0x20000 && r <= 0x3FFFD:
		return 2
	}
	return 1
}

// Rows says "row 3", "rows 3 and 17", or "rows 3, 17, 40 and 12 more" for the
// first few of total row numbers.
func Rows(rows []int, total int) string {
	const show = 5
	shown := rows[:min(len(rows), show)]
	parts := make([]string, len(shown))
	for i, r := range shown {
		parts[i] = strconv.Itoa(r)
	}
	if more := total - len(shown); more > 0 {
		parts = append(parts, strconv.Itoa(more)+" more")
	}
	noun := "rows "
	if total == 1 {
		noun = "row "
	}
	return noun + And(parts)
}

// And joins words as in "a", "a and b", "a, b and c".
func And(words []string) string { return join(words, " and ") }

// Or joins words as in "a", "a or b", "a, b or c".
func Or(words []string) string { return join(words, " or ") }

func join(words []string, last string) string {
	switch n := len(words); n {
	case 0:
		return ""
	case 1:
		return words[0]
	default:
		return strings.Join(words[:n-1], ", ") + last + words[n-1]
	}
}

// Count says "1 row" or "3 rows" for a noun with a regular plural.
func Count(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return strconv.Itoa(n) + " " + noun + "s"
}

// Nearest returns the candidate closest to word by optimal string alignment
// distance (insert, delete, replace, swap neighbours), when it is close enough
// to be a slip of the pen: at most a third of the longer length, and at least
// one. ok is false when there is none or the word is a candidate. Ties go to
// the earlier candidate.
func Nearest(word string, candidates []string) (best string, ok bool) {
	w := []rune(word)
	limit := -1
	for _, c := range candidates {
		if c == word {
			return "", false
		}
		r := []rune(c)
		if len(w) > 200 || len(r) > 200 {
			continue
		}
		d := distance(w, r)
		allowed := max(1, max(len(w), len(r))/3)
		if max(len(w), len(r)) < 3 {
			allowed = 0
		}
		if strings.EqualFold(word, c) {
			d, allowed = 0, 1
		}
		if d <= allowed && (limit < 0 || d < limit) {
			best, limit, ok = c, d, true
		}
	}
	return best, ok
}

func distance(a, b []rune) int {
	prev2 := make([]int, len(b)+1)
	prev := make([]int, len(b)+1)
	cur := make([]int, len(b)+1)
	for j := range prev {
		prev[j] = j
	}
	for i := 1; i <= len(a); i++ {
		cur[0] = i
		for j := 1; j <= len(b); j++ {
			cost := 1
			if a[i-1] == b[j-1] {
				cost = 0
			}
			cur[j] = min(prev[j]+1, cur[j-1]+1, prev[j-1]+cost)
			if i > 1 && j > 1 && a[i-1] == b[j-2] && a[i-2] == b[j-1] {
				cur[j] = min(cur[j], prev2[j-2]+1)
			}
		}
		prev2, prev, cur = prev, cur, prev2
	}
	return prev[len(b)]
}
