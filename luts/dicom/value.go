package dicom

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// raw reads a value into memory; none that is read so may exceed a short-form length.
func (p *parser) raw(e element) ([]byte, error) {
	if e.length == undefined {
		return nil, p.damaged(e.header, e.tag, "a sequence; expected a value of stated length")
	}
	if e.length > 65534 {
		return nil, p.damaged(e.header, e.tag, "a value of %d bytes; expected at most 65534", e.length)
	}
	if e.length == 0 {
		return nil, nil
	}
	return p.bytes(e.off, int(e.length))
}

// text reads a text value without its padding; an absent one is "".
func (p *parser) text(d dataset, t tag) (string, error) {
	e, ok := d[t]
	if !ok {
		return "", nil
	}
	b, err := p.raw(e)
	return strings.Trim(string(b), " \x00"), err
}

// word reads a code string of capital letters, digits, spaces and underscores (CS, PS3.5 6.2).
// Anything else is taken for absent: it can match no defined term.
func (p *parser) word(d dataset, t tag) (string, error) {
	s, err := p.text(d, t)
	if len(s) > 16 || strings.ContainsFunc(s, func(r rune) bool {
		return !('A' <= r && r <= 'Z' || '0' <= r && r <= '9' || r == ' ' || r == '_')
	}) {
		return "", err
	}
	return s, err
}

// uint16s reads the US or SS values of an element, nil where it is absent or empty.
func (p *parser) uint16s(d dataset, t tag) ([]uint16, error) {
	e, ok := d[t]
	if !ok {
		return nil, nil
	}
	b, err := p.raw(e)
	if err != nil {
		return nil, err
	}
	if len(b)%2 != 0 {
		return nil, p.damaged(e.header, t, "a value of %d bytes; expected whole 16-bit numbers", len(b))
	}
	v := make([]uint16, len(b)/2)
	for i := range v {
		v[i] = e.syntax.order().Uint16(b[2*i:])
	}
	return v, nil
}

// number reads one US value; without it the default counts, and a default below 0 makes it required.
func (p *parser) number(d dataset, t tag, absent int) (int, error) {
	v, err := p.uint16s(d, t)
	switch {
	case err != nil:
		return 0, err
	case len(v) > 0:
		return int(v[0]), nil
	case absent < 0:
		return 0, p.damaged(p.size, t, "no value; expected one, as in every image")
	}
	return absent, nil
}

// decimals reads the DS or IS values of an element. What is no finite number is NaN.
func (p *parser) decimals(d dataset, t tag) ([]float64, error) {
	s, err := p.text(d, t)
	if err != nil || s == "" {
		return nil, err
	}
	var v []float64
	for f := range strings.SplitSeq(s, `\`) {
		v = append(v, parseDecimal(f))
		if len(v) > maxWindows {
			break
		}
	}
	return v, nil
}

// parseDecimal reads a DS or IS string (PS3.5 6.2); NaN where it is none.
func parseDecimal(s string) float64 {
	s = strings.Trim(s, " \x00")
	if strings.Trim(s, "0123456789+-.eE") != "" {
		return math.NaN()
	}
	f, err := strconv.ParseFloat(s, 64)
	if err != nil {
		return math.NaN()
	}
	return f
}

// decimal reads one DS value; without it the default counts.
func (p *parser) decimal(d dataset, t tag, absent float64) (float64, error) {
	v, err := p.decimals(d, t)
	if err != nil || len(v) == 0 {
		return absent, err
	}
	if math.IsNaN(v[0]) {
		return 0, p.damaged(d[t].header, t, "no number; expected a decimal number")
	}
	return v[0], nil
}

// phrase makes a text of a file fit to be shown: bytes become text by the character sets that have one byte
// for each character, or UTF-8; what remains unknown, and every control character, is replaced.
func phrase(s, charset string) string {
	s = strings.Trim(s, " \x00")
	if !utf8.ValidString(s) {
		latin := charset == "ISO_IR 100"
		var b strings.Builder
		for _, c := range []byte(s) {
			switch {
			case c < 0x80 || latin:
				b.WriteRune(rune(c))
			default:
				b.WriteRune(utf8.RuneError)
			}
		}
		s = b.String()
	}
	s = strings.Map(func(r rune) rune {
		if unicode.IsControl(r) {
			return ' '
		}
		return r
	}, s)
	if r := []rune(s); len(r) > 64 { // the longest LO
		s = string(r[:64])
	}
	return s
}

// uid reads a UID; required, since only Reference asks.
func (p *parser) uid(d dataset, t tag) (string, error) {
	s, err := p.text(d, t)
	if err != nil {
		return "", err
	}
	if !isUID(s) {
		return "", p.damaged(d[t].header, t, "no UID; expected one, to name the image")
	}
	return s, nil
}

// plural counts things in an error.
func plural(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}
