package response

import (
	"math"
	"testing"

	"evenstep/display/photometry"
)

func taken(levels []int, lum []float64, n int) []LevelReading {
	var out []LevelReading
	for i := range n {
		out = append(out, LevelReading{levels[i], photometry.CdM2(lum[i])})
	}
	return out
}

// TestExpectAlongTheFunction: on a monitor that keeps the standard function, equal levels are equal
// steps of the index, so that what is expected is what comes (tolerance: rounding of the inverse).
func TestExpectAlongTheFunction(t *testing.T) {
	lum := aims(t, levels18(), 1, 400)
	for i := 2; i < 18; i++ {
		got, ok := Expect(levels18()[i], taken(levels18(), lum, i), nil)
		if !ok || math.Abs(float64(got)/lum[i]-1) > 1e-6 {
			t.Errorf("level %d: %v, want %v", levels18()[i], got, lum[i])
		}
	}
	if _, ok := Expect(30, taken(levels18(), lum, 1), nil); ok {
		t.Error("something is expected after one reading")
	}
	// A level gone back to: between its neighbours, not at itself.
	all := taken(levels18(), lum, 18)
	all[5].Luminance *= 10
	if got, ok := Expect(75, all, nil); !ok || math.Abs(float64(got)/lum[5]-1) > 1e-6 {
		t.Errorf("level 75 again: %v, want %v", got, lum[5])
	}
}

// TestExpectFromBefore: a monitor that has lost a tenth of its light since.
func TestExpectFromBefore(t *testing.T) {
	lum := aims(t, levels18(), 1, 400)
	before := taken(levels18(), lum, 18)
	if got, ok := Expect(0, nil, before); !ok || float64(got) != lum[0] {
		t.Errorf("the first level: %v, want %v", got, lum[0])
	}
	now := []LevelReading{{0, photometry.CdM2(.9 * lum[0])}}
	if got, ok := Expect(15, now, before); !ok || math.Abs(float64(got)/(.9*lum[1])-1) > 1e-9 {
		t.Errorf("the second: %v, want %v", got, .9*lum[1])
	}
}

func TestOdd(t *testing.T) {
	lum := aims(t, levels18(), 1, 400)
	n := Noise{Repeatability: .005, Floor: .005}
	so := taken(levels18(), lum, 8)
	for _, c := range []struct {
		name   string
		factor float64
		want   Oddity
	}{
		{"as expected", 1, ""},
		{"12 % more", 1.12, ""},
		{"point left out", 10, TenTimes},
		{"point too many", .1, ATenth},
		{"foot-lambert", 1 / 3.426, OtherUnit},
		{"half", .5, BelowDarker},
		{"two and a half times", 2.4, FarOff},
	} {
		got := Odd(LevelReading{levels18()[8], photometry.CdM2(c.factor * lum[8])}, so, nil, n)
		if got != c.want {
			t.Errorf("%s: %q, want %q", c.name, got, c.want)
		}
	}
	rising := []LevelReading{{0, 1}, {255, 300}}
	if got := Odd(LevelReading{128, 320}, rising, nil, n); got == "" {
		t.Error("a middle level above the brightest is not asked about")
	}
	if got := Odd(LevelReading{0, 1}, nil, nil, n); got != "" {
		t.Errorf("the first reading: %q", got)
	}
}

// TestPowerLawIsNotOdd: a panel without a table is bad, but nothing was mistyped.
func TestPowerLawIsNotOdd(t *testing.T) {
	n := Noise{Repeatability: .005, Floor: .005}
	for _, gamma := range []float64{1.8, 2.2, 2.6} {
		var lum []float64
		for _, l := range levels18() {
			lum = append(lum, .4+400*math.Pow(float64(l)/255, gamma))
		}
		for i := 2; i < 18; i++ {
			if got := Odd(LevelReading{levels18()[i], photometry.CdM2(lum[i])}, taken(levels18(), lum, i), nil, n); got != "" {
				t.Errorf("gamma %v, level %d: %q", gamma, levels18()[i], got)
			}
		}
	}
}
