package checks

import (
	"regexp"
	"strings"
	"testing"
)

// forbidden are things that no text of the tree says. The patterns are put together from pieces, so that
// this file does not match itself.
var forbidden = map[string]*regexp.Regexp{
	"a path of one machine": regexp.MustCompile(`(?m)(^|[^\w./-])(/` + `(wor` + `k|ro` + `ot|tm` + `p|(ho` + `me|Us` + `ers)/\w+)|[A-Z]:\\+Us` + `ers)($|[^\w-])`),
	"a package host":        regexp.MustCompile(`\b(pro` + `xy|su` + `m|ind` + `ex)\.golang\.org\b`),
	"work that is left":     regexp.MustCompile(`\b(TO` + `DO|FIX` + `ME|XX` + `X)\b`),
}

func TestWords(t *testing.T) {
	for _, f := range tracked(t) {
		if f == "go.sum" { // its sums may spell anything
			continue
		}
		content, text := read(t, f)
		if !text {
			continue
		}
		for i, line := range strings.Split(string(content), "\n") {
			for what, pattern := range forbidden {
				if m := pattern.FindString(line); m != "" {
					t.Errorf("%s:%d: %s: %q; expected none", f, i+1, what, m)
				}
			}
		}
	}
}

// TestForbidden: the patterns find what they are for, and nothing else.
func TestForbidden(t *testing.T) {
	for _, c := range []struct {
		line, what string
	}{
		{"see /ro" + "ot/notes", "a path of one machine"},
		{"cd /wor" + "k", "a path of one machine"},
		{"\"/ho" + "me/someone/site.db\"", "a path of one machine"},
		{"file:/" + "/" + "/tm" + "p/x", ""}, // a second slash before it: an address
		{`C:` + `\Us` + `ers\someone`, "a path of one machine"},
		{"testdata/wor" + "k/x, lux/ro" + "ot, ../tm" + "p", ""},
		{"/workshop", ""},
		{"GOPROXY=https://pro" + "xy.golang.org", "a package host"},
		{"// TO" + "DO: later", "work that is left"},
		{"a todo list", ""},
	} {
		found := ""
		for what, pattern := range forbidden {
			if pattern.MatchString(c.line) {
				found = what
			}
		}
		if found != c.what {
			t.Errorf("%q: %q; expected %q", c.line, found, c.what)
		}
	}
}
