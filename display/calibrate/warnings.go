package calibrate

import (
	"fmt"
	"math"
	"sort"
)

const (
	// enough is the number of levels under which a series is called short: contrast is judged over eighteen.
	enough = 18
	// flatRise is what a panel rises by, in JND, over levels that are called flat.
	flatRise = 1.
	// flatShare is the share of all levels that a flat stretch covers at least. A power law of 2.4 rises by
	// three JND over as many levels above black.
	flatShare = 0.03
	// openShare is the half-width of the band, as a share of one of seventeen equal steps, from which on the
	// curve is called open. Half of that contrast is what a step is then uncertain by.
	openShare = 0.1
	// farOff is the distance of a reading from the line between its neighbours, in standard deviations, from
	// which on it is asked whether the reading is mistaken.
	farOff = 6
	// mistaken is the variance, in JND squared, of a reading that is.
	mistaken = 2500
	// telling is the logarithm of the likelihood ratio that is taken for an answer: one in 1100, against
	// what is a rare thing beforehand.
	telling = 7
)

// concerns lists what a user should know of the readings.
func (c *Curve) concerns(in Input) []Warning {
	var out []Warning
	if n := len(c.Points); n < enough {
		out = append(out, Warning{Concern: Short, Text: fmt.Sprintf("%d levels; expected %d or more; read more levels for a table that can be relied on", n, enough)})
	}
	if in.Ramp == "" {
		out = append(out, Warning{Concern: RampOpen, Text: "it is not stated which ramp the readings were taken through; a table made through another table would correct twice; state the ramp"})
	}
	out = append(out, c.reversed()...)
	out = append(out, c.flat()...)
	if c.Exact {
		return out
	}
	out = append(out, c.scattered()...)
	return append(out, c.open()...)
}

// reversed names the stretches over which luminance lies below that of a lower level, by more than noise.
func (c *Curve) reversed() []Warning {
	var out []Warning
	best := 0 // the point that is brightest so far
	from := -1
	name := func(to int) {
		a, b := c.Points[from], c.Points[to]
		out = append(out, Warning{Concern: Reversed, FromLevel: a.Level, ToLevel: b.Level, Text: fmt.Sprintf(
			"luminance falls between levels %d and %d; the table keeps to the lowest level that reaches a luminance; read these levels again, then look for dynamic contrast or a table in the panel", a.Level, b.Level)})
		from = -1
	}
	for i := 1; i < len(c.Points); i++ {
		drop := indexOf(float64(c.Points[best].Luminance)) - indexOf(float64(c.Points[i].Luminance))
		noise := 0.
		if !c.Exact {
			noise = 3.5 * math.Sqrt(c.variance[best]+c.variance[i])
		}
		switch {
		case drop > noise && from < 0:
			from = best
		case drop <= 0 && from >= 0:
			name(i)
		}
		if drop <= 0 {
			best = i
		}
	}
	if from >= 0 {
		name(len(c.Points) - 1)
	}
	return out
}

// flat names the stretches of levels over which the curve hardly rises.
func (c *Curve) flat() []Warning {
	var out []Warning
	js := c.levels(c.Bits)
	for i, l := range js {
		js[i] = indexOf(l)
	}
	least := max(2, int(math.Ceil(flatShare*float64(c.top()))))
	for i := 0; i+least <= c.top(); {
		k := i
		for k < c.top() && math.Abs(js[k+1]-js[i]) < flatRise {
			k++
		}
		if k-i < least {
			i++
			continue
		}
		advice := "the panel or a table in it merges these grays"
		switch {
		case i == 0:
			advice = "black is cut off; lift the black level (brightness) of the monitor and read again"
		case k == c.top():
			advice = "white is clipped; lower the gain (contrast) of the monitor and read again"
		}
		out = append(out, Warning{Concern: Flat, FromLevel: i, ToLevel: k, Text: fmt.Sprintf(
			"levels %d to %d differ by less than one JND (%.1f); %s", i, k, math.Abs(js[k]-js[i]), advice)})
		i = k
	}
	return out
}

// scattered names readings that make the others more likely when they are taken for mistaken, and says so
// where all of them scatter more than the meter's noise.
func (c *Curve) scattered() []Warning {
	samples := thinned(c.samples())
	suspects := suspicious(samples)
	restless := 0.0
	for _, f := range c.mixture {
		if f.length <= 0.1 {
			restless += f.weight
		}
	}
	if len(suspects) == 0 && restless < 0.5 {
		return nil
	}
	now := explain(samples).evidence()
	var out []Warning
	for _, i := range suspects {
		trial := append([]sample(nil), samples...)
		trial[i].variance = mistaken
		others := explain(trial)
		if others.evidence()-now < telling {
			continue
		}
		l := int(math.Round(samples[i].x * float64(c.top())))
		mean, _ := others.weighed().curve([]float64{samples[i].x})
		out = append(out, Warning{Concern: Scatter, FromLevel: l, ToLevel: l, Text: fmt.Sprintf(
			"level %d reads %.4g cd/m2; the other readings lead to expect %.4g; read it again", l, luminanceOf(samples[i].y), luminanceOf(mean[0]))})
	}
	if len(out) > 0 {
		return out
	}
	times, best := 1., now+telling
	for _, k := range []float64{2, 4, 8} {
		trial := append([]sample(nil), samples...)
		for i := range trial {
			trial[i].variance *= k * k
		}
		if e := explain(trial).evidence(); e > best {
			times, best = k, e
		}
	}
	if times > 1 {
		out = append(out, Warning{Concern: Scatter, Text: fmt.Sprintf("the readings scatter about %.0f times as much as the meter's noise; state the meter's repeatability, or let each level settle before it is read", times)})
	}
	return out
}

// suspicious are the samples, three at most, that lie furthest from the line between their neighbours beyond
// noise and beyond what bends between neighbours: the neighbours themselves do not lie far off on the same side.
func suspicious(samples []sample) []int {
	off := make([]float64, len(samples))
	for i := 1; i+1 < len(samples); i++ {
		a, b, d := samples[i-1], samples[i], samples[i+1]
		t := (b.x - a.x) / (d.x - a.x)
		miss := b.y - (a.y + t*(d.y-a.y))
		off[i] = miss / math.Sqrt(b.variance+sq(1-t)*a.variance+sq(t)*d.variance)
	}
	var out []int
	for i := 1; i+1 < len(samples); i++ {
		if math.Abs(off[i]) > farOff && off[i]*off[i-1] <= 0 && off[i]*off[i+1] <= 0 {
			out = append(out, i)
		}
	}
	sort.SliceStable(out, func(i, k int) bool { return math.Abs(off[out[i]]) > math.Abs(off[out[k]]) })
	return out[:min(len(out), 3)]
}

// open names the gap between readings in which the curve is known least, if that is little.
func (c *Curve) open() []Warning {
	first, last := c.index.Predict(0), c.index.Predict(1)
	limit := openShare * (last - first) / 17
	worst, at, gaps := 0., 0, 0
	xs := c.drives()
	for i := 1; i < len(xs); i++ {
		widest := 0.
		for _, t := range []float64{0.25, 0.5, 0.75} {
			widest = max(widest, 1.96*c.spread.Predict(xs[i-1]+t*(xs[i]-xs[i-1])))
		}
		if widest > limit {
			gaps++
		}
		if widest > worst {
			worst, at = widest, i
		}
	}
	if gaps == 0 {
		return nil
	}
	a, b := c.Points[at-1].Level, c.Points[at].Level
	return []Warning{{Concern: Sparse, FromLevel: a, ToLevel: b, Text: fmt.Sprintf(
		"between levels %d and %d the curve is known to %.1f JND only, in %d gaps to more than %.1f; read levels between them, or these again", a, b, worst, gaps, limit)}}
}
