package response

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat/distuv"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
)

// single is the factor for one 95 % interval.
func single() float64 { return distuv.UnitNormal.Quantile((1 + confidence) / 2) }

// estimate makes an Estimate of a figure that is computed from the points with the given gradient,
// and covers the figure at the ends of an assumed Rd.
func (r *Response) estimate(levels int, figure func(*Response) (value float64, grad []term)) Estimate {
	k := single()
	one := func(at *Response, n int) (value, lo, hi float64) {
		v, grad := figure(at)
		b := at.budget().of(grad)
		u := k * math.Sqrt(b.noise/float64(n)+b.other)
		return v, v - u, v + u
	}
	with := func(n int) (float64, float64) {
		_, lo, hi := one(r, n)
		for _, e := range r.ends {
			_, l, h := one(e, n)
			lo, hi = min(lo, l), max(hi, h)
		}
		return lo, hi
	}
	v, _, _ := one(r, 1)
	lo, hi := with(1)
	return Estimate{Value: v, Low: lo, High: hi, Levels: levels, with: with}
}

// LuminanceMax is L'max, the luminance of the highest level with ambient light, in cd/m2.
func (r *Response) LuminanceMax() Estimate { return r.luminance(len(r.Points) - 1) }

// LuminanceMin is L'min, the luminance of level 0 with ambient light, in cd/m2.
func (r *Response) LuminanceMin() Estimate { return r.luminance(0) }

func (r *Response) luminance(point int) Estimate {
	return r.estimate(1, func(at *Response) (float64, []term) {
		return float64(at.Points[point].Luminance), []term{{point, 1}}
	})
}

// HighestRead is the mean of the readings at the highest level, as the meter gave them.
func (r *Response) HighestRead() photometry.CdM2 { return photometry.CdM2(r.read[len(r.read)-1]) }

// darkest is the luminance below which a black counts as 0: no luminance meter resolves it.
const darkest photometry.CdM2 = 1e-6

// Ratio is the luminance ratio r' = L'max/L'min. The reason is not empty where there is none.
func (r *Response) Ratio() (e Estimate, reason string) {
	if r.Points[0].Luminance < darkest {
		return Estimate{}, "L'min reads 0: the ratio has no bound; use a meter that resolves black, or state the ambient light"
	}
	last := len(r.Points) - 1
	return r.estimate(2, func(at *Response) (float64, []term) {
		lo, hi := float64(at.Points[0].Luminance), float64(at.Points[last].Luminance)
		return hi / lo, []term{{0, -hi / (lo * lo)}, {last, 1 / lo}}
	}), ""
}

// AmbientRatio is Lamb/Lmin: ambient luminance over the luminance that level 0 emits. The reason is
// not empty where it cannot be had.
func (r *Response) AmbientRatio() (e Estimate, reason string) {
	if r.Light.Ambient == nil {
		return Estimate{}, "the readings hold an unknown amount of ambient light; measure it with the display off"
	}
	figure := func(at *Response, repeats int) (v, lo, hi float64) {
		lamb, lmin := float64(*at.Light.Ambient), float64(*at.Points[0].Emitted)
		v = lamb / lmin
		sNoise := at.Noise.variance(at.read[0]) / float64(at.Points[0].Readings) / float64(repeats)
		res, off := float64(at.Noise.Resolution), float64(at.Noise.Offset)
		slope := v / lmin // |dv/dLmin|
		spread := at.Light.spread(at.Noise)
		ofLamb := 1 / lmin
		if at.inside[0] {
			ofLamb = (1 + v) / lmin // Lmin = L'min - Lamb moves against Lamb
		}
		other := math.Pow(ofLamb*spread, 2) + slope*slope*(res*res/12+off*off)
		if at.Light.Source != AmbientMeasured {
			other += math.Pow(v*at.Noise.Gain, 2) // Lamb did not come from the luminance meter, so its factor stays
		}
		u := single() * math.Sqrt(slope*slope*sNoise+other)
		return v, max(0, v-u), v + u
	}
	if *r.Points[0].Emitted < darkest {
		return Estimate{}, "level 0 emits nothing that the meter resolves: Lamb/Lmin has no bound"
	}
	with := func(n int) (float64, float64) {
		_, lo, hi := figure(r, n)
		for _, end := range r.ends {
			if *end.Points[0].Emitted < darkest {
				return lo, math.MaxFloat64
			}
			_, l, h := figure(end, n)
			lo, hi = min(lo, l), max(hi, h)
		}
		return lo, hi
	}
	v, _, _ := figure(r, 1)
	lo, hi := with(1)
	return Estimate{Value: v, Low: lo, High: hi, Levels: 1, with: with}, ""
}

// RoomIlluminance is the illuminance on the screen, in lx. The reason is not empty where it was not measured.
func (r *Response) RoomIlluminance() (e Estimate, reason string) {
	if r.Light.Illuminance == nil {
		return Estimate{}, "the illuminance on the screen was not measured"
	}
	v := float64(*r.Light.Illuminance)
	u := single() * illuminanceSpread * v
	return Fixed(v, v-u, v+u, 0), ""
}

// GreatestJNDStep is the variant of the greatest deviation that counts JNDs a step,
// (j2-j1)/(expected JNDs) - 1, largest in size, signed. Information: no scheme limits it. The reason
// is not empty where it cannot be had.
func (r *Response) GreatestJNDStep() (deviation float64, reason string) {
	if len(r.Steps) == 0 {
		return 0, r.Undefined
	}
	before := r.Steps[0].JNDFrom
	for i, s := range r.Steps {
		j, err := gsdf.Index(r.Points[i+1].Luminance)
		if err != nil {
			return 0, fmt.Sprintf("level %d: %v", s.ToLevel, err)
		}
		d := float64(j-before)/float64(s.JNDTo-s.JNDFrom) - 1
		if math.Abs(d) > math.Abs(deviation) {
			deviation = d
		}
		before = j
	}
	return deviation, ""
}

type driftPair struct {
	level        int
	first, later float64
}

// Drift is the greatest relative change of a drift reading against the first reading of its level,
// signed, with the level and the standard deviation that reading noise alone would give it. The
// reason is not empty where there is no drift reading.
func (r *Response) Drift() (change float64, level int, noise float64, reason string) {
	reason = "no drift reading was taken"
	for _, d := range r.drifts {
		if d.first <= 0 {
			if reason != "" {
				reason = "the first reading of the drift level is 0"
			}
			continue
		}
		if c := d.later/d.first - 1; reason != "" || math.Abs(c) > math.Abs(change) {
			change, level, reason = c, d.level, ""
			noise = math.Sqrt(2*r.Noise.variance(d.first)) / d.first
		}
	}
	return change, level, noise, reason
}
