package criteria

import (
	"fmt"
	"math"

	"evenstep/display/response"
)

// Assess says everything that the program says of a visit. used may be nil: then figures are given
// and nothing is judged.
func Assess(v Visit, used *Used) Assessment {
	r := v.Response
	a := Assessment{
		Formula: ContrastFormula, Scale: string(r.Scale), Bits: r.Bits,
		Steps: []StepFigure{}, Findings: []Finding{}, NotAssessed: []Unassessed{}, Causes: []response.Cause{},
		Verdict: NotAssessed,
	}
	if used != nil {
		a.Scheme, a.Edition, a.Class = used.ID, used.Edition, used.Class
	}
	a.describe(r)
	a.annexC(r)
	a.measurePlaces(v)

	var all []judged
	if used != nil {
		all = a.judgeAll(v, used)
	}
	a.Causes = append(a.Causes, r.Causes(hints(used))...)
	a.IlluminanceRange = roomRange(v, used)
	a.repeats(r, all)
	return a
}

// Outcome is the verdict that Assess comes to, without the figures that it takes time to find.
func Outcome(v Visit, used *Used) Verdict {
	a := Assessment{Verdict: NotAssessed}
	if used != nil {
		a.judgeAll(v, used)
	}
	return a.Verdict
}

func hints(used *Used) response.Hints {
	var h response.Hints
	if used == nil {
		return h
	}
	for _, l := range used.Limits {
		if l.Quantity == LuminanceRatio && (l.Formula == "" || l.Formula == "minimum") {
			h.RatioFloor = l.Limit
		}
	}
	return h
}

// describe fills the figures that need no limit.
func (a *Assessment) describe(r *response.Response) {
	a.AmbientSource = string(r.Light.Source)
	if r.Light.Ambient != nil {
		a.Ambient = ptr(float64(*r.Light.Ambient))
	} else {
		a.AmbientReason = "the readings hold an unknown amount of ambient light"
	}
	if r.Light.Illuminance != nil {
		a.Illuminance = ptr(float64(*r.Light.Illuminance))
	}
	if r.Light.Rd != nil {
		a.Rd, a.RdAssumed = ptr(float64(*r.Light.Rd)), r.Light.RdAssumed
	}
	a.Noise = NoiseFigure{
		Repeatability: r.Noise.Repeatability, FloorCdM2: float64(r.Noise.Floor), Assumed: r.Noise.Assumed,
		GainStandard: r.Noise.Gain,
	}
	a.LuminanceMin, a.LuminanceMax = r.LuminanceMin().Value, r.LuminanceMax().Value
	if ratio, reason := r.Ratio(); reason == "" {
		a.LuminanceRatio = ptr(ratio.Value)
	} else {
		a.LuminanceRatioReason = reason
	}
	if low, high, ok := r.JNDs(); ok {
		a.JNDMin, a.JNDMax = ptr(float64(low)), ptr(float64(high))
	} else {
		a.JNDReason = r.Undefined
	}
	for _, s := range r.Steps {
		a.Steps = append(a.Steps, StepFigure{
			FromLevel: s.FromLevel, ToLevel: s.ToLevel, JNDFrom: float64(s.JNDFrom), JNDTo: float64(s.JNDTo),
			ContrastPerJND: s.ContrastPerJND, Expected: s.Expected, Deviation: s.Deviation,
			DeviationInterval: Interval{s.Low, s.High},
		})
	}
	if e, worst, ok := r.GreatestDeviation(); ok {
		a.MaxDeviation = &e.Value
		a.MaxDeviationFromLevel, a.MaxDeviationToLevel = &worst.FromLevel, &worst.ToLevel
		a.MaxDeviationInterval = &Interval{e.Low, e.High}
	} else {
		a.MaxDeviationReason = r.Undefined
	}
	if change, _, _, reason := r.Drift(); reason == "" {
		a.Drift = &change
	} else {
		a.DriftReason = reason
	}
}

// annexC fills the figures that are information only.
func (a *Assessment) annexC(r *response.Response) {
	if d, reason := r.GreatestJNDStep(); reason == "" {
		a.JNDStep.MaxDeviation = &d
	} else {
		a.JNDStep.Reason = reason
	}
	c, reason := r.AnnexC()
	a.AnnexC = AnnexC{Intervals: c.Intervals, Reason: reason}
	if a.AnnexC.Intervals == nil {
		a.AnnexC.Intervals = []float64{}
	}
	if reason == "" {
		a.AnnexC.Mean, a.AnnexC.LUM = &c.Mean, &c.LUM
		a.AnnexC.FitOrder, a.AnnexC.FitP = &c.FitOrder, &c.FitP
	}
}

// measurePlaces fills uniformity by every formula and the match by every denominator.
func (a *Assessment) measurePlaces(v Visit) {
	for _, field := range fields(v.Places) {
		for _, f := range response.UniformityFormulas() {
			e, err := response.Uniformity(field, f, v.Response.Noise)
			if err != nil {
				continue // the finding that needs it says why
			}
			a.Uniformity = append(a.Uniformity, PlacesFigure{string(f), levelOf(field[0].Level), e.Levels, e.Value, Interval{e.Low, e.High}})
		}
	}
	for _, f := range response.PairFormulas() {
		if p := v.pairFigure(f); p.reason == "" {
			a.PairMatch = append(a.PairMatch, PlacesFigure{string(f), nil, p.Levels, p.Value, Interval{p.Low, p.High}})
		}
	}
	if d, _, _, ok := response.ColourSpread(v.Places); ok {
		a.ColourUniformity = &d
	}
	if m := v.colourMatchFigure(); m.reason == "" {
		a.ColourMatch = &m.Value
	}
}

func levelOf(level int) *int {
	if level < 0 {
		return nil
	}
	return &level
}

// judgeAll fills the findings, what is not assessed, and the verdict.
func (a *Assessment) judgeAll(v Visit, used *Used) []judged {
	var all []judged
	for _, l := range used.Limits {
		j, reason := v.judge(l)
		if reason != "" {
			if decides, why := l.Deciding(); !decides {
				reason += "; " + why
			}
			a.NotAssessed = append(a.NotAssessed, Unassessed{named(l), reason})
			continue
		}
		all = append(all, j)
		a.Findings = append(a.Findings, j.Finding)
		if !j.decides {
			_, why := l.Deciding()
			a.NotAssessed = append(a.NotAssessed, Unassessed{named(l), why})
			continue
		}
		if j.Verdict.Worse(a.Verdict) {
			a.Verdict = j.Verdict
		}
	}
	have := map[Quantity]bool{}
	for _, l := range used.Limits {
		have[l.Quantity] = true
	}
	for _, q := range []Quantity{ContrastDeviation, Uniformity} {
		if !have[q] {
			a.NotAssessed = append(a.NotAssessed, Unassessed{string(q), "the scheme file has no limit for this class"})
		}
	}
	return all
}

func named(l Limit) string {
	if l.Formula == "" {
		return string(l.Quantity)
	}
	return string(l.Quantity) + " (" + l.Formula + ")"
}

// mostRepeats is where asking for more readings stops making sense at a bench.
const mostRepeats = 64

// repeats fills how many readings a level would settle the findings that are open.
func (a *Assessment) repeats(r *response.Response, all []judged) {
	taken := math.MaxInt
	for _, p := range r.Points {
		taken = min(taken, p.Readings)
	}
	need := 0
	for _, j := range all {
		if !j.decides || (j.Verdict != MeetsUncertainly && j.Verdict != FailsUncertainly) {
			continue
		}
		open := func(n int) bool {
			low, high := j.estimate.With(n)
			v := j.limit.against(j.Value, low, high)
			return v == MeetsUncertainly || v == FailsUncertainly
		}
		if open(mostRepeats) {
			a.RepeatsNeeded = nil
			a.RepeatsNeededReason = fmt.Sprintf("%s would stay open with %d readings a level: the value is too near its limit, or what is uncertain is the meter or the room light", j.Quantity, mostRepeats*taken)
			return
		}
		lo, hi := 1, mostRepeats // open(lo), not open(hi)
		for hi-lo > 1 {
			if mid := (lo + hi) / 2; open(mid) {
				lo = mid
			} else {
				hi = mid
			}
		}
		need = max(need, hi*taken)
	}
	a.RepeatsNeeded = &need
}

func ptr[T any](v T) *T { return &v }
