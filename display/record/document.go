// Package record seals an assessed visit: raw readings, conditions, the limits as used and what was
// found, in canonical JSON (RFC 8785) under a SHA-256, so that a later change shows. It judges
// nothing and keeps no register.
package record

import "evenstep/display/criteria"

// Schema names the document type; Version its edition. A reader refuses a newer version.
const (
	Schema  = "evenstep-record"
	Version = 1
)

// Record is one assessed visit. Fractions are fractions; units stand in the keys. Sealed fields are
// set by Seal.
type Record struct {
	Schema  string `json:"schema"`
	Version int    `json:"version"`
	Program string `json:"program"` // name and version of the program that sealed it

	Visit   Visit    `json:"visit"`
	Monitor Monitor  `json:"monitor"`
	Persons []Person `json:"persons"` // ids only: names live in the register
	Meter   Meter    `json:"meter"`

	File     *SourceFile `json:"file,omitempty"` // the readings file; absent where readings were typed
	Readings []Reading   `json:"readings"`
	Places   []Place     `json:"places,omitempty"`
	// PlacesFile is the file that the places came from.
	PlacesFile *SourceFile `json:"places_file,omitempty"`
	Neighbour  *Neighbour  `json:"neighbour,omitempty"`

	Table *Table `json:"table,omitempty"` // made in the visit; absent where none was

	Scheme     *criteria.Used      `json:"scheme"` // null where none was asked for
	Assessment criteria.Assessment `json:"assessment"`

	SHA256 string `json:"sha256,omitempty"` // of the canonical form without this key, lower-case hexadecimal
}

// Visit says when and why.
type Visit struct {
	Kind  string `json:"kind"` // "acceptance", "constancy", "check", "after change"
	Time  string `json:"time"` // RFC 3339, when it was assessed
	Notes string `json:"notes,omitempty"`
}

// Monitor says what was measured, as far as the visit knows.
type Monitor struct {
	Serial string `json:"serial"`
	Name   string `json:"name,omitempty"`
	Ramp   string `json:"ramp,omitempty"` // "identity" or a checksum of the graphics card's table
}

// Person is an id with the part it had.
type Person struct {
	ID   string `json:"id"`
	Part string `json:"part"` // "measured", "reviewed"
}

// Meter is the luminance meter and what its papers say.
type Meter struct {
	ID           string  `json:"id"`
	Kind         string  `json:"kind,omitempty"`          // "contact" or "distance"
	CalibratedOn string  `json:"calibrated_on,omitempty"` // ISO 8601 day; "" where not stated
	Factor       float64 `json:"factor,omitempty"`        // against the site's reference meter; the readings hold it; 0 or 1: none
	Resolution   float64 `json:"resolution_cd_m2,omitempty"`
	Offset       float64 `json:"offset_cd_m2,omitempty"`
}

// SourceFile identifies the bytes that the readings came from.
type SourceFile struct {
	Name   string `json:"name"` // base name only
	SHA256 string `json:"sha256"`
	Unit   string `json:"unit"`
}

// Reading is one luminance at one level, as the meter gave it.
type Reading struct {
	Level           int     `json:"level"`
	Luminance       float64 `json:"luminance_cd_m2"`
	Role            string  `json:"role"`
	AmbientIncluded bool    `json:"ambient_included"`
	Time            string  `json:"time,omitempty"` // RFC 3339
}

// Place is one luminance at one position of a uniform field.
type Place struct {
	Position  string      `json:"position"`
	Level     int         `json:"level"`
	Luminance float64     `json:"luminance_cd_m2"`
	Colour    *[2]float64 `json:"u_v_prime,omitempty"`
}

// Table is a table from P-values to driving levels that was made from the visit's readings.
type Table struct {
	InBits       int      `json:"in_bits"`
	OutBits      int      `json:"out_bits"`
	Entries      []int    `json:"entries"`
	AimMin       float64  `json:"aim_min_cd_m2"` // ambient light in it
	AimMax       float64  `json:"aim_max_cd_m2"`
	MaxDeviation float64  `json:"predicted_max_deviation"` // a fraction
	Warnings     []string `json:"warnings,omitempty"`
}

// Neighbour is the other screen of the pair.
type Neighbour struct {
	Serial       string      `json:"serial,omitempty"`
	LuminanceMax *float64    `json:"luminance_max_cd_m2,omitempty"`
	White        *[2]float64 `json:"white_u_v_prime,omitempty"`
	OwnWhite     *[2]float64 `json:"own_white_u_v_prime,omitempty"`
}
