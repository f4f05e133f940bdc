package response

import (
	"math"
	"math/rand/v2"
	"testing"

	"evenstep/display/photometry"
	"evenstep/display/readings"
)

// The five luminances of DICOM PS3.17 Annex PPP at DDL 204, the third taken as the centre.
func annexPPPPlaces() []readings.Place {
	return []readings.Place{
		{Position: readings.TopLeft, Level: 204, Luminance: 191.5},
		{Position: readings.TopRight, Level: 204, Luminance: 176.1},
		{Position: readings.Centre, Level: 204, Luminance: 197.2},
		{Position: readings.BottomLeft, Level: 204, Luminance: 202.5},
		{Position: readings.BottomRight, Level: 204, Luminance: 195.8},
	}
}

// Figures worked by hand from the printed luminances; 5e-6 is half of the last digit given.
func TestUniformityAnnexPPP(t *testing.T) {
	for formula, want := range map[Formula]float64{
		MaximumDeviation: .13946, FromMedian: .10061, FromCentre: .10700, RangeOverCentre: .13387,
	} {
		e, err := Uniformity(annexPPPPlaces(), formula, Noise{Repeatability: .002})
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(e.Value-want) > 5e-6 {
			t.Errorf("%s: %.6f, want %.5f", formula, e.Value, want)
		}
		if !(e.Low < e.Value && e.Value < e.High) || e.Levels != 5 {
			t.Errorf("%s: interval [%v, %v] about %v of %d places", formula, e.Low, e.High, e.Value, e.Levels)
		}
		if lo, hi := e.With(16); !(lo > e.Low && hi < e.High) {
			t.Errorf("%s: sixteen readings a place leave [%v, %v]", formula, lo, hi)
		}
	}
}

// 400 and 370 cd/m2: a hand calculation.
func TestPairDenominators(t *testing.T) {
	for formula, want := range map[Formula]float64{OverLower: 30. / 370, OverMean: 30. / 385, OverHigher: 30. / 400} {
		for _, pair := range [][2]photometry.CdM2{{400, 370}, {370, 400}} {
			e, err := Pair(pair[0], pair[1], formula, Noise{Repeatability: .002})
			if err != nil {
				t.Fatal(err)
			}
			if math.Abs(e.Value-want) > 1e-12 { // rounding only
				t.Errorf("%s of %v: %v, want %v", formula, pair, e.Value, want)
			}
			if !(e.Low < e.Value && e.Value < e.High) {
				t.Errorf("%s: interval [%v, %v] about %v", formula, e.Low, e.High, e.Value)
			}
		}
	}
}

// The slopes behind the interval of a pair, against a simulation: 4000 draws put the standard
// deviation within 4 % with 3.5 sigma of its own.
func TestPairIntervalAgainstSimulation(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 11))
	n := Noise{Repeatability: .004, Floor: .01}
	for _, formula := range PairFormulas() {
		e, err := Pair(400, 370, formula, n)
		if err != nil {
			t.Fatal(err)
		}
		var sum, squares float64
		const draws = 4000
		for range draws {
			noisy := func(l float64) photometry.CdM2 {
				return photometry.CdM2(l + rng.NormFloat64()*math.Sqrt(n.variance(l)))
			}
			s, err := Pair(noisy(400), noisy(370), formula, n)
			if err != nil {
				t.Fatal(err)
			}
			sum += s.Value
			squares += s.Value * s.Value
		}
		sd := math.Sqrt(squares/draws - sum*sum/draws/draws)
		if got := (e.High - e.Low) / 2 / single(); math.Abs(got/sd-1) > .04 {
			t.Errorf("%s: standard uncertainty %v, simulated %v", formula, got, sd)
		}
	}
}

// The true greatest difference must lie in the interval in at least 93 % of simulated visits, as for
// the contrast deviation.
func TestUniformityCoverage(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 5))
	n := Noise{Repeatability: .005, Floor: .005}
	shapes := map[string][]float64{
		"flat":   {200, 200, 200, 200, 200},
		"tilted": {191.5, 176.1, 197.2, 202.5, 195.8},
	}
	for name, truth := range shapes {
		for _, formula := range UniformityFormulas() {
			at := annexPPPPlaces()
			for i := range at {
				at[i].Luminance = photometry.CdM2(truth[i])
			}
			exact, err := Uniformity(at, formula, Noise{})
			if err != nil {
				t.Fatal(err)
			}
			inside := 0
			const trials = 600
			for range trials {
				for i := range at {
					at[i].Luminance = photometry.CdM2(truth[i] + rng.NormFloat64()*math.Sqrt(n.variance(truth[i])))
				}
				e, err := Uniformity(at, formula, n)
				if err != nil {
					t.Fatal(err)
				}
				if e.Low <= exact.Value && exact.Value <= e.High {
					inside++
				}
			}
			if got := float64(inside) / trials; got < .93 {
				t.Errorf("%s, %s: true value inside in %.1f %%; expected at least 93 %%", name, formula, 100*got)
			}
		}
	}
}

func TestPlacesRefused(t *testing.T) {
	noCentre := annexPPPPlaces()
	noCentre[2].Position = readings.Top
	dark := annexPPPPlaces()
	for i := range dark {
		dark[i].Luminance = 0
	}
	bad := annexPPPPlaces()
	bad[0].Luminance = photometry.CdM2(math.NaN())
	for name, places := range map[string][]readings.Place{
		"one place": annexPPPPlaces()[:1], "no centre": noCentre, "dark": dark, "not a number": bad,
	} {
		for _, formula := range UniformityFormulas() {
			if e, err := Uniformity(places, formula, Noise{}); err == nil {
				t.Errorf("%s, %s: %v, expected an error", name, formula, e.Value)
			}
		}
	}
	if _, err := Uniformity(annexPPPPlaces(), "smoothness", Noise{}); err == nil {
		t.Error("an unknown formula was taken")
	}
	if _, err := Pair(400, 0, OverLower, Noise{}); err == nil {
		t.Error("a pair with a dark screen was taken")
	}
	if _, err := Pair(400, 380, "over the moon", Noise{}); err == nil {
		t.Error("an unknown denominator was taken")
	}
}

func TestColourSpread(t *testing.T) {
	places := annexPPPPlaces()
	if _, _, _, ok := ColourSpread(places); ok {
		t.Error("a distance without colours")
	}
	d65 := photometry.UV{U: .1978, V: .4683}
	moved := photometry.UV{U: .1978 + .003, V: .4683 + .004}
	places[0].Colour, places[2].Colour, places[4].Colour = &d65, &d65, &moved
	d, a, b, ok := ColourSpread(places)
	if !ok || math.Abs(d-.005) > 1e-12 || a != readings.TopLeft || b != readings.BottomRight {
		t.Errorf("distance %v between %q and %q", d, a, b)
	}
}
