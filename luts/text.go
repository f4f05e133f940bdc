package luts

import (
	"fmt"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// flaw is an error in the three parts that every message has; whoever knows the place puts it in front.
type flaw struct{ found, expected, do string }

func newFlaw(do, found string, args ...any) *flaw {
	return &flaw{found: fmt.Sprintf(found, args...), do: do}
}

func (f *flaw) wants(expected string, args ...any) *flaw {
	f.expected = fmt.Sprintf(expected, args...)
	return f
}

func (f *flaw) Error() string { return f.found + "; expected " + f.expected + "; " + f.do }

// maxQuoted keeps a message readable when a file holds a page where a word belongs. In characters.
const maxQuoted = 40

// quote is s in double quotes, shortened, with all that does not print escaped.
func quote(s string) string {
	if utf8.RuneCountInString(s) > maxQuoted {
		s = string([]rune(s)[:maxQuoted]) + "…"
	}
	return strconv.Quote(s)
}

// printable is s with all that does not print escaped.
func printable(s string) string {
	var b strings.Builder
	for len(s) > 0 {
		r, size := utf8.DecodeRuneInString(s)
		if unicode.IsPrint(r) && (r != utf8.RuneError || size > 1) {
			b.WriteString(s[:size])
		} else {
			escaped := strconv.Quote(s[:size])
			b.WriteString(escaped[1 : len(escaped)-1])
		}
		s = s[size:]
	}
	return b.String()
}
