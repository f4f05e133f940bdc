package response

import (
	"math"
	"sort"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
)

// LevelReading is a luminance at a level while a series is being taken, as the meter gave it.
type LevelReading struct {
	Level     int
	Luminance photometry.CdM2
}

// Expect is the luminance to be expected at a level, from the readings taken so far and, where there
// are any, those of an earlier series of the same monitor. It reports false where nothing can be said:
// it takes one reading beside an earlier series, or two without.
func Expect(level int, taken, earlier []LevelReading) (photometry.CdM2, bool) {
	taken, earlier = ordered(taken, level), ordered(earlier, -1)
	if old, ok := at(earlier, level); ok {
		if len(taken) == 0 {
			return photometry.CdM2(old), true
		}
		near := nearest(taken, level)
		if then, ok := at(earlier, near.Level); ok && then > 0 && near.Luminance > 0 {
			return photometry.CdM2(old * float64(near.Luminance) / then), true
		}
	}
	if len(taken) < 2 {
		return 0, false
	}
	l, ok := at(taken, level)
	if !ok {
		// Beyond the readings: on along the last two, in steps of the eye.
		a, b := taken[len(taken)-2], taken[len(taken)-1]
		if level < taken[0].Level {
			a, b = taken[1], taken[0]
		}
		ya, yb := visible(float64(a.Luminance)), visible(float64(b.Luminance))
		l = luminanceOf(yb + (yb-ya)*float64(level-b.Level)/float64(b.Level-a.Level))
	}
	return photometry.CdM2(l), !math.IsNaN(l) && l >= 0
}

// visible is a luminance on a scale of roughly equal visible steps: the JND index, and below the
// function a straight line through its first JND.
func visible(l float64) float64 {
	switch lowest := float64(gsdf.MinLuminance()); {
	case l < lowest:
		return float64(gsdf.First) * l / lowest
	case l > float64(gsdf.MaxLuminance()):
		return float64(gsdf.Last)
	}
	j, err := gsdf.Index(photometry.CdM2(l))
	if err != nil {
		return math.NaN()
	}
	return float64(j)
}

func luminanceOf(j float64) float64 {
	switch {
	case j < float64(gsdf.First):
		return max(0, j) / float64(gsdf.First) * float64(gsdf.MinLuminance())
	case j > float64(gsdf.Last):
		return float64(gsdf.MaxLuminance())
	}
	l, err := gsdf.Luminance(gsdf.JND(j))
	if err != nil {
		return math.NaN()
	}
	return float64(l)
}

// ordered sorts by level, with what stands at the level itself left out.
func ordered(rs []LevelReading, without int) []LevelReading {
	var out []LevelReading
	for _, r := range rs {
		if r.Level != without {
			out = append(out, r)
		}
	}
	sort.SliceStable(out, func(i, k int) bool { return out[i].Level < out[k].Level })
	return out
}

func nearest(rs []LevelReading, level int) LevelReading {
	best := rs[0]
	for _, r := range rs {
		if math.Abs(float64(r.Level-level)) < math.Abs(float64(best.Level-level)) {
			best = r
		}
	}
	return best
}

// at is the luminance between ordered readings, in steps of the eye; false outside them.
func at(rs []LevelReading, level int) (float64, bool) {
	for i, r := range rs {
		switch {
		case r.Level == level:
			return float64(r.Luminance), true
		case r.Level > level && i > 0:
			a := rs[i-1]
			ya, yb := visible(float64(a.Luminance)), visible(float64(r.Luminance))
			return luminanceOf(ya + (yb-ya)*float64(level-a.Level)/float64(r.Level-a.Level)), true
		case r.Level > level:
			return 0, false
		}
	}
	return 0, false
}

// Oddity is what is out of the ordinary about a reading; "" where nothing is.
type Oddity string

// The oddities that are asked about while a series is taken.
const (
	TenTimes      Oddity = "ten times what the neighbours lead to expect"
	ATenth        Oddity = "a tenth of what the neighbours lead to expect"
	OtherUnit     Oddity = "off by the factor between foot-lambert and cd/m2"
	BelowDarker   Oddity = "below a darker level"
	AboveBrighter Oddity = "above a brighter level"
	FarOff        Oddity = "far from what the neighbours lead to expect"
)

// Odd says whether a reading looks mistyped beside those taken so far. It only asks: a monitor may well
// do what is odd.
func Odd(reading LevelReading, taken, earlier []LevelReading, n Noise) Oddity {
	l := float64(reading.Luminance)
	if want, ok := Expect(reading.Level, taken, earlier); ok && want > 0 {
		// What lies far from every reading is only roughly known: there a factor of ten counts, no less.
		gap, top := math.Inf(1), float64(reading.Level)
		for _, r := range taken {
			if r.Level != reading.Level {
				gap = min(gap, math.Abs(float64(r.Level-reading.Level)))
			}
			top = max(top, float64(r.Level))
		}
		sure := gap <= top/4 || len(earlier) > 0
		ratio := (l + float64(n.Floor)) / (float64(want) + float64(n.Floor))
		const close = 1.35 // a mistyped factor sits this near to it; panels step less between neighbours
		near := func(factor float64) bool { return ratio > factor/close && ratio < factor*close }
		switch {
		case near(10):
			return TenTimes
		case near(0.1):
			return ATenth
		case !sure:
			if ratio > 4 || ratio < 1./4 {
				return FarOff
			}
		case near(float64(photometry.FootLambert(1).CdM2())), near(1 / float64(photometry.FootLambert(1).CdM2())):
			return OtherUnit
		case ratio > 2.2 || ratio < 1/2.2:
			return FarOff
		}
	}
	for _, r := range taken {
		spread := 3 * math.Sqrt(n.variance(l)+n.variance(float64(r.Luminance)))
		switch {
		case r.Level < reading.Level && l < float64(r.Luminance)-spread:
			return BelowDarker
		case r.Level > reading.Level && l > float64(r.Luminance)+spread:
			return AboveBrighter
		}
	}
	return ""
}
