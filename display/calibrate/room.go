package calibrate

import (
	"math"

	"evenstep/display/photometry"
)

// holds is the greatest contrast deviation up to which a table is said to hold (the limit of the usual
// schemes for diagnosis: common practice, no source).
const holds = 0.10

// RoomLight is the room light in which a table keeps its greatest contrast deviation within 10 %. The
// luminances are Lamb, what the screen reflects; the illuminances are those on the screen. A nil figure
// cannot be had, for the Reason.
type RoomLight struct {
	AmbientLow      *photometry.CdM2   `json:"ambient_low_cd_m2"`
	AmbientHigh     *photometry.CdM2   `json:"ambient_high_cd_m2"`
	IlluminanceLow  *photometry.Lux    `json:"illuminance_low_lx"`
	IlluminanceHigh *photometry.Lux    `json:"illuminance_high_lx"`
	Rd              *photometry.PerLux `json:"rd_per_lx"`
	RdAssumed       bool               `json:"rd_assumed"`
	Reason          string             `json:"reason,omitempty"`
}

// room searches the room light on both sides of the one that the curve was taken in.
func (p *Prediction) room() RoomLight {
	l := p.curve.Light
	r := RoomLight{Rd: l.Rd, RdAssumed: l.RdAssumed}
	if l.Ambient == nil {
		r.Reason = "the readings hold an unknown amount of ambient light; measure it with the display off"
		return r
	}
	here := float64(*l.Ambient)
	at := p.eighteen()
	emitted := make([]float64, len(at))
	for i, v := range at {
		emitted[i] = max(0, p.curve.luminance(p.outs[v])-here)
	}
	within := func(ambient float64) bool {
		full := make([]float64, len(emitted))
		for i, e := range emitted {
			full[i] = e + ambient
		}
		d := deviations(at, full)
		for _, v := range d {
			if math.Abs(v) > holds {
				return false
			}
		}
		return d != nil
	}
	if !within(here) {
		r.Reason = "the table deviates by more than 10 % in the room light that it was made for"
		return r
	}
	low, high := photometry.CdM2(edge(0, here, within)), photometry.CdM2(edge(brightest(here, emitted, within), here, within))
	r.AmbientLow, r.AmbientHigh = &low, &high
	if l.Rd == nil || *l.Rd <= 0 {
		r.Reason = "no Rd is known, so the illuminance cannot be told; measure illuminance and reflected luminance once"
		return r
	}
	lowLux, highLux := photometry.Lux(float64(low)/float64(*l.Rd)), photometry.Lux(float64(high)/float64(*l.Rd))
	r.IlluminanceLow, r.IlluminanceHigh = &lowLux, &highLux
	return r
}

// brightest is an ambient luminance at which the table no longer holds.
func brightest(here float64, emitted []float64, within func(float64) bool) float64 {
	a := max(here, emitted[0]/16, 1e-3)
	for within(a) && a < emitted[len(emitted)-1] {
		a *= 1.25
	}
	return a
}

// edge is the value nearest to out at which within still holds, given that it holds at in and has one edge
// on the way.
func edge(out, in float64, within func(float64) bool) float64 {
	if within(out) {
		return out
	}
	for range 60 {
		mid := (out + in) / 2
		if within(mid) {
			in = mid
		} else {
			out = mid
		}
	}
	return in
}
