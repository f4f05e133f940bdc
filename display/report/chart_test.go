package report

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/response"
)

// describe writes the model of a chart as text. Four significant digits: what is drawn is coarser.
func describe(c Chart) string {
	var b strings.Builder
	say := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }
	say("title %q", c.Title)
	say("note %q", c.Note)
	if c.Empty != "" {
		say("empty %q", c.Empty)
		return b.String()
	}
	for _, a := range []struct {
		name string
		Axis
	}{{"x", c.X}, {"y", c.Y}} {
		say("axis %s %q %.4g to %.4g log %v", a.name, a.Label, a.Min, a.Max, a.Log)
		for _, t := range a.Ticks {
			say("  tick %.4g %q", t.At, t.Text)
		}
	}
	for _, k := range c.Key {
		say("key %s open %v %q", k.Marker.Shape, k.Marker.Open, k.Text)
	}
	for _, band := range c.Bands {
		say("band %.4g to %.4g", band.Low, band.High)
	}
	for _, l := range c.Limits {
		say("limit %.4g %q", l.Y, l.Text)
	}
	for _, l := range c.Lines {
		say("line of %d", len(l.At))
		for _, at := range l.At {
			say("  %.4g %.4g", at.X, at.Y)
		}
	}
	for _, bar := range c.Bars {
		say("bar at %.4g from %.4g to %.4g", bar.X, bar.Low, bar.High)
	}
	for _, m := range c.Marks {
		say("mark %s open %v ring %q at %.4g %.4g", m.Marker.Shape, m.Marker.Open, m.Ring, m.At.X, m.At.Y)
	}
	for _, l := range c.Labels {
		say("label %q at %.4g %.4g", l.Text, l.At.X, l.At.Y)
	}
	return b.String()
}

func TestChartModels(t *testing.T) {
	for name, r := range samples(t) {
		t.Run(name, func(t *testing.T) {
			golden(t, "chart-response-"+name+".txt", []byte(describe(ResponseChart(r.Assessment, points(r)))))
			golden(t, "chart-deviation-"+name+".txt", []byte(describe(DeviationChart(r.Assessment))))
		})
	}
}

// The line of the response chart is the standard function: DICOM PS3.14, Table B-1, which lies up to
// 2.2e-5 of the luminance above the equation (see package gsdf) and is printed to four decimals.
func TestResponseChartLineIsTableB1(t *testing.T) {
	a := criteria.Assessment{
		LuminanceMin: 0.8, LuminanceMax: 4000,
		Steps: []criteria.StepFigure{{FromLevel: 0, ToLevel: 1, JNDFrom: 100, JNDTo: 500}, {FromLevel: 1, ToLevel: 2, JNDFrom: 500, JNDTo: 1023}},
	}
	line := ResponseChart(a, nil).Lines[0].At
	for _, end := range []struct {
		at             XY
		jnd, tabulated float64
	}{
		{line[0], 100, 1.8508},
		{line[len(line)-1], 1023, 3993.4040},
	} {
		if end.at.X != end.jnd || math.Abs(end.at.Y/end.tabulated-1) > 1e-4 {
			t.Errorf("line runs through %v; expected %v cd/m2 at %v", end.at, end.tabulated, end.jnd)
		}
	}
}

func TestDeviationChartState(t *testing.T) {
	step := func(d, lo, hi float64) criteria.StepFigure {
		return criteria.StepFigure{FromLevel: 0, ToLevel: 1, JNDFrom: 100, JNDTo: 120, Deviation: d, DeviationInterval: criteria.Interval{lo, hi}}
	}
	limited := func(limit float64, v criteria.Verdict) criteria.Finding {
		return criteria.Finding{Quantity: "contrast_deviation", Comparison: "<=", Limit: limit, Verdict: v}
	}
	t.Run("shape says how a step stands to the least limit that decides", func(t *testing.T) {
		c := DeviationChart(criteria.Assessment{
			Steps: []criteria.StepFigure{step(0.09, 0.05, 0.13), step(-0.12, -0.2, -0.04), step(0.1, 0, 0.2)},
			Findings: []criteria.Finding{
				limited(0.1, criteria.Fails), limited(0.15, criteria.Meets), limited(0.1, criteria.Fails), limited(0.05, criteria.NotAssessed),
				{Quantity: "luminance_max", Limit: 350},
			},
		})
		if len(c.Limits) != 4 || len(c.Bands) != 1 || c.Bands[0] != (Band{-10, 10}) {
			t.Errorf("limits %v, bands %v; expected 10 and 15 per cent either way, band of 10", c.Limits, c.Bands)
		}
		want := []Mark{
			{At: XY{110, 9}, Marker: Marker{Shape: Circle}},
			{At: XY{110, -12}, Marker: Marker{Shape: Triangle}, Ring: Diamond},
			{At: XY{110, 10}, Marker: Marker{Shape: Circle}},
		}
		for i, m := range c.Marks {
			if m != want[i] {
				t.Errorf("mark %d is %v; expected %v", i, m, want[i])
			}
		}
	})
	t.Run("a limit that does not decide is shown where no other is", func(t *testing.T) {
		c := DeviationChart(criteria.Assessment{
			Steps:    []criteria.StepFigure{step(0.09, 0.05, 0.13)},
			Findings: []criteria.Finding{limited(0.2, criteria.NotAssessed)},
		})
		if len(c.Limits) != 2 || c.Limits[0].Text != "+20 %" || c.Limits[1].Text != "−20 %" {
			t.Errorf("limits are %v", c.Limits)
		}
	})
	t.Run("no limit, no band, no state", func(t *testing.T) {
		c := DeviationChart(criteria.Assessment{Steps: []criteria.StepFigure{step(3, 2, 4)}})
		if len(c.Limits)+len(c.Bands) != 0 || c.Marks[0].Marker.Shape != Circle {
			t.Errorf("limits %v, bands %v, mark %v", c.Limits, c.Bands, c.Marks[0])
		}
	})
	t.Run("an interval far wider than the deviations is cut", func(t *testing.T) {
		c := DeviationChart(criteria.Assessment{Steps: []criteria.StepFigure{step(0.04, -9, 9), step(0.02, 0.01, 0.03)}})
		if c.Y.Max > 15 {
			t.Errorf("axis reaches %v per cent for deviations of 4; expected at most 15", c.Y.Max)
		}
	})
}

// TestSeriesChart: what was read so far, in place, and a reading of 0 left out of a log axis.
func TestSeriesChart(t *testing.T) {
	c := SeriesChart([]response.LevelReading{{Level: 0, Luminance: 0}, {Level: 15, Luminance: 2}, {Level: 30, Luminance: 4}}, 255)
	if len(c.Marks) != 2 || c.Marks[1].At != (XY{30, 4}) || c.X.Max != 255 || c.Y.Min > 2 || c.Y.Max < 4 || c.Empty != "" {
		t.Errorf("%+v", c)
	}
	if c := SeriesChart([]response.LevelReading{{Level: 0, Luminance: 0}}, 255); c.Empty == "" {
		t.Error("a chart of nothing")
	}
}

// TestCompareChart: both visits lie in it, told apart by shape.
func TestCompareChart(t *testing.T) {
	r := sampleRecord(t)
	c := CompareChart(r.Assessment, r.Assessment, points(r), points(r))
	circles, squares := 0, 0
	for _, m := range c.Marks {
		switch m.Marker {
		case Marker{Shape: Circle}:
			circles++
		case Marker{Shape: Square, Open: true}:
			squares++
		}
	}
	if circles == 0 || circles != squares || circles+squares != len(c.Marks) {
		t.Errorf("%d circles and %d squares of %d markers", circles, squares, len(c.Marks))
	}
}

func TestChartsSayWhyTheyAreEmpty(t *testing.T) {
	for _, c := range []struct {
		name string
		a    criteria.Assessment
		want string
	}{
		{"reason", criteria.Assessment{JNDReason: "L' of 0 cd/m2 is below"}, "L' of 0 cd/m² is below"},
		{"other reason", criteria.Assessment{MaxDeviationReason: "no rise"}, "no rise"},
		{"none", criteria.Assessment{}, "the record holds no steps"},
		{"not finite", criteria.Assessment{Steps: []criteria.StepFigure{{JNDTo: 2, Deviation: math.NaN()}}}, "figures that cannot be drawn"},
		{"reversed", criteria.Assessment{Steps: []criteria.StepFigure{{JNDFrom: 2, JNDTo: 2}}}, "figures that cannot be drawn"},
	} {
		t.Run(c.name, func(t *testing.T) {
			for _, chart := range []Chart{ResponseChart(c.a, nil), DeviationChart(c.a)} {
				if !strings.Contains(chart.Empty, c.want) {
					t.Errorf("empty for %q; expected %q in it", chart.Empty, c.want)
				}
			}
		})
	}
}

func TestResponseChartSurvivesMistypedReadings(t *testing.T) {
	a := sampleRecord(t).Assessment
	c := ResponseChart(a, []response.Point{
		{Level: 0, Luminance: 1e300},
		{Level: 15, Luminance: 1e-300},
		{Level: 30, Luminance: 0},
		{Level: 45, Luminance: photometry.CdM2(math.Inf(1))},
		{Level: 7, Luminance: 5},
	})
	if len(c.Marks) != 2 || c.Y.Max > 1e6 || c.Y.Min < 1e-4 {
		t.Errorf("%d marks on an axis from %v to %v; expected 2 on a usable one", len(c.Marks), c.Y.Min, c.Y.Max)
	}
}

// Whatever is drawn stays within the box, and no two texts lie on each other.
func TestChartsStayInTheirBox(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	m, err := newRuler()
	if err != nil {
		t.Fatal(err)
	}
	charts := map[string]Chart{}
	for name, r := range samples(t) {
		charts["response "+name] = ResponseChart(r.Assessment, points(r))
		charts["deviation "+name] = DeviationChart(r.Assessment)
	}
	dense := denseAssessment(rng)
	charts["dense"] = DeviationChart(dense)
	charts["long reason"] = Chart{Title: "Empty", Empty: strings.Repeat("no black that the meter resolves; ", 40)}
	for name, c := range charts {
		for _, box := range []Box{{40, 60, 240, 190}, {10, 10, 240, 96}, {0, 0, 500, 230}} {
			s := &sheet{ruler: m, tight: tightness[0], paper: papers[A4], pages: []*page{{}}}
			c.Draw(s, box, 7)
			if len(s.pages[0].ops) < 3 {
				t.Errorf("%s: only %d steps were drawn", name, len(s.pages[0].ops))
			}
			checkOps(t, fmt.Sprintf("%s in %v", name, box), s.pages[0].ops, box)
		}
	}
}

func denseAssessment(rng *rand.Rand) criteria.Assessment {
	var a criteria.Assessment
	for i := range 255 {
		d := 0.4 * (rng.Float64() - 0.5)
		a.Steps = append(a.Steps, criteria.StepFigure{
			FromLevel: i, ToLevel: i + 1, JNDFrom: float64(50 + 2*i), JNDTo: float64(52 + 2*i), Deviation: d,
			DeviationInterval: criteria.Interval{d - 0.1, d + 0.1},
		})
	}
	a.LuminanceMin, a.LuminanceMax = 0.5, 300
	return a
}

// checkOps fails where a step leaves the box or two texts overlap. The height of a text is that of
// the Go fonts' capitals and descenders, as parts of the size.
func checkOps(t *testing.T, name string, ops []op, box Box) {
	t.Helper()
	const above, below = 0.73, 0.2
	const slip = 0.6 // points: half a line width, and what rounding a text's width leaves
	inside := func(at XY) bool {
		return finite(at.X, at.Y) && at.X >= box.X-slip && at.X <= box.X+box.W+slip && at.Y >= box.Y-slip && at.Y <= box.Y+box.H+slip
	}
	type area struct {
		x0, y0, x1, y1 float64
		text           string
	}
	var texts []area
	for _, o := range ops {
		for _, at := range append(o.line, o.area...) {
			if !inside(at) {
				t.Errorf("%s: %v lies outside of %v", name, at, box)
			}
		}
		if o.text == "" {
			continue
		}
		a := area{o.at.X, o.at.Y - above*o.set.Size, o.at.X + o.width, o.at.Y + below*o.set.Size, o.text}
		if !inside(XY{a.x0, a.y0}) || !inside(XY{a.x1, a.y1}) {
			t.Errorf("%s: text %.40q from %.1f,%.1f to %.1f,%.1f lies outside of %v", name, o.text, a.x0, a.y0, a.x1, a.y1, box)
		}
		for _, b := range texts {
			if a.x0 < b.x1-0.1 && b.x0 < a.x1-0.1 && a.y0 < b.y1-0.1 && b.y0 < a.y1-0.1 {
				t.Errorf("%s: text %.40q lies on %.40q", name, a.text, b.text)
			}
		}
		texts = append(texts, a)
	}
}

func TestAxes(t *testing.T) {
	labels := func(a Axis) string {
		var out []string
		for _, tick := range a.Ticks {
			if tick.Text != "" {
				out = append(out, tick.Text)
			}
		}
		return strings.Join(out, " ")
	}
	for _, c := range []struct {
		name string
		a    Axis
		want string
	}{
		{"linear", linearAxis("", 0, 100, 5), "0 20 40 60 80 100"},
		{"across zero", linearAxis("", -16.8, 16.8, 8), "−15 −10 −5 0 5 10 15"},
		{"decimals", linearAxis("", 0.11, 0.29, 4), "0.15 0.20 0.25"},
		{"no width", linearAxis("", 3, 3, 4), "2.0 2.5 3.0 3.5 4.0"},
		{"offset", linearAxis("", 34.2, 698.8, 7), "100 200 300 400 500 600"},
		{"three decades", logAxis("", 0.61, 420), "1 10 100"},
		{"less than three", logAxis("", 1.2, 90), "1 2 5 10 20 50 100"},
		{"below one", logAxis("", 0.05, 20), "0.05 0.1 0.2 0.5 1 2 5 10 20"},
		{"log without width", logAxis("", 10, 10), "5 10 20"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if got := labels(c.a); got != c.want {
				t.Errorf("ticks are %q; expected %q", got, c.want)
			}
		})
	}
}

// Laws of the axes: ticks rise, lie on the axis, a tick's text is its value, the range is covered.
func TestAxisLaws(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for range 2000 {
		lo := math.Pow(10, 8*rng.Float64()-4)
		hi := lo * (1 + math.Pow(10, 5*rng.Float64()-2))
		for _, a := range []Axis{logAxis("", lo, hi), linearAxis("", lo, hi, 6), linearAxis("", -hi, hi, 6)} {
			if a.Log && (a.Min > lo*(1+1e-9) || a.Max < hi*(1-1e-9)) {
				t.Fatalf("log axis %v to %v does not cover %v to %v", a.Min, a.Max, lo, hi)
			}
			if n := len(a.Ticks); n < 2 || n > 100 {
				t.Fatalf("%d ticks from %v to %v", n, lo, hi)
			}
			before := math.Inf(-1)
			for _, tick := range a.Ticks {
				if p := a.place(tick.At); tick.At <= before || p < -1e-6 || p > 1+1e-6 {
					t.Fatalf("tick %v after %v stands at %v of the axis", tick.At, before, p)
				}
				before = tick.At
				if tick.Text == "" {
					continue
				}
				var v float64
				if _, err := fmt.Sscan(strings.Replace(tick.Text, "−", "-", 1), &v); err != nil || math.Abs(v-tick.At) > 1e-6*max(math.Abs(hi), math.Abs(v)) {
					t.Fatalf("tick %v reads %q", tick.At, tick.Text)
				}
			}
		}
	}
}

func TestMarkersTellShapesApart(t *testing.T) {
	m, err := newRuler()
	if err != nil {
		t.Fatal(err)
	}
	seen := map[string]Marker{}
	for _, shape := range []Shape{Circle, Square, Triangle, Diamond, Cross, Dash} {
		for _, open := range []bool{false, true} {
			if open && (shape == Cross || shape == Dash) {
				continue // drawn with lines: there is nothing to fill
			}
			s := &sheet{ruler: m, pages: []*page{{}}}
			marker := Marker{shape, open}
			marker.Draw(s, XY{50, 50}, 6, black)
			drawn := fmt.Sprintf("%.3v", s.pages[0].ops)
			if other, ok := seen[drawn]; ok {
				t.Errorf("%v is drawn as %v", marker, other)
			}
			seen[drawn] = marker
			checkOps(t, string(shape), s.pages[0].ops, Box{45, 45, 10, 10})
		}
	}
}
