package readings

import (
	"cmp"
	"fmt"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// FormatError says what in a file could not be read as readings.
type FormatError struct {
	File     string // as given to the parser
	Line     int    // counted from 1; 0 where no single line is at fault
	Found    string
	Expected string // without the word "expected"
	Do       string // what the user should do about it

	cause error
}

// Error is one line, "FILE:LINE: found; expected …; do", without control characters whatever the
// file or its name hold.
func (e *FormatError) Error() string {
	place := cmp.Or(e.File, "readings")
	if e.Line > 0 {
		place += ":" + strconv.Itoa(e.Line)
	}
	return printable(fmt.Sprintf("%s: %s; expected %s; %s", place, e.Found, e.Expected, e.Do))
}

// Unwrap is the error of the reader where the file could not be read to its end, else nil.
func (e *FormatError) Unwrap() error { return e.cause }

// maxQuoted keeps a message readable when a cell holds a page of text. In characters.
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
	if strings.IndexFunc(s, func(r rune) bool { return r == utf8.RuneError || !unicode.IsPrint(r) }) < 0 {
		return s
	}
	var b strings.Builder
	for len(s) > 0 {
		r, size := utf8.DecodeRuneInString(s)
		if unicode.IsPrint(r) && r != utf8.RuneError {
			b.WriteString(s[:size])
		} else {
			escaped := strconv.Quote(s[:size])
			b.WriteString(escaped[1 : len(escaped)-1])
		}
		s = s[size:]
	}
	return b.String()
}
