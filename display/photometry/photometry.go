// Package photometry holds the quantities of light that the project measures, as types that carry
// their unit, and the conversions between them. It judges nothing and knows no monitor.
//
// Units follow the SI (BIPM SI brochure, 9th edition, candela, lumen, lux); chromaticity follows
// CIE 15:2018 (xy of the 1931 observer, u'v' of the 1976 diagram).
package photometry

// CdM2 is a luminance in candela per square metre.
type CdM2 float64

// FootLambert is a luminance in foot-lambert: 1/pi candela per square foot.
type FootLambert float64

// Lux is an illuminance in lumen per square metre.
type Lux float64

// FootCandle is an illuminance in lumen per square foot.
type FootCandle float64

// PerLux is a diffuse reflection coefficient Rd: the luminance in cd/m2 that a screen reflects
// for each lux that falls on it (unit cd/m2 per lx, which is 1/sr).
type PerLux float64

// Kelvin is a correlated colour temperature.
type Kelvin float64

// XY is a CIE 1931 chromaticity.
type XY struct{ X, Y float64 }

// UV is a CIE 1976 chromaticity u', v'.
type UV struct{ U, V float64 }
