package calibrate

import (
	"math"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
)

// The fit works on the index of the standard function, where reading noise is nearly even and panels
// bend least. Beyond the ends of the function a straight line goes on, for the fit alone: no aim and no
// prediction is made of it.
var domainEnds = struct{ low, high, lowSlope, highSlope float64 }{
	low: float64(gsdf.MinLuminance()), high: float64(gsdf.MaxLuminance()),
	lowSlope:  1 / (curveAt(2) - curveAt(1)),
	highSlope: 1 / (curveAt(1023) - curveAt(1022)),
}

// curveAt is the standard function between its ends; j outside them is brought to the nearer end.
func curveAt(j float64) float64 {
	l, err := gsdf.Luminance(gsdf.JND(min(max(j, float64(gsdf.First)), float64(gsdf.Last))))
	if err != nil {
		return math.NaN() // only for an index that is none
	}
	return float64(l)
}

// indexOf is j(L), with a straight line beyond the ends of the function.
func indexOf(l float64) float64 {
	d := &domainEnds
	switch {
	case l <= d.low:
		return float64(gsdf.First) + (l-d.low)*d.lowSlope
	case l >= d.high:
		return float64(gsdf.Last) + (l-d.high)*d.highSlope
	}
	j, err := gsdf.Index(photometry.CdM2(l))
	if err != nil {
		return math.NaN() // only for a luminance that is none
	}
	return float64(j)
}

// luminanceOf is the inverse of indexOf.
func luminanceOf(j float64) float64 {
	d := &domainEnds
	switch {
	case j <= float64(gsdf.First):
		return d.low + (j-float64(gsdf.First))/d.lowSlope
	case j >= float64(gsdf.Last):
		return d.high + (j-float64(gsdf.Last))/d.highSlope
	}
	return curveAt(j)
}

// indexSlope is dj/dL at l, in JND per cd/m2.
func indexSlope(l float64) float64 {
	h := max(l*1e-4, 1e-6)
	return (indexOf(l+h) - indexOf(l-h)) / (2 * h)
}
