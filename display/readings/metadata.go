package readings

import (
	"fmt"
	"slices"
	"strings"
	"unicode"
	"unicode/utf8"

	"evenstep/display/photometry"
)

// The depths of a level. 16 bits is the deepest lookup table in use; 8 is what a screen has unless
// it is said otherwise.
const (
	minBits     = 1
	maxBits     = 16
	defaultBits = 8
)

// What metadata may state. Beyond these a value has the wrong unit or is mistyped.
const (
	maxAmbient       = 1000    // cd/m2
	maxIlluminance   = 100_000 // lx, a screen in full sun
	maxRd            = 1       // cd/m2 per lx; a white wall has 1/pi
	maxRepeatability = 0.2     // a fraction
	maxNoiseFloor    = 10      // cd/m2
)

// metadataKeys are the keys in the order in which they are written.
var metadataKeys = []string{
	"bits", "ambient_cd_m2", "illuminance_lx", "rd", "meter", "serial",
	"repeatability", "noise_floor", "ramp", "scheme", "class",
}

// metadata reads the "# key: value" lines. All other comments are passed over, but not those that
// look like a key mistyped: what they state would go unheard.
func (n *numbers) metadata() (Metadata, error) {
	m := Metadata{Bits: defaultBits}
	seen := map[string]int{}
	for _, c := range n.comments {
		key, value, _ := strings.Cut(c.s, ":")
		key, value = strings.TrimSpace(key), strings.TrimSpace(value)
		if !slices.Contains(metadataKeys, key) {
			if near := mistypedKey(key); near != "" {
				return m, n.fail(c.line, "comment "+quote("# "+key+":"), quote("# "+near+":"), "correct the key, or write the comment without the colon")
			}
			continue
		}
		if line, twice := seen[key]; twice {
			return m, n.fail(c.line, fmt.Sprintf("%s a second time after line %d", key, line), "each key once", "delete one of the lines")
		}
		seen[key] = c.line
		if problem := checkText(value); problem != "" {
			return m, n.fail(c.line, key+" "+problem, fmt.Sprintf("a value of at most %d characters on the line", maxText), "correct the value or delete the line")
		}
		if err := n.set(&m, c.line, key, value); err != nil {
			return m, err
		}
	}
	return m, nil
}

// set reads the value of one key.
func (n *numbers) set(m *Metadata, line int, key, value string) error {
	var v float64
	var err error
	switch key {
	case "bits":
		m.Bits, err = n.level(line, key, value, maxBits)
		if err != nil || m.Bits < minBits {
			return n.fail(line, key+" "+quote(value), fmt.Sprintf("a whole number from %d to %d", minBits, maxBits), "write the bit depth of the levels")
		}
	case "ambient_cd_m2":
		v, err = n.within(line, key, value, 0, maxAmbient, "cd/m2")
		m.Ambient = (*photometry.CdM2)(&v)
	case "illuminance_lx":
		v, err = n.within(line, key, value, 0, maxIlluminance, "lx")
		m.Illuminance = (*photometry.Lux)(&v)
	case "rd":
		v, err = n.within(line, key, value, 0, maxRd, "cd/m2 per lx")
		m.Rd = (*photometry.PerLux)(&v)
	case "noise_floor":
		v, err = n.within(line, key, value, 0, maxNoiseFloor, "cd/m2")
		m.NoiseFloor = (*photometry.CdM2)(&v)
	case "repeatability":
		if percent, ok := strings.CutSuffix(value, "%"); ok {
			v, err = n.within(line, key, strings.TrimSpace(percent), 0, 100*maxRepeatability, "%")
			v /= 100
		} else {
			v, err = n.within(line, key, value, 0, maxRepeatability, `as a fraction, or per cent with the sign "%"`)
		}
		m.Repeatability = &v
	case "meter":
		m.Meter = value
	case "serial":
		m.Serial = value
	case "ramp":
		m.Ramp = value
	case "scheme":
		m.Scheme = value
	case "class":
		m.Class = value
	}
	return err
}

// checkText says what keeps a text from being a value on one line, "" where nothing does.
func checkText(s string) string {
	switch {
	case s == "":
		return "without a value"
	case utf8.RuneCountInString(s) > maxText:
		return fmt.Sprintf("of %d characters", utf8.RuneCountInString(s))
	case !utf8.ValidString(s) || strings.ContainsFunc(s, func(r rune) bool { return !unicode.IsGraphic(r) }):
		return quote(s) + " with a character that does not print"
	case s != strings.TrimSpace(s):
		return quote(s) + " with space around it"
	}
	return ""
}
