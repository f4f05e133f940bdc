package response

import (
	"math"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
)

// goldenSection is the place of the smallest value of f between a and b, for an f with one valley.
func goldenSection(a, b float64, f func(float64) float64) float64 {
	ratio := (math.Sqrt(5) - 1) / 2
	c, d := b-ratio*(b-a), a+ratio*(b-a)
	fc, fd := f(c), f(d)
	for b-a > 1e-7*math.Max(1, math.Abs(a)+math.Abs(b)) {
		if fc < fd {
			b, d, fd = d, c, fc
			c = b - ratio*(b-a)
			fc = f(c)
		} else {
			a, c, fc = c, d, fd
			d = a + ratio*(b-a)
			fd = f(d)
		}
	}
	return (a + b) / 2
}

// indexEnds are the indices of the first and the last luminance; false where the GSDF cannot be used.
func indexEnds(lum []float64) (ends [2]gsdf.JND, ok bool) {
	j1, err := gsdf.Index(photometry.CdM2(lum[0]))
	if err != nil {
		return ends, false
	}
	jn, err := gsdf.Index(photometry.CdM2(lum[len(lum)-1]))
	if err != nil || jn < j1 {
		return ends, false
	}
	return [2]gsdf.JND{j1, jn}, true
}
