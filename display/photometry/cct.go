package photometry

import (
	"errors"
	"fmt"
	"math"
)

// ErrNoCCT says that a light has no correlated colour temperature that can be stated.
var ErrNoCCT = errors.New("no correlated colour temperature")

// The temperatures for which the cubic approximation is held to serve (from memory: it is good
// to a few kelvin between illuminant A and D65, and commonly used from 2000 K to 12500 K).
const (
	minCCT Kelvin = 2000
	maxCCT Kelvin = 12500
)

// maxFromPlanckian is the distance in the CIE 1960 diagram beyond which a light is too far from
// any black body for a correlated colour temperature to mean something (CIE 15:2018, from memory).
const maxFromPlanckian = 0.05

// CCT is the correlated colour temperature by the cubic approximation of McCamy 1992 (Color
// Research and Application 17, 142). It answers from 2000 K to 12500 K and for lights within 0.05
// of the black body in the CIE 1960 diagram; all else is refused with ErrNoCCT, or with
// ErrChromaticity if the pair is not Valid.
func (c XY) CCT() (Kelvin, error) {
	if err := c.Valid(); err != nil {
		return 0, err
	}
	n := (c.X - 0.3320) / (0.1858 - c.Y)
	t := Kelvin(5520.33 + n*(6823.3+n*(3525+n*449)))
	// Written so that a NaN, from the point where all lines of equal temperature meet, is refused.
	if !(t >= minCCT && t <= maxCCT) {
		return 0, fmt.Errorf("x %v, y %v has %w between %v and %v K: use the chromaticity itself", c.X, c.Y, ErrNoCCT, minCCT, maxCCT)
	}
	if d := c.fromPlanckian(t); d > maxFromPlanckian {
		return 0, fmt.Errorf("x %v, y %v has %w: it is %.3f from the black body, at most %v allowed", c.X, c.Y, ErrNoCCT, d, maxFromPlanckian)
	}
	return t, nil
}

// fromPlanckian is the distance in the CIE 1960 diagram to the black body of temperature t.
func (c XY) fromPlanckian(t Kelvin) float64 {
	uv, body := c.UV(), planckian(t)
	// The v of 1960 is two thirds of the v' of 1976.
	return math.Hypot(uv.U-body.U, (uv.V-body.V)*2/3)
}

// planckian is the chromaticity of the black body by the rational approximation of Krystek 1985
// (Color Research and Application 10, 38), 1000 K to 15000 K; coefficients from memory, checked
// against illuminant A.
func planckian(t Kelvin) UV {
	k := float64(t)
	u := (0.860117757 + k*(1.54118254e-4+k*1.28641212e-7)) / (1 + k*(8.42420235e-4+k*7.08145163e-7))
	v := (0.317398726 + k*(4.22806245e-5+k*4.20481691e-8)) / (1 + k*(-2.89741816e-5+k*1.61456053e-7))
	return UV{U: u, V: v * 3 / 2}
}
