package calibrate

import (
	"math"
	"math/rand/v2"
	"sort"
	"testing"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
)

// panel is a simulated monitor: what it emits at a share x of the highest driving level, in cd/m2.
type panel struct {
	emits   func(x float64) float64
	ambient float64 // Lamb, cd/m2
}

func (p panel) full(x float64) float64 { return p.emits(x) + p.ambient }

// family draws panels of one kind. The shape runs from 0 at x = 0 to 1 at x = 1.
type family struct {
	name  string
	shape func(rng *rand.Rand) func(x float64) float64
	// luminance, where set, gives the panel by itself instead of by its shape.
	luminance func(rng *rand.Rand, lo, hi float64) func(x float64) float64
}

func (f family) draw(rng *rand.Rand) panel {
	hi := uniform(rng, 250, 1000)
	lo := hi / uniform(rng, 300, 1200)
	ambient := lo * uniform(rng, 0.05, 0.5)
	if f.luminance != nil {
		return panel{f.luminance(rng, lo, hi), ambient}
	}
	s := f.shape(rng)
	return panel{func(x float64) float64 { return lo + (hi-lo)*s(x) }, ambient}
}

func uniform(rng *rand.Rand, a, b float64) float64 { return a + (b-a)*rng.Float64() }

func gamma(g float64) func(rng *rand.Rand) func(x float64) float64 {
	return func(rng *rand.Rand) func(x float64) float64 {
		exponent := g + uniform(rng, -0.05, 0.05)
		return func(x float64) float64 { return math.Pow(x, exponent) }
	}
}

// tuned are the families that the fit's constants were chosen on.
var tuned = []family{
	{name: "power 2.2", shape: gamma(2.2)},
	{name: "S-curve", shape: func(rng *rand.Rand) func(x float64) float64 {
		a, b, k := uniform(rng, 2, 2.8), uniform(rng, 1, 1.6), uniform(rng, 0.5, 1.5)
		return func(x float64) float64 {
			up := math.Pow(x, a)
			return up / (up + k*math.Pow(1-x, b))
		}
	}},
	{name: "dark kink", shape: func(rng *rand.Rand) func(x float64) float64 {
		at, g := uniform(rng, 0.05, 0.12), uniform(rng, 2, 2.4)
		return func(x float64) float64 {
			if x < at {
				return math.Pow(at, g) * x / at
			}
			return math.Pow(x, g)
		}
	}},
	{name: "near the GSDF", luminance: func(rng *rand.Rand, lo, hi float64) func(x float64) float64 {
		// Made for another room light, and a little off.
		made, wave, phase := uniform(rng, 0.02, 0.6), uniform(rng, 0.002, 0.01), uniform(rng, 0, 6)
		j1, jn := index(lo+made), index(hi+made)
		return func(x float64) float64 {
			x += wave * x * (1 - x) * 4 * math.Sin(7*x+phase)
			return max(lo, luminance(j1+(jn-j1)*x)-made)
		}
	}},
	{name: "sRGB-like", shape: func(rng *rand.Rand) func(x float64) float64 {
		// The transfer function of IEC 61966-2-1 (from memory), a little off.
		g := uniform(rng, 0.95, 1.05)
		return func(x float64) float64 {
			x = math.Pow(x, g)
			if x <= 0.04045 {
				return x / 12.92
			}
			return math.Pow((x+0.055)/1.055, 2.4)
		}
	}},
	{name: "saturating", shape: func(rng *rand.Rand) func(x float64) float64 {
		g, k := uniform(rng, 2, 2.4), uniform(rng, 1, 3)
		return func(x float64) float64 {
			s := math.Pow(x, g)
			return (1 - math.Exp(-k*s)) / (1 - math.Exp(-k))
		}
	}},
	{name: "piecewise table", luminance: func(rng *rand.Rand, lo, hi float64) func(x float64) float64 {
		// A table of few entries in the panel, straight in luminance between them.
		pieces, g := 16+rng.IntN(17), uniform(rng, 1.9, 2.4)
		at := func(i int) float64 { return lo + (hi-lo)*math.Pow(float64(i)/float64(pieces), g) }
		return func(x float64) float64 {
			i := min(int(x*float64(pieces)), pieces-1)
			t := x*float64(pieces) - float64(i)
			return at(i)*(1-t) + at(i+1)*t
		}
	}},
}

// heldOut are the families that nothing was tuned on.
var heldOut = []family{
	{name: "power 1.8", shape: gamma(1.8)},
	{name: "power 2.4", shape: gamma(2.4)},
	{name: "power with offset", shape: func(rng *rand.Rand) func(x float64) float64 {
		c, g := uniform(rng, 0.02, 0.15), uniform(rng, 2, 2.6)
		return func(x float64) float64 {
			return (math.Pow(x+c, g) - math.Pow(c, g)) / (math.Pow(1+c, g) - math.Pow(c, g))
		}
	}},
	{name: "wavy", shape: func(rng *rand.Rand) func(x float64) float64 {
		g, wave, turns, phase := uniform(rng, 2, 2.4), uniform(rng, 0.005, 0.02), uniform(rng, 2, 4), uniform(rng, 0, 6)
		return func(x float64) float64 {
			return math.Pow(x, g) * math.Exp(wave*(math.Sin(2*math.Pi*turns*x+phase)-math.Sin(2*math.Pi*turns+phase)))
		}
	}},
	{name: "cut off at black", shape: func(rng *rand.Rand) func(x float64) float64 {
		from, g := uniform(rng, 0.01, 0.06), uniform(rng, 2, 2.5)
		return func(x float64) float64 { return math.Pow(max(0, x-from)/(1-from), g) }
	}},
	{name: "voltage taps", luminance: func(rng *rand.Rand, lo, hi float64) func(x float64) float64 {
		// A cell of S-shaped transmission whose voltage is set at a few taps and runs straight between them.
		g, steep := uniform(rng, 2, 2.4), uniform(rng, 0.7, 1.3)
		volt := func(s float64) float64 { return math.Asinh(s*20) * steep / (1.05 - math.Pow(s, 3)*0.3) }
		taps := []float64{0, 1. / 63, 4. / 63, 9. / 63, 16. / 63, 24. / 63, 32. / 63, 42. / 63, 54. / 63, 1}
		for i := 1; i < len(taps)-1; i++ {
			taps[i] *= uniform(rng, 0.9, 1.1)
		}
		at := make([]float64, len(taps))
		for i, x := range taps {
			at[i] = volt(math.Pow(x, g))
		}
		back := func(v float64) float64 {
			a, b := 0., 1.
			for range 50 {
				if m := (a + b) / 2; volt(m) < v {
					a = m
				} else {
					b = m
				}
			}
			return a
		}
		return func(x float64) float64 {
			i := 1
			for i < len(taps)-1 && x > taps[i] {
				i++
			}
			t := (x - taps[i-1]) / (taps[i] - taps[i-1])
			return lo + (hi-lo)*back(at[i-1]*(1-t)+at[i]*t)
		}
	}},
	{name: "exponential", luminance: func(rng *rand.Rand, lo, hi float64) func(x float64) float64 {
		k := uniform(rng, 0.6, 1)
		return func(x float64) float64 { return lo * math.Pow(hi/lo, math.Pow(x, k)) }
	}},
}

func index(l float64) float64 {
	j, err := gsdf.Index(photometry.CdM2(l))
	if err != nil {
		panic(err)
	}
	return float64(j)
}

func luminance(j float64) float64 {
	l, err := gsdf.Luminance(gsdf.JND(j))
	if err != nil {
		panic(err)
	}
	return float64(l)
}

// even are n levels of 8 bits in equal steps.
func even(n int) []int {
	out := make([]int, n)
	for i := range out {
		out[i] = int(math.Round(255 * float64(i) / float64(n-1)))
	}
	return out
}

// dark are n levels of 8 bits, close together at the dark end.
func dark(n int) []int {
	out := make([]int, n)
	for i := range out {
		out[i] = int(math.Round(255 * math.Pow(float64(i)/float64(n-1), 2)))
	}
	return out
}

// read takes one reading of each 8-bit level.
func (p panel) read(rng *rand.Rand, levels []int, n response.Noise) []readings.Reading {
	var out []readings.Reading
	for _, l := range levels {
		v := p.emits(float64(l) / 255)
		v += rng.NormFloat64() * math.Hypot(n.Repeatability*v, float64(n.Floor))
		out = append(out, readings.Reading{Level: l, Luminance: photometry.CdM2(max(0, v)), Role: readings.Series, Ambient: readings.Excluded})
	}
	return out
}

// deviation is the panel's true greatest contrast deviation through a table of 8 bits in, at the eighteen
// levels 0, 15, ... 255, L' with ambient light.
func (p panel) deviation(t testing.TB, entries []uint16, outBits int) float64 {
	t.Helper()
	var rs []readings.Reading
	for l := 0; l <= 255; l += 15 {
		x := float64(entries[l]) / float64(int(1)<<outBits-1)
		rs = append(rs, readings.Reading{Level: l, Luminance: photometry.CdM2(p.full(x)), Role: readings.Series, Ambient: readings.Included})
	}
	r, err := response.Evaluate(response.Input{Bits: 8, Readings: rs, Light: response.DarkRoom()})
	if err != nil {
		t.Fatal(err)
	}
	d, _, ok := r.GreatestDeviation()
	if !ok {
		t.Fatal(r.Undefined)
	}
	return d.Value
}

func quantile(v []float64, q float64) float64 {
	s := append([]float64(nil), v...)
	sort.Float64s(s)
	return s[min(int(q*float64(len(s))), len(s)-1)]
}
