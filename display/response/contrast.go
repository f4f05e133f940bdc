package response

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat/distuv"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
)

// confidence of every interval.
const confidence = 0.95

// band holds the two parts of the variance of a figure: what repeats would average out, and what
// they would not.
type band struct{ noise, other float64 }

// term is one entry of a gradient over the points.
type term struct {
	point int
	slope float64
}

// sidak is the factor by which a standard uncertainty is widened so that n intervals hold at once
// with the confidence of all intervals (Sidak 1967: exact for independent errors, safe for others).
func sidak(n int) float64 {
	each := math.Pow(confidence, 1/float64(n))
	return distuv.UnitNormal.Quantile((1 + each) / 2)
}

// compute fills Steps by the contrast formula: J in equal steps over the levels from j(L'first) to
// j(L'last); measured and expected contrast per JND are the relative luminance differences
// 2(L2-L1)/(L2+L1) over the JNDs of the step (AAPM On-line Report 03 section 4.3.4; formula from memory).
func (r *Response) compute() {
	last := len(r.Points) - 1
	lo, hi := r.Points[0].Luminance, r.Points[last].Luminance
	j1, err := gsdf.Index(lo)
	if err != nil {
		r.Undefined = fmt.Sprintf("level %d: %v", r.Points[0].Level, err)
		return
	}
	jn, err := gsdf.Index(hi)
	if err != nil {
		r.Undefined = fmt.Sprintf("level %d: %v", r.Points[last].Level, err)
		return
	}
	if jn <= j1 {
		r.Undefined = fmt.Sprintf("the highest level (%.4g cd/m2) is not brighter than the lowest (%.4g cd/m2): there is no range to spread steps over", hi, lo)
		return
	}
	span := float64(r.Points[last].Level - r.Points[0].Level)
	aims := make([]aim, len(r.Points))
	for i, p := range r.Points {
		t := float64(p.Level-r.Points[0].Level) / span
		aims[i] = newAim(j1, jn, t)
	}
	dj1, djn := 1/aims[0].slope, 1/aims[last].slope
	k := sidak(last)
	budget := r.budget()
	r.Steps = make([]Step, last)
	r.bands = make([]band, last)
	for i := 1; i <= last; i++ {
		a, b := float64(r.Points[i-1].Luminance), float64(r.Points[i].Luminance)
		x, y := aims[i-1], aims[i]
		measured, ma, mb := relativeStep(a, b)
		expected, ex, ey := relativeStep(x.luminance, y.luminance)
		ratio := measured / expected
		jnds := float64(y.index - x.index)
		// The ends move the whole standard curve: dJ/dJ1 = 1-t, dJ/dJn = t.
		end1 := ex*x.slope*(1-x.t) + ey*y.slope*(1-y.t)
		endN := ex*x.slope*x.t + ey*y.slope*y.t
		grad := [4]term{
			{i - 1, ma / expected},
			{i, mb / expected},
			{0, -ratio / expected * end1 * dj1},
			{last, -ratio / expected * endN * djn},
		}
		r.bands[i-1] = budget.of(grad[:])
		u := k * math.Sqrt(r.bands[i-1].noise+r.bands[i-1].other)
		r.Steps[i-1] = Step{
			FromLevel: r.Points[i-1].Level, ToLevel: r.Points[i].Level,
			JNDFrom: x.index, JNDTo: y.index,
			ContrastPerJND: measured / jnds, Expected: expected / jnds,
			Deviation: ratio - 1, Low: ratio - 1 - u, High: ratio - 1 + u,
		}
	}
}

// aim is a place on the standard function.
type aim struct {
	t         float64 // share of the way from the lowest to the highest level
	index     gsdf.JND
	luminance float64
	slope     float64 // dL/dJ in cd/m2 per JND
}

func newAim(j1, jn gsdf.JND, t float64) aim {
	j := j1 + gsdf.JND(t)*(jn-j1)
	j = min(max(j, gsdf.First), gsdf.Last)
	const h = 1e-3 // JND; the function bends over tens of JND, so the difference quotient is good to 1e-8
	below, above := max(j-h, gsdf.First), min(j+h, gsdf.Last)
	at := func(x gsdf.JND) float64 {
		l, err := gsdf.Luminance(x)
		if err != nil {
			return math.NaN() // not reached: x is kept inside the domain
		}
		return float64(l)
	}
	return aim{t: t, index: j, luminance: at(j), slope: (at(above) - at(below)) / float64(above-below)}
}

// relativeStep is 2(b-a)/(b+a) and its slopes over a and b.
func relativeStep(a, b float64) (value, da, db float64) {
	sum := a + b
	if sum == 0 {
		return 0, 0, 0
	}
	return 2 * (b - a) / sum, -4 * b / (sum * sum), 4 * a / (sum * sum)
}

// errorBudget holds what the luminances L' are uncertain by.
type errorBudget struct {
	noise  []float64   // variance of the mean at each point, from reading noise
	single []float64   // variance at each point that repeats leave: meter resolution
	common [][]float64 // standard uncertainties that move all points together, one slice a source
}

func (r *Response) budget() errorBudget {
	n := len(r.Points)
	b := errorBudget{noise: make([]float64, n), single: make([]float64, n)}
	res := float64(r.Noise.Resolution)
	gain, offset, ambient := make([]float64, n), make([]float64, n), make([]float64, n)
	lambSpread := r.Light.spread(r.Noise)
	for i, p := range r.Points {
		b.noise[i] = r.Noise.variance(r.read[i]) / float64(p.Readings)
		b.single[i] = res * res / 12
		gain[i] = r.Noise.Gain * r.read[i]
		if r.Light.Source == AmbientMeasured {
			gain[i] = r.Noise.Gain * float64(p.Luminance) // the same meter measured Lamb
		}
		offset[i] = float64(r.Noise.Offset)
		if !r.inside[i] {
			ambient[i] = lambSpread
		} else {
			ambient[i] = -r.taken
		}
	}
	for _, source := range [][]float64{gain, offset, ambient} {
		for _, v := range source {
			if v != 0 {
				b.common = append(b.common, source)
				break
			}
		}
	}
	return b
}

func (b errorBudget) of(grad []term) band {
	var v band
	// Two entries of a gradient may name the same point: its slopes add before they are squared.
	for i, g := range grad {
		seen := false
		slope := g.slope
		for k, h := range grad {
			if h.point != g.point || k == i {
				continue
			}
			if k < i {
				seen = true
				break
			}
			slope += h.slope
		}
		if seen {
			continue
		}
		v.noise += slope * slope * b.noise[g.point]
		v.other += slope * slope * b.single[g.point]
	}
	for _, source := range b.common {
		sum := 0.0
		for _, g := range grad {
			sum += g.slope * source[g.point]
		}
		v.other += sum * sum
	}
	return v
}

// widen takes the ends of an assumed Rd into every step's interval: the true Rd may lie anywhere
// between them, so the interval covers all of it.
func (r *Response) widen() {
	for _, e := range r.ends {
		for i := range e.Steps {
			if i < len(r.Steps) {
				r.Steps[i].Low = min(r.Steps[i].Low, e.Steps[i].Low)
				r.Steps[i].High = max(r.Steps[i].High, e.Steps[i].High)
			}
		}
	}
}

// GreatestDeviation is the largest |Deviation| over the steps, with the interval in which the true
// one lies: [max(0, max(|d|-U)), max(|d|+U)] from the simultaneous intervals d +- U of the steps. It
// reports false where there are no steps.
func (r *Response) GreatestDeviation() (Estimate, Step, bool) {
	if len(r.Steps) == 0 {
		return Estimate{}, Step{}, false
	}
	worst := r.Steps[0]
	for _, s := range r.Steps {
		if math.Abs(s.Deviation) > math.Abs(worst.Deviation) {
			worst = s
		}
	}
	with := func(n int) (float64, float64) {
		lo, hi := r.deviationInterval(n)
		for _, e := range r.ends {
			if len(e.Steps) == 0 {
				continue
			}
			l, h := e.deviationInterval(n)
			lo, hi = min(lo, l), max(hi, h)
		}
		return lo, hi
	}
	lo, hi := with(1)
	return Estimate{Value: math.Abs(worst.Deviation), Low: lo, High: hi, Levels: len(r.Points), with: with}, worst, true
}

func (r *Response) deviationInterval(repeats int) (lo, hi float64) {
	k := sidak(len(r.Steps))
	for i, s := range r.Steps {
		u := k * math.Sqrt(r.bands[i].noise/float64(repeats)+r.bands[i].other)
		d := math.Abs(s.Deviation)
		lo, hi = max(lo, d-u), max(hi, d+u)
	}
	return lo, hi
}

// JNDs is the index range j(L'min), j(L'max). It reports false where the GSDF cannot be used.
func (r *Response) JNDs() (low, high gsdf.JND, ok bool) {
	if len(r.Steps) == 0 {
		return 0, 0, false
	}
	return r.Steps[0].JNDFrom, r.Steps[len(r.Steps)-1].JNDTo, true
}

// LevelJND is the index that a point should have: equal steps over the levels.
func (r *Response) LevelJND(point int) (gsdf.JND, bool) {
	switch {
	case len(r.Steps) == 0:
		return 0, false
	case point == 0:
		return r.Steps[0].JNDFrom, true
	}
	return r.Steps[point-1].JNDTo, true
}

// Expected is the luminance that the standard function asks for at a point, given the measured ends.
func (r *Response) Expected(point int) (photometry.CdM2, bool) {
	j, ok := r.LevelJND(point)
	if !ok {
		return 0, false
	}
	l, err := gsdf.Luminance(j)
	return l, err == nil
}
