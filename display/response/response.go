// Package response turns the readings of a visit into what can be said of a monitor's grays: the
// luminances with ambient light over the levels, contrast per JND and its deviation from the
// Grayscale Standard Display Function (DICOM PS3.14), the metrics of PS3.14 Annex C, the uncertainty
// of each, and the cause that the deviations point to. It knows no limit and gives no verdict.
package response

import (
	"evenstep/display/gsdf"
	"evenstep/display/photometry"
)

// AmbientSource says where the ambient luminance of a visit comes from.
type AmbientSource string

// The sources of the ambient luminance Lamb.
const (
	AmbientMeasured  AmbientSource = "measured"               // a luminance, display off, room light as in use
	AmbientFromRd    AmbientSource = "illuminance_rd"         // illuminance times a known Rd
	AmbientAssumedRd AmbientSource = "illuminance_rd_assumed" // illuminance times the default Rd
	AmbientDarkRoom  AmbientSource = "dark_room"              // stated: no ambient light
	AmbientInside    AmbientSource = "included"               // every reading holds it, its size is not known
)

// Light is the room light of a visit.
type Light struct {
	Source      AmbientSource
	Ambient     *photometry.CdM2   // Lamb; nil where the readings hold an unknown amount
	Illuminance *photometry.Lux    // on the screen plane; nil where not measured
	Rd          *photometry.PerLux // nil where neither given, assumed nor derivable
	RdAssumed   bool               // Rd is the default, true value anywhere in RdLow..RdHigh
}

// The default diffuse reflection coefficient, and the range in which the true one is taken to lie
// with equal chance (typical matt liquid-crystal screens; from memory, no document read).
const (
	RdDefault photometry.PerLux = 0.005
	RdLow     photometry.PerLux = 0.002
	RdHigh    photometry.PerLux = 0.010
)

// Noise is what is known of the meter.
type Noise struct {
	Repeatability float64         // r: standard deviation of a reading as a fraction of it
	Floor         photometry.CdM2 // a: standard deviation near zero; s^2 = (r L)^2 + a^2
	Assumed       bool            // r or a is the default
	Gain          float64         // standard uncertainty of the factor common to all readings, a fraction; 0: not stated
	Resolution    photometry.CdM2 // one unit of the least digit; 0: not stated
	Offset        photometry.CdM2 // standard uncertainty of a zero error or stray light common to all readings; 0: not stated
}

// The reading noise taken where none is stated (common practice, no source).
const (
	RepeatabilityDefault                 = 0.005
	FloorDefault         photometry.CdM2 = 0.005
)

// Point is one level of a response.
type Point struct {
	Level     int
	Luminance photometry.CdM2  // L', ambient light in it
	Emitted   *photometry.CdM2 // L without ambient; nil where the ambient light is not known
	Readings  int              // how many were averaged
}

// Step is the interval between two neighbouring levels.
type Step struct {
	FromLevel, ToLevel int
	JNDFrom, JNDTo     gsdf.JND // equal steps of the index over the levels, from j(L'first) to j(L'last)
	ContrastPerJND     float64  // measured: relative luminance difference per JND
	Expected           float64  // the same on the standard function
	Deviation          float64  // ContrastPerJND / Expected - 1
	Low, High          float64  // simultaneous 95 % interval of Deviation over all steps
}
