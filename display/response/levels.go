package response

import (
	"math"

	"evenstep/display/gsdf"
)

// JNDAt is the index of what the monitor shows at a level, in the light of the visit. Between measured
// levels it follows a straight line over the index. It reports false outside the levels and where the
// GSDF cannot be used.
func (r *Response) JNDAt(level int) (gsdf.JND, bool) {
	if len(r.Steps) == 0 {
		return 0, false
	}
	for i, p := range r.Points {
		switch {
		case p.Level == level:
			j, err := gsdf.Index(p.Luminance)
			return j, err == nil
		case p.Level > level && i > 0:
			a, errA := gsdf.Index(r.Points[i-1].Luminance)
			b, errB := gsdf.Index(p.Luminance)
			t := gsdf.JND(level-r.Points[i-1].Level) / gsdf.JND(p.Level-r.Points[i-1].Level)
			return a + (b-a)*t, errA == nil && errB == nil
		case p.Level > level:
			return 0, false
		}
	}
	return 0, false
}

// LevelAbove is the level whose index lies nearest to wanted JND above that of base, and by how many JND
// it does. It reports false where no higher level is brighter.
func (r *Response) LevelAbove(base int, wanted gsdf.JND) (level int, jnd gsdf.JND, ok bool) {
	from, known := r.JNDAt(base)
	if !known {
		return 0, 0, false
	}
	best := math.Inf(1)
	for l := base + 1; l < 1<<r.Bits; l++ {
		j, known := r.JNDAt(l)
		if !known || j <= from {
			continue
		}
		miss := math.Abs(float64(j - from - wanted))
		if miss >= best && j-from > wanted {
			break
		}
		if miss < best {
			best, level, jnd, ok = miss, l, j-from, true
		}
	}
	return level, jnd, ok
}
