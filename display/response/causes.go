package response

import (
	"fmt"
	"math"
	"strings"

	"evenstep/display/gsdf"
)

// The causes that readings alone can point to, in words. What needs the register or the graphics
// card (a table made for another monitor, a table that was lost, colour management) is not here.
const (
	CauseAmbientLeftOut  = "ambient light left out"
	CauseAmbientTwice    = "ambient light counted twice"
	CauseOtherRoomLight  = "table made for another room light"
	CauseNoTable         = "no GSDF table loaded"
	CauseLimitedRange    = "limited-range output"
	CauseMistypedLevel   = "a mistyped level"
	CauseMistypedReading = "a mistyped reading"
	CauseDrift           = "drift during the series"
	CauseSixBit          = "a six-bit panel"
	CauseCoarseTable     = "a coarse table"
	CauseRatioOnly       = "luminance ratio off while the shape is right"
)

// The thresholds of the causes. Rates of hits and false alarms at these values are printed by
// TestStudyCauses.
const (
	surelyOff      = 0.10  // a cause of shape is looked for only where the greatest deviation surely exceeds this
	explains       = 0.5   // a cause must at least halve the greatest deviation
	powerLawLeft   = 0.30  // share of the root-mean-square deviation that a power law may leave
	powerLawLeast  = 0.20  // greatest deviation below which no power law is looked for
	alike          = 1.25  // causes that leave deviations within this factor of each other are reported as a set
	flatStep       = -0.60 // a step that surely deviates by less than this shows (nearly) no contrast
	driftLeast     = 0.015 // relative change
	driftSigmas    = 3.5
	levelLeast     = 3.0 / 255 // share of the range by which a level must be misplaced
	levelSigmas    = 4.0
	sixBitShare    = 0.70 // share of all contrast found in one of four neighbouring steps
	coarseSpread   = 0.45 // standard deviation of the steps, in steps, beyond noise
	fineSeries     = 100  // levels from which steps are close enough to show a coarse table
	coarsestSeries = 40   // steps above which neighbours are too close to tell causes of shape
)

// Hints is what the causes need to know beside the readings.
type Hints struct {
	RatioFloor float64 // the least luminance ratio that is asked for; 0: none
}

// Causes names what the deviations point to, each with its evidence in numbers. Causes that the
// readings cannot tell apart come as one set; where nothing fits, nothing is said.
func (r *Response) Causes(h Hints) []Cause {
	var out []Cause
	if c, ok := r.driftCause(); ok {
		out = append(out, c)
	}
	if len(r.Steps) == 0 {
		return out
	}
	shape := r
	if sub, ok := r.Eighteen(); ok {
		shape = sub
	}
	if len(shape.Steps) >= 4 && len(shape.Steps) <= coarsestSeries {
		if c, ok := shape.shapeCause(); ok {
			out = append(out, c)
		}
	}
	if c, ok := r.coarseCause(); ok {
		out = append(out, c)
	}
	if c, ok := shape.ratioCause(h); ok {
		out = append(out, c)
	}
	return out
}

// suspect is a cause of shape with the deviation that is left once it is allowed for.
type suspect struct {
	names            []string
	left             float64 // root-mean-square deviation that stays
	evidence, advice string
}

func (r *Response) shapeCause() (Cause, bool) {
	worst, _, _ := r.GreatestDeviation()
	if worst.Low <= surelyOff {
		return Cause{}, false
	}
	if s, ok := r.limitedRange(); ok {
		return Cause{Causes: s.names, Evidence: s.evidence, Advice: s.advice}, true
	}
	lum := make([]float64, len(r.Points))
	levels := make([]float64, len(r.Points))
	for i, p := range r.Points {
		lum[i], levels[i] = float64(p.Luminance), float64(p.Level)
	}
	before := deviations(levels, lum)
	var found []suspect
	for _, look := range []func(levels, lum, before []float64) (suspect, bool){r.ambientSuspect, r.powerLawSuspect, r.levelSuspect} {
		if s, ok := look(levels, lum, before); ok {
			found = append(found, s)
		}
	}
	if len(found) == 0 {
		return Cause{}, false
	}
	best := found[0]
	for _, s := range found[1:] {
		if s.left < best.left {
			best = s
		}
	}
	c := Cause{Causes: append([]string(nil), best.names...), Evidence: best.evidence, Advice: best.advice}
	for _, s := range found {
		if s.left == best.left || s.left > alike*best.left {
			continue
		}
		c.Causes = append(c.Causes, s.names...)
		c.Evidence += "; or " + s.evidence
		c.Advice += "; or " + s.advice
	}
	return c, true
}

// deviations are those of the contrast formula for any luminances; nil where the GSDF cannot be used.
func deviations(levels, lum []float64) []float64 {
	ends, ok := indexEnds(lum)
	if !ok {
		return nil
	}
	last := len(lum) - 1
	out := make([]float64, last)
	at := func(i int) float64 {
		return newAim(ends[0], ends[1], (levels[i]-levels[0])/(levels[last]-levels[0])).luminance
	}
	before := at(0)
	for i := 1; i <= last; i++ {
		next := at(i)
		m, _, _ := relativeStep(lum[i-1], lum[i])
		e, _, _ := relativeStep(before, next)
		out[i-1] = m/e - 1
		before = next
	}
	return out
}

func size(d []float64) (greatest, rms float64) {
	for _, v := range d {
		greatest = max(greatest, math.Abs(v))
		rms += v * v
	}
	return greatest, math.Sqrt(rms / float64(len(d)))
}

// ambientSuspect looks for one luminance that, added to every reading, makes the deviations vanish.
func (r *Response) ambientSuspect(levels, lum, before []float64) (suspect, bool) {
	const steps = 80
	shifted := make([]float64, len(lum))
	try := func(x float64) float64 {
		for i, l := range lum {
			shifted[i] = l + x
		}
		d := deviations(levels, shifted)
		if d == nil {
			return math.Inf(1)
		}
		_, rms := size(d)
		return rms
	}
	// From k = -1, nearly all of L'min taken off, to k = 1, ten times L'min added, in growing steps.
	place := func(k float64) float64 { return lum[0] * (math.Pow(11, k) - 1) }
	best, left := 0.0, math.Inf(1)
	for i := -steps; i <= steps; i++ {
		k := float64(i) / steps
		if v := try(place(k)); v < left {
			best, left = k, v
		}
	}
	k := goldenSection(best-1.0/steps, best+1.0/steps, func(k float64) float64 { return try(place(k)) })
	x := place(k)
	left = try(x)
	greatest, _ := size(before)
	for i, l := range lum {
		shifted[i] = l + x
	}
	after := deviations(levels, shifted)
	if after == nil {
		return suspect{}, false
	}
	rest, _ := size(after)
	if rest > explains*greatest || rest > surelyOff || math.Abs(x) < 0.08*lum[0] {
		return suspect{}, false
	}
	moved := "added to"
	if x < 0 {
		moved = "taken from"
	}
	s := suspect{
		left:     left,
		evidence: fmt.Sprintf("with %.3g cd/m2 %s every reading the greatest deviation falls from %.1f to %.1f %%", math.Abs(x), moved, 100*greatest, 100*rest),
	}
	lamb := 0.0
	if r.Light.Ambient != nil {
		lamb = float64(*r.Light.Ambient)
	}
	added := lamb > 0 && !r.inside[0]
	switch {
	case x > 0:
		s.names = []string{CauseAmbientLeftOut, CauseOtherRoomLight}
		s.advice = "measure the ambient luminance with the display off and state it; if it is stated right, the table was made for a brighter room: calibrate for this light"
	case added && -x > 0.5*lamb && -x < 1.5*lamb:
		s.names = []string{CauseAmbientTwice, CauseOtherRoomLight}
		s.advice = "check whether the meter saw the room light: then the readings hold the ambient light already; if not, the table was made for a darker room"
	default:
		s.names = []string{CauseOtherRoomLight}
		s.advice = "check the ambient luminance; if it is right, the table was made for a darker room: calibrate for this light"
	}
	return s, true
}

// powerLawSuspect compares the deviations with those of a monitor that follows a power of the level.
func (r *Response) powerLawSuspect(levels, lum, before []float64) (suspect, bool) {
	greatest, rms := size(before)
	if greatest < powerLawLeast {
		return suspect{}, false
	}
	last := len(lum) - 1
	model := make([]float64, len(lum))
	left := func(gamma float64) float64 {
		for i := range lum {
			model[i] = lum[0] + (lum[last]-lum[0])*math.Pow((levels[i]-levels[0])/(levels[last]-levels[0]), gamma)
		}
		d := deviations(levels, model)
		if d == nil {
			return math.Inf(1)
		}
		sum := 0.0
		for i := range d {
			sum += (before[i] - d[i]) * (before[i] - d[i])
		}
		return math.Sqrt(sum / float64(len(d)))
	}
	gamma := goldenSection(1.2, 3.4, left)
	rest := left(gamma)
	if rest > powerLawLeft*rms {
		return suspect{}, false
	}
	return suspect{
		names: []string{CauseNoTable}, left: rest,
		evidence: fmt.Sprintf("the luminances follow a power of the level with exponent %.2f: its deviations explain %.0f %% of those measured", gamma, 100*(1-rest/rms)),
		advice:   "load the monitor's GSDF table, or select its GSDF mode, and measure again",
	}, true
}

// levelSuspect looks for one inner point that fits at another level.
func (r *Response) levelSuspect(levels, lum, before []float64) (suspect, bool) {
	greatest, _ := size(before)
	last := len(lum) - 1
	index := make([]float64, len(lum))
	for i, l := range lum {
		ends, ok := indexEnds([]float64{l, l})
		if !ok {
			return suspect{}, false
		}
		index[i] = float64(ends[0])
	}
	budget := r.budget()
	moved := append([]float64(nil), levels...)
	best, second := -1, math.Inf(1)
	bestLeft, bestLevel, bestRest := math.Inf(1), 0.0, 0.0
	for k := 1; k < last; k++ {
		if before[k-1]*before[k] >= 0 {
			continue
		}
		level, ok := levelFor(levels, index, k)
		if !ok || level <= levels[k-1] || level >= levels[k+1] {
			continue
		}
		slope := math.Abs(index[k+1]-index[k-1]) / (levels[k+1] - levels[k-1])    // JND per level
		luminanceSlope := newAim(gsdf.JND(index[k]), gsdf.JND(index[k]), 0).slope // cd/m2 per JND
		spread := math.Sqrt(budget.noise[k]+budget.single[k]) / luminanceSlope / slope
		off := math.Abs(level - levels[k])
		if off < levelLeast*levels[last] || off < levelSigmas*spread {
			continue
		}
		moved[k] = level
		rest, left := size(deviations(moved, lum))
		moved[k] = levels[k]
		if left < bestLeft {
			best, second, bestLeft, bestLevel, bestRest = k, bestLeft, left, level, rest
		} else {
			second = min(second, left)
		}
	}
	if best < 0 || bestRest > explains*greatest || bestRest > surelyOff || second < alike*bestLeft {
		return suspect{}, false
	}
	expected, _ := r.Expected(best)
	names := []string{CauseMistypedLevel, CauseMistypedReading}
	evidence := fmt.Sprintf("level %.0f reads %.4g cd/m2, which fits level %.0f (about %.4g cd/m2 is expected at %.0f); moved there, the greatest deviation falls from %.1f to %.1f %%",
		levels[best], lum[best], bestLevel, float64(expected), levels[best], 100*greatest, 100*bestRest)
	if plan, ok := planLevel(levels, best, bestLevel); ok {
		names = names[:1]
		evidence = fmt.Sprintf("level %.0f breaks the equal steps of the others and its reading, %.4g cd/m2, fits level %.0f; there the greatest deviation falls from %.1f to %.1f %%",
			levels[best], lum[best], plan, 100*greatest, 100*bestRest)
	}
	return suspect{names: names, left: bestLeft, evidence: evidence, advice: "read that level again, and check level and reading against the notes"}, true
}

// planLevel is the place in equal steps that a level should have had, where all the others keep equal
// steps and the reading fits it.
func planLevel(levels []float64, k int, fits float64) (float64, bool) {
	last := len(levels) - 1
	step := levels[last] / float64(last)
	for i, l := range levels {
		if i != k && math.Abs(l-float64(i)*step) > 0.51 {
			return 0, false
		}
	}
	plan := math.Round(float64(k) * step)
	return plan, math.Abs(levels[k]-plan) > 1 && math.Abs(fits-plan) < step/6
}

// levelFor is the level at which the index of point k would lie on the smooth curve through its neighbours.
func levelFor(levels, index []float64, k int) (float64, bool) {
	lo, hi := max(0, k-2), min(len(levels)-1, k+2)
	var xs, ys []float64
	for i := lo; i <= hi; i++ {
		if i != k {
			xs, ys = append(xs, index[i]), append(ys, levels[i])
		}
	}
	for i := 1; i < len(xs); i++ {
		if xs[i] <= xs[i-1] {
			return 0, false
		}
	}
	// Lagrange's polynomial of level over index through up to four neighbours.
	sum := 0.0
	for i := range xs {
		w := ys[i]
		for m := range xs {
			if m != i {
				w *= (index[k] - xs[m]) / (xs[i] - xs[m])
			}
		}
		sum += w
	}
	return sum, true
}

// limitedRange: both ends flat, the rest alive.
func (r *Response) limitedRange() (suspect, bool) {
	last := len(r.Steps) - 1
	first, end := r.Steps[0], r.Steps[last]
	if first.High > flatStep || end.High > flatStep {
		return suspect{}, false
	}
	for _, s := range r.Steps[1:last] {
		if s.Deviation < flatStep {
			return suspect{}, false
		}
	}
	return suspect{
		names:    []string{CauseLimitedRange},
		evidence: fmt.Sprintf("levels %d to %d and %d to %d show no contrast (%.0f and %.0f %%) while all between do", first.FromLevel, first.ToLevel, end.FromLevel, end.ToLevel, 100*first.Deviation, 100*end.Deviation),
		advice:   "set the graphics card and the monitor's input to full range (0 to 255) and measure again",
	}, true
}

func (r *Response) driftCause() (Cause, bool) {
	change, level, noise, reason := r.Drift()
	if reason != "" || math.Abs(change) < driftLeast || math.Abs(change) < driftSigmas*noise {
		return Cause{}, false
	}
	return Cause{
		Causes:   []string{CauseDrift},
		Evidence: fmt.Sprintf("level %d read %+.1f %% at the end of the series; reading noise alone gives %.1f %%", level, 100*change, 100*noise),
		Advice:   "let monitor and meter warm up until the white field holds still, then repeat the series",
	}, true
}

// coarseCause looks at a fine series for steps that come doubled or not at all.
func (r *Response) coarseCause() (Cause, bool) {
	if len(r.Points) < fineSeries {
		return Cause{}, false
	}
	if period := 1 << max(r.Bits-6, 0); period > 1 && len(r.Points) == 1<<r.Bits {
		shares, total := make([]float64, period), 0.0
		for _, s := range r.Steps {
			shares[s.ToLevel%period] += 1 + s.Deviation
			total += 1 + s.Deviation
		}
		for _, v := range shares {
			if v/total > sixBitShare {
				return Cause{
					Causes:   []string{CauseSixBit},
					Evidence: fmt.Sprintf("%.0f %% of all contrast lies in every %dth step", 100*v/total, period),
					Advice:   "check the link and the panel: only 64 gray levels arrive; use another input, cable, driver setting or monitor",
				}, true
			}
		}
	}
	// Repeatability that was only assumed may be too good: count the noise twice over.
	weight := 1.0
	if r.Noise.Assumed {
		weight = 4
	}
	excess, uncertain, flat := 0.0, 0.0, 0
	for i, s := range r.Steps {
		// The mean of the neighbours is taken off: a smooth deviation is no coarseness.
		local, n := 0.0, 0
		for k := max(0, i-8); k <= min(len(r.Steps)-1, i+8); k++ {
			local += r.Steps[k].Deviation
			n++
		}
		d := s.Deviation - local/float64(n)
		v := weight * r.bands[i].noise
		excess += d*d - v
		uncertain += 2 * v * v
		if 1+s.Deviation < 0.25 {
			flat++
		}
	}
	n := float64(len(r.Steps))
	excess, uncertain = excess/n, math.Sqrt(uncertain)/n
	if excess < coarseSpread*coarseSpread || excess < 5*uncertain {
		return Cause{}, false
	}
	return Cause{
		Causes:   []string{CauseCoarseTable},
		Evidence: fmt.Sprintf("steps scatter by %.0f %% of a step beyond reading noise, and %d of %d are flat", 100*math.Sqrt(excess), flat, len(r.Steps)),
		Advice:   "use a table with more output bits than input bits (8 in, 10 or more out)",
	}, true
}

// ratioCause: the steps meet the strictest limit in use, only the range does not reach.
func (r *Response) ratioCause(h Hints) (Cause, bool) {
	worst, _, ok := r.GreatestDeviation()
	ratio, reason := r.Ratio()
	if h.RatioFloor <= 0 || !ok || reason != "" || worst.Value > surelyOff || ratio.High >= h.RatioFloor {
		return Cause{}, false
	}
	lo := float64(r.Points[0].Luminance)
	parts := []string{fmt.Sprintf("ratio %.0f, asked for %.0f, while no step deviates by more than %.1f %%; L'min is %.3g cd/m2", ratio.Value, h.RatioFloor, 100*worst.Value, lo)}
	advice := "lower the black level or raise white: check brightness setting, backlight hours and screen reflections"
	if a := r.Light.Ambient; a != nil && *a > 0 {
		parts = append(parts, fmt.Sprintf("%.0f %% of it is room light", 100*float64(*a)/lo))
		if float64(*a) > lo/4 {
			advice = "turn the room light down, or choose a class that allows this ratio"
		}
	}
	return Cause{Causes: []string{CauseRatioOnly}, Evidence: strings.Join(parts, "; "), Advice: advice}, true
}
