package report

import (
	"math"
	"slices"
	"strings"
	"testing"

	"evenstep/display/criteria"
)

func TestFindingInWords(t *testing.T) {
	for _, c := range []struct {
		name                             string
		f                                criteria.Finding
		quantity, value, interval, limit string
	}{
		{
			"luminance",
			criteria.Finding{Quantity: "luminance_max", Value: 412.34, Interval: criteria.Interval{408.2, 416.4}, Comparison: ">=", Limit: 350, Unit: "cd/m2"},
			"maximum luminance L'max", "412.3 cd/m²", "408.2 to 416.4 cd/m²", "≥ 350 cd/m²",
		},
		{
			"dark luminance",
			criteria.Finding{Quantity: "luminance_min", Value: 0.8512, Interval: criteria.Interval{0.8, 0.9}, Comparison: "<=", Limit: 1.5, Unit: "cd/m2"},
			"minimum luminance L'min", "0.851 cd/m²", "0.800 to 0.900 cd/m²", "≤ 1.5 cd/m²",
		},
		{
			"so near the limit that rounding would hide it",
			criteria.Finding{Quantity: "luminance_max", Value: 349.998, Interval: criteria.Interval{349, 351}, Comparison: ">=", Limit: 350, Unit: "cd/m2"},
			"maximum luminance L'max", "349.998 cd/m²", "349.000 to 351.000 cd/m²", "≥ 350 cd/m²",
		},
		{
			"on the limit",
			criteria.Finding{Quantity: "luminance_max", Value: 350, Interval: criteria.Interval{349, 351}, Comparison: ">", Limit: 350, Unit: "cd/m2"},
			"maximum luminance L'max", "350.0 cd/m²", "349.0 to 351.0 cd/m²", "> 350 cd/m²",
		},
		{
			"deviation in per cent",
			criteria.Finding{Quantity: "contrast_deviation", Value: 0.0984, Interval: criteria.Interval{0.081, 0.112}, Comparison: "<=", Limit: 0.1, Unit: "1"},
			"greatest contrast deviation", "9.8 %", "8.1 to 11.2 %", "≤ 10 %",
		},
		{
			"limit that is no whole per cent in binary",
			criteria.Finding{Quantity: "uniformity", Value: 0.5, Interval: criteria.Interval{0.4, 0.6}, Comparison: "<", Limit: 0.07, Unit: "1"},
			"luminance uniformity", "50.0 %", "40.0 to 60.0 %", "< 7 %",
		},
		{
			"ratio",
			criteria.Finding{Quantity: "luminance_ratio", Value: 412.7, Interval: criteria.Interval{400, 425}, Comparison: ">=", Limit: 250, Unit: "1"},
			"luminance ratio L'max/L'min", "412.7", "400.0 to 425.0", "≥ 250",
		},
		{
			"about",
			criteria.Finding{Quantity: "luminance_ratio_aim", Value: 350, Interval: criteria.Interval{340, 360}, Comparison: "about", Limit: 250, LimitHigh: ptr(450.0), Unit: "1"},
			"luminance ratio, aim L'max/L'min", "350.0", "340.0 to 360.0", "about 250 to 450",
		},
		{
			"within, near its high end, without bound above",
			criteria.Finding{Quantity: "room_illuminance", Value: 50.01, Interval: criteria.Interval{46, math.MaxFloat64}, Comparison: "within", Limit: 25, LimitHigh: ptr(50.0), Unit: "lx"},
			"room illuminance", "50.01 lx", "46.00 lx or more", "25 to 50 lx",
		},
		{
			"colour",
			criteria.Finding{Quantity: "colour_match", Value: 0.0042, Interval: criteria.Interval{0.0042, 0.0042}, Comparison: "<=", Limit: 0.005, Unit: "u'v'"},
			"colour match of the pair Δu'v'", "0.0042", "not stated", "≤ 0.005",
		},
		{
			"negative",
			criteria.Finding{Quantity: "pair_match", Value: -0.031, Interval: criteria.Interval{-0.05, -0.01}, Comparison: "<=", Limit: 0.1, Unit: "1"},
			"luminance match of the pair", "−3.1 %", "−5.0 to −1.0 %", "≤ 10 %",
		},
		{
			"what is not known",
			criteria.Finding{Quantity: "veiling_glare", Value: 3e9, Interval: criteria.Interval{1e-9, math.NaN()}, Comparison: "<=", Limit: math.Inf(1), Unit: "px"},
			"veiling glare", "3e+09 px", "0.0 to – px", "≤ – px",
		},
	} {
		t.Run(c.name, func(t *testing.T) {
			got := []string{Quantity(c.f), Value(c.f), Interval(c.f), Limit(c.f)}
			if want := []string{c.quantity, c.value, c.interval, c.limit}; !slices.Equal(got, want) {
				t.Errorf("got  %q\nwant %q", got, want)
			}
		})
	}
}

func TestDetails(t *testing.T) {
	base := criteria.Finding{
		Quantity: "uniformity", Formula: "deviation from centre", Levels: 9, Unit: "1", Comparison: "<=", Limit: 0.1,
		Source: "section 2", Confidence: "read", Verdict: criteria.Meets, Against: criteria.Meets,
	}
	for _, c := range []struct {
		name   string
		change func(f *criteria.Finding)
		want   string
	}{
		{"plain", func(f *criteria.Finding) {}, "deviation from centre | 9 places | source: section 2 | limit read in the scheme"},
		{"one level", func(f *criteria.Finding) {
			f.Quantity, f.Levels, f.Source, f.Formula = "luminance_max", 1, "", ""
		}, "1 level | limit read in the scheme"},
		{"provisional", func(f *criteria.Finding) {
			f.Provisional, f.ProvisionalReason, f.Levels = true, "11 levels; the limit was made for 18", 0
		}, "provisional: 11 levels; the limit was made for 18 | deviation from centre | source: section 2 | limit read in the scheme"},
		{"provisional without a reason", func(f *criteria.Finding) {
			f.Provisional, f.Levels, f.Source, f.Formula = true, 0, "", ""
		}, "provisional | limit read in the scheme"},
		{"does not decide", func(f *criteria.Finding) {
			f.Verdict, f.Against, f.Confidence = criteria.NotAssessed, criteria.FailsUncertainly, "from memory"
			f.Note, f.Formula, f.Levels, f.Source = "limit not confirmed (from memory): it decides once confirmed; field at level 204; luminance_max is 300 cd/m2", "", 0, ""
		}, "does not decide; the value fails it within uncertainty | field at level 204 | maximum luminance is 300 cd/m² | limit from memory, not confirmed"},
		{"confirmed", func(f *criteria.Finding) {
			f.Confidence, f.Formula, f.Levels, f.Source = "weak", "", 0, ""
			f.Confirmed = &criteria.Confirmation{Document: "Example A", Page: "14", Person: "p-002", Date: "2024-01-09"}
		}, "limit from one restatement only | confirmed by p-002 on 2024-01-09 in Example A, page 14"},
		{"override", func(f *criteria.Finding) {
			f.Confidence, f.Formula, f.Levels, f.Source = "site", "", 0, ""
			f.Override = &criteria.Override{Limit: 0.15, Comparison: "<", Reason: "newer monitors", Name: "p-002", Date: "2024-01-09"}
		}, "the site's own limit | in place of the scheme's < 15 %, by p-002 on 2024-01-09: newer monitors"},
	} {
		t.Run(c.name, func(t *testing.T) {
			f := base
			c.change(&f)
			if got := strings.Join(Details(f), " | "); got != c.want {
				t.Errorf("got  %q\nwant %q", got, c.want)
			}
		})
	}
}

func TestRoomLight(t *testing.T) {
	for _, c := range []struct {
		name string
		r    criteria.LuxRange
		want string
	}{
		{
			"both ends",
			criteria.LuxRange{Low: ptr(12.04), LowBinds: "contrast_deviation", High: ptr(120.4), HighBinds: "luminance_ratio", Rd: ptr(0.005), RdAssumed: true},
			"Every limit that depends on room light holds from 12 lx (below it greatest contrast deviation binds) to 120 lx (above it luminance ratio L'max/L'min binds) on the screen, for Rd 0.005 cd/m² per lx (assumed).",
		},
		{
			"from the dark",
			criteria.LuxRange{Low: ptr(0.0), High: ptr(8.5), HighBinds: "ambient_ratio", HighUnconfirmed: true},
			"Every limit that depends on room light holds up to 8.5 lx (above it ambient ratio Lamb/Lmin binds, a limit that is not confirmed) on the screen.",
		},
		{
			"open above",
			criteria.LuxRange{Low: ptr(2.0), LowBinds: "contrast_deviation", Reason: "searched to 10000 lx"},
			"Every limit that depends on room light holds from 2 lx (below it greatest contrast deviation binds) upwards; nothing binds at the bright end on the screen; searched to 10000 lx.",
		},
		{"everywhere", criteria.LuxRange{Low: ptr(0.0)}, "Every limit that depends on room light holds in any room light."},
		{"nowhere", criteria.LuxRange{Reason: "luminance_ratio is not met even in a dark room"}, "No range of room light: luminance ratio is not met even in a dark room."},
	} {
		t.Run(c.name, func(t *testing.T) {
			if got := RoomLight(c.r); got != c.want {
				t.Errorf("got  %q\nwant %q", got, c.want)
			}
		})
	}
}

func TestRepeats(t *testing.T) {
	for want, a := range map[string]criteria.Assessment{
		"none, nothing is open":                                  {RepeatsNeeded: ptr(0)},
		"1 reading a level settles what is open":                 {RepeatsNeeded: ptr(1)},
		"12 readings a level, in all, would settle what is open": {RepeatsNeeded: ptr(12)},
		"cannot be said: maximum luminance would stay open":      {RepeatsNeededReason: "luminance_max would stay open"},
		"cannot be said": {},
	} {
		if got := Repeats(a); got != want {
			t.Errorf("got %q; expected %q", got, want)
		}
	}
}

func TestEveryVerdictHasItsOwnSign(t *testing.T) {
	verdicts := []criteria.Verdict{criteria.Meets, criteria.MeetsUncertainly, criteria.FailsUncertainly, criteria.Fails, criteria.NotAssessed}
	signs, markers := map[string]bool{}, map[Marker]bool{}
	for _, v := range verdicts {
		signs[Sign(v)] = true
		markers[MarkerOf(v)] = true
	}
	if len(signs) != len(verdicts) || len(markers) != len(verdicts) {
		t.Errorf("%d signs and %d markers for %d verdicts", len(signs), len(markers), len(verdicts))
	}
}

func TestEveryWordIsKnown(t *testing.T) {
	for _, q := range []criteria.Quantity{
		criteria.LuminanceMax, criteria.LuminanceMin, criteria.LuminanceRatio, criteria.LuminanceRatioAim, criteria.ContrastDeviation,
		criteria.Uniformity, criteria.PairMatch, criteria.ColourUniformity, criteria.ColourMatch, criteria.AmbientRatio, criteria.RoomIlluminance,
	} {
		if _, ok := terms[q]; !ok {
			t.Errorf("quantity %s has no words", q)
		}
	}
	seen := map[string]bool{}
	for _, c := range []criteria.Confidence{
		criteria.Read, criteria.SecondHand, criteria.Weak, criteria.FromMemory, criteria.Unsure, criteria.Site, "", "another",
	} {
		seen[Confidence(string(c))] = true
	}
	if len(seen) != 8 {
		t.Errorf("%d different words for 8 confidences", len(seen))
	}
	seen = map[string]bool{}
	for _, s := range []string{"measured", "illuminance_rd", "illuminance_rd_assumed", "dark_room", "included", "", "another"} {
		seen[AmbientSource(s)] = true
	}
	if len(seen) != 7 {
		t.Errorf("%d different words for 7 sources of ambient light", len(seen))
	}
}

func TestSignedPercent(t *testing.T) {
	for v, want := range map[float64]string{0.0984: "+9.8 %", -0.1: "−10 %", 0: "0 %", -0.0001: "0 %", 0.0001: "0 %"} {
		if got := signedPercent(v); got != want {
			t.Errorf("%v is %q; expected %q", v, got, want)
		}
	}
}
