package report

import (
	"math"
	"strings"
	"testing"

	"evenstep/display/criteria"
	"evenstep/display/gsdf"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/record"
	"evenstep/display/response"
)

// The records here are invented: no such monitor, meter, person or scheme exists.

// sampleReadings are 18 levels of a monitor from 0.5 to 420 cd/m2 that follows the standard
// function but for a bow of a stated size in its lower half, so that steps deviate to both sides.
func sampleReadings(t testing.TB, ambient, bow float64) []readings.Reading {
	t.Helper()
	index := func(l float64) float64 {
		j, err := gsdf.Index(photometry.CdM2(l))
		if err != nil {
			t.Fatal(err)
		}
		return float64(j)
	}
	lo, hi := index(0.5+ambient), index(420+ambient)
	var out []readings.Reading
	for i := range 18 {
		x := float64(i) / 17
		j := lo + (hi-lo)*(x+bow*math.Sin(3*math.Pi*x)/(3*math.Pi))
		l, err := gsdf.Luminance(gsdf.JND(j))
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, readings.Reading{
			Level: i * 15, Luminance: l - photometry.CdM2(ambient), Role: readings.Series, Ambient: readings.Excluded,
		})
	}
	return out
}

func ptr[T any](v T) *T { return &v }

// sampleAssessment fills what readings alone give, by package response.
func sampleAssessment(t testing.TB, in []readings.Reading, light response.Light) criteria.Assessment {
	t.Helper()
	noise := response.Noise{Repeatability: response.RepeatabilityDefault, Floor: response.FloorDefault, Assumed: true}
	r, err := response.Evaluate(response.Input{Bits: 8, Scale: readings.DDL, Readings: in, Light: light, Noise: noise})
	if err != nil {
		t.Fatal(err)
	}
	a := criteria.Assessment{
		Scale: "ddl", Bits: 8, AmbientSource: string(light.Source), RdAssumed: light.RdAssumed,
		LuminanceMin: r.LuminanceMin().Value, LuminanceMax: r.LuminanceMax().Value,
		Noise:   criteria.NoiseFigure{Repeatability: noise.Repeatability, FloorCdM2: float64(noise.Floor), Assumed: true},
		Verdict: criteria.NotAssessed,
	}
	if light.Ambient != nil {
		a.Ambient = ptr(float64(*light.Ambient))
	}
	if light.Illuminance != nil {
		a.Illuminance = ptr(float64(*light.Illuminance))
	}
	if light.Rd != nil {
		a.Rd = ptr(float64(*light.Rd))
	}
	if ratio, reason := r.Ratio(); reason == "" {
		a.LuminanceRatio = &ratio.Value
	} else {
		a.LuminanceRatioReason = reason
	}
	a.JNDReason, a.MaxDeviationReason = r.Undefined, r.Undefined
	for _, s := range r.Steps {
		a.Steps = append(a.Steps, criteria.StepFigure{
			FromLevel: s.FromLevel, ToLevel: s.ToLevel, JNDFrom: float64(s.JNDFrom), JNDTo: float64(s.JNDTo),
			ContrastPerJND: s.ContrastPerJND, Expected: s.Expected, Deviation: s.Deviation,
			DeviationInterval: criteria.Interval{s.Low, s.High},
		})
	}
	if n := len(a.Steps); n > 0 {
		a.JNDMin, a.JNDMax = &a.Steps[0].JNDFrom, &a.Steps[n-1].JNDTo
	}
	if e, worst, ok := r.GreatestDeviation(); ok {
		a.MaxDeviation, a.MaxDeviationInterval = &e.Value, &criteria.Interval{e.Low, e.High}
		a.MaxDeviationFromLevel, a.MaxDeviationToLevel = &worst.FromLevel, &worst.ToLevel
	}
	a.JNDStep.Reason, a.AnnexC.Reason = "not in this sample", "not in this sample"
	a.DriftReason = "no drift reading was taken"
	a.RepeatsNeeded = ptr(12)
	return a
}

// sampleRecord is the usual record: five findings, one of which does not decide.
func sampleRecord(t testing.TB) *record.Record {
	t.Helper()
	return recordOf(t, sampleReadings(t, 0.11, 0.06), response.MeasuredAmbient(0.11, ptr(photometry.Lux(22))))
}

func recordOf(t testing.TB, in []readings.Reading, light response.Light) *record.Record {
	t.Helper()
	a := sampleAssessment(t, in, light)
	a.Scheme, a.Edition, a.Class = "example-a", "2021", "diagnostic"
	a.Formula = "contrast per JND against PS3.14, JND index from the levels"
	a.Verdict = criteria.MeetsUncertainly
	dev := 0.058
	if a.MaxDeviation != nil {
		dev = *a.MaxDeviation
	}
	a.Findings = []criteria.Finding{
		{
			Quantity: "luminance_max", Value: a.LuminanceMax, Interval: criteria.Interval{a.LuminanceMax * 0.99, a.LuminanceMax * 1.01},
			Comparison: ">=", Limit: 350, Unit: "cd/m2", Formula: "L'max, ambient light included", Levels: 1,
			Source: "section 4.1; the scheme's table", Confidence: "read", Verdict: criteria.Meets, Against: criteria.Meets,
		},
		{
			Quantity: "luminance_ratio", Value: 689, Interval: criteria.Interval{671, 707},
			Comparison: ">=", Limit: 250, Unit: "1", Formula: "L'max/L'min, ambient light included", Levels: 2,
			Source: "section 4.2; the scheme's table", Confidence: "read", Verdict: criteria.Meets, Against: criteria.Meets,
		},
		{
			Quantity: "contrast_deviation", Value: dev, Interval: criteria.Interval{dev - 0.018, dev + 0.047},
			Comparison: "<=", Limit: 0.1, Unit: "1", Formula: a.Formula, Levels: 18,
			Source: "section 4.4; restated in a public guide", Confidence: "second-hand",
			Verdict: criteria.MeetsUncertainly, Against: criteria.MeetsUncertainly,
		},
		{
			Quantity: "ambient_ratio", Value: 0.22, Interval: criteria.Interval{0.19, 0.25},
			Comparison: "<", Limit: 0.25, Unit: "1", Formula: "Lamb/Lmin", Levels: 1,
			Source: "section 3.2", Confidence: "read", Verdict: criteria.Meets, Against: criteria.Meets,
		},
		{
			Quantity: "colour_match", Value: 0.0042, Interval: criteria.Interval{0.0042, 0.0042},
			Comparison: "<=", Limit: 0.01, Unit: "u'v'", Formula: "u'v' distance between the two screens", Levels: 2,
			Source: "chapter 2; no document read", Confidence: "from memory", Verdict: criteria.NotAssessed, Against: criteria.Meets,
			Note: "limit not confirmed (from memory): it decides once the site has confirmed it",
		},
	}
	a.NotAssessed = []criteria.Unassessed{{Quantity: "uniformity", Reason: "no places were measured"}}
	a.IlluminanceRange = criteria.LuxRange{
		Low: ptr(2.4), LowBinds: "contrast_deviation", High: ptr(61.0), HighBinds: "ambient_ratio", Rd: ptr(0.005),
	}
	r := &record.Record{
		Schema: record.Schema, Version: record.Version, Program: "evenstep 0.1.0",
		Visit:   record.Visit{Kind: "constancy", Time: "2024-05-17T09:30:00+02:00"},
		Monitor: record.Monitor{Serial: "EX-20417", Name: "reading room 2, left", Ramp: "identity"},
		Persons: []record.Person{{ID: "p-007", Part: "measured"}, {ID: "p-002", Part: "reviewed"}},
		Meter:   record.Meter{ID: "meter-3", CalibratedOn: "2023-11-02"},
		File:    &record.SourceFile{Name: "left-screen.csv", SHA256: strings.Repeat("0", 64), Unit: "cd/m2"},
		Scheme: &criteria.Used{
			ID: "example-a", Name: "Example scheme A", Edition: "2021", Class: "diagnostic",
		},
		Assessment: a,
		SHA256:     "3f7a91c204be5d68a1f09b7723c45e8810d2aa64f5b91c3e7786240fde5513ab",
	}
	for _, rd := range in {
		r.Readings = append(r.Readings, record.Reading{
			Level: rd.Level, Luminance: float64(rd.Luminance), Role: string(rd.Role), AmbientIncluded: rd.Ambient == readings.Included,
		})
	}
	return r
}

const longName = "Überlandkrankenhaus-Befundarbeitsplatz-Łódź-Ωμέγα-ЖЩ-0001-with-a-serial-that-does-not-end-0123456789-0123456789"

// stressRecord has 16 findings with long notes, causes, places, and every text longer than usual.
func stressRecord(t testing.TB) *record.Record {
	t.Helper()
	r := recordOf(t, sampleReadings(t, 0.11, 0.16), response.FromIlluminance(22, nil))
	a := &r.Assessment
	a.Verdict = criteria.Fails
	quantities := []string{
		"luminance_max", "luminance_min", "luminance_ratio", "luminance_ratio_aim", "contrast_deviation", "contrast_deviation",
		"uniformity", "uniformity", "pair_match", "colour_uniformity", "colour_match", "ambient_ratio", "room_illuminance",
		"luminance_max", "luminance_ratio", "pair_match",
	}
	units := map[string]string{
		"luminance_max": "cd/m2", "luminance_min": "cd/m2", "room_illuminance": "lx",
		"colour_uniformity": "u'v'", "colour_match": "u'v'",
	}
	verdicts := []criteria.Verdict{criteria.Fails, criteria.FailsUncertainly, criteria.MeetsUncertainly, criteria.NotAssessed, criteria.Meets}
	a.Findings = nil
	for i, q := range quantities {
		unit := units[q]
		if unit == "" {
			unit = "1"
		}
		f := criteria.Finding{
			Quantity: q, Value: 0.1234, Interval: criteria.Interval{0.0987, 0.1482}, Comparison: "<=", Limit: 0.1, Unit: unit,
			Formula: "maximum luminance deviation", Levels: 18, Verdict: verdicts[i%len(verdicts)], Against: criteria.Fails,
			Source:     "section 7.4.2, table 12; a restatement in the annual guide of an example society",
			Confidence: "from memory", Provisional: i%4 == 1, ProvisionalReason: "11 levels; the limit was made for 18",
			Note: "without ambient light: 0.0998, which would turn the verdict; limit not confirmed (from memory): it decides once the site has confirmed it",
		}
		if strings.HasPrefix(q, "luminance") {
			f.Value, f.Interval, f.Comparison, f.Limit = 349.98, criteria.Interval{341.2, 358.8}, ">=", 350
		}
		if q == "luminance_ratio_aim" {
			f.Comparison, f.Limit, f.LimitHigh = "about", 250, ptr(450.0)
		}
		if i == 12 {
			f.Override = &criteria.Override{Limit: 50, Comparison: "<=", Reason: "the rooms are darker than the scheme asks", Name: "p-002", Date: "2024-01-09"}
			f.Confidence = "site"
		}
		if i == 13 {
			f.Confirmed = &criteria.Confirmation{Document: "Example scheme A, 2021", Page: "14", Person: "p-002", Date: "2024-01-09"}
		}
		a.Findings = append(a.Findings, f)
	}
	a.NotAssessed = append(a.NotAssessed,
		criteria.Unassessed{Quantity: "pair_match", Reason: "the other screen of the pair was not measured"},
		criteria.Unassessed{Quantity: "colour_match", Reason: "the colour of the other screen was not measured"})
	a.Causes = []response.Cause{
		{
			Causes:   []string{response.CauseAmbientLeftOut, response.CauseOtherRoomLight},
			Evidence: "with 0.11 cd/m2 taken from every level the greatest deviation falls from 16.2 % to 2.1 %",
			Advice:   "measure the ambient luminance with the display off and state it; then judge again",
		},
		{
			Causes: []string{response.CauseDrift}, Evidence: "level 255 fell by 2.4 % from the first to the last reading",
			Advice: "let the monitor warm up for 30 minutes and measure again",
		},
	}
	a.RepeatsNeeded, a.RepeatsNeededReason = nil, "luminance_max would stay open with 64 readings a level: the value is too near its limit, or what is uncertain is the meter or the room light"
	a.Drift, a.DriftReason = ptr(-0.024), ""
	a.IlluminanceRange = criteria.LuxRange{High: ptr(48.0), HighBinds: "luminance_ratio", HighUnconfirmed: true, Rd: ptr(0.005), RdAssumed: true, Low: ptr(0.0)}
	for level, l := range map[int]float64{26: 9.8, 204: 196} {
		a.Uniformity = append(a.Uniformity, criteria.PlacesFigure{Formula: "maximum luminance deviation", Level: ptr(level), Places: 9, Value: l / 1000})
	}
	a.Uniformity = a.Uniformity[:1]
	*a.Uniformity[0].Level = 204
	a.Uniformity[0].Value = 0.112
	for _, level := range []int{26, 204} {
		for i, p := range positions {
			l := float64(level)*0.96 - float64(i%5)*float64(level)*0.021
			r.Places = append(r.Places, record.Place{Position: p, Level: level, Luminance: l})
		}
	}
	r.Monitor.Serial, r.Monitor.Name = longName, strings.ReplaceAll(longName, "-", " ")
	r.Meter.ID, r.Meter.CalibratedOn = longName, ""
	r.Persons = append(r.Persons, record.Person{ID: longName, Part: "reviewed"})
	r.Visit.Notes = strings.TrimSpace(strings.Repeat("The blind was half closed; the corridor door stood open for the last third of the series. ", 7)) + " 検査室 and a\u202eturned name."
	r.Scheme.Name = "Example scheme with a long name, as national bodies like to give them, part 157: displays in reading rooms"
	r.Scheme.Site = &criteria.SiteID{Site: "example site", File: "site-limits.toml", SHA256: strings.Repeat("1", 64)}
	return r
}

// darkRecord is a visit whose black reads 0 in a dark room: no steps.
func darkRecord(t testing.TB) *record.Record {
	t.Helper()
	in := sampleReadings(t, 0, 0)
	in[0].Luminance = 0
	r := recordOf(t, in, response.DarkRoom())
	r.Scheme, r.SHA256, r.File = nil, "", nil
	r.Assessment.Findings, r.Assessment.NotAssessed, r.Assessment.Verdict = nil, nil, ""
	r.Assessment.IlluminanceRange = criteria.LuxRange{Reason: "no scheme was asked for"}
	r.Assessment.LuminanceRatio = nil
	r.Assessment.LuminanceRatioReason = "L'min reads 0: the ratio has no bound"
	r.Monitor, r.Persons, r.Meter = record.Monitor{}, nil, record.Meter{}
	return r
}

func samples(t testing.TB) map[string]*record.Record {
	return map[string]*record.Record{"usual": sampleRecord(t), "stress": stressRecord(t), "dark": darkRecord(t)}
}
