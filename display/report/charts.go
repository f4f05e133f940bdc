package report

import (
	"fmt"
	"math"

	"evenstep/display/criteria"
	"evenstep/display/gsdf"
	"evenstep/display/response"
)

// greatestShown is the deviation up to which the axis goes: fifty times the contrast that ought to
// be. A marker beyond it lies on the edge.
const greatestShown = 50

const jndAxis = "JND index"

// ResponseChart shows the luminance of every level, with ambient light, at the JND index that the
// level ought to have, on the line of the standard function (PS3.14 section 7.1).
func ResponseChart(a criteria.Assessment, points []response.Point) Chart {
	c := Chart{Title: "Luminance over JND index"}
	if c.Empty = noSteps(a); c.Empty != "" {
		return c
	}
	first, last := a.Steps[0].JNDFrom, a.Steps[len(a.Steps)-1].JNDTo
	c.Note = fmt.Sprintf("%d levels from JND %s to %s: %s JNDs",
		len(a.Steps)+1, number(first, 1), number(last, 1), number(last-first, 1))
	index := map[int]float64{a.Steps[0].FromLevel: first}
	for _, s := range a.Steps {
		index[s.ToLevel] = s.JNDTo
	}
	c.Key = []KeyEntry{{Marker{Circle, true}, "measured"}}
	lo, hi := a.LuminanceMin, a.LuminanceMax
	for _, p := range points {
		j, ok := index[p.Level]
		if l := float64(p.Luminance); ok && l > 0 && finite(l) {
			c.Marks = append(c.Marks, Mark{At: XY{j, l}, Marker: Marker{Circle, true}})
			lo, hi = min(lo, l), max(hi, l)
		}
	}
	const pieces = 48
	var line Line
	for i := range pieces + 1 {
		j := first + (last-first)*float64(i)/pieces
		l, err := gsdf.Luminance(gsdf.JND(j))
		if err != nil {
			continue // a rounding error beyond an end of the function
		}
		line.At = append(line.At, XY{j, float64(l)})
		lo, hi = min(lo, float64(l)), max(hi, float64(l))
	}
	if n := len(line.At); n > 0 {
		c.Labels = []Label{{line.At[n*2/5], "standard function"}}
	}
	// A mistyped reading must not stretch the axis beyond use: its marker then lies on the edge.
	const least, most = 0.001, 100000
	lo, hi = min(most/10, max(least, lo)), max(least*10, min(most, hi))
	c.Lines = []Line{line}
	c.X = spanOfJND(first, last)
	c.Y = logAxis("luminance L' with ambient light, cd/m²", lo, hi)
	return c
}

// DeviationChart shows the deviation of every step from the contrast that the standard function
// asks for, in per cent, with its 95 % interval, and the limit where one was judged.
func DeviationChart(a criteria.Assessment) Chart {
	c := Chart{Title: "Deviation of contrast, step by step"}
	if c.Empty = noSteps(a); c.Empty != "" {
		return c
	}
	limits := deviationLimits(a.Findings)
	limit := math.Inf(1)
	reach := 0.05 // the axis shows at least 5 per cent either way, so that small noise looks small
	for _, l := range limits {
		limit, reach = min(limit, l), max(reach, l)
		for _, y := range []float64{l, -l} {
			c.Limits = append(c.Limits, LimitLine{Y: 100 * y, Text: signedPercent(y)})
		}
	}
	if len(limits) > 0 {
		c.Bands = []Band{{-100 * limit, 100 * limit}}
	}
	worst := 0
	for i, s := range a.Steps {
		reach = max(reach, math.Abs(s.Deviation))
		if math.Abs(s.Deviation) > math.Abs(a.Steps[worst].Deviation) {
			worst = i
		}
	}
	bars := 0.0
	for i, s := range a.Steps {
		x := (s.JNDFrom + s.JNDTo) / 2
		m := Mark{At: XY{x, 100 * s.Deviation}, Marker: Marker{Circle, false}}
		if math.Abs(s.Deviation) > limit {
			m.Marker.Shape = Triangle
		}
		if i == worst {
			m.Ring = Diamond
		}
		lo, hi := s.DeviationInterval[0], s.DeviationInterval[1]
		bars = max(bars, math.Abs(lo), math.Abs(hi))
		c.Marks = append(c.Marks, m)
		c.Bars = append(c.Bars, Bar{x, 100 * lo, 100 * hi})
	}
	// Intervals may be so wide at the dark end that no deviation could be seen beside them: they
	// are shown up to twice the rest, and cut there.
	reach = min(greatestShown, 1.12*max(reach, min(bars, 2*reach)))
	w := a.Steps[worst]
	c.Note = fmt.Sprintf("greatest: %s between levels %d and %d", signedPercent(w.Deviation), w.FromLevel, w.ToLevel)
	c.Key = deviationKey(len(limits) > 0)
	c.X = spanOfJND(a.Steps[0].JNDFrom, a.Steps[len(a.Steps)-1].JNDTo)
	c.Y = linearAxis("deviation, % (bars: 95 % intervals, over all steps at once)", -100*reach, 100*reach, 8)
	for i, t := range c.Y.Ticks {
		if t.At > 0 {
			c.Y.Ticks[i].Text = "+" + t.Text
		}
	}
	return c
}

func deviationKey(limited bool) []KeyEntry {
	greatest := KeyEntry{Marker{Diamond, true}, "greatest"}
	if !limited {
		return []KeyEntry{{Marker{Circle, false}, "step"}, greatest}
	}
	return []KeyEntry{
		{Marker{Circle, false}, "within"},
		{Marker{Triangle, false}, "beyond the limit"},
		greatest,
		{Marker{}, "limit"},
	}
}

// deviationLimits are the limits of contrast deviation, as fractions, each once; the ones that
// decide where there are any, else the ones that are only compared.
func deviationLimits(findings []criteria.Finding) []float64 {
	var deciding, other []float64
	add := func(to []float64, v float64) []float64 {
		for _, have := range to {
			if have == v {
				return to
			}
		}
		return append(to, v)
	}
	for _, f := range findings {
		switch {
		case f.Quantity != string(criteria.ContrastDeviation) || f.Limit <= 0 || f.Limit > greatestShown:
		case f.Verdict == criteria.NotAssessed:
			other = add(other, f.Limit)
		default:
			deciding = add(deciding, f.Limit)
		}
	}
	if len(deciding) > 0 {
		return deciding
	}
	return other
}

// spanOfJND is the axis of both charts, with air at both ends.
func spanOfJND(first, last float64) Axis {
	air := 0.03 * (last - first)
	return linearAxis(jndAxis, first-air, last+air, 7)
}

// noSteps is the reason for which there is nothing to draw, "" where there is.
func noSteps(a criteria.Assessment) string {
	for _, s := range a.Steps {
		if !finite(s.JNDFrom, s.JNDTo, s.Deviation, s.DeviationInterval[0], s.DeviationInterval[1]) || s.JNDTo <= s.JNDFrom {
			return "the steps of the record hold figures that cannot be drawn"
		}
	}
	switch {
	case len(a.Steps) > 0:
		return ""
	case a.JNDReason != "":
		return prose(a.JNDReason)
	case a.MaxDeviationReason != "":
		return prose(a.MaxDeviationReason)
	}
	return "the record holds no steps"
}

// CompareChart shows the responses of two visits on the standard function's line of the later one.
func CompareChart(before, after criteria.Assessment, pointsBefore, pointsAfter []response.Point) Chart {
	c := ResponseChart(after, pointsAfter)
	old := ResponseChart(before, pointsBefore)
	if c.Empty != "" || old.Empty != "" {
		if c.Empty == "" {
			c.Empty = old.Empty
		}
		return c
	}
	c.Title = "Luminance over JND index, both visits"
	c.Note = ""
	c.Key = []KeyEntry{{Marker{Square, true}, "earlier"}, {Marker{Circle, false}, "later"}}
	for i := range c.Marks {
		c.Marks[i].Marker.Open = false
	}
	for _, m := range old.Marks {
		m.Marker = Marker{Square, true}
		c.Marks = append(c.Marks, m)
	}
	first := min(after.Steps[0].JNDFrom, before.Steps[0].JNDFrom)
	last := max(after.Steps[len(after.Steps)-1].JNDTo, before.Steps[len(before.Steps)-1].JNDTo)
	c.X = spanOfJND(first, last)
	c.Y = logAxis(c.Y.Label, min(after.LuminanceMin, before.LuminanceMin), max(after.LuminanceMax, before.LuminanceMax))
	return c
}

// SeriesChart shows the readings of a series that is being taken, over its levels up to top.
func SeriesChart(taken []response.LevelReading, top int) Chart {
	c := Chart{Title: "Luminance over level, so far", Note: fmt.Sprintf("%d levels read", len(taken))}
	lo, hi := math.Inf(1), 0.0
	for _, r := range taken {
		if l := float64(r.Luminance); l > 0 && finite(l) {
			c.Marks = append(c.Marks, Mark{At: XY{float64(r.Level), l}, Marker: Marker{Circle, true}})
			lo, hi = min(lo, l), max(hi, l)
		}
	}
	if len(c.Marks) == 0 {
		c.Empty = "No reading above 0 yet."
		return c
	}
	const least, most = 0.001, 100000
	c.X = linearAxis("level", 0, float64(top), 6)
	c.Y = logAxis("luminance as read, cd/m²", min(most/10, max(least, lo)), max(least*10, min(most, hi)))
	c.Key = []KeyEntry{{Marker{Circle, true}, "read"}}
	return c
}

// CurvePoint is a place on a monitor's characteristic curve: the driving level as a share of the highest,
// luminances with ambient light in cd/m². Low and High are its 95 % interval; both 0 where there is none.
type CurvePoint struct{ Drive, Luminance, Low, High float64 }

// CurveChart shows a characteristic curve with its interval, and the readings that it was made from.
func CurveChart(curve, points []CurvePoint) Chart {
	c := Chart{Title: "Characteristic curve of the panel", Key: []KeyEntry{{Marker{Circle, true}, "read"}}}
	lo, hi := math.Inf(1), 0.0
	var line Line
	for _, p := range curve {
		if !finite(p.Luminance, p.Low, p.High) || p.Luminance <= 0 {
			continue
		}
		line.At = append(line.At, XY{p.Drive, p.Luminance})
		if p.High > p.Low && p.Low > 0 {
			c.Bars = append(c.Bars, Bar{p.Drive, p.Low, p.High})
		}
		lo, hi = min(lo, p.Luminance), max(hi, p.Luminance)
	}
	for _, p := range points {
		if finite(p.Luminance) && p.Luminance > 0 {
			c.Marks = append(c.Marks, Mark{At: XY{p.Drive, p.Luminance}, Marker: Marker{Circle, true}})
			lo, hi = min(lo, p.Luminance), max(hi, p.Luminance)
		}
	}
	if len(line.At) == 0 {
		c.Empty = "There is no curve."
		return c
	}
	c.Note = "bars: 95 % interval of the curve"
	c.Lines = []Line{line}
	c.X = linearAxis("driving level, share of the highest", 0, 1, 5)
	const least, most = 0.001, 100000
	c.Y = logAxis("luminance with ambient light, cd/m²", min(most/10, max(least, lo)), max(least*10, min(most, hi)))
	return c
}
