package readings

import (
	"bytes"
	"crypto/sha256"
	"encoding/csv"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strconv"
	"strings"
	"testing"
	"testing/iotest"
	"time"

	"evenstep/display/photometry"
)

var samples = filepath.Join("..", "..", "testdata", "readings")

// places are the samples that hold places.
var places = map[string]bool{"demo-places.csv": true, "ppp-uniformity.csv": true}

func sampleNames(t testing.TB) []string {
	t.Helper()
	paths, err := filepath.Glob(filepath.Join(samples, "*.csv"))
	if err != nil {
		t.Fatal(err)
	}
	if len(paths) < 16 {
		t.Fatalf("%d files in %s, want 16 or more", len(paths), samples)
	}
	var names []string
	for _, p := range paths {
		names = append(names, filepath.Base(p))
	}
	return names
}

func sampleBytes(t testing.TB, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(samples, name))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func mustParse(t testing.TB, name, content string) *File {
	t.Helper()
	f, err := Parse(name, strings.NewReader(content))
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func sample(t testing.TB, name string) *File {
	t.Helper()
	return mustParse(t, name, string(sampleBytes(t, name)))
}

// records reads a file with the CSV reader of the standard library: the rows below the header.
func records(t testing.TB, content []byte, delim rune) (header []string, rows [][]string) {
	t.Helper()
	r := csv.NewReader(bytes.NewReader(bytes.TrimPrefix(content, []byte("\xef\xbb\xbf"))))
	r.Comment, r.Comma = '#', delim
	all, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	return all[0], all[1:]
}

// TestSamples reads every sample, and compares its cells with another CSV reader's.
func TestSamples(t *testing.T) {
	delims := map[string]rune{"semicolon-decimal-comma.csv": ';', "tab.csv": '\t'}
	for _, name := range sampleNames(t) {
		t.Run(name, func(t *testing.T) {
			b := sampleBytes(t, name)
			if !bytes.HasPrefix(bytes.TrimPrefix(b, []byte("\xef\xbb\xbf")), []byte("# source: ")) {
				t.Error("the first line does not say where the file comes from")
			}
			sum := fmt.Sprintf("%x", sha256.Sum256(b))
			if places[name] {
				f, err := ParsePlaces(name, bytes.NewReader(b))
				if err != nil {
					t.Fatal(err)
				}
				if f.Name != name || f.SHA256 != sum {
					t.Errorf("name %q and checksum %s", f.Name, f.SHA256)
				}
				return
			}
			f, err := Parse(name, bytes.NewReader(b))
			if err != nil {
				t.Fatal(err)
			}
			if f.Name != name || f.SHA256 != sum {
				t.Errorf("name %q and checksum %s", f.Name, f.SHA256)
			}
			delim := ','
			if d, ok := delims[name]; ok {
				delim = d
			}
			header, rows := records(t, b, delim)
			at := map[string]int{}
			for i, h := range header {
				at[strings.ToLower(strings.TrimSpace(h))] = i
			}
			level, ok := at["level"]
			if !ok {
				level = at["ddl"]
			}
			lum, factor := at["luminance_cd_m2"], 1.0
			if i, ok := at["luminance"]; ok {
				lum = i
			}
			if i, ok := at["luminance_fl"]; ok {
				lum, factor = i, 3.426259 // NIST Special Publication 811, Appendix B
			}
			if n := len(rows); n != len(f.Readings) && n != len(f.Readings)+1 { // one sample ends with an empty row
				t.Fatalf("%d readings of %d rows", len(f.Readings), n)
			}
			for i, r := range f.Readings {
				if got := strconv.Itoa(r.Level); got != rows[i][level] {
					t.Errorf("row %d: level %s, want %s", i, got, rows[i][level])
				}
				v, err := strconv.ParseFloat(strings.Replace(rows[i][lum], ",", ".", 1), 64)
				if err != nil {
					t.Fatal(err)
				}
				// The factor has seven digits.
				if want := v * factor; math.Abs(float64(r.Luminance)-want) > 2e-7*want {
					t.Errorf("row %d: %v cd/m2, want %v", i, r.Luminance, want)
				}
				if i > 0 && r.Line <= f.Readings[i-1].Line {
					t.Errorf("row %d: line %d after %d", i, r.Line, f.Readings[i-1].Line)
				}
			}
		})
	}
}

// TestPublishedSample compares with the luminances printed in DICOM PS3.17 Annex PPP.3.1, whose
// twelfth level is misprinted, and with the five places printed there.
func TestPublishedSample(t *testing.T) {
	luminances := []photometry.CdM2{0.64, 2.03, 4.17, 7.11, 11.12, 16.75, 24.07, 33.67, 46.24, 63.12, 83.94, 110.6, 144.9, 190.1, 246.3, 317.8, 406.4, 520.9}
	for name, twelfth := range map[string]int{"ppp-annex.csv": 165, "ppp-annex-as-printed.csv": 160} {
		f := sample(t, name)
		for i, r := range f.Readings {
			level := 15 * i
			if i == 11 {
				level = twelfth
			}
			if r.Level != level || r.Luminance != luminances[i] || r.Ambient != Excluded || r.Role != Series || !r.Time.IsZero() {
				t.Errorf("%s: reading %d is %+v, want level %d and %v cd/m2", name, i, r, level, luminances[i])
			}
		}
		if len(f.Readings) != 18 || f.Scale != DDL || f.Unit != "cd/m2" || f.Metadata.Bits != 8 || *f.Metadata.Ambient != 0.408 {
			t.Errorf("%s: %d readings, %+v", name, len(f.Readings), f.Metadata)
		}
	}
	f, err := ParsePlaces("ppp-uniformity.csv", bytes.NewReader(sampleBytes(t, "ppp-uniformity.csv")))
	if err != nil {
		t.Fatal(err)
	}
	want := []Place{
		{TopLeft, 204, 191.5, nil, 5},
		{TopRight, 204, 176.1, nil, 6},
		{Centre, 204, 197.2, nil, 7},
		{BottomLeft, 204, 202.5, nil, 8},
		{BottomRight, 204, 195.8, nil, 9},
	}
	if !reflect.DeepEqual(f.Places, want) || f.Unit != "cd/m2" {
		t.Errorf("places %+v in %s", f.Places, f.Unit)
	}
}

func TestSampleMetadata(t *testing.T) {
	m := sample(t, "demo-good.csv").Metadata
	if m.Bits != 8 || *m.Ambient != 0.12 || m.Illuminance != nil || m.Rd != nil || m.Meter != "meter-01" || m.Serial != "EV-1001" ||
		*m.Repeatability != 0.002 || *m.NoiseFloor != 0.002 || m.Ramp != "" || m.Scheme != "acr-aapm-siim-2012" || m.Class != "diagnostic" {
		t.Errorf("demo-good.csv: %+v", m)
	}
	if m := sample(t, "ten-bit.csv").Metadata; m.Bits != 10 {
		t.Errorf("ten-bit.csv: %d bits, stated below the rows", m.Bits)
	}
	m = sample(t, "semicolon-decimal-comma.csv").Metadata
	if *m.Ambient != 0.12 || *m.Repeatability != 0.002 {
		t.Errorf("semicolon-decimal-comma.csv: ambient %v, repeatability %v", *m.Ambient, *m.Repeatability)
	}
	f := sample(t, "footlambert.csv")
	if f.Unit != "fL" || *f.Metadata.Illuminance != 24 || *f.Metadata.Rd != 0.005 || f.Readings[0].Ambient != Included {
		t.Errorf("footlambert.csv: %s, %+v", f.Unit, f.Metadata)
	}
	f = sample(t, "repeats-drift.csv")
	roles := map[Role]int{}
	for _, r := range f.Readings {
		roles[r.Role]++
	}
	if roles[Series] != 18 || roles[Repeat] != 4 || roles[Drift] != 2 || f.Metadata.Ramp != "identity" {
		t.Errorf("repeats-drift.csv: %v", roles)
	}
	if want := time.Date(2026, 11, 2, 13, 5, 12, 0, time.UTC); !f.Readings[0].Time.Equal(want) {
		t.Errorf("repeats-drift.csv: first at %v, want %v", f.Readings[0].Time, want)
	}
}

// TestLegal reads what looks odd and is right.
func TestLegal(t *testing.T) {
	const two = "level,luminance\n0,0.64\n255,520.9\n"
	clock := func(name, cell string, want time.Time) legal {
		return legal{name, "level,luminance,time\n0,0.64," + cell + "\n255,520.9,\n", func(f *File) bool {
			return f.Readings[0].Time.Equal(want) && f.Readings[1].Time.IsZero()
		}}
	}
	lum := func(name, cell string, want photometry.CdM2) legal {
		return legal{name, "level;luminance\n0;" + cell + "\n255;520\n", func(f *File) bool {
			return f.Readings[0].Luminance == want && !math.Signbit(float64(f.Readings[0].Luminance))
		}}
	}
	free := func(comment string) legal {
		return legal{"comment " + comment, comment + "\n" + two, func(f *File) bool {
			return reflect.DeepEqual(f.Metadata, Metadata{Bits: 8}) && f.Readings[0].Line == 3
		}}
	}
	rows := []legal{
		{"two levels", two, func(f *File) bool { return len(f.Readings) == 2 && f.Metadata.Bits == 8 }},
		{"no end of the last line", strings.TrimSuffix(two, "\n"), func(f *File) bool { return f.Readings[1].Luminance == 520.9 }},
		{"CR alone", strings.ReplaceAll(two, "\n", "\r"), func(f *File) bool { return f.Readings[1].Line == 3 }},
		{"CRLF", strings.ReplaceAll(two, "\n", "\r\n"), func(f *File) bool { return f.Readings[1].Line == 3 }},
		{"ends of line mixed", "level,luminance\r\n0,0.64\r\r\n\n255,520.9\n", func(f *File) bool { return f.Readings[1].Line == 5 }},
		{"byte-order mark", "\ufeff" + two, func(f *File) bool { return f.Readings[0].Level == 0 }},
		{"blank lines", "\n\n" + strings.ReplaceAll(two, "\n", "\n \t\n"), func(f *File) bool { return f.Readings[1].Line == 7 }},
		{"spaces and case", " LEVEL , Luminance_CD_m2 ,\tRole\n 0 , 0.64 , Series \n255,520.9,REPEAT\n255,520.8,\n", func(f *File) bool {
			return f.Readings[0].Role == Series && f.Readings[1].Role == Repeat && f.Readings[2].Role == Series
		}},
		{"quoted names", "\"level\";\"luminance\"\n0;0.64\n255;520.9\n", func(f *File) bool { return len(f.Readings) == 2 }},
		{"p_value", "P_Value,luminance\n0,0.64\n255,520.9\n", func(f *File) bool { return f.Scale == PValue }},
		{"ddl", "ddl,luminance\n0,0.64\n255,520.9\n", func(f *File) bool { return f.Scale == DDL }},
		{"columns in another order", "luminance,role,level\n0.64,,0\n520.9,,255\n", func(f *File) bool { return f.Readings[1].Level == 255 }},
		{"quoted cells", "\"level\",\"luminance\"\n\"0\", \"0.64\" \n255,\"520.9\"\n", func(f *File) bool { return f.Readings[0].Luminance == 0.64 }},
		{"delimiter in a quoted cell", "level;luminance;ambient_included\n0;\"0,64\";\"no\"\n255;520,9;YES\n", func(f *File) bool {
			return f.Readings[0].Luminance == 0.64 && f.Readings[0].Ambient == Excluded && f.Readings[1].Ambient == Included
		}},
		{"tabs with empty cells", "level\tluminance\trole\n0\t0,64\t\n255\t520,9\t\n", func(f *File) bool { return f.Readings[1].Luminance == 520.9 }},
		{"empty columns and rows of a spreadsheet", "level,luminance,,\n0,0.64,,\n,,,\n255,520.9,,\n,,,,,\n", func(f *File) bool { return len(f.Readings) == 2 }},
		{"levels falling", "level,luminance\n255,520.9\n0,0.64\n", func(f *File) bool { return f.Readings[0].Level == 255 }},
		{"repeat before its series", "level,luminance,role\n0,0.6,drift\n0,0.62,repeat\n0,0.64,\n255,520.9,\n", func(f *File) bool { return f.Readings[0].Role == Drift }},
		{"luminance falling", "level,luminance\n0,0.64\n9,0.60\n255,0.3\n", func(f *File) bool { return len(f.Readings) == 3 }},
		{"level with zeros before", "level,luminance\n000,0.64\n0255,520.9\n", func(f *File) bool { return f.Readings[1].Level == 255 }},
		{"1 bit", "# bits: 1\nlevel,luminance\n0,0.64\n1,520.9\n", func(f *File) bool { return f.Metadata.Bits == 1 }},
		{"16 bits, stated last", "level,luminance\n0,0.64\n65535,520.9\n# bits: 16\n", func(f *File) bool { return f.Metadata.Bits == 16 }},
		{"no space in the comment", "#rd:0.005\n" + two, func(f *File) bool { return *f.Metadata.Rd == 0.005 && f.Metadata.Illuminance == nil }},
		{"comment between rows", "level,luminance\n0,0.64\n  # serial: EV: 1001 \n255,520.9\n", func(f *File) bool { return f.Metadata.Serial == "EV: 1001" }},
		{"zeros", "# ambient_cd_m2: 0\n# illuminance_lx: -0\n# noise_floor: 0\n# repeatability: 0%\n" + two, func(f *File) bool {
			m := f.Metadata
			return *m.Ambient == 0 && *m.Illuminance == 0 && !math.Signbit(float64(*m.Illuminance)) && *m.NoiseFloor == 0 && *m.Repeatability == 0
		}},
		{"greatest values", "# ambient_cd_m2: 1000\n# illuminance_lx: 1e5\n# noise_floor: 10\n# repeatability: 20 %\n# rd: 1\nlevel,luminance\n0,0\n255,100000\n", func(f *File) bool {
			m := f.Metadata
			return *m.Ambient == 1000 && *m.Illuminance == 1e5 && *m.NoiseFloor == 10 && *m.Repeatability == 0.2 && *m.Rd == 1
		}},
		{"repeatability as a fraction", "# repeatability: 0.005\n" + two, func(f *File) bool { return *f.Metadata.Repeatability == 0.005 }},
		{"repeatability per cent", "# repeatability: 0.5%\n" + two, func(f *File) bool { return *f.Metadata.Repeatability == 0.005 }},
		{"letters of other scripts", "# meter: Messgerät №\u00a01 – 輝度計\n" + two, func(f *File) bool { return f.Metadata.Meter == "Messgerät №\u00a01 – 輝度計" }},
		{"longest value", "# class: " + strings.Repeat("é", maxText) + "\n" + two, func(f *File) bool { return len(f.Metadata.Class) == 2*maxText }},
		{"longest line", "#" + strings.Repeat("x", maxLine-1) + "\n" + two, func(f *File) bool { return f.Readings[0].Line == 3 }},
		// NIST Special Publication 811: 1 fL is 3.426259 cd/m2, so 50 fL are 171.31 cd/m2.
		{"foot-lambert", "level,luminance_fl\n0,0\n255,50\n", func(f *File) bool {
			return f.Unit == "fL" && math.Abs(float64(f.Readings[1].Luminance)-171.31) < 0.005
		}},
		clock("time with offset", "2026-11-02T14:05:00+01:00", time.Date(2026, 11, 2, 13, 5, 0, 0, time.UTC)),
		clock("time in UTC", "2026-11-02T14:05:00.25Z", time.Date(2026, 11, 2, 14, 5, 0, 25e7, time.UTC)),
		clock("time without zone", "2026-11-02 14:05:00", time.Date(2026, 11, 2, 14, 5, 0, 0, time.UTC)),
		clock("time with space and offset", "2026-11-02 14:05:00-05:30", time.Date(2026, 11, 2, 19, 35, 0, 0, time.UTC)),
		clock("time with T and no zone", "2026-11-02T14:05:00.5", time.Date(2026, 11, 2, 14, 5, 0, 5e8, time.UTC)),
		clock("time of year 1", "0001-01-01T01:00:00+01:00", time.Time{}),
		lum("point", "1.234", 1.234),
		lum("comma", "1,234", 1.234),
		lum("no digit before", ".5", 0.5),
		lum("no digit after", "5,", 5),
		lum("exponent", "1.5E+2", 150),
		lum("small exponent", "12e-2", 0.12),
		lum("plus sign", "+1.5", 1.5),
		lum("minus zero", "-0.00", 0),
		free("# site: Harbour clinic"),
		free("# name: EV-1001"),
		free("# source: invented"),
		free("# seen at http://example.org/bits: no key"),
		free("# ambient light was measured first: yes"),
		free("# serial no: 7"),
		free("#:"),
		free("# : 8"),
		free("# bits 10"),
	}
	for _, row := range rows {
		t.Run(row.name, func(t *testing.T) {
			if f := mustParse(t, "legal.csv", row.content); !row.ok(f) {
				t.Errorf("%q was read as %+v", row.content, f)
			}
		})
	}
}

type legal struct {
	name, content string
	ok            func(*File) bool
}

// TestTimesDoNotDependOnTheStation: the zone is the offset, also where it is the zone of the station.
func TestTimesDoNotDependOnTheStation(t *testing.T) {
	const content = "level,luminance,time\n0,0.64,2026-11-02T14:05:00+01:00\n255,520.9,2026-11-02T14:05:00Z\n"
	before := time.Local
	defer func() { time.Local = before }()
	time.Local = time.FixedZone("HERE", 3600)
	here := mustParse(t, "a.csv", content)
	time.Local = time.FixedZone("THERE", 0)
	there := mustParse(t, "a.csv", content)
	if !reflect.DeepEqual(here, there) {
		t.Errorf("times %v and %v", here.Readings, there.Readings)
	}
}

// TestPlacesLegal reads what looks odd and is right in a file of places.
func TestPlacesLegal(t *testing.T) {
	const content = "PLACE,luminance_fl,u_prime,v_prime,ddl\n" +
		"Center,50,0.1978,0.4683,\n# bits: is no key here\nTOP-LEFT,49,,,\ntop_right,48,0,0.7,\nbottom  left,47,,,\nBottom-Right,46,,,\n" +
		"left,45,,,0\nright,45,,,0\ntop,45,,,0\nbottom,45,,,0\n" +
		"centre,45,,,0\ntop left,45,,,0\ntop right,45,,,0\nbottom left,45,,,0\nbottom right,45,,,0\n"
	f, err := ParsePlaces("p.csv", strings.NewReader(content))
	if err != nil {
		t.Fatal(err)
	}
	if f.Unit != "fL" || len(f.Places) != 14 {
		t.Fatalf("%d places in %s", len(f.Places), f.Unit)
	}
	for i, want := range []Position{Centre, TopLeft, TopRight, BottomLeft, BottomRight, Left, Right, Top, Bottom} {
		if got := f.Places[i].Position; got != want {
			t.Errorf("place %d is %q, want %q", i, got, want)
		}
	}
	p := f.Places[0]
	if p.Level != LevelUnstated || *p.Colour != (photometry.UV{U: 0.1978, V: 0.4683}) || math.Abs(float64(p.Luminance)-171.31) > 0.005 || p.Line != 2 {
		t.Errorf("first place %+v", p)
	}
	if f.Places[1].Colour != nil || f.Places[5].Level != 0 {
		t.Errorf("second and sixth place %+v, %+v", f.Places[1], f.Places[5])
	}
	if _, err := ParsePlaces("p.csv", iotest.ErrReader(os.ErrClosed)); !errors.Is(err, os.ErrClosed) {
		t.Errorf("error %v, want %v", err, os.ErrClosed)
	}
}

// TestCaps reaches each limit of a file, and goes one beyond.
func TestCaps(t *testing.T) {
	const ends = "level,luminance,role\n0,0.64,\n255,520.9,\n"
	many := ends + strings.Repeat("0,0.6,repeat\n", maxRows-2)
	if f := mustParse(t, "rows.csv", many); len(f.Readings) != maxRows {
		t.Errorf("%d readings, want %d", len(f.Readings), maxRows)
	}
	filled := "level,luminance\n0,0.64\n255,520.9\n"
	filled += strings.Repeat("#"+strings.Repeat("x", 1022)+"\n", (maxFile-len(filled))/1024)
	filled += strings.Repeat("\n", maxFile-len(filled))
	mustParse(t, "full.csv", filled)
	for name, content := range map[string]string{
		"rows.csv":   many + "0,0.6,repeat\n",
		"full.csv":   filled + "\n",
		"line.csv":   "#" + strings.Repeat("x", maxLine) + "\n" + ends,
		"value.csv":  "# class: " + strings.Repeat("é", maxText+1) + "\n" + ends,
		"header.csv": strings.Repeat("level", 100) + "\n",
	} {
		_, err := Parse(name, strings.NewReader(content))
		if err == nil {
			t.Errorf("%s was accepted", name)
			continue
		}
		checkFormatError(t, name, err)
	}
}

// TestEveryLevel reads the longest series there is.
func TestEveryLevel(t *testing.T) {
	var b strings.Builder
	b.WriteString("# bits: 16\nlevel,luminance,role,ambient_included,time\n")
	for l := range 1 << 16 {
		fmt.Fprintf(&b, "%d,%.3f,series,no,2026-11-02T14:05:00.123+01:00\n", l, 1+float64(l)/100)
	}
	f := mustParse(t, "all.csv", b.String())
	if len(f.Readings) != 1<<16 || f.Readings[65535].Luminance != 656.35 {
		t.Errorf("%d readings", len(f.Readings))
	}
}

func TestReaderFails(t *testing.T) {
	half := iotest.TimeoutReader(iotest.OneByteReader(strings.NewReader("level,luminance\n0,0.64\n")))
	_, err := Parse("half.csv", half)
	if !errors.Is(err, iotest.ErrTimeout) {
		t.Errorf("error %v, want %v", err, iotest.ErrTimeout)
	}
	checkFormatError(t, "half.csv", err)
}

// TestErrorIsOneLine gives the file a name that would break the line.
func TestErrorIsOneLine(t *testing.T) {
	for name, want := range map[string]string{
		"a\nb\x1b[2J.csv": `a\nb\x1b[2J.csv:1: unknown column "x\u202ey\x7f"`,
		"bad\xff.csv":     `bad\xff.csv:1: unknown column "x\u202ey\x7f"`,
		"Zimmer ü.csv":    `Zimmer ü.csv:1: unknown column "x\u202ey\x7f"`,
		"":                `readings:1: unknown column "x\u202ey\x7f"`,
	} {
		_, err := Parse(name, strings.NewReader("x\u202ey\x7f\n"))
		if err == nil || !strings.HasPrefix(err.Error(), want+"; expected ") {
			t.Errorf("error %q, want %q", err, want)
		}
	}
}
