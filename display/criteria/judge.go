package criteria

import (
	"fmt"
	"math"

	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
)

// Visit is what was measured at one monitor.
type Visit struct {
	Response  *response.Response
	Places    []readings.Place // of uniform fields; nil: not measured
	Neighbour *Neighbour       // the other screen of a pair; nil: not measured
}

// Neighbour is the other screen of a pair.
type Neighbour struct {
	LuminanceMax *photometry.CdM2 // highest level, measured as this series was, ambient light in it or not; nil: not measured
	White        *photometry.UV
	OwnWhite     *photometry.UV // of the screen judged; nil: the mean over its places is taken
}

// provisionalBelow is the number of levels for which the contrast limits were made (PS3.16 lists
// 18 patterns of the set; PS3.17 Annex PPP works with 18).
const provisionalBelow = 18

// figure is the value that a limit is held against.
type figure struct {
	response.Estimate
	formula     string
	note        string
	other       *float64 // the value on the other basis, where the sources leave the basis open
	provisional string
	reason      string // not empty: there is no value
}

// figureOf finds the figure for a limit.
func (v Visit) figureOf(l Limit) figure {
	r := v.Response
	switch l.Quantity {
	case LuminanceMax, LuminanceMin, LuminanceRatio, LuminanceRatioAim:
		return v.luminanceFigure(l)
	case ContrastDeviation:
		return contrastFigure(r)
	case AmbientRatio:
		e, reason := r.AmbientRatio()
		return figure{Estimate: e, formula: "Lamb/Lmin", reason: reason}
	case RoomIlluminance:
		e, reason := r.RoomIlluminance()
		return figure{Estimate: e, formula: "as measured", reason: reason}
	case Uniformity:
		return v.uniformityFigure(response.Formula(l.Formula))
	case PairMatch:
		return v.pairFigure(response.Formula(l.Formula))
	case ColourUniformity:
		d, a, b, ok := response.ColourSpread(v.Places)
		if !ok {
			return figure{reason: "no colours were measured at two places"}
		}
		return figure{
			Estimate: response.Fixed(d, d, d, colours(v.Places)), formula: "greatest u'v' distance between two places",
			note: fmt.Sprintf("between %s and %s; the colour uncertainty of the meter is not stated", a, b),
		}
	case ColourMatch:
		return v.colourMatchFigure()
	}
	return figure{reason: "is not computed"}
}

func contrastFigure(r *response.Response) figure {
	at, whole := r, true
	if sub, ok := r.Eighteen(); ok {
		at, whole = sub, len(sub.Points) == len(r.Points)
	}
	e, _, ok := at.GreatestDeviation()
	if !ok {
		return figure{reason: r.Undefined}
	}
	if len(at.Points) < 3 {
		return figure{reason: "two levels cannot deviate: the curve is laid through them; measure levels between"}
	}
	f := figure{Estimate: e, formula: ContrastFormula}
	if !whole {
		f.formula += ", on the 18-level subset"
	}
	if n := len(at.Points); n < provisionalBelow {
		f.provisional = fmt.Sprintf("%d levels; the limit was made for %d", n, provisionalBelow)
	} else if gap := widestGap(at); gap > 1.5/(provisionalBelow-1) {
		f.provisional = fmt.Sprintf("a gap of %.0f %% of the range lies between two levels; the limit was made for %d even ones", 100*gap, provisionalBelow)
	}
	return f
}

// widestGap is the greatest distance between neighbouring levels, as a share of the range.
func widestGap(r *response.Response) float64 {
	gap := 0
	for i := 1; i < len(r.Points); i++ {
		gap = max(gap, r.Points[i].Level-r.Points[i-1].Level)
	}
	return float64(gap) / float64(int(1)<<r.Bits-1)
}

// luminanceFigure is L'max, L'min or the ratio on the basis that the limit speaks of.
func (v Visit) luminanceFigure(l Limit) figure {
	of := func(r *response.Response) (response.Estimate, string) {
		switch l.Quantity {
		case LuminanceMax:
			return r.LuminanceMax(), ""
		case LuminanceMin:
			return r.LuminanceMin(), ""
		}
		return r.Ratio()
	}
	mark := "'"
	name := map[Quantity]string{LuminanceMax: "L%smax", LuminanceMin: "L%smin", LuminanceRatio: "L%[1]smax/L%[1]smin", LuminanceRatioAim: "L%[1]smax/L%[1]smin"}[l.Quantity]
	bare, known := v.Response.WithoutAmbient()
	if l.Basis == Emitted {
		if !known {
			return figure{reason: "the limit is for luminance without ambient light, which the readings hold in an unknown amount"}
		}
		e, reason := of(bare)
		return figure{Estimate: e, formula: fmt.Sprintf(name, "") + ", without ambient light", reason: reason}
	}
	e, reason := of(v.Response)
	f := figure{Estimate: e, formula: fmt.Sprintf(name, mark) + ", ambient light included", reason: reason}
	if l.Basis == Open && known {
		if other, none := of(bare); none == "" {
			f.other = &other.Value
		}
	}
	return f
}

func (v Visit) uniformityFigure(formula response.Formula) figure {
	if len(v.Places) == 0 {
		return figure{reason: "no places were measured"}
	}
	if formula == OpenFormula {
		return figure{reason: "the formula has not been seen"}
	}
	worst := figure{formula: string(formula), reason: "no places were measured"}
	for _, field := range fields(v.Places) {
		e, err := response.Uniformity(field, formula, v.Response.Noise)
		if err != nil {
			return figure{reason: err.Error()}
		}
		if worst.reason != "" || e.Value > worst.Value {
			worst.Estimate, worst.reason = e, ""
			worst.note = fieldNote(field[0].Level)
		}
	}
	return worst
}

func fieldNote(level int) string {
	if level < 0 {
		return ""
	}
	return fmt.Sprintf("field at level %d", level)
}

// fields splits places by the level of their field, in order of first appearance.
func fields(places []readings.Place) [][]readings.Place {
	var out [][]readings.Place
	at := map[int]int{}
	for _, p := range places {
		i, ok := at[p.Level]
		if !ok {
			i = len(out)
			at[p.Level] = i
			out = append(out, nil)
		}
		out[i] = append(out[i], p)
	}
	return out
}

func colours(places []readings.Place) (n int) {
	for _, p := range places {
		if p.Colour != nil {
			n++
		}
	}
	return n
}

func (v Visit) pairFigure(formula response.Formula) figure {
	if v.Neighbour == nil || v.Neighbour.LuminanceMax == nil {
		return figure{reason: "the other screen of the pair was not measured"}
	}
	if formula == OpenFormula {
		return figure{reason: "the formula has not been seen"}
	}
	e, err := response.Pair(v.Response.HighestRead(), *v.Neighbour.LuminanceMax, formula, v.Response.Noise)
	if err != nil {
		return figure{reason: err.Error()}
	}
	return figure{Estimate: e, formula: "|La - Lb| " + string(formula)}
}

func (v Visit) colourMatchFigure() figure {
	if v.Neighbour == nil || v.Neighbour.White == nil {
		return figure{reason: "the colour of the other screen was not measured"}
	}
	own := v.Neighbour.OwnWhite
	if own == nil {
		var mean photometry.UV
		n := 0.0
		for _, p := range v.Places {
			if p.Colour != nil {
				mean.U += p.Colour.U
				mean.V += p.Colour.V
				n++
			}
		}
		if n == 0 {
			return figure{reason: "the colour of this screen was not measured"}
		}
		mean.U /= n
		mean.V /= n
		own = &mean
	}
	d := own.Distance(*v.Neighbour.White)
	return figure{
		Estimate: response.Fixed(d, d, d, 2), formula: "u'v' distance between the two screens",
		note: "the colour uncertainty of the meter is not stated",
	}
}

// against says how a value and its interval stand to the limit.
func (l Limit) against(value, low, high float64) Verdict {
	holds := l.holds
	switch {
	case l.LimitHigh != nil:
		surelyIn := holds(low) && holds(high)
		surelyOut := high < l.Limit || low > *l.LimitHigh
		return state(holds(value), surelyIn, surelyOut)
	case l.Comparison == ">=" || l.Comparison == ">":
		return state(holds(value), holds(low), !holds(high))
	}
	return state(holds(value), holds(high), !holds(low))
}

// holds says whether a value keeps the limit.
func (l Limit) holds(v float64) bool {
	switch l.Comparison {
	case ">=":
		return v >= l.Limit
	case ">":
		return v > l.Limit
	case "<=":
		return v <= l.Limit
	case "<":
		return v < l.Limit
	}
	return v >= l.Limit && v <= *l.LimitHigh // "about" and "within"
}

func state(holds, surelyIn, surelyOut bool) Verdict {
	switch {
	case surelyIn:
		return Meets
	case surelyOut:
		return Fails
	case holds:
		return MeetsUncertainly
	}
	return FailsUncertainly
}

// severity orders the verdicts, worst highest; NotAssessed has none.
func (v Verdict) severity() int {
	switch v {
	case Meets:
		return 1
	case MeetsUncertainly:
		return 2
	case FailsUncertainly:
		return 3
	case Fails:
		return 4
	}
	return 0
}

// Worse says whether v is worse than w. Not assessed is worse than nothing.
func (v Verdict) Worse(w Verdict) bool { return v.severity() > w.severity() }

// Holds says whether the limit is kept, with certainty or not.
func (v Verdict) Holds() bool { return v == Meets || v == MeetsUncertainly }

// judged is a finding with the estimate behind it.
type judged struct {
	Finding
	limit    Limit
	estimate response.Estimate
	decides  bool
}

// judge holds one limit against the visit. It reports false, with the reason, where there is no figure.
func (v Visit) judge(l Limit) (judged, string) {
	f := v.figureOf(l)
	if f.reason != "" {
		return judged{}, f.reason
	}
	low, high := f.Low, f.High
	out := judged{limit: l, estimate: f.Estimate}
	out.Finding = Finding{
		Quantity: string(l.Quantity), Value: f.Value, Interval: Interval{low, finite(high)},
		Comparison: l.Comparison, Limit: l.Limit, LimitHigh: l.LimitHigh, Unit: l.Unit,
		Formula: f.formula, Levels: f.Levels, Source: source(l), Confidence: string(l.Confidence),
		Confirmed: l.Confirmed, Override: l.Override,
		Provisional: f.provisional != "", ProvisionalReason: f.provisional,
		Against: l.against(f.Value, low, high), Note: f.note,
	}
	if l.Formula != "" && l.Quantity != Uniformity && l.Quantity != PairMatch {
		out.Formula += ", " + l.Formula // tells two limits of one quantity apart
	}
	if l.Note != "" {
		out.Note = join(out.Note, l.Note)
	}
	if f.other != nil {
		note := fmt.Sprintf("without ambient light: %.4g", *f.other)
		if l.holds(*f.other) != out.Against.Holds() {
			note += ", which would turn the verdict"
		}
		out.Note = join(note, out.Note)
	}
	var why string
	if out.decides, why = l.Deciding(); out.decides {
		out.Verdict = out.Against
	} else {
		out.Verdict = NotAssessed
		out.Note = join(why, out.Note)
	}
	return out, ""
}

// finite keeps an unbounded interval end representable in JSON.
func finite(x float64) float64 {
	if math.IsInf(x, 1) {
		return math.MaxFloat64
	}
	return x
}

func join(a, b string) string {
	switch {
	case a == "":
		return b
	case b == "":
		return a
	}
	return a + "; " + b
}

func source(l Limit) string { return join(l.Section, l.Source) }
