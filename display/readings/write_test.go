package readings

import (
	"bytes"
	"errors"
	"io"
	"math"
	"math/rand/v2"
	"reflect"
	"strconv"
	"strings"
	"testing"
	"time"
	"unicode"

	"evenstep/display/photometry"
)

// plain is f without what another file of the same content has otherwise.
func plain(f *File) *File {
	p := *f
	p.Name, p.SHA256 = "", ""
	p.Readings = append([]Reading(nil), f.Readings...)
	for i := range p.Readings {
		p.Readings[i].Line = 0
	}
	return &p
}

// roundTrip writes f, reads it back and demands the same.
func roundTrip(t *testing.T, f *File) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := Write(&b, f); err != nil {
		t.Fatal(err)
	}
	back, err := Parse("back.csv", bytes.NewReader(b.Bytes()))
	if err != nil {
		t.Fatalf("%v\n%s", err, b.Bytes())
	}
	if !reflect.DeepEqual(plain(back), plain(f)) {
		t.Fatalf("read back as %+v, want %+v\n%s", plain(back), plain(f), b.Bytes())
	}
	return b.Bytes()
}

func optional[T any](random *rand.Rand, v T) *T {
	if random.IntN(2) == 0 {
		return nil
	}
	return &v
}

// words is a text that metadata may hold.
func words(random *rand.Rand) string {
	if random.IntN(3) == 0 {
		return ""
	}
	var b strings.Builder
	for range 1 + random.IntN(maxText) {
		r := rune(random.IntN(0x2fff))
		if random.IntN(2) == 0 {
			r = rune(random.IntN(0x80))
		}
		if unicode.IsGraphic(r) {
			b.WriteRune(r)
		}
	}
	return strings.TrimSpace(b.String())
}

// anyFile is a file that Parse may return.
func anyFile(random *rand.Rand) *File {
	f := &File{Scale: DDL, Unit: candela, Metadata: Metadata{
		Bits:          1 + random.IntN(maxBits),
		Ambient:       optional(random, photometry.CdM2(maxAmbient*random.Float64())),
		Illuminance:   optional(random, photometry.Lux(maxIlluminance*random.Float64())),
		Rd:            optional(random, photometry.PerLux(maxRd*random.Float64())),
		Meter:         words(random),
		Serial:        words(random),
		Repeatability: optional(random, maxRepeatability*random.Float64()),
		NoiseFloor:    optional(random, photometry.CdM2(maxNoiseFloor*random.Float64())),
		Ramp:          words(random),
		Scheme:        words(random),
		Class:         words(random),
	}}
	if random.IntN(3) == 0 {
		f.Scale = PValue
	}
	if random.IntN(2) == 0 {
		f.Unit = footLambert
	}
	withRoles, withAmbient, withTimes := random.IntN(2) == 0, random.IntN(2) == 0, random.IntN(2) == 0
	add := func(level int, role Role) {
		v := math.Exp(40*random.Float64() - 30) // down to far below any meter
		if random.IntN(10) == 0 {
			v = 0
		}
		r := Reading{Level: level, Role: role, Luminance: photometry.CdM2(v)}
		if f.Unit == footLambert {
			r.Luminance = photometry.FootLambert(v).CdM2()
		}
		if withAmbient {
			r.Ambient = []Ambient{Unstated, Included, Excluded}[random.IntN(3)]
		}
		if withTimes && random.IntN(4) > 0 {
			zone := time.UTC
			if minutes := random.IntN(28*60) - 14*60; minutes != 0 {
				zone = time.FixedZone("", 60*minutes)
			}
			r.Time = time.Unix(random.Int64N(1<<32), random.Int64N(1e9)).In(zone)
		}
		f.Readings = append(f.Readings, r)
	}
	top := 1<<f.Metadata.Bits - 1
	seen := map[int]bool{}
	for _, level := range append([]int{0, top}, random.Perm(min(top, 40))...) {
		if !seen[level] {
			seen[level] = true
			add(level, Series)
			for withRoles && random.IntN(3) == 0 {
				add(level, []Role{Repeat, Drift}[random.IntN(2)])
			}
		}
	}
	random.Shuffle(len(f.Readings), func(i, k int) { f.Readings[i], f.Readings[k] = f.Readings[k], f.Readings[i] })
	return f
}

// TestWriteParses: what is written is read back the same, and another CSV reader finds the same
// levels in it.
func TestWriteParses(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 6))
	for range 2000 {
		f := anyFile(random)
		header, rows := records(t, roundTrip(t, f), ',')
		if len(rows) != len(f.Readings) || len(header) < 2 {
			t.Fatalf("another reader finds %d rows, want %d", len(rows), len(f.Readings))
		}
		for i, r := range f.Readings {
			if rows[i][0] != strconv.Itoa(r.Level) {
				t.Fatalf("another reader finds level %s, want %d", rows[i][0], r.Level)
			}
		}
	}
}

func TestSamplesRoundTrip(t *testing.T) {
	for _, name := range sampleNames(t) {
		if !places[name] {
			roundTrip(t, sample(t, name))
		}
	}
}

// TestWritten pins the form of a file.
func TestWritten(t *testing.T) {
	zone := time.FixedZone("", 3600)
	ambient, r := photometry.CdM2(0.12), 0.002
	f := &File{
		Name: "w.csv", Scale: PValue, Unit: "fL",
		Metadata: Metadata{Bits: 10, Ambient: &ambient, Serial: "EV-1001", Repeatability: &r},
		Readings: []Reading{
			{Level: 0, Luminance: photometry.FootLambert(0.3).CdM2(), Role: Series, Ambient: Excluded},
			{Level: 1023, Luminance: photometry.FootLambert(121.7).CdM2(), Role: Series, Ambient: Included, Time: time.Date(2026, 11, 2, 14, 5, 0, 0, zone)},
			{Level: 0, Luminance: photometry.FootLambert(1e-7).CdM2(), Role: Drift},
		},
	}
	const want = "# bits: 10\n# ambient_cd_m2: 0.12\n# serial: EV-1001\n# repeatability: 0.002\n" +
		"p_value,luminance_fl,role,ambient_included,time\n" +
		"0,0.3,series,no,\n1023,121.7,series,yes,2026-11-02T14:05:00+01:00\n0,1e-07,drift,,\n"
	if got := string(roundTrip(t, f)); got != want {
		t.Errorf("written:\n%s\nwant:\n%s", got, want)
	}

	bare := &File{Readings: []Reading{{Level: 0, Luminance: 0.64}, {Level: 255, Luminance: 520.9}}}
	var b bytes.Buffer
	if err := Write(&b, bare); err != nil {
		t.Fatal(err)
	}
	if want := "level,luminance_cd_m2\n0,0.64\n255,520.9\n"; b.String() != want {
		t.Errorf("written %q, want %q", b.String(), want)
	}
}

// TestShortestFootLambert: decimals as a meter shows them come back as they were.
func TestShortestFootLambert(t *testing.T) {
	for i := range 100_000 {
		want := plainNumber(float64(i) / 1000)
		v, err := strconv.ParseFloat(want, 64)
		if err != nil {
			t.Fatal(err)
		}
		if got := formatFootLambert(photometry.FootLambert(v).CdM2()); got != want {
			t.Fatalf("%s fL is written %s", want, got)
		}
	}
	// A luminance that no foot-lambert gives exactly stays within a unit of its last place.
	for i := range 1000 {
		l := photometry.CdM2(1 + float64(i)/1000)
		v, err := strconv.ParseFloat(formatFootLambert(l), 64)
		if err != nil {
			t.Fatal(err)
		}
		if got := photometry.FootLambert(v).CdM2(); math.Abs(float64(got-l)) > 0x1p-52 {
			t.Errorf("%v cd/m2 comes back as %v", l, got)
		}
	}
}

// TestWriteTimes: an offset that RFC 3339 cannot say, and a clock that runs on, lose nothing that counts.
func TestWriteTimes(t *testing.T) {
	moment := time.Date(1890, 1, 2, 3, 4, 5, 6, time.FixedZone("local mean time", 3208))
	f := &File{Readings: []Reading{{Level: 0, Luminance: 0.64, Time: moment}, {Level: 255, Luminance: 520.9, Time: time.Now()}}}
	var b bytes.Buffer
	if err := Write(&b, f); err != nil {
		t.Fatal(err)
	}
	back := mustParse(t, "t.csv", b.String())
	for i, r := range back.Readings {
		if !r.Time.Equal(f.Readings[i].Time) {
			t.Errorf("time %v comes back as %v", f.Readings[i].Time, r.Time)
		}
	}
}

func TestWriteRefuses(t *testing.T) {
	negative := photometry.CdM2(-1)
	nan := math.NaN()
	for name, change := range map[string]func(*File){
		"line end in the serial":  func(f *File) { f.Metadata.Serial = "EV-1001\n# bits: 16" },
		"return in the meter":     func(f *File) { f.Metadata.Meter = "a\rb" },
		"space around the class":  func(f *File) { f.Metadata.Class = " diagnostic" },
		"long scheme":             func(f *File) { f.Metadata.Scheme = strings.Repeat("x", maxText+1) },
		"ramp that is not UTF-8":  func(f *File) { f.Metadata.Ramp = "\xff" },
		"no such depth":           func(f *File) { f.Metadata.Bits = 17 },
		"negative depth":          func(f *File) { f.Metadata.Bits = -8 },
		"negative ambient":        func(f *File) { f.Metadata.Ambient = &negative },
		"repeatability not known": func(f *File) { f.Metadata.Repeatability = &nan },
		"unknown scale":           func(f *File) { f.Scale = "gray" },
		"unknown unit":            func(f *File) { f.Unit = "nit" },
		"unknown role":            func(f *File) { f.Readings[0].Role = "first,no" },
		"unknown ambient":         func(f *File) { f.Readings[0].Ambient = "maybe" },
		"negative luminance":      func(f *File) { f.Readings[0].Luminance = -1 },
		"luminance not a number":  func(f *File) { f.Readings[0].Luminance = photometry.CdM2(nan) },
		"foot-lambert not known":  func(f *File) { f.Unit, f.Readings[0].Luminance = "fL", photometry.CdM2(nan) },
		"infinite luminance":      func(f *File) { f.Readings[1].Luminance = photometry.CdM2(math.Inf(1)) },
		"negative level":          func(f *File) { f.Readings[0].Level = -1 },
		"level twice":             func(f *File) { f.Readings[1].Level = 0 },
		"end missing":             func(f *File) { f.Readings[1].Level = 254 },
		"no readings":             func(f *File) { f.Readings = nil },
		"year beyond RFC 3339":    func(f *File) { f.Readings[0].Time = time.Date(10_000, 1, 1, 0, 0, 0, 0, time.UTC) },
	} {
		t.Run(name, func(t *testing.T) {
			f := &File{Name: "w.csv", Readings: []Reading{{Level: 0, Luminance: 0.64}, {Level: 255, Luminance: 520.9}}}
			change(f)
			var b bytes.Buffer
			err := Write(&b, f)
			if err == nil {
				t.Fatalf("written:\n%s", b.String())
			}
			checkFormatError(t, "w.csv", err)
			if b.Len() > 0 {
				t.Errorf("refused, but wrote %q", b.String())
			}
		})
	}
}

func TestWriterFails(t *testing.T) {
	r, w := io.Pipe()
	r.CloseWithError(errDiskFull)
	err := Write(w, &File{Name: "w.csv", Readings: []Reading{{Level: 0, Luminance: 0.64}, {Level: 255, Luminance: 520.9}}})
	if !errors.Is(err, errDiskFull) || !strings.HasPrefix(err.Error(), "w.csv: ") {
		t.Errorf("error %v, want %v", err, errDiskFull)
	}
}

var errDiskFull = errors.New("no space left")
