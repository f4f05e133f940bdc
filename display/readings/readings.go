// Package readings holds what a meter said, one luminance at one level, and the CSV file in which
// a series of such readings travels. It computes nothing from them and adds no ambient light.
package readings

import (
	"time"

	"evenstep/display/photometry"
)

// Role says what a reading is for.
type Role string

// The roles of a reading.
const (
	Series Role = "series" // one of the levels, in the order measured
	Repeat Role = "repeat" // the same level again: averaged with its level
	Drift  Role = "drift"  // the same level later: compared with the first of its level, never averaged
)

// Ambient says whether a reading holds the ambient light that the screen reflects.
type Ambient string

// The states of Ambient. Nothing may be judged while a reading is Unstated.
const (
	Unstated Ambient = ""
	Included Ambient = "included"
	Excluded Ambient = "excluded"
)

// Scale says what the levels of a series are.
type Scale string

// The scales of a level: the raw input of the display system, or the input of a calibrated chain
// (PS3.14 section 3). A series over P-values is judged, never used as a characteristic curve.
const (
	DDL    Scale = "ddl"
	PValue Scale = "p_value"
)

// Reading is one luminance at one level.
type Reading struct {
	Level     int
	Luminance photometry.CdM2 // as the meter gave it, in cd/m2 whatever the unit of the file
	Role      Role
	Ambient   Ambient
	Time      time.Time // zero where it was not noted
	Line      int       // line of the file it came from, 0 where it was typed
}

// Metadata is what the "# key: value" lines of a file state. A nil pointer or an empty string was
// not stated.
type Metadata struct {
	Bits          int                // bit depth of the levels, 8 where not stated
	Ambient       *photometry.CdM2   // ambient_cd_m2
	Illuminance   *photometry.Lux    // illuminance_lx
	Rd            *photometry.PerLux // rd
	Meter         string             // meter
	Serial        string             // serial of the monitor
	Repeatability *float64           // repeatability, a fraction of the reading
	NoiseFloor    *photometry.CdM2   // noise_floor
	Ramp          string             // ramp: "identity" or a checksum
	Scheme        string             // scheme
	Class         string             // class
}

// File is one parsed readings file.
type File struct {
	Name     string
	SHA256   string // of the bytes as read, lower-case hexadecimal
	Scale    Scale
	Unit     string // "cd/m2" or "fL", as the column was headed
	Metadata Metadata
	Readings []Reading // in file order
}
