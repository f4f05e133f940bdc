package report

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"evenstep/display/criteria"
	"evenstep/display/response"
)

// term is how a quantity is called and written.
type term struct {
	symbol  string
	text    string
	percent bool // a fraction that is shown in per cent
	places  bool // computed from places, not from levels
}

var terms = map[criteria.Quantity]term{
	criteria.LuminanceMax:      {symbol: "L'max", text: "maximum luminance"},
	criteria.LuminanceMin:      {symbol: "L'min", text: "minimum luminance"},
	criteria.LuminanceRatio:    {symbol: "L'max/L'min", text: "luminance ratio"},
	criteria.LuminanceRatioAim: {symbol: "L'max/L'min", text: "luminance ratio, aim"},
	criteria.ContrastDeviation: {text: "greatest contrast deviation", percent: true},
	criteria.Uniformity:        {text: "luminance uniformity", percent: true, places: true},
	criteria.PairMatch:         {text: "luminance match of the pair", percent: true},
	criteria.ColourUniformity:  {symbol: "Δu'v'", text: "colour uniformity", places: true},
	criteria.ColourMatch:       {symbol: "Δu'v'", text: "colour match of the pair"},
	criteria.AmbientRatio:      {symbol: "Lamb/Lmin", text: "ambient ratio"},
	criteria.RoomIlluminance:   {text: "room illuminance"},
}

// Name is what a quantity is called: "maximum luminance L'max". One that is not known is given as
// it stands, with spaces.
func Name(quantity string) string {
	t, ok := terms[criteria.Quantity(quantity)]
	switch {
	case !ok:
		return strings.ReplaceAll(quantity, "_", " ")
	case t.symbol == "":
		return t.text
	}
	return t.text + " " + t.symbol
}

// Quantity is what the finding judges, in words.
func Quantity(f criteria.Finding) string { return Name(f.Quantity) }

// Value is the figure of the finding with its unit. It has as many digits as it takes to tell it
// from the limit, so that nothing that fails reads as if it stood on the limit.
func Value(f criteria.Finding) string { return withUnit(f, figure(f, f.Value)) }

// Interval is the 95 % interval of the finding with its unit, or that none is stated.
func Interval(f criteria.Finding) string {
	lo, hi := f.Interval[0], f.Interval[1]
	if lo == hi {
		return notStated // the figure came without an uncertainty
	}
	if hi >= math.MaxFloat64 {
		return withUnit(f, figure(f, lo)) + " or more"
	}
	return withUnit(f, figure(f, lo)+" to "+figure(f, hi))
}

// Limit is the limit of the finding with its sign and unit: "≥ 350 cd/m²", "250 to 450".
func Limit(f criteria.Finding) string {
	limit := bound(f, f.Limit)
	switch {
	case f.LimitHigh != nil && f.Comparison == "about":
		limit = "about " + limit + " to " + bound(f, *f.LimitHigh)
	case f.LimitHigh != nil:
		limit += " to " + bound(f, *f.LimitHigh)
	default:
		limit = comparison(f.Comparison) + " " + limit
	}
	return withUnit(f, limit)
}

func comparison(c string) string {
	switch c {
	case ">=":
		return "≥"
	case "<=":
		return "≤"
	}
	return c
}

func withUnit(f criteria.Finding, s string) string {
	switch unit := unitOf(f.Unit); {
	case terms[criteria.Quantity(f.Quantity)].percent && f.Unit == "1":
		return s + " %"
	case unit == "":
		return s
	default:
		return s + " " + unit
	}
}

// unitOf is how a unit is written. A colour distance carries its unit in its name.
func unitOf(unit string) string {
	switch unit {
	case "1", "u'v'":
		return ""
	case "cd/m2":
		return "cd/m²"
	}
	return unit
}

// scaled is a value in the unit in which it is shown.
func scaled(f criteria.Finding, v float64) float64 {
	if terms[criteria.Quantity(f.Quantity)].percent && f.Unit == "1" {
		return 100 * v
	}
	return v
}

// figure writes a value of the finding without its unit, with the decimals that suit its value.
func figure(f criteria.Finding, v float64) string {
	return decimal(scaled(f, v), decimals(f))
}

// decimals is how many a finding's value needs: by its size, and so many that it differs from each
// end of the limit in what is shown as it does in truth.
func decimals(f criteria.Finding) int {
	v := scaled(f, f.Value)
	n := 1
	switch size := math.Abs(v); {
	case f.Unit == "u'v'":
		n = 4
	case terms[criteria.Quantity(f.Quantity)].percent, size >= 100, f.Unit == "lx":
	case size >= 1:
		n = 2
	default:
		n = 3
	}
	const most = 9
	limits := []float64{f.Limit}
	if f.LimitHigh != nil {
		limits = append(limits, *f.LimitHigh)
	}
	for _, l := range limits {
		for n < most && v != scaled(f, l) && decimal(v, n) == decimal(scaled(f, l), n) {
			n++
		}
	}
	return n
}

// decimal is number for a value that may be of any size.
func decimal(v float64, n int) string {
	const plain = 1e7 // from here on digits before the point say nothing to the eye
	switch {
	case !finite(v):
		return "–"
	case math.Abs(v) >= plain:
		return strings.Replace(strconv.FormatFloat(v, 'g', 4, 64), "-", "−", 1)
	}
	return number(v, n)
}

// bound writes an end of a limit as the scheme has it, without zeros that say nothing.
func bound(f criteria.Finding, v float64) string { return concise(scaled(f, v)) }

// concise writes up to six significant digits.
func concise(v float64) string {
	const digits = 6 // enough for any limit, too few for what scaling to per cent leaves in the last digits
	if !finite(v) {
		return "–"
	}
	return strings.Replace(strconv.FormatFloat(v, 'g', digits, 64), "-", "−", 1)
}

// signedPercent writes a fraction as a deviation in per cent, with its sign.
func signedPercent(v float64) string {
	s := decimal(100*v, 1)
	if v > 0 && strings.Trim(s, "0.") != "" {
		s = "+" + s
	}
	return strings.TrimSuffix(s, ".0") + " %"
}

// percent writes a fraction in per cent.
func percent(v float64) string { return decimal(100*v, 1) + " %" }

// Sign is the sign of a verdict in text: round where the limit is met, pointed where it is not,
// filled where that is certain, open where it lies within the uncertainty.
func Sign(v criteria.Verdict) string {
	switch v {
	case criteria.Meets:
		return "●"
	case criteria.MeetsUncertainly:
		return "○"
	case criteria.FailsUncertainly:
		return "∆"
	case criteria.Fails:
		return "▲"
	}
	return "–"
}

// MarkerOf is Sign as a shape to be drawn.
func MarkerOf(v criteria.Verdict) Marker {
	switch v {
	case criteria.Meets:
		return Marker{Shape: Circle}
	case criteria.MeetsUncertainly:
		return Marker{Shape: Circle, Open: true}
	case criteria.FailsUncertainly:
		return Marker{Shape: Triangle, Open: true}
	case criteria.Fails:
		return Marker{Shape: Triangle}
	}
	return Marker{Shape: Dash}
}

// Confidence says in words how well a limit is known.
func Confidence(c string) string {
	switch criteria.Confidence(c) {
	case criteria.Read:
		return "limit read in the scheme"
	case criteria.SecondHand:
		return "limit second-hand"
	case criteria.Weak:
		return "limit from one restatement only"
	case criteria.FromMemory:
		return "limit from memory"
	case criteria.Unsure:
		return "limit quoted in more than one way"
	case criteria.Site:
		return "the site's own limit"
	case "":
		return "how the limit is known is not stated"
	}
	return "limit: " + c
}

// AmbientSource says in words where the ambient luminance comes from.
func AmbientSource(source string) string {
	switch response.AmbientSource(source) {
	case response.AmbientMeasured:
		return "measured, display off"
	case response.AmbientFromRd:
		return "illuminance times Rd"
	case response.AmbientAssumedRd:
		return "illuminance times an assumed Rd"
	case response.AmbientDarkRoom:
		return "dark room, as stated"
	case response.AmbientInside:
		return "in every reading, size not known"
	case "":
		return "source not stated"
	}
	return source
}

// RoomLight says in one sentence or two in which room light the limits hold and what binds at the ends.
func RoomLight(r criteria.LuxRange) string {
	if r.Low != nil && *r.Low == 0 && r.LowBinds == "" {
		r.Low = nil // there is no less light than none
	}
	if r.Low == nil && r.High == nil {
		if r.Reason != "" {
			return "No range of room light: " + prose(r.Reason) + "."
		}
		return "Every limit that depends on room light holds in any room light."
	}
	end := func(v float64, side, binds string, unconfirmed bool) string {
		s := lux(v) + " lx"
		if binds == "" {
			return s
		}
		s += " (" + side + " it " + Name(binds) + " binds"
		if unconfirmed {
			s += ", a limit that is not confirmed"
		}
		return s + ")"
	}
	s := "Every limit that depends on room light holds "
	switch {
	case r.High == nil:
		s += "from " + end(*r.Low, "below", r.LowBinds, r.LowUnconfirmed) + " upwards; nothing binds at the bright end"
	case r.Low == nil:
		s += "up to " + end(*r.High, "above", r.HighBinds, r.HighUnconfirmed)
	default:
		s += "from " + end(*r.Low, "below", r.LowBinds, r.LowUnconfirmed) +
			" to " + end(*r.High, "above", r.HighBinds, r.HighUnconfirmed)
	}
	s += " on the screen"
	if r.Rd != nil {
		s += ", for Rd " + concise(*r.Rd) + " cd/m² per lx"
		if r.RdAssumed {
			s += " (assumed)"
		}
	}
	if r.Reason != "" {
		s += "; " + prose(r.Reason)
	}
	return s + "."
}

// lux writes an illuminance to a digit that a meter shows.
func lux(v float64) string {
	switch {
	case math.Abs(v) >= 100:
		return trimmed(decimal(v, 0))
	case math.Abs(v) >= 10:
		return trimmed(decimal(v, 1))
	}
	return trimmed(decimal(v, 2))
}

// trimmed takes away zeros at the end of the decimals.
func trimmed(s string) string {
	if !strings.Contains(s, ".") || strings.Contains(s, "e") {
		return s
	}
	return strings.TrimRight(strings.TrimRight(s, "0"), ".")
}

// Repeats says how many readings a level would settle what is open.
func Repeats(a criteria.Assessment) string {
	switch n := a.RepeatsNeeded; {
	case n == nil && a.RepeatsNeededReason != "":
		return "cannot be said: " + prose(a.RepeatsNeededReason)
	case n == nil:
		return "cannot be said"
	case *n == 0:
		return "none, nothing is open"
	case *n == 1:
		return "1 reading a level settles what is open"
	default:
		return fmt.Sprintf("%d readings a level, in all, would settle what is open", *n)
	}
}

// prose puts the names of quantities in place of their keys, and writes units as they are printed.
func prose(s string) string {
	s = strings.ReplaceAll(s, "cd/m2", "cd/m²")
	words := strings.Split(s, " ")
	for i, w := range words {
		bare := strings.TrimRight(w, ",;:.")
		if t, ok := terms[criteria.Quantity(bare)]; ok && strings.Contains(bare, "_") {
			words[i] = t.text + w[len(bare):]
		}
	}
	return strings.Join(words, " ")
}

// Details says in short parts what a finding rests on: formula, levels, source, confidence, what the
// site did to the limit, and why it is provisional or does not decide.
func Details(f criteria.Finding) []string {
	var out []string
	add := func(s string) {
		if s != "" {
			out = append(out, s)
		}
	}
	if f.Verdict == criteria.NotAssessed && f.Against != "" && f.Against != criteria.NotAssessed {
		add("does not decide; the value " + againstWords(f.Against))
	}
	if f.Provisional {
		add(strings.TrimSuffix("provisional: "+f.ProvisionalReason, ": "))
	}
	for _, part := range strings.Split(f.Note, "; ") {
		if !strings.HasPrefix(part, "limit not confirmed") { // said once, with the confidence
			add(prose(part))
		}
	}
	add(f.Formula)
	if f.Levels > 0 {
		unit := "level"
		if terms[criteria.Quantity(f.Quantity)].places {
			unit = "place"
		}
		if f.Levels != 1 {
			unit += "s"
		}
		add(fmt.Sprintf("%d %s", f.Levels, unit))
	}
	if f.Source != "" {
		add("source: " + f.Source)
	}
	if known := Confidence(f.Confidence); unconfirmed(f) {
		add(known + ", not confirmed")
	} else {
		add(known)
	}
	if c := f.Confirmed; c != nil {
		s := "confirmed by " + c.Person + " on " + c.Date + " in " + c.Document
		if c.Page != "" {
			s += ", page " + c.Page
		}
		add(s)
	}
	if o := f.Override; o != nil {
		was := f
		was.Limit, was.LimitHigh, was.Comparison = o.Limit, nil, o.Comparison
		add("in place of the scheme's " + Limit(was) + ", by " + o.Name + " on " + o.Date + ": " + o.Reason)
	}
	return out
}

// unconfirmed says whether a limit rests on less than a text that states it, and no one has confirmed it.
func unconfirmed(f criteria.Finding) bool {
	if f.Confirmed != nil || f.Override != nil {
		return false
	}
	switch criteria.Confidence(f.Confidence) {
	case criteria.Read, criteria.SecondHand, criteria.Site:
		return false
	}
	return true
}

func againstWords(v criteria.Verdict) string {
	switch v {
	case criteria.Meets:
		return "meets it"
	case criteria.MeetsUncertainly:
		return "meets it within uncertainty"
	case criteria.FailsUncertainly:
		return "fails it within uncertainty"
	}
	return "fails it"
}
