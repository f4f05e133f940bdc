package photometry

import "math"

// foot is the international foot in metres, exact by definition.
const foot = 0.3048

const (
	cdM2PerFootLambert = 1 / (math.Pi * foot * foot)
	luxPerFootCandle   = 1 / (foot * foot)
)

// CdM2 is the same luminance in candela per square metre: 3.4262591 for one foot-lambert.
func (l FootLambert) CdM2() CdM2 { return CdM2(l * cdM2PerFootLambert) }

// FootLambert is the same luminance in foot-lambert.
func (l CdM2) FootLambert() FootLambert { return FootLambert(l / cdM2PerFootLambert) }

// Lux is the same illuminance in lux: 10.7639104 for one foot-candle.
func (e FootCandle) Lux() Lux { return Lux(e * luxPerFootCandle) }

// FootCandle is the same illuminance in foot-candle.
func (e Lux) FootCandle() FootCandle { return FootCandle(e / luxPerFootCandle) }

// Reflected is the luminance that a screen of diffuse reflection coefficient rd reflects when e
// falls on it: Lamb = Rd E. Mirror images of lamps are not part of it.
func Reflected(e Lux, rd PerLux) CdM2 { return CdM2(float64(e) * float64(rd)) }
