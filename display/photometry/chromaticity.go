package photometry

import (
	"errors"
	"fmt"
	"math"
)

// ErrChromaticity says that a pair of numbers is not the chromaticity of a light.
var ErrChromaticity = errors.New("not a chromaticity")

// sumSlack lets a pair on the line x + y = 1, such as the red end of the spectrum, survive
// rounding in the last digits.
const sumSlack = 1e-9

// D65 is the chromaticity of CIE standard illuminant D65 for the 1931 observer, to the five
// decimals of CIE 15:2018.
func D65() XY { return XY{X: 0.31270, Y: 0.32900} }

// Valid refuses with ErrChromaticity a pair that no light can have: not a number, negative, y of
// 0, or x and y together above 1. It does not ask whether the pair lies within the spectrum locus.
func (c XY) Valid() error {
	switch {
	case math.IsNaN(c.X) || math.IsNaN(c.Y):
		return fmt.Errorf("x %v, y %v is %w: give two numbers", c.X, c.Y, ErrChromaticity)
	case c.X < 0 || c.Y < 0:
		return fmt.Errorf("x %v, y %v is %w: neither may be negative", c.X, c.Y, ErrChromaticity)
	case c.Y == 0:
		return fmt.Errorf("x %v, y %v is %w: y of 0 has no luminance", c.X, c.Y, ErrChromaticity)
	case c.X+c.Y > 1+sumSlack:
		return fmt.Errorf("x %v, y %v is %w: together they may not exceed 1", c.X, c.Y, ErrChromaticity)
	}
	return nil
}

// UV is the same chromaticity in the CIE 1976 diagram (CIE 15:2018). A pair that is not Valid
// gives a meaningless result.
func (c XY) UV() UV {
	d := -2*c.X + 12*c.Y + 3
	return UV{U: 4 * c.X / d, V: 9 * c.Y / d}
}

// XY is the same chromaticity in the CIE 1931 diagram (CIE 15:2018).
func (c UV) XY() XY {
	d := 6*c.U - 16*c.V + 12
	return XY{X: 9 * c.U / d, Y: 4 * c.V / d}
}

// Distance is the straight distance between two chromaticities in the CIE 1976 diagram.
func (c UV) Distance(to UV) float64 { return math.Hypot(c.U-to.U, c.V-to.V) }
