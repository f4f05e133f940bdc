package readings

import (
	"fmt"
	"regexp"
	"strconv"
	"strings"

	"evenstep/display/photometry"
)

// maxLuminance is far above any monitor and any meter for them. In cd/m2.
const maxLuminance = 100_000

// decimal is what a number may look like. Forms that other programs read as numbers, hexadecimal,
// underscores and names of infinity, are typing mistakes here.
var decimal = regexp.MustCompile(`^[+-]?([0-9]+[.,]?[0-9]*|[.,][0-9]+)([eE][+-]?[0-9]{1,4})?$`)

// grouped is a number with marks that may group its digits.
var grouped = regexp.MustCompile(`^[+-]?[0-9.,' \x{a0}\x{202f}]+$`)

// numbers reads the numbers of one file, which must agree on the decimal mark.
type numbers struct {
	*sheet
	point, comma int // the lines on which each mark was seen first
}

// parse reads one number. what names it in a message.
func (n *numbers) parse(line int, what, s string) (float64, error) {
	found := what + " " + quote(s)
	const plain = "a number such as 0.64"
	marks := strings.Count(s, ".") + strings.Count(s, ",")
	switch {
	case s == "":
		return 0, n.fail(line, "no "+what, plain, "write the number or delete the row")
	case grouped.MatchString(s) && (marks > 1 || !decimal.MatchString(s)) && strings.ContainsAny(s, "0123456789"):
		return 0, n.fail(line, found+" with thousands marks", plain, "write it without thousands marks")
	case !decimal.MatchString(s):
		return 0, n.fail(line, found, plain, "write the number alone, without unit or text")
	}
	if strings.Contains(s, ",") {
		if n.delim == ',' {
			return 0, n.fail(line, found+" with a decimal comma in a comma-separated file", plain, "write a point, or separate the columns with semicolons")
		}
		n.comma = first(n.comma, line)
	} else if marks > 0 {
		n.point = first(n.point, line)
	}
	if n.comma > 0 && n.point > 0 {
		other := n.point
		if line == n.point {
			other = n.comma
		}
		return 0, n.fail(line, fmt.Sprintf("%s, and the other decimal mark on line %d", found, other), "one decimal mark throughout the file", "write every number with a point, in the # lines as well")
	}
	v, err := strconv.ParseFloat(strings.Replace(s, ",", ".", 1), 64)
	if err != nil {
		return 0, n.fail(line, found+", which is too large", plain, "check the number")
	}
	mantissa, _, _ := strings.Cut(strings.ToLower(s), "e")
	if v == 0 && strings.ContainsAny(mantissa, "123456789") {
		return 0, n.fail(line, found+", which is too small", plain, "write 0")
	}
	return v, nil
}

func first(seen, line int) int {
	if seen > 0 {
		return seen
	}
	return line
}

// within reads one number from low to high.
func (n *numbers) within(line int, what, s string, low, high float64, unit string) (float64, error) {
	v, err := n.parse(line, what, s)
	if err != nil {
		return 0, err
	}
	if !(v >= low && v <= high) {
		return 0, n.fail(line, what+" "+quote(s), strings.TrimSpace(fmt.Sprintf("%s to %s %s", plainNumber(low), plainNumber(high), unit)), "check the number and its unit")
	}
	if v == 0 {
		v = 0 // a meter may print -0.00
	}
	return v, nil
}

// luminance reads the luminance of a row, in the unit that its column is headed with.
func (n *numbers) luminance(r row) (photometry.CdM2, error) {
	s := n.cell(r, luminanceColumn)
	v, err := n.parse(r.line, luminanceColumn, s)
	if err != nil {
		return 0, err
	}
	l, found := photometry.CdM2(v), luminanceColumn+" "+quote(s)
	if n.unit() == footLambert {
		l, found = photometry.FootLambert(v).CdM2(), found+" in fL"
	}
	switch {
	case l < 0:
		return 0, n.fail(r.line, found+" below zero", "0 or more", "set the zero of the meter and measure again")
	case l > maxLuminance:
		return 0, n.fail(r.line, found, fmt.Sprintf("at most %d cd/m2", maxLuminance), "check the number and its unit")
	case l == 0:
		return 0, nil // not -0
	}
	return l, nil
}

// The units of luminance, as File and PlacesFile name them.
const (
	candela     = "cd/m2"
	footLambert = "fL"
)

func (s *sheet) unit() string {
	if s.heading[luminanceColumn] == "luminance_fl" {
		return footLambert
	}
	return candela
}

// level reads a whole number from 0 to top.
func (s *sheet) level(line int, what, cell string, top int) (int, error) {
	expected := fmt.Sprintf("a whole number from 0 to %d", top)
	if cell == "" {
		return 0, s.fail(line, "no "+what, expected, "write the level or delete the row")
	}
	if strings.Trim(cell, "0123456789") != "" {
		return 0, s.fail(line, what+" "+quote(cell), expected, "write the level in digits alone")
	}
	v, err := strconv.Atoi(cell)
	if err != nil || v > top {
		return 0, s.fail(line, what+" "+quote(cell), expected, levelAdvice(top))
	}
	return v, nil
}

func levelAdvice(top int) string {
	if top >= 1<<maxBits-1 {
		return "correct the level"
	}
	return `correct the level, or state the bit depth in a line such as "# bits: 10"`
}

// plainNumber is v in the fewest digits that read back as v, without an exponent where that is short.
func plainNumber(v float64) string {
	if v == 0 || v >= 1e-6 && v < 1e15 {
		return strconv.FormatFloat(v, 'f', -1, 64)
	}
	return strconv.FormatFloat(v, 'e', -1, 64)
}
