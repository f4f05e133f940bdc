package calibrate

import (
	"bytes"
	"crypto/md5"
	"encoding/binary"
	"encoding/hex"
	"errors"
	"flag"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"evenstep/display/response"
)

var update = flag.Bool("update", false, "write the golden files anew")

func origin() Provenance {
	return Provenance{
		Monitor:        "Übungsmonitor 3",
		Serial:         "EV-0003",
		Date:           time.Date(2026, 5, 4, 9, 30, 15, 0, time.FixedZone("", 7200)),
		ReadingsSHA256: strings.Repeat("0123456789abcdef", 4),
		Program:        "evenstep 0.0",
	}
}

// annexProfile is the table of PS3.14 Annex D.1 as a profile.
func annexProfile(t testing.TB, version ICCVersion) ([]byte, Result) {
	t.Helper()
	c := mustCurve(t, exactly(t, "annex-d-1-1-characteristic-curve.csv"))
	res := mustTable(t, c, Aim{}, 8, 10)
	b, err := Profile(c, res, origin(), version)
	if err != nil {
		t.Fatal(err)
	}
	return b, res
}

func u32(b []byte, at int) int { return int(binary.BigEndian.Uint32(b[at:])) }
func u16(b []byte, at int) int { return int(binary.BigEndian.Uint16(b[at:])) }

// The bytes of a display profile by ICC.1: header, tag table and types, as a conformance check of the ICC's
// reference implementation and a general-purpose colour library have them; the layout of the video table tag
// as the reader and the writer of that library have it.
func TestProfileBytes(t *testing.T) {
	for version, versionBytes := range map[ICCVersion]string{ICCv2: "02400000", ICCv4: "04400000"} {
		b, res := annexProfile(t, version)
		for _, f := range []struct {
			at   int
			want string // hexadecimal
			what string
		}{
			{4, "00000000", "preferred CMM"},
			{8, versionBytes, "version"},
			{12, "6d6e7472", "class mntr"},
			{16, "52474220", "colour space RGB"},
			{20, "58595a20", "connection space XYZ"},
			{24, "07ea000500040007001e000f", "date and time, UTC"},
			{36, "61637370", "acsp"},
			{40, "00000000" + "00000000" + "00000000" + "00000000" + "0000000000000000", "platform to attributes"},
			{64, "00000000", "perceptual"},
			{68, "0000f6d6000100000000d32d", "D50"},
			{80, "00000000", "creator"},
			{100, strings.Repeat("00", 28), "reserved"},
		} {
			want, err := hex.DecodeString(f.want)
			if err != nil {
				t.Fatal(f.what, err)
			}
			if got := b[f.at : f.at+len(want)]; !bytes.Equal(got, want) {
				t.Errorf("version %d, %s: %x; expected %x", version, f.what, got, want)
			}
		}
		if u32(b, 0) != len(b) || len(b)%4 != 0 {
			t.Errorf("version %d: size %d of %d bytes", version, u32(b, 0), len(b))
		}
		id := b[84:100]
		if version == ICCv2 {
			if !bytes.Equal(id, make([]byte, 16)) {
				t.Errorf("identity %x in version 2; expected zeros", id)
			}
		} else {
			plain := bytes.Clone(b)
			for _, z := range [][2]int{{44, 48}, {64, 68}, {84, 100}} {
				clear(plain[z[0]:z[1]])
			}
			if sum := md5.Sum(plain); !bytes.Equal(id, sum[:]) {
				t.Errorf("identity %x; expected the MD5 %x", id, sum)
			}
		}
		tags := map[string][]byte{}
		for i := range u32(b, 128) {
			e := 132 + 12*i
			if u32(b, e+4)%4 != 0 {
				t.Errorf("tag %s at %d; expected a multiple of 4", b[e:e+4], u32(b, e+4))
			}
			tags[string(b[e:e+4])] = b[u32(b, e+4) : u32(b, e+4)+u32(b, e+8)]
		}
		types := map[string]string{
			"desc": "desc", "cprt": "text", "dmdd": "desc", "wtpt": "XYZ ", "rXYZ": "XYZ ", "gXYZ": "XYZ ", "bXYZ": "XYZ ",
			"rTRC": "curv", "gTRC": "curv", "bTRC": "curv", "lumi": "XYZ ", "calt": "dtim", "targ": "text", "vcgt": "vcgt",
		}
		if version == ICCv4 {
			types["desc"], types["cprt"], types["dmdd"], types["chad"] = "mluc", "mluc", "mluc", "sf32"
		}
		for name, kind := range types {
			if len(tags[name]) < 8 || string(tags[name][:4]) != kind || u32(tags[name], 4) != 0 {
				t.Errorf("version %d: tag %s is %.8q; expected the type %s", version, name, tags[name], kind)
			}
		}
		if len(tags) != len(types) {
			t.Errorf("version %d: %d tags; expected %d", version, len(tags), len(types))
		}
		v := tags["vcgt"]
		if len(v) != 1554 || u32(v, 8) != 0 || u16(v, 12) != 3 || u16(v, 14) != 256 || u16(v, 16) != 2 {
			t.Errorf("video table %x of %d bytes; expected 3 channels of 256 entries of 2 bytes in 1554", v[:18], len(v))
		}
		for k := range 3 {
			for i, e := range res.Table.Entries {
				if got, want := u16(v, 18+512*k+2*i), int(math.Round(65535*float64(e)/1023)); got != want {
					t.Fatalf("channel %d, entry %d: %d; expected %d", k, i, got, want)
				}
			}
		}
		curve := tags["rTRC"]
		// Level 1 of Table D.1-2 is 118, whose luminance is 0.324244 of 84.34 cd/m2 (worked out from the tables).
		if u32(curve, 8) != 256 || u16(curve, 12+2) != int(math.Round(65535*0.324244/84.34)) || u16(curve, 12+2*255) != 65535 {
			t.Errorf("tone curve begins %x, ends %d", curve[:16], u16(curve, 12+2*255))
		}
		if got := float64(u32(tags["lumi"], 12)) / 65536; math.Abs(got-84.34) > 1e-4 {
			t.Errorf("luminance %v cd/m2; expected 84.34", got)
		}
		if !bytes.Contains(tags["targ"], []byte(`"serial":"EV-0003"`)) || !bytes.Contains(tags["targ"], []byte(origin().ReadingsSHA256)) {
			t.Errorf("origin %s", tags["targ"])
		}
		again, _ := annexProfile(t, version)
		if !bytes.Equal(b, again) {
			t.Errorf("version %d: the same input gave other bytes", version)
		}
		golden := filepath.Join("testdata", "annex-d-1-v"+string('0'+rune(version))+".icc")
		if *update {
			if err := os.MkdirAll("testdata", 0o755); err != nil {
				t.Fatal(err)
			}
			if err := os.WriteFile(golden, b, 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(golden)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(b, want) {
			t.Errorf("version %d differs from %s; look at it, then run with -update", version, golden)
		}
	}
}

// The stand-in colours are those of IEC 61966-2-1 (chromaticities from memory) brought to D50 with the
// Bradford matrix (from memory); they sum to D50 exactly.
func TestPrimaries(t *testing.T) {
	type m3 = [3][3]float64
	mul := func(a, b m3) (c m3) {
		for i := range 3 {
			for j := range 3 {
				for k := range 3 {
					c[i][j] += a[i][k] * b[k][j]
				}
			}
		}
		return c
	}
	inverse := func(m m3) (c m3) {
		det := 0.0
		for i := range 3 {
			det += m[0][i] * (m[1][(i+1)%3]*m[2][(i+2)%3] - m[1][(i+2)%3]*m[2][(i+1)%3])
		}
		for i := range 3 {
			for j := range 3 {
				c[j][i] = (m[(i+1)%3][(j+1)%3]*m[(i+2)%3][(j+2)%3] - m[(i+1)%3][(j+2)%3]*m[(i+2)%3][(j+1)%3]) / det
			}
		}
		return c
	}
	apply := func(m m3, v [3]float64) (out [3]float64) {
		for i := range 3 {
			for k := range 3 {
				out[i] += m[i][k] * v[k]
			}
		}
		return out
	}
	xyz := func(x, y float64) [3]float64 { return [3]float64{x / y, 1, (1 - x - y) / y} }
	r, g, b, w := xyz(0.64, 0.33), xyz(0.30, 0.60), xyz(0.15, 0.06), xyz(0.3127, 0.3290)
	var p m3
	for i := range 3 {
		p[i] = [3]float64{r[i], g[i], b[i]}
	}
	s := apply(inverse(p), w)
	bradford := m3{{0.8951, 0.2664, -0.1614}, {-0.7502, 1.7135, 0.0367}, {0.0389, -0.0685, 1.0296}}
	from, to := apply(bradford, w), apply(bradford, [3]float64{0.9642, 1, 0.8249})
	adapt := mul(inverse(bradford), mul(m3{{to[0] / from[0]}, {0, to[1] / from[1]}, {0, 0, to[2] / from[2]}}, bradford))
	const unit = 1. / 65536
	for i := range 3 {
		for j := range 3 {
			if got := float64(adaptation[3*i+j]) * unit; math.Abs(got-adapt[i][j]) > 2*unit {
				t.Errorf("adaptation %d,%d: %v; expected %v", i, j, got, adapt[i][j])
			}
		}
	}
	want := mul(adapt, p)
	for k := range 3 {
		sum := s15(0)
		for i := range 3 {
			sum += primaries[i][k]
			if got := float64(primaries[i][k]) * unit; math.Abs(got-want[k][i]*s[i]) > 3*unit {
				t.Errorf("primary %d, %d: %v; expected %v", i, k, got, want[k][i]*s[i])
			}
		}
		if sum != d50[k] {
			t.Errorf("coordinate %d sums to %#x; expected %#x", k, sum, d50[k])
		}
	}
}

func TestProvenance(t *testing.T) {
	c := mustCurve(t, quiet.input(quiet.read(source(1), dark(20), studyNoise), studyNoise))
	res := mustTable(t, c, Aim{}, 8, 10)
	m, err := origin().Map(c, res)
	if err != nil {
		t.Fatal(err)
	}
	for k, want := range map[string]any{
		"monitor": "Übungsmonitor 3", "serial": "EV-0003", "has_serial": true, "ambient_cd_m2": 0.2, "ambient_source": "measured",
		"date": "2026-05-04T07:30:15Z", "program": "evenstep 0.0", "taken_as_they_are": false,
	} {
		if m[k] != want {
			t.Errorf("%s: %v; expected %v", k, m[k], want)
		}
	}
	for name, spoil := range map[string]func(p *Provenance){
		"monitor":     func(p *Provenance) { p.Monitor = " " },
		"serial":      func(p *Provenance) { p.Serial = "" },
		"both":        func(p *Provenance) { p.NoSerial = true },
		"date":        func(p *Provenance) { p.Date = time.Time{} },
		"short hash":  func(p *Provenance) { p.ReadingsSHA256 = "abc" },
		"capital":     func(p *Provenance) { p.ReadingsSHA256 = strings.Repeat("A", 64) },
		"no program":  func(p *Provenance) { p.Program = "" },
		"no anything": func(p *Provenance) { *p = Provenance{} },
	} {
		p := origin()
		spoil(&p)
		if err := p.Check(); !errors.Is(err, ErrProvenance) {
			t.Errorf("%s: %v; expected a refusal", name, err)
		}
		if _, err := Profile(c, res, p, ICCv4); !errors.Is(err, ErrProvenance) {
			t.Errorf("%s: a profile was written: %v", name, err)
		}
	}
	none := origin()
	none.Serial, none.NoSerial = "", true
	if m, err := none.Map(c, res); err != nil || m["serial"] != nil || m["has_serial"] != false {
		t.Errorf("%v, %v; expected no serial number, and that said", m, err)
	}
	b, err := Profile(c, res, none, ICCv2)
	if err != nil || !bytes.Contains(b, []byte("no serial number")) {
		t.Errorf("%v; expected the profile to say that there is no serial number", err)
	}
	// The tone curve is without ambient light where that is known: 0.5 of 400 cd/m2 at black.
	black := u16(b, bytes.Index(b, []byte("curv\x00\x00\x00\x00"))+12)
	if math.Abs(float64(black)/65535-0.5/400) > 0.05*0.5/400 {
		t.Errorf("black %d; expected about %.0f", black, 65535*0.5/400)
	}
}

func TestProfileRefuses(t *testing.T) {
	c := mustCurve(t, quiet.input(quiet.read(source(1), dark(20), studyNoise), studyNoise))
	res := mustTable(t, c, Aim{}, 8, 10)
	if _, err := Profile(c, res, origin(), 3); err == nil {
		t.Error("version 3: no error")
	}
	half := res
	half.Table.Entries = half.Table.Entries[:100]
	if _, err := Profile(c, half, origin(), ICCv4); err == nil {
		t.Error("half a table: no error")
	}
	lit := mustCurve(t, exactly(t, "annex-d-1-1-characteristic-curve.csv"))
	lit.Light = response.MeasuredAmbient(100, nil)
	if _, err := Profile(lit, res, origin(), ICCv4); err == nil {
		t.Error("more ambient light than white: no error")
	}
}
