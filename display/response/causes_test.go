package response

import (
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"evenstep/display/photometry"
	"evenstep/display/readings"
)

func causesOf(r *Response, h Hints) []string {
	var out []string
	for _, c := range r.Causes(h) {
		out = append(out, c.Causes...)
	}
	return out
}

// TestPublishedCauses finds the faults of published data.
func TestPublishedCauses(t *testing.T) {
	printed := levels18()
	printed[11] = 160
	var fine []int
	var fineLum []float64
	for i, row := range table(t, "toolkit-sample-curve.csv") {
		fine, fineLum = append(fine, i), append(fineLum, number(t, row[1]))
	}
	quiet := Noise{Repeatability: 0.001, Floor: 0.002}
	for _, c := range []struct {
		name   string
		in     Input
		want   string
		detail string
	}{
		{"PS3.17 Annex PPP as printed", Input{Bits: 8, Readings: series(printed, pppLuminances), Light: MeasuredAmbient(pppAmbient, nil), Noise: quiet}, CauseMistypedLevel, "fits level 165"},
		{"PS3.17 Annex PPP without its ambient", Input{Bits: 8, Readings: series(levels18(), pppLuminances), Light: DarkRoom(), Noise: quiet}, CauseAmbientLeftOut, "added to"},
		{"PS3.17 Annex PPP with ambient", Input{Bits: 8, Readings: series(levels18(), pppLuminances), Light: MeasuredAmbient(pppAmbient, nil), Noise: quiet}, "", ""},
		{"toolkit sample curve", Input{Bits: 8, Readings: series(fine, fineLum), Light: MeasuredAmbient(1, nil), Noise: quiet}, CauseNoTable, "exponent"},
		{"toolkit sample curve, dark", Input{Bits: 8, Readings: series(fine, fineLum), Light: DarkRoom(), Noise: quiet}, CauseNoTable, "exponent"},
	} {
		t.Run(c.name, func(t *testing.T) {
			cs := mustEvaluate(t, c.in).Causes(Hints{})
			if c.want == "" {
				if len(cs) != 0 {
					t.Fatalf("named %v; want nothing", cs)
				}
				return
			}
			if len(cs) != 1 || !slices.Contains(cs[0].Causes, c.want) || !strings.Contains(cs[0].Evidence, c.detail) {
				t.Fatalf("named %+v; want %s with %q", cs, c.want, c.detail)
			}
			if cs[0].Advice == "" {
				t.Error("no advice")
			}
		})
	}
}

// fault is a monitor or a measurement with one thing wrong, of the size that the study states.
type fault struct {
	name string
	size string
	want string
	make func(t *testing.T, rng *rand.Rand, noise Noise) (Input, Hints)
}

// simulated is an 18-level visit at a monitor of up to 5 % true deviation, in a room of known
// ambient light that the readings do not hold.
func simulated(t *testing.T, rng *rand.Rand, noise Noise, most float64) (lum []float64, ambient float64) {
	lo := 0.5 + rng.Float64()
	lum = panel(t, rng, levels18(), lo, 250+500*rng.Float64(), most*rng.Float64())
	return lum, lo * (0.1 + 0.15*rng.Float64())
}

func visit(rng *rand.Rand, levels []int, full []float64, ambient, stated float64, noise Noise) Input {
	emitted := make([]float64, len(full))
	for i := range full {
		emitted[i] = full[i] - ambient
	}
	return Input{Bits: 8, Readings: series(levels, noisy(rng, emitted, noise)), Light: MeasuredAmbient(photometry.CdM2(stated), nil), Noise: noise}
}

func faults() []fault {
	const worst = 0.05 // true deviation under the fault
	return []fault{
		{"ambient left out", "Lamb is 50 % of L'min", CauseAmbientLeftOut, func(t *testing.T, rng *rand.Rand, n Noise) (Input, Hints) {
			lum, _ := simulated(t, rng, n, worst)
			return visit(rng, levels18(), lum, 0.5*lum[0], 0, n), Hints{}
		}},
		{"ambient counted twice", "Lamb is 70 % of L'min", CauseAmbientTwice, func(t *testing.T, rng *rand.Rand, n Noise) (Input, Hints) {
			lum, _ := simulated(t, rng, n, worst)
			return visit(rng, levels18(), lum, 0, 0.7*lum[0], n), Hints{}
		}},
		{"no table", "exponent 1.8 to 2.6", CauseNoTable, func(t *testing.T, rng *rand.Rand, n Noise) (Input, Hints) {
			gamma, lo, hi := 1.8+0.8*rng.Float64(), 0.2+0.8*rng.Float64(), 200+500*rng.Float64()
			var lum []float64
			for _, p := range levels18() {
				lum = append(lum, lo+(hi-lo)*math.Pow(float64(p)/255, gamma)*(1+0.01*rng.NormFloat64()))
			}
			ambient := 0.2 * rng.Float64()
			for i := range lum {
				lum[i] += ambient
			}
			return visit(rng, levels18(), lum, ambient, ambient, n), Hints{}
		}},
		{"limited range", "16 to 235 of 255", CauseLimitedRange, func(t *testing.T, rng *rand.Rand, n Noise) (Input, Hints) {
			lum, ambient := simulated(t, rng, n, worst)
			j := levels18()
			out := make([]float64, len(lum))
			for i, p := range j {
				q := min(max((float64(p)-16)*255/219, 0), 255) / 15
				k := min(int(q), 16)
				out[i] = math.Exp(math.Log(lum[k]) + (q-float64(k))*(math.Log(lum[k+1])-math.Log(lum[k])))
			}
			return visit(rng, j, out, ambient, ambient, n), Hints{}
		}},
		{"mistyped level", "off by a third of a step (5 of 255)", CauseMistypedLevel, func(t *testing.T, rng *rand.Rand, n Noise) (Input, Hints) {
			lum, ambient := simulated(t, rng, n, worst)
			levels := levels18()
			levels[2+rng.IntN(14)] += 5 - 10*rng.IntN(2)
			return visit(rng, levels, lum, ambient, ambient, n), Hints{}
		}},
		{"mistyped reading", "20 % off", CauseMistypedReading, func(t *testing.T, rng *rand.Rand, n Noise) (Input, Hints) {
			lum, ambient := simulated(t, rng, n, worst)
			in := visit(rng, levels18(), lum, ambient, ambient, n)
			in.Readings[2+rng.IntN(14)].Luminance *= photometry.CdM2(1.2 - 0.4*float64(rng.IntN(2)))
			return in, Hints{}
		}},
		{"drift", "4 % over the series", CauseDrift, func(t *testing.T, rng *rand.Rand, n Noise) (Input, Hints) {
			lum, ambient := simulated(t, rng, n, worst)
			for i := range lum {
				lum[i] *= 1 + 0.04*float64(i)/17
			}
			in := visit(rng, levels18(), lum, ambient, ambient, n)
			return withDrift(rng, in, lum[2]*1.04-ambient, n), Hints{}
		}},
		{"six-bit panel", "256 levels", CauseSixBit, func(t *testing.T, rng *rand.Rand, n Noise) (Input, Hints) {
			levels := allLevels()
			full := aims(t, levels, 0.5+rng.Float64(), 250+500*rng.Float64())
			lum := make([]float64, 256)
			for i := range lum {
				lum[i] = full[(i/4)*255/63]
			}
			return visit(rng, levels, lum, 0, 0, n), Hints{}
		}},
		{"coarse table", "8 bits in, 8 bits out, 256 levels, 0.2 % repeatability", CauseCoarseTable, func(t *testing.T, rng *rand.Rand, _ Noise) (Input, Hints) {
			n := Noise{Repeatability: 0.002, Floor: 0.002}
			return visit(rng, allLevels(), tableOf(t, rng, 8), 0, 0, n), Hints{}
		}},
		{"ratio only", "ratio 15 % under the floor", CauseRatioOnly, func(t *testing.T, rng *rand.Rand, n Noise) (Input, Hints) {
			lum, ambient := simulated(t, rng, n, worst)
			in := visit(rng, levels18(), lum, ambient, ambient, n)
			return in, Hints{RatioFloor: lum[17] / lum[0] / 0.85}
		}},
	}
}

func allLevels() []int {
	l := make([]int, 256)
	for i := range l {
		l[i] = i
	}
	return l
}

// tableOf is a power-law monitor behind a GSDF table of so many output bits.
func tableOf(t *testing.T, rng *rand.Rand, bits int) []float64 {
	gamma, lo, hi := 2.0+0.4*rng.Float64(), 0.3+0.7*rng.Float64(), 250+400*rng.Float64()
	out := make([]float64, 256)
	top := float64(int(1)<<bits - 1)
	for i, want := range aims(t, allLevels(), lo, hi) {
		v := math.Round(top * math.Pow(max(0, want-lo)/(hi-lo), 1/gamma))
		out[i] = lo + (hi-lo)*math.Pow(v/top, gamma)
	}
	return out
}

func withDrift(rng *rand.Rand, in Input, later float64, n Noise) Input {
	l := noisy(rng, []float64{later}, n)[0]
	in.Readings = append(in.Readings, readings.Reading{Level: 30, Luminance: photometry.CdM2(l), Role: readings.Drift, Ambient: readings.Excluded})
	return in
}

// TestStudyCauses counts how often each cause is named at a stated size of fault, and how often
// anything is named of a monitor that has none. Quick runs take fewer trials.
func TestStudyCauses(t *testing.T) {
	trials, calm := 500, 6000
	if testing.Short() {
		trials, calm = 60, 400
	}
	noise := Noise{Repeatability: 0.003, Floor: 0.005}
	t.Logf("causes: repeatability 0.3 %%, true deviation under the fault 0 to 5 %%, %d trials a fault", trials)
	for i, f := range faults() {
		rng := rand.New(rand.NewPCG(11, uint64(i)))
		hit, alone := 0, 0
		for range trials {
			in, h := f.make(t, rng, noise)
			names := causesOf(mustEvaluate(t, in), h)
			if slices.Contains(names, f.want) {
				hit++
				if len(names) == 1 {
					alone++
				}
			}
		}
		share := float64(hit) / float64(trials)
		t.Logf("%-22s %-52s named %5.1f %%, alone %5.1f %%", f.name, f.size, 100*share, 100*float64(alone)/float64(trials))
		if share < 0.90 {
			t.Errorf("%s is named in %.1f %% of the trials, want at least 90 %%", f.name, 100*share)
		}
	}
	rng := rand.New(rand.NewPCG(12, 12))
	false18, falseFine := 0, 0
	for range calm {
		n := Noise{Repeatability: 0.001 + 0.009*rng.Float64(), Floor: 0.005}
		lum, ambient := simulated(t, rng, n, 0.10)
		in := withDrift(rng, visit(rng, levels18(), lum, ambient, ambient, n), lum[2]-ambient, n)
		if names := causesOf(mustEvaluate(t, in), Hints{RatioFloor: lum[17] / lum[0] * (0.7 + 0.3*rng.Float64())}); len(names) > 0 {
			false18++
		}
	}
	fine := calm / 20
	for range fine {
		n := Noise{Repeatability: 0.001 + 0.004*rng.Float64(), Floor: 0.002}
		if names := causesOf(mustEvaluate(t, visit(rng, allLevels(), tableOf(t, rng, 10), 0, 0, n)), Hints{}); len(names) > 0 {
			falseFine++
		}
	}
	t.Logf("false alarms of all causes together, true deviation 0 to 10 %%, repeatability 0.1 to 1 %%: %d of %d (%.2f %%); 256 levels behind a 10-bit table: %d of %d",
		false18, calm, 100*float64(false18)/float64(calm), falseFine, fine)
	limit := 0.01 * float64(calm)
	if testing.Short() {
		limit += 3 * math.Sqrt(limit)
	}
	if float64(false18) > limit || float64(falseFine) > 0.01*float64(fine)+1 {
		t.Errorf("false alarms above 1 %%")
	}
}
