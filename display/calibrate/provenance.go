package calibrate

import (
	"errors"
	"fmt"
	"strings"
	"time"

	"evenstep/luts"
)

// Provenance is what a table remembers of how it came about.
type Provenance struct {
	Monitor        string    // what the monitor is called
	Serial         string    // "" only where NoSerial
	NoSerial       bool      // it was stated that the monitor has no serial number
	Date           time.Time // of the readings
	ReadingsSHA256 string    // of the file of readings, lower-case hexadecimal
	Program        string    // name and version of the program that made the table
}

// ErrProvenance wraps what is missing of a provenance.
var ErrProvenance = errors.New("a table must say where it comes from")

// Check says what is missing: the monitor, its serial number or the word that it has none, the date, the
// hash of the readings, the program.
func (p Provenance) Check() error {
	missing := func(what, do string) error {
		return fmt.Errorf("provenance: no %s; %w; expected one; %s", what, ErrProvenance, do)
	}
	switch {
	case strings.TrimSpace(p.Monitor) == "":
		return missing("monitor", "name the monitor")
	case p.Serial == "" && !p.NoSerial:
		return missing("serial number", "state it, or that the monitor has none")
	case p.Serial != "" && p.NoSerial:
		return fmt.Errorf("provenance: the serial number %q and the word that there is none; %w; expected one of them", p.Serial, ErrProvenance)
	case p.Date.IsZero():
		return missing("date", "state when the readings were taken")
	case len(p.ReadingsSHA256) != 64 || strings.Trim(p.ReadingsSHA256, "0123456789abcdef") != "":
		return missing("hash of the readings", "give the SHA-256 of their file in lower-case hexadecimal")
	case p.Program == "":
		return missing("program", "give its name and version")
	}
	return nil
}

// Map is the provenance of a table as table files hold it, with the ambient light and the aim that the
// table was made for. A figure that is not known is null. It fails where Check does.
func (p Provenance) Map(c *Curve, r Result) (luts.Provenance, error) {
	if err := p.Check(); err != nil {
		return nil, err
	}
	m := luts.Provenance{
		"monitor":           p.Monitor,
		"serial":            nil,
		"has_serial":        !p.NoSerial,
		"ambient_cd_m2":     nil,
		"ambient_source":    string(c.Light.Source),
		"aim_min_cd_m2":     float64(r.Range.Min),
		"aim_max_cd_m2":     float64(r.Range.Max),
		"aim_ratio":         r.Range.Ratio,
		"date":              p.Date.UTC().Format(time.RFC3339),
		"readings_sha256":   p.ReadingsSHA256,
		"program":           p.Program,
		"levels_read":       len(c.Points),
		"taken_as_they_are": c.Exact,
	}
	if !p.NoSerial {
		m["serial"] = p.Serial
	}
	if c.Light.Ambient != nil {
		m["ambient_cd_m2"] = float64(*c.Light.Ambient)
	}
	return m, nil
}
