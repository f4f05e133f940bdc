package response

import (
	"math"
	"testing"

	"evenstep/display/gsdf"
)

// TestLevelsByJND: on a monitor that keeps the standard function a level is worth the same everywhere:
// the range of the index over 255 (PS3.14 section 7.1; the tolerance is rounding of the inverse).
func TestLevelsByJND(t *testing.T) {
	r := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), aims(t, levels18(), 1, 400)), Light: DarkRoom()})
	low, high, _ := r.JNDs()
	each := (high - low) / 255
	for _, l := range []int{0, 1, 15, 100, 255} {
		j, ok := r.JNDAt(l)
		if want := low + each*gsdf.JND(l); !ok || math.Abs(float64(j-want)) > 1e-6 {
			t.Errorf("level %d: %v, want %v", l, j, want)
		}
	}
	for _, c := range []struct {
		base   int
		wanted gsdf.JND
		steps  int
	}{{0, 1, 1}, {128, each, 1}, {128, 3 * each, 3}, {128, 2.4 * each, 2}, {250, 100, 5}} {
		level, jnd, ok := r.LevelAbove(c.base, c.wanted)
		if !ok || level != c.base+c.steps || math.Abs(float64(jnd-each*gsdf.JND(c.steps))) > 1e-6 {
			t.Errorf("%v JND above %d: level %d, %v JND; want %d levels", c.wanted, c.base, level, jnd, c.steps)
		}
	}
	if _, _, ok := r.LevelAbove(255, 1); ok {
		t.Error("a level above the highest")
	}
	if _, ok := r.JNDAt(256); ok {
		t.Error("level 256 of 8 bits")
	}
}
