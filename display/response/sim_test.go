package response

import (
	"math"
	"math/rand/v2"
	"testing"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
	"evenstep/display/readings"
)

// levels18 are the eighteen 8-bit levels 0, 15, ... 255.
func levels18() []int {
	var l []int
	for i := 0; i <= 255; i += 15 {
		l = append(l, i)
	}
	return l
}

// series makes readings of the luminances at the levels, without ambient light in them.
func series(levels []int, lum []float64) []readings.Reading {
	var rs []readings.Reading
	for i, l := range levels {
		rs = append(rs, readings.Reading{Level: l, Luminance: photometry.CdM2(lum[i]), Role: readings.Series, Ambient: readings.Excluded})
	}
	return rs
}

func mustEvaluate(t testing.TB, in Input) *Response {
	t.Helper()
	r, err := Evaluate(in)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// aims are the luminances of the standard function at the levels between lo and hi cd/m2.
func aims(t testing.TB, levels []int, lo, hi float64) []float64 {
	t.Helper()
	j1, err := gsdf.Index(photometry.CdM2(lo))
	if err != nil {
		t.Fatal(err)
	}
	jn, err := gsdf.Index(photometry.CdM2(hi))
	if err != nil {
		t.Fatal(err)
	}
	var out []float64
	top := levels[len(levels)-1]
	for _, p := range levels {
		l, err := gsdf.Luminance(j1 + (jn-j1)*gsdf.JND(p)/gsdf.JND(top))
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, float64(l))
	}
	return out
}

// panel is a monitor whose greatest true deviation is size, smooth in shape with a rough part, both
// drawn from rng. The luminances hold the ambient light.
func panel(t testing.TB, rng *rand.Rand, levels []int, lo, hi, size float64) []float64 {
	t.Helper()
	ideal := aims(t, levels, lo, hi)
	if size == 0 {
		return ideal
	}
	n := len(levels) - 1
	shape := make([]float64, n)
	a, b, c := rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()
	rough := rng.Float64()
	for i := range shape {
		x := float64(i) / float64(n-1)
		shape[i] = a*math.Cos(math.Pi*x) + b*math.Cos(2*math.Pi*x) + c*math.Cos(3*math.Pi*x) + rough*rng.NormFloat64()
	}
	build := func(scale float64) ([]float64, float64) {
		// Steps are relative differences; the whole is stretched so that both ends stay.
		stretch := 0.0
		lum := make([]float64, n+1)
		for pass := 0; pass < 60; pass++ {
			lum[0] = ideal[0]
			for i := 1; i <= n; i++ {
				e, _, _ := relativeStep(ideal[i-1], ideal[i])
				c := e * (1 + scale*shape[i-1]) * (1 + stretch)
				lum[i] = lum[i-1] * (2 + c) / (2 - c)
			}
			miss := math.Log(ideal[n] / lum[n])
			stretch += miss / math.Log(hi/lo)
		}
		r := mustEvaluate(t, Input{Bits: 8, Readings: series(levels, lum), Light: DarkRoom()})
		d, _, _ := r.GreatestDeviation()
		return lum, d.Value
	}
	scale := size / 2
	var lum []float64
	for pass := 0; pass < 12; pass++ {
		var got float64
		lum, got = build(scale)
		scale *= size / got
	}
	return lum
}

// noisy adds the reading noise of n.
func noisy(rng *rand.Rand, lum []float64, n Noise) []float64 {
	out := make([]float64, len(lum))
	for i, l := range lum {
		out[i] = max(0, l+rng.NormFloat64()*math.Sqrt(n.variance(l)))
	}
	return out
}
