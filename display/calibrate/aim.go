package calibrate

import (
	"errors"
	"fmt"
	"math"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
)

// Aim is the range of luminances that a table goes for, ambient light in them. Nil is not stated; with
// nothing stated the aim is what the panel has, as measured. A ratio alone keeps the panel's white and
// lifts black; a ratio with one luminance gives the other one; all three at once are refused.
type Aim struct {
	Min, Max *photometry.CdM2
	Ratio    *float64 // L'max / L'min
}

// Range is an aim worked out for one panel, with what it costs against the panel's own range.
type Range struct {
	Min, Max  photometry.CdM2 // ambient light in them
	JNDs      gsdf.JND        // from Min to Max
	JNDsLost  gsdf.JND        // of the panel's own range
	WhiteLost photometry.CdM2 // what the brightest gray loses
	BlackGain photometry.CdM2 // what the darkest gray gains
	Ratio     float64
	PanelMin  photometry.CdM2 // the panel's own range, ambient light in it
	PanelMax  photometry.CdM2
}

// ErrAim wraps every refusal of an aim.
var ErrAim = errors.New("the aim cannot be reached")

// Range works an aim out for the panel. An aim beyond what the panel shows is brought to it, with a
// warning, where the curve is not known well enough to tell them apart; else it is refused, wrapping ErrAim,
// as is a luminance outside the standard function.
func (c *Curve) Range(a Aim) (Range, []Warning, error) {
	black, white := c.Band(c.blackest()), c.Band(c.whitest())
	r := Range{PanelMin: black.Luminance, PanelMax: white.Luminance, Min: black.Luminance, Max: white.Luminance}
	var warnings []Warning
	for _, v := range []*photometry.CdM2{a.Min, a.Max} {
		if v != nil && !(*v > 0) {
			return r, nil, fmt.Errorf("aim: a luminance of %v cd/m2; %w; expected more than 0", *v, ErrAim)
		}
	}
	if a.Ratio != nil && !(*a.Ratio > 1) {
		return r, nil, fmt.Errorf("aim: a luminance ratio of %v; %w; expected more than 1", *a.Ratio, ErrAim)
	}
	if a.Min != nil {
		r.Min = *a.Min
	}
	if a.Max != nil {
		r.Max = *a.Max
	}
	if a.Ratio != nil {
		switch {
		case a.Min != nil && a.Max != nil:
			return r, nil, fmt.Errorf("aim: minimum, maximum and ratio at once; %w; expected two of them at most; leave one out", ErrAim)
		case a.Min != nil:
			r.Max = photometry.CdM2(float64(r.Min) * *a.Ratio)
		default:
			r.Min = photometry.CdM2(float64(r.Max) / *a.Ratio)
		}
	}
	if r.Min < black.Luminance {
		if r.Min < black.Low {
			return r, nil, fmt.Errorf("aim: a darkest gray of %.4g cd/m2 with the ambient light; %w; expected at least %.4g, the panel's own; ask for a higher minimum or a lower ratio", r.Min, ErrAim, black.Luminance)
		}
		warnings = append(warnings, Warning{Concern: AimMoved, Text: fmt.Sprintf("the aim's darkest gray, %.4g cd/m2, is below the panel's %.4g by less than is known of it; the panel's is taken", r.Min, black.Luminance)})
		r.Min = black.Luminance
	}
	if r.Max > white.Luminance {
		if r.Max > white.High {
			return r, nil, fmt.Errorf("aim: a brightest gray of %.5g cd/m2 with the ambient light; %w; expected at most %.5g, the panel's own; ask for a lower maximum or turn the backlight up", r.Max, ErrAim, white.Luminance)
		}
		warnings = append(warnings, Warning{Concern: AimMoved, Text: fmt.Sprintf("the aim's brightest gray, %.5g cd/m2, is above the panel's %.5g by less than is known of it; the panel's is taken", r.Max, white.Luminance)})
		r.Max = white.Luminance
	}
	j1, err := gsdf.Index(r.Min)
	if err != nil {
		return r, nil, fmt.Errorf("aim: the darkest gray: %w; %w; state the ambient light, or aim for a higher minimum", err, ErrAim)
	}
	jn, err := gsdf.Index(r.Max)
	if err != nil {
		return r, nil, fmt.Errorf("aim: the brightest gray: %w; %w; aim for a lower maximum", err, ErrAim)
	}
	if jn-j1 < 1 {
		return r, nil, fmt.Errorf("aim: %.4g to %.4g cd/m2 is less than one JND; %w; expected a range to spread grays over", r.Min, r.Max, ErrAim)
	}
	r.JNDs = jn - j1
	r.Ratio = float64(r.Max / r.Min)
	r.JNDsLost = max(0, gsdf.JND(indexOf(float64(r.PanelMax))-indexOf(float64(r.PanelMin)))-r.JNDs)
	r.WhiteLost, r.BlackGain = r.PanelMax-r.Max, r.Min-r.PanelMin
	return r, warnings, nil
}

// blackest and whitest are the darkest and the brightest level of the readings, of equals the lower one; a
// fitted curve has them at its ends.
func (c *Curve) blackest() Drive { return c.extreme(0, func(a, b float64) bool { return a < b }) }
func (c *Curve) whitest() Drive  { return c.extreme(1, func(a, b float64) bool { return a > b }) }

// blackestOf is the driving level of a bit depth that lies nearest to the darkest level.
func (c *Curve) blackestOf(bits int) int {
	return int(math.Round(float64(c.blackest()) * float64(int(1)<<bits-1)))
}

func (c *Curve) extreme(end Drive, beyond func(a, b float64) bool) Drive {
	if !c.Exact {
		return end
	}
	best := 0
	for i, p := range c.Points {
		if beyond(float64(p.Luminance), float64(c.Points[best].Luminance)) {
			best = i
		}
	}
	return Drive(c.drives()[best])
}

// targets are the luminances of n grays in equal steps of the index from lo to hi (PS3.14 D.1.3).
func targets(lo, hi photometry.CdM2, n int) ([]float64, error) {
	j1, err := gsdf.Index(lo)
	if err != nil {
		return nil, err
	}
	jn, err := gsdf.Index(hi)
	if err != nil {
		return nil, err
	}
	out := make([]float64, n)
	for i := range out {
		l, err := gsdf.Luminance(min(j1+(jn-j1)*gsdf.JND(i)/gsdf.JND(n-1), jn))
		if err != nil {
			return nil, err
		}
		out[i] = float64(l)
	}
	return out, nil
}
