// Package calibrate makes a table out of readings: a monitor's characteristic curve (luminance over
// driving level, ambient light in it), a table from P-values to driving levels that follows the Grayscale
// Standard Display Function (DICOM PS3.14) between two luminances, what that table will do, which levels
// to read next, and the table as an ICC display profile. It reads no files, loads no table into a graphics
// card, and gives no verdict.
package calibrate

import (
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
)

// Input is what a curve is made from.
type Input struct {
	Bits     int            // bit depth of the levels
	Scale    readings.Scale // only driving levels make a curve
	Ramp     string         // the ramp the readings were taken through: "identity", a checksum, or "" where not stated
	Readings []readings.Reading
	Light    response.Light
	Noise    response.Noise
}

// Identity is the ramp that changes nothing.
const Identity = "identity"

// Drive is a driving level as a share of the highest one, 0 to 1, whatever the bit depth.
type Drive float64

// Concern says what a warning is about.
type Concern string

// The concerns that a series of readings can raise.
const (
	Flat     Concern = "flat"     // luminance does not rise over some levels
	Reversed Concern = "reversed" // luminance falls over some levels
	Sparse   Concern = "sparse"   // the readings leave the curve open between two levels
	Short    Concern = "short"    // there are few levels
	Scatter  Concern = "scatter"  // the readings lie further from the curve than the meter's noise explains
	RampOpen Concern = "ramp"     // it is not stated which ramp the readings were taken through
	AimMoved Concern = "aim"      // the aim was brought to what the panel can do
	Coarse   Concern = "coarse"   // the driving levels are too few for the steps asked for
)

// Warning is what a user should know of a curve or a table. FromLevel and ToLevel are driving levels of
// the readings' bit depth; both are 0 where it is not about levels.
type Warning struct {
	Concern   Concern `json:"concern"`
	FromLevel int     `json:"from_level"`
	ToLevel   int     `json:"to_level"`
	Text      string  `json:"text"` // one line: what was found, what to do
}

// Band is a luminance with its 95 % interval.
type Band struct {
	Luminance, Low, High photometry.CdM2 // ambient light in it
}
