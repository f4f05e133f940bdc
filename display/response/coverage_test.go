package response

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"evenstep/display/photometry"
	"evenstep/display/readings"
)

// leastCoverage is what the design asks of the interval of the greatest deviation. Its intervals are
// made for 95 %.
const leastCoverage = 0.93

// coverage is the share of trials in which the true greatest deviation lies in its interval.
func coverage(t *testing.T, levels []int, r, size float64, trials int, seed uint64) (share, width float64) {
	rng := rand.New(rand.NewPCG(seed, uint64(len(levels))))
	noise := Noise{Repeatability: r, Floor: FloorDefault}
	hit := 0
	for range trials {
		lo := 0.3 + 1.2*rng.Float64()
		lum := panel(t, rng, levels, lo, 170+700*rng.Float64(), size)
		truth := mustEvaluate(t, Input{Bits: 8, Readings: series(levels, lum), Light: DarkRoom()})
		want, _, _ := truth.GreatestDeviation()
		got := mustEvaluate(t, Input{Bits: 8, Readings: series(levels, noisy(rng, lum, noise)), Light: DarkRoom(), Noise: noise})
		e, _, ok := got.GreatestDeviation()
		if !ok {
			t.Fatal(got.Undefined)
		}
		if e.Low <= want.Value && want.Value <= e.High {
			hit++
		}
		width += e.High - e.Low
	}
	return float64(hit) / float64(trials), width / float64(trials)
}

// TestStudyCoverage simulates monitors and meters and counts how often the interval of the greatest
// deviation holds the true one. Quick runs take fewer trials.
func TestStudyCoverage(t *testing.T) {
	trials := 2000
	if testing.Short() {
		trials = 150
	}
	// Three standard errors of a share of 0.93 in so many trials: what chance alone may take off.
	slack := 0.0
	if testing.Short() {
		slack = 3 * math.Sqrt(0.93*0.07/float64(trials))
	}
	t.Logf("coverage of the true greatest deviation, 18 levels, %d trials a cell; mean width of the interval", trials)
	for i, r := range []float64{0.001, 0.005, 0.010, 0.015} {
		line := fmt.Sprintf("repeatability %.1f %%:", 100*r)
		for k, size := range []float64{0, 0.05, 0.08, 0.12} {
			share, width := coverage(t, levels18(), r, size, trials, uint64(100*i+k))
			line += fmt.Sprintf("  %2.0f %% panel %.1f %% (width %.1f %%)", 100*size, 100*share, 100*width)
			if share < leastCoverage-slack {
				t.Errorf("repeatability %.3f, panel of %.2f: coverage %.3f, want at least %.2f", r, size, share, leastCoverage)
			}
		}
		t.Log(line)
	}
}

// TestGainDropsOut: a factor common to all readings moves no relative step but by its part in J1 and
// Jn, and widens L'max by just that factor.
func TestGainDropsOut(t *testing.T) {
	lum := panel(t, rand.New(rand.NewPCG(1, 2)), levels18(), 0.8, 400, 0.08)
	plain := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), lum), Light: DarkRoom()})
	gain := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), lum), Light: DarkRoom(), Noise: Noise{Gain: 0.015}})
	e, _, _ := gain.GreatestDeviation()
	p, _, _ := plain.GreatestDeviation()
	if p.High != p.Low || p.Low != p.Value {
		t.Errorf("without noise the interval is %v to %v, want the value %v alone", p.Low, p.High, p.Value)
	}
	if w := e.High - e.Value; w <= 0 || w > 0.012 {
		t.Errorf("3 %% of gain (k=2) widens the greatest deviation by %v, want a little above 0", w)
	}
	m := gain.LuminanceMax()
	closeTo(t, "half width of L'max", (m.High-m.Low)/2, 1.959964*0.015*lum[17], 1e-4)
	ratio, _ := gain.Ratio()
	closeTo(t, "half width of the ratio", ratio.High-ratio.Value, 0, 1e-9)
	// The same by brute force: every reading 1.5 % higher.
	shifted := make([]float64, len(lum))
	for i := range lum {
		shifted[i] = lum[i] * 1.015
	}
	s := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), shifted), Light: DarkRoom()})
	k := sidak(17)
	for i := range s.Steps {
		u := (gain.Steps[i].High - gain.Steps[i].Low) / 2 / k
		closeTo(t, "shift of a step", u, math.Abs(s.Steps[i].Deviation-plain.Steps[i].Deviation), 2e-4) // first order against exact
	}
}

// TestGradient compares the propagated noise of every step with a simulation.
func TestGradient(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 7))
	lum := panel(t, rng, levels18(), 0.9, 380, 0.05)
	noise := Noise{Repeatability: 0.003, Floor: 0.002}
	base := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), lum), Light: DarkRoom(), Noise: noise})
	const trials = 4000
	sum := make([]float64, 17)
	for range trials {
		r := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), noisy(rng, lum, noise)), Light: DarkRoom()})
		for i := range sum {
			d := r.Steps[i].Deviation - base.Steps[i].Deviation
			sum[i] += d * d
		}
	}
	for i := range sum {
		got, want := math.Sqrt(sum[i]/trials), math.Sqrt(base.bands[i].noise)
		// A standard deviation from 4000 trials is known to 1.1 %; four of those.
		if math.Abs(got/want-1) > 0.045 {
			t.Errorf("step %d: propagated %.5f, simulated %.5f", i+1, want, got)
		}
	}
}

// TestRepeatsNarrow: averaging n readings a level narrows what noise widens, and With foretells it.
func TestRepeatsNarrow(t *testing.T) {
	rs := series(levels18(), pppLuminances)
	noise := Noise{Repeatability: 0.01, Floor: 0.005}
	one := mustEvaluate(t, Input{Bits: 8, Readings: rs, Light: MeasuredAmbient(pppAmbient, nil), Noise: noise})
	more := append([]readings.Reading(nil), rs...)
	for range 3 {
		for _, r := range rs {
			r.Role = readings.Repeat
			more = append(more, r)
		}
	}
	four := mustEvaluate(t, Input{Bits: 8, Readings: more, Light: MeasuredAmbient(pppAmbient, nil), Noise: noise})
	e1, _, _ := one.GreatestDeviation()
	e4, _, _ := four.GreatestDeviation()
	lo, hi := e1.With(4)
	closeTo(t, "low end", e4.Low, lo, 1e-12)
	closeTo(t, "high end", e4.High, hi, 1e-12)
	closeTo(t, "value", e4.Value, e1.Value, 1e-12)
	if e4.High-e4.Low >= e1.High-e1.Low {
		t.Error("four readings a level are no narrower than one")
	}
}

// TestAssumedRd: the interval covers the figure at every Rd that the default stands for.
func TestAssumedRd(t *testing.T) {
	rs := series(levels18(), pppLuminances)
	at := func(rd photometry.PerLux) *Response {
		return mustEvaluate(t, Input{Bits: 8, Readings: rs, Light: FromIlluminance(50, &rd)})
	}
	assumed := mustEvaluate(t, Input{Bits: 8, Readings: rs, Light: FromIlluminance(50, nil)})
	if !assumed.Light.RdAssumed || assumed.Light.Source != AmbientAssumedRd {
		t.Fatal("the default Rd is not marked")
	}
	closeTo(t, "Lamb", float64(*assumed.Light.Ambient), 0.25, 1e-12)
	e, _, _ := assumed.GreatestDeviation()
	ratio, _ := assumed.Ratio()
	amb, _ := assumed.AmbientRatio()
	for rd := RdLow; rd <= RdHigh; rd += 0.0005 {
		r := at(rd)
		d, _, _ := r.GreatestDeviation()
		if d.Value < e.Low || d.Value > e.High {
			t.Errorf("Rd %v: greatest deviation %v outside %v to %v", rd, d.Value, e.Low, e.High)
		}
		if v, _ := r.Ratio(); v.Value < ratio.Low || v.Value > ratio.High {
			t.Errorf("Rd %v: ratio %v outside %v to %v", rd, v.Value, ratio.Low, ratio.High)
		}
		if v, _ := r.AmbientRatio(); v.Value < amb.Low || v.Value > amb.High {
			t.Errorf("Rd %v: ambient ratio %v outside %v to %v", rd, v.Value, amb.Low, amb.High)
		}
	}
	if lo, hi := e.With(400); hi-lo < 0.01 {
		t.Error("repeats were credited with an assumed Rd")
	}
}

// TestAmbientOncePerReading: a reading that holds the ambient light and one that does not give the
// same response.
func TestAmbientOncePerReading(t *testing.T) {
	rs := series(levels18(), pppLuminances)
	mixed := append([]readings.Reading(nil), rs...)
	for i := range mixed {
		if i%2 == 0 {
			mixed[i].Luminance += pppAmbient
			mixed[i].Ambient = readings.Included
		}
	}
	a := mustEvaluate(t, Input{Bits: 8, Readings: rs, Light: MeasuredAmbient(pppAmbient, nil)})
	b := mustEvaluate(t, Input{Bits: 8, Readings: mixed, Light: MeasuredAmbient(pppAmbient, nil)})
	for i := range a.Steps {
		closeTo(t, "deviation", b.Steps[i].Deviation, a.Steps[i].Deviation, 1e-12)
	}
	ra, _ := a.AmbientRatio()
	rb, _ := b.AmbientRatio()
	closeTo(t, "Lamb/Lmin", rb.Value, ra.Value, 1e-12)
	closeTo(t, "Lamb/Lmin", ra.Value, 0.408/0.64, 1e-12)
}

// TestRefusals: nothing is computed while ambient light is open, or the series is no series.
func TestRefusals(t *testing.T) {
	rs := series(levels18(), pppLuminances)
	unstated := append([]readings.Reading(nil), rs...)
	unstated[3].Ambient = readings.Unstated
	broken := append([]readings.Reading(nil), rs...)
	broken[5].Luminance = photometry.CdM2(math.NaN())
	for name, in := range map[string]Input{
		"unstated flag":       {Bits: 8, Readings: unstated, Light: DarkRoom()},
		"excluded, no amount": {Bits: 8, Readings: rs, Light: AmbientInReadings()},
		"no top level":        {Bits: 8, Readings: rs[:17], Light: DarkRoom()},
		"wrong depth":         {Bits: 10, Readings: rs, Light: DarkRoom()},
		"no readings":         {Bits: 8, Light: DarkRoom()},
		"not a number":        {Bits: 8, Readings: broken, Light: DarkRoom()},
		"silly repeatability": {Bits: 8, Readings: rs, Light: DarkRoom(), Noise: Noise{Repeatability: 5}},
		"silly depth":         {Bits: 99, Readings: rs, Light: DarkRoom()},
	} {
		if r, err := Evaluate(in); err == nil {
			t.Errorf("%s: evaluated to %v", name, r.Points)
		}
	}
}

// TestDrift takes the change against the first reading of the level.
func TestDrift(t *testing.T) {
	rs := series(levels18(), pppLuminances)
	for _, l := range []photometry.CdM2{2.05, 1.99} {
		rs = append(rs, readings.Reading{Level: 15, Luminance: l, Role: readings.Drift, Ambient: readings.Excluded})
	}
	r := mustEvaluate(t, Input{Bits: 8, Readings: rs, Light: DarkRoom()})
	c, level, _, reason := r.Drift()
	if reason != "" || level != 15 {
		t.Fatal(level, reason)
	}
	closeTo(t, "drift", c, 1.99/2.03-1, 1e-12)
	plain := mustEvaluate(t, Input{Bits: 8, Readings: rs[:18], Light: DarkRoom()})
	for i := range plain.Steps {
		if plain.Steps[i] != r.Steps[i] {
			t.Fatal("a drift reading was averaged into its level")
		}
	}
}

// TestScaleInvariance: more bits and the same luminances give the same deviations. 65535 is 257
// times 255, so the levels fall on whole ones.
func TestScaleInvariance(t *testing.T) {
	lum := panel(t, rand.New(rand.NewPCG(3, 4)), levels18(), 0.5, 300, 0.09)
	wide := make([]int, 18)
	for i := range wide {
		wide[i] = levels18()[i] * 257
	}
	a := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), lum), Light: DarkRoom()})
	b := mustEvaluate(t, Input{Bits: 16, Readings: series(wide, lum), Light: DarkRoom()})
	for i := range a.Steps {
		closeTo(t, "deviation", b.Steps[i].Deviation, a.Steps[i].Deviation, 1e-12)
	}
}
