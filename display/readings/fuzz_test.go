package readings

import (
	"bytes"
	"math"
	"testing"
)

// seed adds the samples and the faulty files, and fails where there are none.
func seed(f *testing.F) {
	for _, name := range sampleNames(f) {
		f.Add(sampleBytes(f, name))
	}
	all := faults(f)
	if len(all) == 0 {
		f.Fatalf("no cases in %s", malformed)
	}
	for _, c := range all {
		f.Add([]byte(c.content))
	}
}

// FuzzParse: every file is refused in one line, or is what Parse promises and comes back from Write.
func FuzzParse(f *testing.F) {
	seed(f)
	f.Fuzz(func(t *testing.T, content []byte) {
		file, err := Parse("fuzz.csv", bytes.NewReader(content))
		if err != nil {
			checkFormatError(t, "fuzz.csv", err)
			return
		}
		ends := map[int]bool{}
		for _, r := range file.Readings {
			if l := float64(r.Luminance); math.IsNaN(l) || l < 0 || l > maxLuminance {
				t.Errorf("luminance %v", l)
			}
			if r.Level < 0 || r.Level >= 1<<file.Metadata.Bits {
				t.Errorf("level %d of %d bits", r.Level, file.Metadata.Bits)
			}
			ends[r.Level] = true
		}
		if !ends[0] || !ends[1<<file.Metadata.Bits-1] {
			t.Error("an end of the series is missing")
		}
		roundTrip(t, file)
	})
}

// FuzzParsePlaces: every file is refused in one line, or has five places at each of its levels.
func FuzzParsePlaces(f *testing.F) {
	seed(f)
	f.Fuzz(func(t *testing.T, content []byte) {
		file, err := ParsePlaces("fuzz.csv", bytes.NewReader(content))
		if err != nil {
			checkFormatError(t, "fuzz.csv", err)
			return
		}
		fields := map[int]map[Position]bool{}
		for _, p := range file.Places {
			if l := float64(p.Luminance); math.IsNaN(l) || l < 0 || l > maxLuminance {
				t.Errorf("luminance %v", l)
			}
			if c := p.Colour; c != nil && !(c.U >= 0 && c.U <= maxUV && c.V >= 0 && c.V <= maxUV) {
				t.Errorf("colour %v", *c)
			}
			if fields[p.Level] == nil {
				fields[p.Level] = map[Position]bool{}
			}
			if fields[p.Level][p.Position] {
				t.Errorf("%q twice at level %d", p.Position, p.Level)
			}
			fields[p.Level][p.Position] = true
		}
		for level, places := range fields {
			for _, want := range fivePoints {
				if !places[want] {
					t.Errorf("no %q at level %d", want, level)
				}
			}
		}
	})
}
