package response

import (
	"errors"
	"fmt"
	"math"
	"sort"

	"evenstep/display/photometry"
	"evenstep/display/readings"
)

// Input is what a response is computed from.
type Input struct {
	Bits     int // bit depth of the levels
	Scale    readings.Scale
	Readings []readings.Reading
	Light    Light
	Noise    Noise
}

// Response is what the readings say of a monitor's grays. The first point is level 0, the last the
// highest level of the bit depth.
type Response struct {
	Bits   int
	Scale  readings.Scale
	Light  Light
	Noise  Noise
	Points []Point // rising levels
	Steps  []Step  // one fewer than Points; nil where the GSDF cannot be used

	// Undefined says why there are no Steps: L' outside the function, or no rise from end to end.
	Undefined string

	drifts []driftPair
	inside []bool // per point: the readings hold the ambient light
	read   []float64
	ends   []*Response // the same readings at the ends of an assumed Rd
	taken  float64     // standard uncertainty of an ambient luminance that was taken out of readings that held it

	bands []band // per step: parts of the variance of Deviation
}

// ErrAmbientUnknown is returned while it is not known whether a reading holds the ambient light, or
// how much is to be added.
var ErrAmbientUnknown = errors.New("ambient light is not known")

// Evaluate computes the response. It fails where it is not known how ambient light stands to the
// readings, where an end level is missing, or where the meter's figures are out of range; a
// luminance that the GSDF does not know is no failure (see Response.Undefined).
func Evaluate(in Input) (*Response, error) {
	if err := in.Noise.check(); err != nil {
		return nil, err
	}
	if in.Bits < 1 || in.Bits > 16 {
		return nil, fmt.Errorf("bit depth is %d; expected 1 to 16; state the depth of the levels", in.Bits)
	}
	r := &Response{Bits: in.Bits, Scale: in.Scale, Light: in.Light, Noise: in.Noise}
	if err := r.gather(in); err != nil {
		return nil, err
	}
	r.compute()
	for _, end := range in.Light.extremes() {
		at := in
		at.Light = end
		e := &Response{Bits: in.Bits, Scale: in.Scale, Light: end, Noise: in.Noise}
		if err := e.gather(at); err != nil {
			return nil, err
		}
		e.compute()
		r.ends = append(r.ends, e)
	}
	r.widen()
	return r, nil
}

// gather averages series and repeat readings by level, with the ambient light added where the
// reading does not hold it.
func (r *Response) gather(in Input) error {
	type sum struct {
		read, total float64
		n           int
		inside      bool
		first       *readings.Reading
	}
	levels := map[int]*sum{}
	lamb, known := 0.0, in.Light.Ambient != nil
	if known {
		lamb = float64(*in.Light.Ambient)
		if math.IsNaN(lamb) || lamb < 0 || math.IsInf(lamb, 0) {
			return fmt.Errorf("ambient luminance is %v cd/m2; expected 0 or more; measure it with the display off", lamb)
		}
	}
	full := func(rd readings.Reading) (float64, error) {
		switch {
		case rd.Ambient == readings.Included:
			return float64(rd.Luminance), nil
		case rd.Ambient == readings.Excluded && known:
			return float64(rd.Luminance) + lamb, nil
		case rd.Ambient == readings.Excluded:
			return 0, fmt.Errorf("level %d: the reading does not hold the ambient light: %w; state its luminance, the illuminance, or a dark room", rd.Level, ErrAmbientUnknown)
		}
		return 0, fmt.Errorf("level %d: %w; state whether the readings hold it, and how much it is", rd.Level, ErrAmbientUnknown)
	}
	for i, rd := range in.Readings {
		if v := float64(rd.Luminance); math.IsNaN(v) || math.IsInf(v, 0) || v < 0 {
			return fmt.Errorf("level %d: luminance is %v cd/m2; expected 0 or more; take the reading again", rd.Level, v)
		}
		if rd.Role == readings.Drift {
			continue
		}
		v, err := full(rd)
		if err != nil {
			return err
		}
		s := levels[rd.Level]
		if s == nil {
			s = &sum{inside: rd.Ambient == readings.Included}
			levels[rd.Level] = s
		}
		if s.first == nil && rd.Role != readings.Repeat {
			s.first = &in.Readings[i]
		}
		s.read += float64(rd.Luminance)
		s.total += v
		s.n++
		s.inside = s.inside && rd.Ambient == readings.Included
	}
	order := make([]int, 0, len(levels))
	for l := range levels {
		order = append(order, l)
	}
	sort.Ints(order)
	top := 1<<in.Bits - 1
	if len(order) < 2 || order[0] != 0 || order[len(order)-1] != top {
		return fmt.Errorf("levels: %d measured; expected at least level 0 and level %d of %d bits; measure both ends", len(order), top, in.Bits)
	}
	for _, l := range order {
		s := levels[l]
		v := s.total / float64(s.n)
		// A reading that holds the ambient light cannot be below it, but for noise.
		if short := lamb - v; s.inside && known && short > 4*math.Sqrt(in.Noise.variance(lamb)+in.Noise.variance(v)) {
			return fmt.Errorf("level %d: reads %.4g cd/m2 with ambient light in it, but the ambient light alone is %.4g; expected at least that; correct the ambient luminance, or state that the readings do not hold it", l, v, lamb)
		}
		p := Point{Level: l, Luminance: photometry.CdM2(v), Readings: s.n}
		if known {
			e := photometry.CdM2(v - lamb)
			p.Emitted = &e
		}
		r.Points = append(r.Points, p)
		r.inside = append(r.inside, s.inside)
		r.read = append(r.read, s.read/float64(s.n))
	}
	for _, rd := range in.Readings {
		s := levels[rd.Level]
		if rd.Role != readings.Drift || s == nil || s.first == nil {
			continue
		}
		first, err := full(*s.first)
		if err != nil {
			return err
		}
		later, err := full(rd)
		if err != nil {
			return err
		}
		r.drifts = append(r.drifts, driftPair{level: rd.Level, first: first, later: later})
	}
	return nil
}

// Eighteen is the response at the eighteen equal levels 0, 1/17, ... 1 of the full range, for which
// the schemes' contrast limits were made. A level counts if it lies within half an 8-bit level of
// its place. It reports false where the series does not contain them.
func (r *Response) Eighteen() (*Response, bool) {
	const steps = 17
	top := float64(int(1)<<r.Bits - 1)
	reach := top / 255 / 2
	var keep []int
	for i := 0; i <= steps; i++ {
		want := float64(i) * top / steps
		best, dist := -1, math.Inf(1)
		for k, p := range r.Points {
			if d := math.Abs(float64(p.Level) - want); d < dist {
				best, dist = k, d
			}
		}
		if dist > reach || (len(keep) > 0 && keep[len(keep)-1] == best) {
			return nil, false
		}
		keep = append(keep, best)
	}
	if len(keep) == len(r.Points) {
		return r, true
	}
	return r.pick(keep), true
}

// pick is the response restricted to some of its points.
func (r *Response) pick(keep []int) *Response {
	sub := &Response{Bits: r.Bits, Scale: r.Scale, Light: r.Light, Noise: r.Noise, drifts: r.drifts}
	for _, k := range keep {
		sub.Points = append(sub.Points, r.Points[k])
		sub.inside = append(sub.inside, r.inside[k])
		sub.read = append(sub.read, r.read[k])
	}
	sub.compute()
	for _, e := range r.ends {
		sub.ends = append(sub.ends, e.pick(keep))
	}
	sub.widen()
	return sub
}

// AtIlluminance is the same monitor in another room light: what it emits stays, what it reflects
// follows e and rd. It reports false where it is not known what the monitor emits.
func (r *Response) AtIlluminance(e photometry.Lux, rd photometry.PerLux) (*Response, bool) {
	at := &Response{Bits: r.Bits, Scale: r.Scale, Light: r.Light.withIlluminance(e, rd), Noise: r.Noise, inside: r.inside, read: r.read}
	at.taken = r.Light.spread(r.Noise)
	for _, p := range r.Points {
		if p.Emitted == nil {
			return nil, false
		}
		p.Luminance = *p.Emitted + *at.Light.Ambient
		at.Points = append(at.Points, p)
	}
	at.compute()
	return at, true
}

// WithoutAmbient is what the monitor emits. It reports false where that is not known.
func (r *Response) WithoutAmbient() (*Response, bool) { return r.AtIlluminance(0, 0) }
