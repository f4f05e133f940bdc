package record

import (
	"fmt"
	"time"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
)

// Take fills in what was measured: readings, places and neighbour.
func (r *Record) Take(in response.Input, places []readings.Place, n *criteria.Neighbour) {
	r.Readings = make([]Reading, 0, len(in.Readings))
	for _, rd := range in.Readings {
		one := Reading{
			Level: rd.Level, Luminance: float64(rd.Luminance), Role: string(rd.Role),
			AmbientIncluded: rd.Ambient == readings.Included,
		}
		if !rd.Time.IsZero() {
			one.Time = rd.Time.UTC().Format(time.RFC3339)
		}
		r.Readings = append(r.Readings, one)
	}
	r.Meter.Resolution, r.Meter.Offset = float64(in.Noise.Resolution), float64(in.Noise.Offset)
	r.Places = nil
	for _, p := range places {
		r.Places = append(r.Places, Place{Position: string(p.Position), Level: p.Level, Luminance: float64(p.Luminance), Colour: pair(p.Colour)})
	}
	if n == nil {
		r.Neighbour = nil
		return
	}
	if r.Neighbour == nil {
		r.Neighbour = &Neighbour{}
	}
	r.Neighbour.LuminanceMax, r.Neighbour.White, r.Neighbour.OwnWhite = (*float64)(n.LuminanceMax), pair(n.White), pair(n.OwnWhite)
}

// Measured is the visit as it was measured, to be judged again. It fails where the readings are not a
// series, which a sealed record's always are.
func (r *Record) Measured() (criteria.Visit, error) {
	a := r.Assessment
	in := response.Input{
		Bits: a.Bits, Scale: readings.Scale(a.Scale),
		Light: response.Light{
			Source: response.AmbientSource(a.AmbientSource), Ambient: (*photometry.CdM2)(a.Ambient),
			Illuminance: (*photometry.Lux)(a.Illuminance), Rd: (*photometry.PerLux)(a.Rd), RdAssumed: a.RdAssumed,
		},
		Noise: response.Noise{
			Repeatability: a.Noise.Repeatability, Floor: photometry.CdM2(a.Noise.FloorCdM2), Assumed: a.Noise.Assumed,
			Gain: a.Noise.GainStandard, Resolution: photometry.CdM2(r.Meter.Resolution), Offset: photometry.CdM2(r.Meter.Offset),
		},
	}
	for _, rd := range r.Readings {
		one := readings.Reading{Level: rd.Level, Luminance: photometry.CdM2(rd.Luminance), Role: readings.Role(rd.Role), Ambient: readings.Excluded}
		if rd.AmbientIncluded {
			one.Ambient = readings.Included
		}
		if rd.Time != "" {
			t, err := time.Parse(time.RFC3339, rd.Time)
			if err != nil {
				return criteria.Visit{}, fmt.Errorf("record: level %d: %w", rd.Level, err)
			}
			one.Time = t
		}
		in.Readings = append(in.Readings, one)
	}
	resp, err := response.Evaluate(in)
	if err != nil {
		return criteria.Visit{}, fmt.Errorf("record: %w", err)
	}
	v := criteria.Visit{Response: resp}
	for _, p := range r.Places {
		v.Places = append(v.Places, readings.Place{Position: readings.Position(p.Position), Level: p.Level, Luminance: photometry.CdM2(p.Luminance), Colour: unpair(p.Colour)})
	}
	if n := r.Neighbour; n != nil {
		v.Neighbour = &criteria.Neighbour{LuminanceMax: (*photometry.CdM2)(n.LuminanceMax), White: unpair(n.White), OwnWhite: unpair(n.OwnWhite)}
	}
	return v, nil
}

func pair(c *photometry.UV) *[2]float64 {
	if c == nil {
		return nil
	}
	return &[2]float64{c.U, c.V}
}

func unpair(c *[2]float64) *photometry.UV {
	if c == nil {
		return nil
	}
	return &photometry.UV{U: c[0], V: c[1]}
}
