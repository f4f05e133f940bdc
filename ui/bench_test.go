package ui

import (
	"fmt"
	"testing"
	"time"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/report"
	"evenstep/display/store"
)

// BenchmarkReading is what follows a typed reading before the next can be typed: the visit judged anew
// and both plots drawn at the size they have in a window of 1920x1200.
func BenchmarkReading(b *testing.B) {
	scheme, err := criteria.Find("acr-aapm-siim-2012")
	if err != nil {
		b.Fatal(err)
	}
	used, err := scheme.Use("diagnostic", nil)
	if err != nil {
		b.Fatal(err)
	}
	m := store.Monitor{Bits: 8, Serial: "EV-1"}
	d := store.Draft{Head: store.Head{Light: store.Light{Kind: store.LightMeasured, Ambient: .1}}}
	for i, l := range evenPlan(8, 18) {
		d.Readings = append(d.Readings, readings.Reading{
			Level: l, Luminance: photometry.CdM2(1.2 + .0000041*float64(l*l*l) + .0035*float64(l*l) + .05*float64(i)), Role: readings.Series, Time: time.Now(),
		})
	}
	for b.Loop() {
		r, a, err := d.Judge(m, nil, used)
		if err != nil {
			b.Fatal(err)
		}
		for _, c := range []report.Chart{report.ResponseChart(a, r.Points), report.DeviationChart(a)} {
			p := newPicture(860, 440, 1)
			c.Draw(p, report.Box{X: 4, Y: 4, W: 852, H: 432}, 11)
		}
	}
}

func TestPlans(t *testing.T) {
	if got := fmt.Sprint(evenPlan(8, 18)); got != "[0 15 30 45 60 75 90 105 120 135 150 165 180 195 210 225 240 255]" {
		t.Error(got)
	}
	if got := fmt.Sprint(evenPlan(8, 11)); got != "[0 26 51 77 102 128 153 179 204 230 255]" {
		t.Error(got)
	}
	for _, bits := range []int{8, 10, 12} {
		for _, n := range []int{11, 18} {
			p := evenPlan(bits, n)
			if got, err := planOf(fmt.Sprint(p)[1:len(fmt.Sprint(p))-1], bits); err != nil || len(got) != n {
				t.Errorf("%d bits, %d levels: %v, %v", bits, n, got, err)
			}
		}
	}
	for _, bad := range []string{"", "0", "0 256", "0 15 15 255", "0 x 255", "15 255", "0 -1 255"} {
		if got, err := planOf(bad, 8); err == nil {
			t.Errorf("%q gave %v", bad, got)
		}
	}
}

func TestPlacesAreRead(t *testing.T) {
	typed := map[readings.Position][3]string{
		readings.TopLeft: {"190", "", ""}, readings.TopRight: {"191", "", ""}, readings.Centre: {"200,5", "0.198", "0,468"},
		readings.BottomLeft: {"188", "", ""}, readings.BottomRight: {"187", "", ""},
	}
	at := func(p readings.Position) (string, string, string) { return typed[p][0], typed[p][1], typed[p][2] }
	got, err := readPlaces("204", 8, at)
	if err != nil || len(got) != 5 || got[2].Luminance != 200.5 || got[2].Colour == nil || got[2].Colour.V != .468 || got[0].Level != 204 {
		t.Errorf("%+v, %v", got, err)
	}
	if got, err := readPlaces("", 8, func(readings.Position) (string, string, string) { return "", "", "" }); err != nil || got != nil {
		t.Errorf("nothing typed: %+v, %v", got, err)
	}
	if _, err := readPlaces("256", 8, at); err == nil {
		t.Error("level 256 of 8 bits")
	}
	for p, bad := range map[readings.Position][3]string{readings.Centre: {"x", "", ""}, readings.TopLeft: {"190", "0.9", "0.4"}, readings.TopRight: {"", "", ""}} {
		was := typed[p]
		typed[p] = bad
		if got, err := readPlaces("204", 8, at); err == nil {
			t.Errorf("%s %v: %+v", p, bad, got)
		}
		typed[p] = was
	}
}

func TestPaperOfTheCountry(t *testing.T) {
	for locale, want := range map[string]report.Paper{"en_US.UTF-8": report.Letter, "de_DE.UTF-8": report.A4, "C": report.A4, "": report.A4} {
		if got := paperHere(func(k string) string {
			if k == "LANG" {
				return locale
			}
			return ""
		}); got != want {
			t.Errorf("%q: %v", locale, got)
		}
	}
}

func TestSafeNames(t *testing.T) {
	for in, want := range map[string]string{"EV-1": "EV-1", "a/b:c": "a-b-c", "..": "monitor", "": "monitor", "a\nb": "a-b"} {
		if got := safeName(in); got != want {
			t.Errorf("%q: %q, want %q", in, got, want)
		}
	}
}
