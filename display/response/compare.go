package response

import (
	"fmt"
	"math"
)

// Change is one figure at two visits.
type Change struct {
	What          string
	Unit          string // "cd/m2", "1", or "%" for fractions
	Before, After Estimate
	Beyond        bool // by more than the uncertainties of both
}

// Compare holds two responses of one monitor against each other: L'max, L'min, ratio, greatest
// deviation, and the luminance of every level that both have. A change is beyond the uncertainty where
// it exceeds the root of the sum of squares of both 95 % half-widths; what both visits share, as the
// factor of one meter, makes that bound a little wide.
func Compare(before, after *Response) []Change {
	var out []Change
	add := func(what, unit string, a, b Estimate) {
		ua, ub := half(a), half(b)
		out = append(out, Change{what, unit, a, b, math.Abs(b.Value-a.Value) > math.Hypot(ua, ub)})
	}
	add("L'max", "cd/m2", before.LuminanceMax(), after.LuminanceMax())
	add("L'min", "cd/m2", before.LuminanceMin(), after.LuminanceMin())
	if a, reason := before.Ratio(); reason == "" {
		if b, reason := after.Ratio(); reason == "" {
			add("luminance ratio", "1", a, b)
		}
	}
	if a, _, ok := before.GreatestDeviation(); ok {
		if b, _, ok := after.GreatestDeviation(); ok {
			add("greatest deviation", "%", a, b)
		}
	}
	at := map[int]int{}
	for i, p := range before.Points {
		at[p.Level] = i
	}
	for k, p := range after.Points {
		if i, ok := at[p.Level]; ok && before.Bits == after.Bits {
			add(fmt.Sprintf("L' at level %d", p.Level), "cd/m2", before.luminance(i), after.luminance(k))
		}
	}
	return out
}

func half(e Estimate) float64 { return (e.High - e.Low) / 2 }
