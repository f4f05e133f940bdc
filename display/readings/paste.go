package readings

import (
	"fmt"
	"regexp"
	"strconv"
	"strings"

	"evenstep/display/photometry"
)

// pasted is the name that errors give to text from the clipboard.
const pasted = "pasted text"

var (
	wholeCommaWhole = regexp.MustCompile(`^\d+,\d+$`)
	plainLevel      = regexp.MustCompile(`^\d{1,5}$`)
)

// ParsePaste reads a series from the clipboard: lines of level and luminance, or of luminances alone,
// which then belong to the levels of plan in order. Columns are separated by tabs, semicolons or
// spaces, or by a comma where the luminances have decimal points; decimal commas are allowed beside
// the others. A first line of words is passed over. Luminances are as typed, whatever their unit; role
// and ambient are left to the caller. Every error is a *FormatError.
func ParsePaste(clip string, plan []int) ([]Reading, error) {
	fail := func(line int, found, expected, do string) ([]Reading, error) {
		return nil, &FormatError{File: pasted, Line: line, Found: found, Expected: expected, Do: do}
	}
	const shape = "lines of level and luminance, or of luminances alone"
	if len(clip) > maxFile {
		return fail(0, fmt.Sprintf("%d bytes", len(clip)), fmt.Sprintf("at most %d", maxFile), "load a file instead")
	}
	n := &numbers{sheet: &sheet{name: pasted, delim: ';'}}
	var out []Reading
	columns := 0
	lines := strings.Split(strings.NewReplacer("\r\n", "\n", "\r", "\n").Replace(clip), "\n")
	for i, l := range lines {
		l = strings.TrimSpace(l)
		if l == "" || strings.HasPrefix(l, "#") {
			continue
		}
		if len(out) == 0 && columns == 0 && !strings.ContainsAny(l[:1], "0123456789.,+-") {
			continue // a header
		}
		cells, ambiguous := cut(l)
		if ambiguous {
			return fail(i+1, quote(l)+", which may be a level and a luminance or a decimal comma", "one or the other", "separate the columns with tabs or semicolons")
		}
		if columns == 0 {
			columns = len(cells)
		}
		if len(cells) != columns || columns > 2 {
			return fail(i+1, fmt.Sprintf("%d columns", len(cells)), shape, "copy those columns only")
		}
		r := Reading{Role: Series, Line: i + 1}
		if columns == 2 {
			if !plainLevel.MatchString(cells[0]) {
				return fail(i+1, "level "+quote(cells[0]), "a whole number", "copy the level in the first column")
			}
			r.Level, _ = strconv.Atoi(cells[0])
		} else {
			if len(out) >= len(plan) {
				return fail(i+1, fmt.Sprintf("more than %d luminances", len(plan)), "one for each level that is to come", "copy fewer lines, or copy the levels too")
			}
			r.Level = plan[len(out)]
		}
		v, err := n.parse(i+1, "luminance", cells[columns-1])
		if err != nil {
			return nil, err
		}
		if v < 0 || v > maxLuminance {
			return fail(i+1, fmt.Sprintf("luminance %g", v), fmt.Sprintf("0 to %d", maxLuminance), "check the number and its unit")
		}
		r.Luminance = photometry.CdM2(v)
		for _, earlier := range out {
			if earlier.Level == r.Level {
				return fail(i+1, fmt.Sprintf("level %d again, first on line %d", r.Level, earlier.Line), "each level once", "copy one of them")
			}
		}
		if len(out) >= maxRows {
			return fail(i+1, "too many lines", fmt.Sprintf("at most %d", maxRows), "load a file instead")
		}
		out = append(out, r)
	}
	if len(out) == 0 {
		return fail(0, "no numbers", shape, "copy the series again")
	}
	return out, nil
}

// cut splits a pasted line into its cells.
func cut(l string) (cells []string, ambiguous bool) {
	for _, sep := range []string{"\t", ";"} {
		if strings.Contains(l, sep) {
			cells = strings.Split(l, sep)
			for i := range cells {
				cells[i] = strings.TrimSpace(cells[i])
			}
			return cells, false
		}
	}
	if cells = strings.Fields(l); len(cells) > 1 {
		for i := range cells {
			cells[i] = strings.TrimSuffix(cells[i], ",")
		}
		return cells, false
	}
	if wholeCommaWhole.MatchString(l) {
		// "0,64" can only be a luminance; "15,203" may be both.
		return []string{l}, !strings.HasPrefix(l, "0,")
	}
	if a, b, ok := strings.Cut(l, ","); ok && plainLevel.MatchString(a) && strings.Contains(b, ".") {
		return []string{a, b}, false
	}
	return []string{l}, false
}
