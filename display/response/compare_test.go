package response

import (
	"math"
	"math/rand/v2"
	"testing"
)

// TestCompare: two visits that differ by noise alone agree in 95 % of the figures or more, and a
// monitor that lost a tenth of its light has changed.
func TestCompare(t *testing.T) {
	n := Noise{Repeatability: .005, Floor: .002}
	rng := rand.New(rand.NewPCG(21, 4))
	visit := func(scale float64) *Response {
		lum := aims(t, levels18(), 1, 400)
		for i := range lum {
			lum[i] *= scale
			lum[i] += rng.NormFloat64() * math.Sqrt(n.variance(lum[i]))
		}
		return mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), lum), Light: DarkRoom(), Noise: n})
	}
	figures, beyond := 0, 0
	for range 200 {
		for _, c := range Compare(visit(1), visit(1)) {
			figures++
			if c.Beyond {
				beyond++
			}
		}
	}
	if share := float64(beyond) / float64(figures); share > .06 { // 5 % by design, and 4400 figures scatter by 0.3 %
		t.Errorf("%.1f %% of the figures changed where nothing did", 100*share)
	}
	changes := Compare(visit(1), visit(.9))
	if len(changes) != 4+18 {
		t.Fatalf("%d figures, want 22", len(changes))
	}
	for _, c := range changes {
		want := c.What != "luminance ratio" && c.What != "greatest deviation"
		if c.Beyond != want {
			t.Errorf("%s from %v to %v: beyond %v, want %v", c.What, c.Before.Value, c.After.Value, c.Beyond, want)
		}
	}
	other := visit(1)
	other.Bits = 10
	for _, c := range Compare(visit(1), other) {
		if len(c.What) > 8 && c.What[:8] == "L' at le" {
			t.Errorf("levels of 8 and of 10 bits were compared: %s", c.What)
		}
	}
}
