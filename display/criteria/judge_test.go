package criteria

import (
	"math"
	"strings"
	"testing"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
)

// annexPPP is the example of DICOM PS3.17 Annex PPP: the luminance response printed in PPP.3.1 with
// level 165 where 160 is printed, and the five places at DDL 204, the third taken as the centre.
func annexPPP(t *testing.T, light response.Light) Visit {
	t.Helper()
	lum := []float64{0.64, 2.03, 4.17, 7.11, 11.12, 16.75, 24.07, 33.67, 46.24, 63.12, 83.94, 110.6, 144.9, 190.1, 246.3, 317.8, 406.4, 520.9}
	v := Visit{Response: evaluate(t, lum, light, response.Noise{Repeatability: .001, Floor: .001})}
	for i, p := range []readings.Position{readings.TopLeft, readings.TopRight, readings.Centre, readings.BottomLeft, readings.BottomRight} {
		v.Places = append(v.Places, readings.Place{Position: p, Level: 204, Luminance: []photometry.CdM2{191.5, 176.1, 197.2, 202.5, 195.8}[i]})
	}
	return v
}

func evaluate(t *testing.T, lum []float64, light response.Light, noise response.Noise) *response.Response {
	t.Helper()
	in := response.Input{Bits: 8, Scale: readings.DDL, Light: light, Noise: noise}
	for i, l := range lum {
		in.Readings = append(in.Readings, readings.Reading{
			Level: i * 255 / (len(lum) - 1), Luminance: photometry.CdM2(l), Role: readings.Series, Ambient: readings.Excluded,
		})
	}
	r, err := response.Evaluate(in)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// onCurve makes 18 readings without ambient light of a monitor whose L' lies on the standard function
// between lo and hi with ambient lamb in it, every step's end moved by ripple in turn.
func onCurve(t *testing.T, lo, hi, lamb, ripple float64) []float64 {
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
	for i := range 18 {
		l, err := gsdf.Luminance(j1 + (jn-j1)*gsdf.JND(i)/17)
		if err != nil {
			t.Fatal(err)
		}
		if i%2 == 1 && i < 17 {
			l *= photometry.CdM2(1 + ripple)
		}
		out = append(out, float64(l)-lamb)
	}
	return out
}

func use(t *testing.T, scheme, class string, site *SiteFile) *Used {
	t.Helper()
	s, err := Find(scheme)
	if err != nil {
		t.Fatal(err)
	}
	u, err := s.Use(class, site)
	if err != nil {
		t.Fatal(err)
	}
	return u
}

func finding(t *testing.T, a Assessment, quantity Quantity, formula string) Finding {
	t.Helper()
	for _, f := range a.Findings {
		if f.Quantity == string(quantity) && strings.Contains(f.Formula, formula) {
			return f
		}
	}
	t.Fatalf("no finding %s %q among %+v", quantity, formula, a.Findings)
	return Finding{}
}

// TestPublishedVisit judges the published example. The figures are those of the worked example:
// 8.14 % with ambient light, ratio 497.4, uniformity 13.946 and 10.700 %; tolerances are half of the
// last digit given.
func TestPublishedVisit(t *testing.T) {
	v := annexPPP(t, response.MeasuredAmbient(.408, nil))
	a := Assess(v, use(t, "nyc-2016", "primary-diagnostic", nil))
	within := func(what string, got, want, tolerance float64) {
		t.Helper()
		if math.IsNaN(got) || math.Abs(got-want) > tolerance {
			t.Errorf("%s: %v, want %v", what, got, want)
		}
	}
	within("greatest deviation", *a.MaxDeviation, .0814, 5e-5)
	within("JND-step variant", *a.JNDStep.MaxDeviation, .1056, 5e-5)
	within("ratio", *a.LuminanceRatio, 497.4, .05)
	for _, u := range a.Uniformity {
		want := map[string]float64{
			string(response.MaximumDeviation): .13946, string(response.FromMedian): .10061,
			string(response.FromCentre): .10700, string(response.RangeOverCentre): .13387,
		}[u.Formula]
		within(u.Formula, u.Value, want, 5e-6)
		if *u.Level != 204 || u.Places != 5 {
			t.Errorf("%s at level %v of %d places", u.Formula, *u.Level, u.Places)
		}
	}
	if len(a.Uniformity) != 4 {
		t.Errorf("%d formulas of uniformity, want 4", len(a.Uniformity))
	}
	ratio := finding(t, a, LuminanceRatio, "L'max/L'min")
	within("ratio judged", ratio.Value, 497.4, .05)
	// The basis is open in that scheme: without ambient light the ratio is 813.9.
	if ratio.Verdict != Meets || !strings.Contains(ratio.Note, "without ambient light: 813.9") {
		t.Errorf("ratio: %s, note %q", ratio.Verdict, ratio.Note)
	}
	within("uniformity judged", finding(t, a, Uniformity, "maximum luminance deviation").Value, .13946, 5e-6)
	within("uniformity judged", finding(t, a, Uniformity, "deviation from centre").Value, .10700, 5e-6)
	if a.Verdict != Meets {
		t.Errorf("verdict %q", a.Verdict)
	}

	dark := Assess(annexPPP(t, response.DarkRoom()), use(t, "acr-aapm-siim-2012", "diagnostic", nil))
	within("greatest deviation without ambient light", *dark.MaxDeviation, .1996, 5e-5)
	if f := finding(t, dark, ContrastDeviation, ""); f.Verdict != Fails || f.Levels != 18 || f.Provisional {
		t.Errorf("without ambient light: %+v", f)
	}
	if dark.Verdict != Fails {
		t.Errorf("verdict %q", dark.Verdict)
	}
}

func TestStates(t *testing.T) {
	high := 450.
	for _, c := range []struct {
		comparison       string
		limit            float64
		limitHigh        *float64
		value, low, high float64
		want             Verdict
	}{
		{">=", 100, nil, 110, 101, 119, Meets},
		{">=", 100, nil, 100, 100, 100, Meets},
		{">", 100, nil, 100, 100, 100, Fails},
		{">=", 100, nil, 105, 95, 115, MeetsUncertainly},
		{">=", 100, nil, 99, 95, 103, FailsUncertainly},
		{">=", 100, nil, 90, 85, 99.9, Fails},
		{"<=", .1, nil, .05, .04, .06, Meets},
		{"<=", .1, nil, .1, .1, .1, Meets},
		{"<", .1, nil, .1, .1, .1, Fails},
		{"<=", .1, nil, .09, .07, .11, MeetsUncertainly},
		{"<=", .1, nil, .11, .09, .13, FailsUncertainly},
		{"<=", .1, nil, .2, .15, .25, Fails},
		{"within", 250, &high, 350, 300, 400, Meets},
		{"within", 250, &high, 260, 240, 280, MeetsUncertainly},
		{"within", 250, &high, 470, 440, 500, FailsUncertainly},
		{"about", 250, &high, 200, 180, 220, Fails},
		{"within", 250, &high, 600, 500, 700, Fails},
	} {
		l := Limit{Comparison: c.comparison, Limit: c.limit, LimitHigh: c.limitHigh}
		if got := l.against(c.value, c.low, c.high); got != c.want {
			t.Errorf("%v [%v, %v] %s %v: %s, want %s", c.value, c.low, c.high, c.comparison, c.limit, got, c.want)
		}
	}
}

// TestWordOfTheSite: a limit from memory decides nothing until the site has confirmed it.
func TestWordOfTheSite(t *testing.T) {
	lum := onCurve(t, 1, 300, 0, 0) // too dark for 350
	v := Visit{Response: evaluate(t, lum, response.DarkRoom(), response.Noise{Repeatability: .001, Floor: .001})}
	before := Assess(v, use(t, "tg270-2019", "diagnostic", nil))
	f := finding(t, before, LuminanceMax, "")
	if f.Verdict != NotAssessed || f.Against != Fails || !strings.Contains(f.Note, "limit not confirmed") {
		t.Errorf("before: %+v", f)
	}
	if before.Verdict != Meets { // the ambient ratio decides and is 0 in a dark room
		t.Errorf("verdict before: %q", before.Verdict)
	}
	listed := false
	for _, n := range before.NotAssessed {
		listed = listed || n.Quantity == string(LuminanceMax) && strings.Contains(n.Reason, "not confirmed")
	}
	if !listed {
		t.Errorf("not listed as not assessed: %+v", before.NotAssessed)
	}
	site, err := ParseSite("site.toml", []byte(goodSite))
	if err != nil {
		t.Fatal(err)
	}
	after := Assess(v, use(t, "tg270-2019", "diagnostic", site))
	if f := finding(t, after, LuminanceMax, ""); f.Verdict != Fails || f.Confirmed == nil {
		t.Errorf("after: %+v", f)
	}
	if after.Verdict != Fails {
		t.Errorf("verdict after: %q", after.Verdict)
	}
}

func TestUnsureNeverDecides(t *testing.T) {
	lum := onCurve(t, 1, 50, 0, 0)
	v := Visit{Response: evaluate(t, lum, response.DarkRoom(), response.Noise{})}
	a := Assess(v, use(t, "ipem-91-2005", "reporting", nil))
	if a.Verdict != NotAssessed || len(a.Findings) == 0 {
		t.Errorf("verdict %q from %+v", a.Verdict, a.Findings)
	}
	for _, f := range a.Findings {
		if f.Verdict != NotAssessed {
			t.Errorf("%s decides: %s", f.Quantity, f.Verdict)
		}
	}
}

func TestFewLevelsAreProvisional(t *testing.T) {
	lum := onCurve(t, 1, 400, 0, 0)
	var eleven []float64
	j1, _ := gsdf.Index(1)
	jn, _ := gsdf.Index(400)
	for i := range 11 {
		// the levels i*255/10 are rounded down, so the aims follow them
		l, err := gsdf.Luminance(j1 + (jn-j1)*gsdf.JND(i*255/10)/255)
		if err != nil {
			t.Fatal(err)
		}
		eleven = append(eleven, float64(l))
	}
	noise := response.Noise{Repeatability: .001, Floor: .001}
	for _, c := range []struct {
		lum         []float64
		levels      int
		provisional bool
	}{{lum, 18, false}, {eleven, 11, true}} {
		v := Visit{Response: evaluate(t, c.lum, response.DarkRoom(), noise)}
		f := finding(t, Assess(v, use(t, "acr-aapm-siim-2012", "diagnostic", nil)), ContrastDeviation, "")
		if f.Levels != c.levels || f.Provisional != c.provisional || (f.ProvisionalReason != "") != c.provisional {
			t.Errorf("%d levels: %+v", c.levels, f)
		}
	}
}

// TestTwoLevelsSayNothing: a curve through two levels deviates by 0 whatever the monitor.
func TestTwoLevelsSayNothing(t *testing.T) {
	v := Visit{Response: evaluate(t, []float64{1, 400}, response.DarkRoom(), response.Noise{})}
	a := Assess(v, use(t, "acr-aapm-siim-2012", "diagnostic", nil))
	for _, f := range a.Findings {
		if f.Quantity == string(ContrastDeviation) {
			t.Errorf("judged: %+v", f)
		}
	}
}

// TestRepeatsSettle: the number asked for settles every finding that is open, one fewer does not.
func TestRepeatsSettle(t *testing.T) {
	lum := onCurve(t, 1, 420, 0, .013)
	noise := response.Noise{Repeatability: .004, Floor: .002}
	v := Visit{Response: evaluate(t, lum, response.DarkRoom(), noise)}
	used := use(t, "acr-aapm-siim-2012", "diagnostic", nil)
	a := Assess(v, used)
	f := finding(t, a, ContrastDeviation, "")
	if f.Verdict != MeetsUncertainly && f.Verdict != FailsUncertainly {
		t.Fatalf("the case is not open: %+v", f)
	}
	if a.RepeatsNeeded == nil || *a.RepeatsNeeded < 2 {
		t.Fatalf("repeats %v, reason %q", a.RepeatsNeeded, a.RepeatsNeededReason)
	}
	e, _, _ := v.Response.GreatestDeviation()
	state := func(n int) Verdict {
		low, high := e.With(n)
		for _, l := range used.Limits {
			if l.Quantity == ContrastDeviation {
				return l.against(e.Value, low, high)
			}
		}
		return ""
	}
	if s := state(*a.RepeatsNeeded); s != Meets && s != Fails {
		t.Errorf("%d readings a level leave %s", *a.RepeatsNeeded, s)
	}
	if s := state(*a.RepeatsNeeded - 1); s == Meets || s == Fails {
		t.Errorf("%d readings a level would do: %s", *a.RepeatsNeeded-1, s)
	}

	near := Visit{Response: evaluate(t, onCurve(t, 1, 350.01, 0, 0), response.DarkRoom(), response.Noise{Repeatability: .001, Gain: .03})}
	if a := Assess(near, used); a.RepeatsNeeded != nil || !strings.Contains(a.RepeatsNeededReason, "luminance_max") {
		t.Errorf("a meter's common factor cannot be repeated away: %v, %q", a.RepeatsNeeded, a.RepeatsNeededReason)
	}
	sure := Visit{Response: evaluate(t, onCurve(t, 1, 450, 0, 0), response.DarkRoom(), response.Noise{Repeatability: .0005})}
	if a := Assess(sure, used); a.RepeatsNeeded == nil || *a.RepeatsNeeded != 0 {
		t.Errorf("nothing is open: %v, %q", a.RepeatsNeeded, a.RepeatsNeededReason)
	}
}

// TestRoomRange: just inside the ends every limit holds, just outside the one that binds does not.
func TestRoomRange(t *testing.T) {
	used := use(t, "din-6868-157-2014", "dental-rk5", nil)
	acr := use(t, "acr-aapm-siim-2012", "diagnostic", nil)
	lux := photometry.Lux(40)
	rd := photometry.PerLux(.005)
	// A table made for 0.5 cd/m2 of ambient light: too dark a room is as wrong as too bright a one.
	bright := evaluate(t, onCurve(t, 1.5, 420, .5, 0), response.FromIlluminance(100, &rd), response.Noise{Repeatability: .001})
	for _, c := range []struct {
		name                string
		v                   Visit
		used                *Used
		lowBinds, highBinds Quantity
	}{
		{"room class binds", Visit{Response: evaluate(t, onCurve(t, 1, 420, .2, 0), response.FromIlluminance(lux, &rd), response.Noise{})}, used, "", RoomIlluminance},
		{"made for more light", Visit{Response: bright}, acr, ContrastDeviation, AmbientRatio},
	} {
		t.Run(c.name, func(t *testing.T) {
			a := Assess(c.v, c.used)
			r := a.IlluminanceRange
			if r.Reason != "" || r.Low == nil || r.High == nil || r.LowBinds != string(c.lowBinds) || r.HighBinds != string(c.highBinds) {
				t.Fatalf("range %+v", r)
			}
			holds := func(e float64, q Quantity) bool {
				at, ok := c.v.Response.AtIlluminance(photometry.Lux(e), rd)
				if !ok {
					t.Fatal("what the monitor emits is not known")
				}
				for _, l := range c.used.Limits {
					if l.Quantity == q && l.Advisory == "" {
						f := Visit{Response: at}.figureOf(l)
						return f.reason == "" && l.holds(f.Value)
					}
				}
				t.Fatalf("no limit %s", q)
				return false
			}
			if !holds(*r.High*.999, c.highBinds) || holds(*r.High*1.001, c.highBinds) {
				t.Errorf("the upper end %v lx is none of %s", *r.High, c.highBinds)
			}
			if c.lowBinds != "" && (!holds(*r.Low*1.001, c.lowBinds) || holds(*r.Low*.999, c.lowBinds)) {
				t.Errorf("the lower end %v lx is none of %s", *r.Low, c.lowBinds)
			}
			if c.lowBinds == "" && *r.Low != 0 {
				t.Errorf("lower end %v lx, nothing binds", *r.Low)
			}
		})
	}
}

func TestRoomRangeReasons(t *testing.T) {
	acr := use(t, "acr-aapm-siim-2012", "diagnostic", nil)
	good := onCurve(t, 1.2, 420, .12, 0)
	inside := response.Input{Bits: 8, Light: response.AmbientInReadings()}
	for i, l := range good {
		inside.Readings = append(inside.Readings, readings.Reading{Level: 15 * i, Luminance: photometry.CdM2(l), Role: readings.Series, Ambient: readings.Included})
	}
	r, err := response.Evaluate(inside)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name string
		v    Visit
		used *Used
		want string
	}{
		{"no scheme", Visit{Response: r}, nil, "no scheme"},
		{"unknown ambient", Visit{Response: r}, acr, "unknown amount"},
		{"too dark a monitor", Visit{Response: evaluate(t, onCurve(t, 1, 200, 0, 0), response.DarkRoom(), response.Noise{})}, acr, "in no room light"},
		{"only advice", Visit{Response: r}, use(t, "iaea-hhs17-2011", "mammography", nil), "no limit of this class"},
	} {
		if got := Assess(c.v, c.used).IlluminanceRange; !strings.Contains(got.Reason, c.want) || got.Low != nil || got.High != nil {
			t.Errorf("%s: %+v, want reason with %q", c.name, got, c.want)
		}
	}
	// Rd is not known in a dark room: the default stands in, marked.
	dark := Assess(Visit{Response: evaluate(t, good, response.DarkRoom(), response.Noise{})}, acr).IlluminanceRange
	if !dark.RdAssumed || *dark.Rd != float64(response.RdDefault) {
		t.Errorf("a dark room: %+v", dark)
	}
}

func TestPairAndColour(t *testing.T) {
	lmax := photometry.CdM2(370)
	white := photometry.UV{U: .1978, V: .4683}
	off := photometry.UV{U: .1978, V: .4883}
	v := Visit{
		Response:  evaluate(t, onCurve(t, 1, 400, 0, 0), response.DarkRoom(), response.Noise{Repeatability: .001}),
		Neighbour: &Neighbour{LuminanceMax: &lmax, White: &off, OwnWhite: &white},
	}
	site, err := ParseSite("s", []byte("site=\"a\"\n[[confirm]]\nscheme=\"tg18-2005\"\nclass=\"primary\"\nquantity=\"pair_match\"\nformula=\"over the lower\"\nlimit=0.1\ndocument=\"d\"\npage=\"1\"\nperson=\"p\"\ndate=2026-01-01\n"))
	if err != nil {
		t.Fatal(err)
	}
	a := Assess(v, use(t, "tg18-2005", "primary", site))
	pair := finding(t, a, PairMatch, "over the lower")
	if math.Abs(pair.Value-30./370) > 1e-9 || pair.Verdict != Meets { // the reading is exact to rounding of the inverse
		t.Errorf("pair: %+v", pair)
	}
	if c := finding(t, a, ColourMatch, ""); math.Abs(c.Value-.02) > 1e-12 || c.Against != Fails {
		t.Errorf("colour: %+v", c)
	}
	if len(a.PairMatch) != 3 || a.ColourMatch == nil {
		t.Errorf("figures of the pair: %+v, %v", a.PairMatch, a.ColourMatch)
	}
}

// TestWithoutScheme judges nothing but has the figures.
func TestWithoutScheme(t *testing.T) {
	a := Assess(annexPPP(t, response.DarkRoom()), nil)
	if a.Verdict != NotAssessed || len(a.Findings) != 0 || a.MaxDeviation == nil || len(a.Steps) != 17 {
		t.Errorf("%+v", a)
	}
}

// TestBlackOfZero: without ambient light the function does not know the black; the rest is judged.
func TestBlackOfZero(t *testing.T) {
	lum := onCurve(t, 1, 400, 0, 0)
	lum[0] = 0
	a := Assess(Visit{Response: evaluate(t, lum, response.DarkRoom(), response.Noise{})}, use(t, "acr-aapm-siim-2012", "diagnostic", nil))
	if a.MaxDeviation != nil || a.MaxDeviationReason == "" || a.JNDMin != nil || a.LuminanceRatio != nil || a.LuminanceRatioReason == "" {
		t.Errorf("%+v", a)
	}
	if f := finding(t, a, LuminanceMax, ""); f.Verdict != Meets {
		t.Errorf("L'max is not judged: %+v", f)
	}
	listed := false
	for _, n := range a.NotAssessed {
		listed = listed || n.Quantity == string(ContrastDeviation)
	}
	if !listed {
		t.Error("the contrast deviation is not listed as not assessed")
	}
}
