package criteria

import (
	"fmt"
	"math"
	"slices"

	"evenstep/display/photometry"
	"evenstep/display/response"
)

// The range of room light that is searched: from none to bright daylight on the screen.
const (
	brightest = photometry.Lux(10000)
	dimmest   = photometry.Lux(0.1) // the first step above none
	perDecade = 24                  // steps a decade; between them the ends are found by halving
)

// roomLimit is a limit that moves with the room light, as it is held against another illuminance.
type roomLimit struct {
	Limit
	decides bool
}

// roomRange finds the illuminance on the screen in which every limit that depends on ambient light
// holds: those that decide, and those that would if the site confirmed them. The range around the
// measured illuminance is taken where that lies in one, else the widest in lux.
func roomRange(v Visit, used *Used) LuxRange {
	var out LuxRange
	r := v.Response
	if sub, ok := r.Eighteen(); ok {
		r = sub // what depends on room light is judged on it, and a fine series takes long
	}
	rd := response.RdDefault
	out.RdAssumed = true
	if r.Light.Rd != nil && !r.Light.RdAssumed {
		rd, out.RdAssumed = *r.Light.Rd, false
	}
	out.Rd = ptr(float64(rd))
	if used == nil {
		out.Reason = "no scheme was asked for"
		return out
	}
	var limits []roomLimit
	for _, l := range used.Limits {
		decides, _ := l.Deciding()
		mayDecide := decides || (l.Advisory == "" && (l.Confidence == Weak || l.Confidence == FromMemory))
		moves := l.Quantity == RoomIlluminance || l.Quantity == AmbientRatio || l.Quantity == ContrastDeviation ||
			((l.Quantity == LuminanceMax || l.Quantity == LuminanceMin || l.Quantity == LuminanceRatio || l.Quantity == LuminanceRatioAim) && l.Basis != Emitted)
		if mayDecide && moves {
			limits = append(limits, roomLimit{l, decides})
		}
	}
	const nothing = "no limit of this class depends on room light and may decide"
	if len(limits) == 0 {
		out.Reason = nothing
		return out
	}
	if _, known := r.WithoutAmbient(); !known {
		out.Reason = "the readings hold an unknown amount of ambient light"
		return out
	}
	// What cannot be had in any light says nothing about the light.
	bright, _ := r.AtIlluminance(brightest, rd)
	limits = slices.DeleteFunc(limits, func(l roomLimit) bool { return Visit{Response: bright}.figureOf(l.Limit).reason != "" })
	if len(limits) == 0 {
		out.Reason = nothing
		return out
	}
	// broken returns the first limit that does not hold at e.
	broken := func(e photometry.Lux) *roomLimit {
		at, _ := r.AtIlluminance(e, rd)
		moved := Visit{Response: at}
		for i, l := range limits {
			f := moved.figureOf(l.Limit)
			if f.reason != "" || !l.holds(f.Value) {
				return &limits[i]
			}
		}
		return nil
	}
	grid := []photometry.Lux{0}
	decades := math.Log10(float64(brightest / dimmest))
	steps := int(math.Round(decades * perDecade))
	for i := 0; i <= steps; i++ {
		grid = append(grid, dimmest*photometry.Lux(math.Pow(10, decades*float64(i)/float64(steps))))
	}
	type span struct{ first, last int }
	var spans []span
	for i, e := range grid {
		if broken(e) != nil {
			continue
		}
		if n := len(spans); n > 0 && spans[n-1].last == i-1 {
			spans[n-1].last = i
		} else {
			spans = append(spans, span{i, i})
		}
	}
	if len(spans) == 0 {
		worst := broken(grid[0])
		out.Reason = fmt.Sprintf("in no room light do all limits hold: %s is not met even in a dark room", worst.Quantity)
		if other := broken(brightest); other.Quantity != worst.Quantity {
			out.Reason = fmt.Sprintf("in no room light do all limits hold: %s is not met in a dark room, %s not in a bright one", worst.Quantity, other.Quantity)
		}
		return out
	}
	pick := spans[0]
	for _, s := range spans {
		if grid[s.last]-grid[s.first] > grid[pick.last]-grid[pick.first] {
			pick = s
		}
	}
	if now := r.Light.Illuminance; now != nil {
		for _, s := range spans {
			if grid[s.first] <= *now && *now <= grid[s.last] {
				pick = s
			}
		}
	}
	edge := func(good, bad photometry.Lux) (photometry.Lux, *roomLimit) {
		why := broken(bad)
		for range 40 { // to far below what an illuminance meter shows
			mid := (good + bad) / 2
			if b := broken(mid); b != nil {
				bad, why = mid, b
			} else {
				good = mid
			}
		}
		return good, why
	}
	low := grid[pick.first]
	if pick.first > 0 {
		e, why := edge(low, grid[pick.first-1])
		low, out.LowBinds, out.LowUnconfirmed = e, string(why.Quantity), !why.decides
	}
	out.Low = ptr(float64(low))
	if pick.last < len(grid)-1 {
		e, why := edge(grid[pick.last], grid[pick.last+1])
		out.High, out.HighBinds, out.HighUnconfirmed = ptr(float64(e)), string(why.Quantity), !why.decides
	}
	return out
}
