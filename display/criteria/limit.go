package criteria

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"evenstep/display/response"
)

// quantityRule says which units, comparisons, formulas and bases a quantity may have.
type quantityRule struct {
	unit     string
	most     float64  // greatest limit that makes sense
	formulas []string // nil: none needed; "" is then the only one unless free
	free     bool     // a formula of any wording tells two limits of one quantity apart
	basis    bool     // needs a basis
	up, down bool     // ">=" or "<=" makes sense
}

// OpenFormula stands where a document's formula has not been seen: nothing can be judged.
const OpenFormula = "open"

// ContrastFormula names how the contrast deviation is computed.
const ContrastFormula = "contrast per JND, 2(L2-L1)/(L2+L1) over the JNDs of the step, against the standard function"

var rules = map[Quantity]quantityRule{
	LuminanceMax:      {unit: "cd/m2", most: 10000, free: true, basis: true, up: true},
	LuminanceMin:      {unit: "cd/m2", most: 100, free: true, basis: true, up: true},
	LuminanceRatio:    {unit: "1", most: 1e6, free: true, basis: true, up: true},
	LuminanceRatioAim: {unit: "1", most: 1e6, basis: true},
	ContrastDeviation: {unit: "1", most: 1, down: true},
	Uniformity:        {unit: "1", most: 2, formulas: append(names(response.UniformityFormulas()), OpenFormula), down: true},
	PairMatch:         {unit: "1", most: 2, formulas: append(names(response.PairFormulas()), OpenFormula), down: true},
	ColourUniformity:  {unit: "u'v'", most: .5, down: true},
	ColourMatch:       {unit: "u'v'", most: .5, down: true},
	AmbientRatio:      {unit: "1", most: 100, free: true, down: true},
	RoomIlluminance:   {unit: "lx", most: 100000, down: true},
}

func names(fs []response.Formula) []string {
	out := make([]string, len(fs))
	for i, f := range fs {
		out[i] = string(f)
	}
	return out
}

// Quantities is the closed list of judged quantities, in the order of a report.
func Quantities() []Quantity {
	return []Quantity{
		LuminanceMax, LuminanceMin, LuminanceRatio, LuminanceRatioAim, ContrastDeviation, AmbientRatio,
		RoomIlluminance, Uniformity, PairMatch, ColourUniformity, ColourMatch,
	}
}

// check returns the field at fault and what is wrong with it.
func (l Limit) check() (field string, err error) {
	rule, ok := rules[l.Quantity]
	if !ok {
		var all []string
		for _, q := range Quantities() {
			all = append(all, string(q))
		}
		return "quantity", fmt.Errorf("%q is not known; expected one of %s; correct the spelling", l.Quantity, strings.Join(all, ", "))
	}
	if l.Unit != rule.unit {
		return "unit", fmt.Errorf("is %q; expected %q for %s; convert the limit", l.Unit, rule.unit, l.Quantity)
	}
	var comparisons []string
	switch {
	case l.Quantity == LuminanceRatioAim:
		comparisons = []string{"about"}
	case rule.up:
		comparisons = []string{">=", ">"}
	case l.Quantity == RoomIlluminance:
		comparisons = []string{"<=", "<", "within"}
	default:
		comparisons = []string{"<=", "<"}
	}
	if !slices.Contains(comparisons, l.Comparison) {
		return "comparison", fmt.Errorf("is %q; expected one of %s for %s; correct it", l.Comparison, strings.Join(comparisons, " "), l.Quantity)
	}
	if !(l.Limit > 0 && l.Limit <= rule.most) {
		return "limit", fmt.Errorf("is %v; expected more than 0 and at most %v (unit %q, fractions are not per cent); correct it", l.Limit, rule.most, rule.unit)
	}
	twoEnds := l.Comparison == "about" || l.Comparison == "within"
	switch {
	case twoEnds && (l.LimitHigh == nil || !(*l.LimitHigh > l.Limit) || math.IsInf(*l.LimitHigh, 0)):
		return "limit_high", fmt.Errorf("is missing or not above limit %v; expected the upper end for %q; add it", l.Limit, l.Comparison)
	case !twoEnds && l.LimitHigh != nil:
		return "limit_high", fmt.Errorf("stands beside %q; expected it for \"about\" and \"within\" only; remove it", l.Comparison)
	case l.Comparison == "about" && (l.Aim == nil || !(*l.Aim >= l.Limit && *l.Aim <= *l.LimitHigh)):
		return "aim", fmt.Errorf("is missing or outside the limits; expected the value to be near; add it")
	case l.Comparison != "about" && l.Aim != nil:
		return "aim", fmt.Errorf("stands beside %q; expected it for \"about\" only; remove it", l.Comparison)
	}
	switch {
	case rule.formulas != nil && !slices.Contains(rule.formulas, l.Formula):
		return "formula", fmt.Errorf("is %q; expected one of %s for %s; name the formula", l.Formula, strings.Join(rule.formulas, ", "), l.Quantity)
	case rule.formulas == nil && !rule.free && l.Formula != "":
		return "formula", fmt.Errorf("is %q; expected none for %s; remove it", l.Formula, l.Quantity)
	case l.Formula == OpenFormula && l.Advisory == "":
		return "advisory", errors.New("is missing; expected a reason where the formula is open; add it")
	}
	switch {
	case rule.basis && l.Basis != WithAmbient && l.Basis != Emitted && l.Basis != Open:
		return "basis", fmt.Errorf("is %q; expected %q, %q or %q for %s; state which luminance is meant", l.Basis, WithAmbient, Emitted, Open, l.Quantity)
	case !rule.basis && l.Basis != "":
		return "basis", fmt.Errorf("is %q; expected none for %s; remove it", l.Basis, l.Quantity)
	}
	confidences := []Confidence{Read, SecondHand, Weak, FromMemory, Unsure}
	if !slices.Contains(confidences, l.Confidence) {
		return "confidence", fmt.Errorf("is %q; expected one of %v; say how the limit is known", l.Confidence, confidences)
	}
	if strings.TrimSpace(l.Source) == "" {
		return "source", errors.New("is missing; expected what was read; add it")
	}
	return "", nil
}
