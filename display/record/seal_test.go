package record

import (
	"bytes"
	"errors"
	"flag"
	"io/fs"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
)

var update = flag.Bool("update", false, "write the golden files anew")

// sample is a visit with every part of a record in it. Invented.
func sample(t testing.TB) Record {
	t.Helper()
	in := response.Input{Bits: 8, Scale: readings.DDL, Light: response.MeasuredAmbient(.2, nil), Noise: response.Noise{Repeatability: .002, Floor: .001, Resolution: .01}}
	r := Record{
		Program: "evenstep test",
		Visit:   Visit{Kind: "acceptance", Time: "2026-11-30T09:15:00Z", Notes: "Blende zu; Größe ≥ 21\""},
		Monitor: Monitor{Serial: "EV-1001", Name: "left", Ramp: "identity"},
		Persons: []Person{{ID: "p-001", Part: "measured"}},
		Meter:   Meter{ID: "meter-01", CalibratedOn: "2026-05-04", Resolution: .01},
		File:    &SourceFile{Name: "a.csv", SHA256: strings.Repeat("0", 64), Unit: "cd/m2"},
	}
	for i, l := range []float64{.9, 4, 14, 33, 66, 118, 197, 310, 470} {
		level := i * 255 / 8
		in.Readings = append(in.Readings, readings.Reading{Level: level, Luminance: photometry.CdM2(l), Role: readings.Series, Ambient: readings.Excluded})
		r.Readings = append(r.Readings, Reading{Level: level, Luminance: l, Role: "series", Time: "2026-11-30T09:00:00Z"})
	}
	resp, err := response.Evaluate(in)
	if err != nil {
		t.Fatal(err)
	}
	s, err := criteria.Find("acr-aapm-siim-2012")
	if err != nil {
		t.Fatal(err)
	}
	if r.Scheme, err = s.Use("diagnostic", nil); err != nil {
		t.Fatal(err)
	}
	r.Assessment = criteria.Assess(criteria.Visit{Response: resp}, r.Scheme)
	r.Places = []Place{{Position: "centre", Level: 204, Luminance: 190, Colour: &[2]float64{.198, .468}}}
	lmax := 455.
	r.Neighbour = &Neighbour{Serial: "EV-1002", LuminanceMax: &lmax}
	return r
}

// TestJudgedAgain: a record holds all that its assessment was made from.
func TestJudgedAgain(t *testing.T) {
	sealed, _ := seal(t, sample(t))
	v, err := sealed.Measured()
	if err != nil {
		t.Fatal(err)
	}
	again := criteria.Assess(v, sealed.Scheme)
	// Places and neighbour of the sample were added by hand after it was assessed.
	again.PairMatch, again.NotAssessed = nil, sealed.Assessment.NotAssessed
	if d := cmp.Diff(sealed.Assessment, again); d != "" {
		t.Errorf("judging the record again differs:\n%s", d)
	}
	taken := Record{}
	taken.Take(response.Input{Readings: []readings.Reading{{Level: 3, Luminance: 2, Role: readings.Drift, Ambient: readings.Included}}}, v.Places, v.Neighbour)
	if d := cmp.Diff(sealed.Places, taken.Places); d != "" {
		t.Errorf("places:\n%s", d)
	}
	if r := taken.Readings[0]; r.Role != "drift" || !r.AmbientIncluded || *taken.Neighbour.LuminanceMax != 455 {
		t.Errorf("%+v, %+v", r, taken.Neighbour)
	}
}

func seal(t testing.TB, r Record) (*Record, []byte) {
	t.Helper()
	sealed, text, err := Seal(r)
	if err != nil {
		t.Fatal(err)
	}
	return sealed, text
}

func TestSealAndRead(t *testing.T) {
	sealed, text := seal(t, sample(t))
	got, err := Read("r.json", text)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(sealed, got, cmp.AllowUnexported(criteria.Limit{})); d != "" {
		t.Errorf("what was read differs from what was sealed:\n%s", d)
	}
	if c := (&Record{SHA256: "a1b2c3d4e5f6" + strings.Repeat("0", 52)}).Code(); c != "A1B2-C3D4-E5F6" {
		t.Errorf("code %q", c)
	}
	if (&Record{}).Code() != "" {
		t.Error("a record without hash has a code")
	}
	_, again := seal(t, *got)
	if !bytes.Equal(again, text) {
		t.Error("sealing what was read gives other bytes")
	}
}

// TestFormIsKept holds the record's form: a change of it is a change of what sites have on disk. The
// figures are left to the tests of response; here they are rounded away by taking them out.
func TestFormIsKept(t *testing.T) {
	r := sample(t)
	r.Assessment = criteria.Assessment{Verdict: criteria.NotAssessed}
	_, text := seal(t, r)
	golden := filepath.Join("testdata", "record.golden.json")
	if *update {
		if err := os.WriteFile(golden, text, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(string(want), string(text)); d != "" {
		t.Errorf("the form of a record changed:\n%s", d)
	}
	if _, err := Read(golden, want); err != nil {
		t.Errorf("a record of before is not read: %v", err)
	}
}

// TestEveryByteCounts changes each byte of a record, one at a time.
func TestEveryByteCounts(t *testing.T) {
	_, text := seal(t, sample(t))
	stride := 1
	if testing.Short() {
		stride = 7
	}
	rng := rand.New(rand.NewPCG(1, 2))
	for i := 0; i < len(text); i += stride {
		changed := bytes.Clone(text)
		changed[i] ^= byte(1 + rng.IntN(255))
		if _, err := Read("r.json", changed); err == nil {
			t.Fatalf("byte %d changed from %q to %q and was not noticed", i, text[i], changed[i])
		}
	}
}

func TestEveryLengthCounts(t *testing.T) {
	_, text := seal(t, sample(t))
	stride := 1
	if testing.Short() {
		stride = 7
	}
	for n := 0; n < len(text); n += stride {
		if _, err := Read("r.json", text[:n]); err == nil {
			t.Fatalf("the first %d of %d bytes were read as a record", n, len(text))
		} else if !errors.Is(err, ErrTruncated) {
			t.Fatalf("the first %d bytes: %v; want %v", n, err, ErrTruncated)
		}
	}
	if _, err := Read("r.json", append(text, '\n')); !errors.Is(err, ErrAltered) {
		t.Errorf("another line break: %v", err)
	}
}

func TestReadRefuses(t *testing.T) {
	sealed, text := seal(t, sample(t))
	replace := func(old, new string) []byte {
		out := bytes.Replace(text, []byte(old), []byte(new), 1)
		if bytes.Equal(out, text) {
			t.Fatalf("%q is not in the record", old)
		}
		return out
	}
	for _, c := range []struct {
		name string
		text []byte
		want error
	}{
		{"newer", replace(`"version":1`, `"version":2`), ErrNewer},
		{"older", replace(`"version":1`, `"version":0`), ErrAltered},
		{"foreign", replace(Schema, "something"), ErrForeign},
		{"not an object", []byte("[1]\n"), ErrForeign},
		{"white space", replace(`{`, `{ `), ErrAltered},
		{"order of keys", []byte(strings.Replace(string(text), `{"ambient_cd_m2"`, `{"zambient_cd_m2"`, 1)), ErrAltered},
		{"figure", replace(`"luminance_cd_m2":4`, `"luminance_cd_m2":5`), ErrAltered},
		{"hash", replace(`"sha256":"`+string(text[bytes.LastIndex(text, []byte(`"sha256":"`))+10]), `"sha256":"z`), ErrAltered},
		{"no JSON", []byte("level,luminance\n"), ErrForeign},
		{"zeros", make([]byte, len(text)), ErrForeign},
		{"first byte", append([]byte("x"), text[1:]...), ErrAltered},
		{"not UTF-8", replace(`"left"`, "\"l\xffft\""), ErrAltered},
		{"line end of another system", replace("\n", "\r\n"), ErrAltered},
		{"no hash", replace(`,"sha256":"`+sealed.SHA256+`"`, ""), ErrAltered},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := Read("r.json", c.text)
			if !errors.Is(err, c.want) {
				t.Fatalf("%v; want %v", err, c.want)
			}
			if !strings.HasPrefix(err.Error(), "r.json: ") || strings.ContainsAny(err.Error(), "\r\n") {
				t.Errorf("%q; want one line that names the file", err)
			}
		})
	}
}

// TestUnknownField: a record with a key that this program does not know is not read in part, though
// its hash is right.
func TestUnknownField(t *testing.T) {
	_, text := seal(t, sample(t))
	for _, c := range []struct{ old, new string }{
		{`"program":`, `"programme":`},
		{`"program":`, `"Program":`},   // which the standard library's decoder takes for program
		{`"position":`, `"poſition":`}, // likewise: a long s
	} {
		changed := bytes.Replace(text, []byte(c.old), []byte(c.new), 1)
		if bytes.Equal(changed, text) {
			t.Fatalf("%s is not in the record", c.old)
		}
		if _, err := Read("r.json", resealed(t, changed)); !errors.Is(err, ErrForeign) {
			t.Errorf("%s: %v; want %v", c.new, err, ErrForeign)
		}
	}
	if _, err := Read("r.json", resealed(t, text)); err != nil {
		t.Errorf("without a change: %v", err)
	}
}

// resealed gives a changed record the hash of its content.
func resealed(t *testing.T, text []byte) []byte {
	t.Helper()
	v, err := parse(text)
	if err != nil {
		t.Fatal(err)
	}
	o := v.(object)
	var bare object
	for _, m := range o {
		if m.key != "sha256" {
			bare = append(bare, m)
		}
	}
	sum := hashOf(appendCanonical(nil, bare))
	for i := range o {
		if o[i].key == "sha256" {
			o[i].value = sum
		}
	}
	return append(appendCanonical(nil, o), '\n')
}

func TestSealRefuses(t *testing.T) {
	for _, c := range []struct {
		name   string
		change func(*Record)
		want   string
	}{
		{"kind", func(r *Record) { r.Visit.Kind = "party" }, `kind of visit is "party"`},
		{"time", func(r *Record) { r.Visit.Time = "30.11.2026" }, "expected RFC 3339"},
		{"time without a leading zero", func(r *Record) { r.Visit.Time = "2026-11-30T9:15:00Z" }, "expected RFC 3339"},
		{"time with a comma", func(r *Record) { r.Visit.Time = "2026-11-30T09:15:00,5Z" }, "expected RFC 3339"},
		{"time of a reading", func(r *Record) { r.Readings[0].Time = "noon" }, "level 0: time of the reading"},
		{"calibration", func(r *Record) { r.Meter.CalibratedOn = "May" }, "day of the meter's calibration"},
		{"long id", func(r *Record) { r.Persons[0].ID = strings.Repeat("x", 65) }, "at most 64 characters"},
		{"long id of the meter", func(r *Record) { r.Meter.ID = strings.Repeat("é", 65) }, "at most 64 characters"},
		{"id not UTF-8", func(r *Record) { r.Meter.ID = "\xff" }, "at most 64 characters"},
		{"serial of the neighbour", func(r *Record) { r.Neighbour.Serial = "\x1b[0m" }, "neighbour's serial"},
		{"line break", func(r *Record) { r.Monitor.Serial = "a\nb" }, "no line breaks"},
		{"no id", func(r *Record) { r.Persons[0].ID = "" }, "a person has no id"},
		{"notes", func(r *Record) { r.Visit.Notes = strings.Repeat("x", 4001) }, "the notes have 4001 characters"},
		{"not a number", func(r *Record) { r.Readings[0].Luminance = math.NaN() }, "expected finite numbers"},
		{"not finite", func(r *Record) { r.Assessment.LuminanceMax = math.Inf(1) }, "expected finite numbers"},
	} {
		t.Run(c.name, func(t *testing.T) {
			r := sample(t)
			c.change(&r)
			if _, _, err := Seal(r); err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("%v; want %q", err, c.want)
			}
		})
	}
}

// TestListsAreLists: a list of nothing reads [], never null, and what was handed in is left as it was.
func TestListsAreLists(t *testing.T) {
	r := Record{
		Visit:      Visit{Kind: "check", Time: "2026-11-30T09:15:00Z"},
		Scheme:     &criteria.Used{},
		Assessment: criteria.Assessment{Causes: []response.Cause{{}}},
	}
	sealed, text := seal(t, r)
	for _, key := range []string{"persons", "readings", "limits", "steps", "intervals", "findings", "not_assessed", "cause"} {
		if !bytes.Contains(text, []byte(`"`+key+`":[]`)) {
			t.Errorf("%s is no empty list in %s", key, text)
		}
	}
	if r.Persons != nil || r.Scheme.Limits != nil || r.Assessment.Causes[0].Causes != nil {
		t.Errorf("sealing changed what it was given: %+v", r)
	}
	got, err := Read("r.json", text)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(sealed, got, cmp.AllowUnexported(criteria.Limit{})); d != "" {
		t.Errorf("what was read differs from what was sealed:\n%s", d)
	}
}

// TestFileNameNotUTF8: a name from an old file system does not keep a visit from being sealed.
func TestFileNameNotUTF8(t *testing.T) {
	r := sample(t)
	r.File.Name = "gr\xfcn.csv"
	sealed, text := seal(t, r)
	got, err := Read("r.json", text)
	if err != nil || got.File.Name != "gr\ufffdn.csv" || sealed.File.Name != got.File.Name {
		t.Errorf("sealed %q, read %q (%v)", sealed.File.Name, got.File.Name, err)
	}
}

func TestWriteFile(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "r.json")
	read := func() string {
		t.Helper()
		b, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		return string(b)
	}
	if err := WriteFile(path, []byte("one"), false); err != nil || read() != "one" {
		t.Fatalf("%q, %v", read(), err)
	}
	if err := WriteFile(path, []byte("two"), false); !errors.Is(err, fs.ErrExist) || read() != "one" {
		t.Errorf("%q, %v; want the file left alone", read(), err)
	}
	if err := WriteFile(path, []byte("one"), false); err != nil {
		t.Errorf("the same once more: %v", err)
	}
	if err := WriteFile(path, []byte("two"), true); err != nil || read() != "two" {
		t.Errorf("%q, %v", read(), err)
	}
	if err := WriteFile(filepath.Join(dir, "none", "r.json"), nil, true); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("no folder: %v", err)
	}
	if err := WriteFile(filepath.Join(path, "r.json"), nil, true); err == nil {
		t.Error("a file was taken for a folder")
	}
	if err := os.Mkdir(filepath.Join(dir, "folder"), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := WriteFile(filepath.Join(dir, "folder"), []byte("x"), true); err == nil {
		t.Error("a folder was written over")
	}
	if err := WriteFile(filepath.Join(dir, "folder"), []byte("x"), false); !errors.Is(err, fs.ErrExist) {
		t.Errorf("a folder in the place: %v", err)
	}
	left, err := os.ReadDir(dir)
	if err != nil || len(left) != 2 {
		t.Errorf("left behind: %v, %v", left, err)
	}
}

// TestWriteFileInClosedFolder: a folder that takes no new file keeps its old one.
func TestWriteFileInClosedFolder(t *testing.T) {
	if os.Geteuid() <= 0 {
		t.Skip("permissions do not bind this user or system")
	}
	dir := t.TempDir()
	path := filepath.Join(dir, "r.json")
	if err := os.WriteFile(path, []byte("old"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Chmod(dir, 0o500); err != nil {
		t.Fatal(err)
	}
	defer os.Chmod(dir, 0o700)
	if err := WriteFile(path, []byte("new"), true); !errors.Is(err, fs.ErrPermission) {
		t.Errorf("%v; want %v", err, fs.ErrPermission)
	}
	if b, err := os.ReadFile(path); err != nil || string(b) != "old" {
		t.Errorf("%q, %v; want the old file", b, err)
	}
}

func FuzzRead(f *testing.F) {
	_, text := seal(f, sample(f))
	f.Add(text)
	f.Add([]byte("{}\n"))
	f.Fuzz(func(t *testing.T, text []byte) {
		r, err := Read("r.json", text)
		if err != nil {
			if strings.ContainsAny(err.Error(), "\r\n") {
				t.Errorf("error of several lines: %q", err)
			}
			return
		}
		if _, again := seal(t, *r); !bytes.Equal(again, text) {
			t.Errorf("a record was read that the program would not write")
		}
	})
}
