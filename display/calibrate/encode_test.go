package calibrate

import (
	"bytes"
	"math"
	"strings"
	"testing"

	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
	"evenstep/luts"
)

// powerLaw is a curve of an invented panel without a table, and the table made for it.
func powerLaw(t *testing.T) (*Curve, Result) {
	t.Helper()
	in := Input{Bits: 8, Scale: readings.DDL, Ramp: Identity, Light: response.DarkRoom(), Noise: response.Noise{Repeatability: .002, Floor: .002}}
	for l := 0; l <= 255; l += 15 {
		in.Readings = append(in.Readings, readings.Reading{
			Level: l, Luminance: photometry.CdM2(1 + 399*math.Pow(float64(l)/255, 2.2)), Role: readings.Series, Ambient: readings.Excluded,
		})
	}
	c, err := NewCurve(in)
	if err != nil {
		t.Fatal(err)
	}
	r, err := c.Table(Aim{}, 8, 10)
	if err != nil {
		t.Fatal(err)
	}
	return c, r
}

// TestEncodedTablesReadBack reads each form back and compares every entry.
func TestEncodedTablesReadBack(t *testing.T) {
	c, r := powerLaw(t)
	for _, file := range []string{"a.json", "a.csv", "a.icc", "a.icm"} {
		b, err := Encode(file, c, r, origin())
		if err != nil {
			t.Fatal(err)
		}
		var got luts.Table
		switch {
		case strings.HasSuffix(file, ".json"):
			got, _, err = luts.ReadJSON(file, bytes.NewReader(b))
		case strings.HasSuffix(file, ".csv"):
			got, _, err = luts.ReadCSV(file, bytes.NewReader(b))
		default:
			var v VideoTable
			if v, err = ReadVideoTable(b); err == nil {
				got, err = v.Table(10)
			}
		}
		if err != nil {
			t.Fatalf("%s: %v", file, err)
		}
		if len(got.Entries) != len(r.Table.Entries) {
			t.Fatalf("%s: %d entries, want %d", file, len(got.Entries), len(r.Table.Entries))
		}
		for i, e := range got.Entries {
			if e != r.Table.Entries[i] {
				t.Fatalf("%s: entry %d is %d, want %d", file, i, e, r.Table.Entries[i])
			}
		}
	}
	if _, err := Encode("a.txt", c, r, origin()); err == nil || !strings.Contains(err.Error(), ".json, .csv, .icc") {
		t.Errorf("an unknown ending: %v", err)
	}
	if _, err := Encode("a.json", c, r, Provenance{}); err == nil {
		t.Error("a table that comes from nowhere")
	}
}

func TestWords(t *testing.T) {
	c, r := powerLaw(t)
	p, err := c.Predict(r.Table, Path{})
	if err != nil {
		t.Fatal(err)
	}
	labels := map[string]string{}
	for _, l := range Words(r, p) {
		if l.Label != "" {
			labels[l.Label] = l.Text
		}
		if strings.Contains(l.Text, "%!") {
			t.Errorf("%q", l.Text)
		}
	}
	for label, want := range map[string]string{"panel": "1 to 400 cd/m²", "deviation": "at 18 levels", "gray levels": "256 kept, 0 lost", "room light": "the table holds 10 %"} {
		if !strings.Contains(labels[label], want) {
			t.Errorf("%s: %q; want %q in it", label, labels[label], want)
		}
	}
	lux, cd := photometry.Lux(12), photometry.CdM2(.3)
	for want, room := range map[string]RoomLight{
		"from 12 to 12 lx on the screen (Rd assumed)": {IlluminanceLow: &lux, IlluminanceHigh: &lux, RdAssumed: true},
		"from 0.3 to 0.3 cd/m² of ambient luminance":  {AmbientLow: &cd, AmbientHigh: &cd},
		"from 0.3 cd/m² of ambient luminance":         {AmbientLow: &cd},
		"cannot be said: nobody knows":                {Reason: "nobody knows"},
		"in no room light":                            {},
	} {
		if got := room.words(); !strings.HasSuffix(got, want) {
			t.Errorf("%q; want %q at its end", got, want)
		}
	}
}
