package store

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/record"
)

var noon = time.Date(2026, 11, 30, 12, 0, 0, 0, time.UTC)

func newStore(t testing.TB) *Store {
	t.Helper()
	s, err := Open(filepath.Join(t.TempDir(), "register.db"))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { s.Close() })
	return s
}

func must[T any](t testing.TB) func(T, error) T {
	return func(v T, err error) T {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
}

func testMonitor() Monitor {
	return Monitor{Serial: "EV-1", Bits: 8, CalibratedIn: InMonitor, Orientation: "portrait", Scheme: "acr-aapm-siim-2012", Class: "diagnostic", Label: "left"}
}

func TestSiteIsKept(t *testing.T) {
	s := newStore(t)
	lx := photometry.Lux(32)
	room := must[int64](t)(s.SaveRoom(Room{Name: "reading room", Illuminance: &lx, Notes: "two windows"}))
	station := must[int64](t)(s.SaveStation(Station{RoomID: room, Name: "A", Place: 1}))
	m := testMonitor()
	m.StationID = &station
	rd := photometry.PerLux(.004)
	m.Rd = &rd
	id := must[int64](t)(s.SaveMonitor(m))
	got := must[Monitor](t)(s.Monitor(id))
	if got.Room != "reading room" || got.Station != "A" || got.Title() != "reading room › A › left" || *got.Rd != rd || got.BacklightHours != nil {
		t.Errorf("%+v", got)
	}
	got.Label = "right"
	must[int64](t)(s.SaveMonitor(got))
	if all := must[[]Monitor](t)(s.Monitors()); len(all) != 1 || all[0].Label != "right" {
		t.Errorf("%+v", all)
	}
	r := .002
	must[int64](t)(s.SaveMeter(Meter{Name: "meter-01", Kind: Contact, GainUncertainty: .03, Repeatability: &r, CalibratedOn: "2026-05-04"}))
	meter := must[[]Meter](t)(s.Meters())[0]
	if n := meter.Noise(); n.Gain != .015 || n.Repeatability != .002 || !n.Assumed || meter.Factor != 1 {
		t.Errorf("%+v: %+v", meter, n)
	}
	if err := s.SavePerson(Person{ID: "p-001", Role: "physicist", Name: "A. Person"}); err != nil {
		t.Fatal(err)
	}
	if err := s.SavePerson(Person{ID: "p-001", Role: "physicist"}); err != nil {
		t.Fatal(err)
	}
	if p := must[[]Person](t)(s.Persons())[0]; p.Name != "" || p.Role != "physicist" {
		t.Errorf("the name was not erased: %+v", p)
	}
	if err := s.SaveSite("Northfield", "site = \"Northfield\"\n"); err != nil {
		t.Fatal(err)
	}
	if name, limits, err := s.Site(); err != nil || name != "Northfield" || !strings.Contains(limits, "Northfield") {
		t.Errorf("%q, %q, %v", name, limits, err)
	}
}

func TestWhatIsRefused(t *testing.T) {
	s := newStore(t)
	room := must[int64](t)(s.SaveRoom(Room{Name: "a"}))
	must[int64](t)(s.SaveMonitor(testMonitor()))
	bits := testMonitor()
	bits.Serial, bits.Bits = "x", 17
	lx := photometry.Lux(-1)
	for name, err := range map[string]error{
		"no name":          second(s.SaveRoom(Room{})),
		"negative light":   second(s.SaveRoom(Room{Name: "b", Illuminance: &lx})),
		"same room":        second(s.SaveRoom(Room{Name: "a"})),
		"station nowhere":  second(s.SaveStation(Station{RoomID: room + 1, Name: "x"})),
		"same serial":      second(s.SaveMonitor(testMonitor())),
		"bits":             second(s.SaveMonitor(bits)),
		"meter's kind":     second(s.SaveMeter(Meter{Name: "m", Kind: "magic"})),
		"meter's day":      second(s.SaveMeter(Meter{Name: "m", Kind: Contact, DueOn: "soon"})),
		"person's id":      s.SavePerson(Person{}),
		"line break":       s.SavePerson(Person{ID: "a\nb"}),
		"unknown monitor":  second(s.Monitor(99)),
		"unknown record":   third(s.Record(99)),
		"unknown visit":    second(s.Draft(99)),
		"changed, unknown": second(s.SaveRoom(Room{ID: 99, Name: "z"})),
	} {
		if err == nil || strings.ContainsAny(err.Error(), "\r\n") {
			t.Errorf("%s: %v; want an error of one line", name, err)
		}
	}
}

func second[T any](_ T, err error) error        { return err }
func third[T, U any](_ T, _ U, err error) error { return err }

// visit puts a visit of nine levels on the register and returns it.
func visit(t testing.TB, s *Store, monitor int64, scale float64) Draft {
	t.Helper()
	d := must[Draft](t)(s.StartDraft(monitor, Head{
		Kind: "check", Person: "p-001", Scheme: "acr-aapm-siim-2012", Class: "diagnostic", Light: Light{Kind: LightMeasured, Ambient: .2},
	}, noon))
	for i, l := range []float64{.9, 4, 14, 33, 66, 118, 197, 310, 470} {
		r := readings.Reading{Level: i * 255 / 8, Luminance: photometry.CdM2(l * scale), Role: readings.Series, Ambient: readings.Excluded, Time: noon.Add(time.Duration(i) * time.Second)}
		if err := s.AddReading(d.ID, r); err != nil {
			t.Fatal(err)
		}
	}
	return must[Draft](t)(s.Draft(d.ID))
}

func limits(t testing.TB, scheme, class string) *criteria.Used {
	t.Helper()
	return must[*criteria.Used](t)(must[*criteria.Scheme](t)(criteria.Find(scheme)).Use(class, nil))
}

func sealVisit(t testing.TB, s *Store, d Draft, m Monitor, at time.Time) int64 {
	t.Helper()
	doc := must[record.Record](t)(d.Document(m, nil, limits(t, d.Scheme, d.Class), "evenstep test", at))
	sealed, text, err := record.Seal(doc)
	if err != nil {
		t.Fatal(err)
	}
	return must[int64](t)(s.SealDraft(d, sealed, text))
}

func TestVisitToRecord(t *testing.T) {
	s := newStore(t)
	m := testMonitor()
	m.ID = must[int64](t)(s.SaveMonitor(m))
	d := visit(t, s, m.ID, 1)
	if len(d.Readings) != 9 || d.Readings[8].Luminance != 470 || !d.Readings[8].Time.Equal(noon.Add(8*time.Second)) || d.Person != "p-001" {
		t.Fatalf("%+v", d)
	}
	if err := s.UndoReading(d.ID); err != nil {
		t.Fatal(err)
	}
	if got := must[Draft](t)(s.Draft(d.ID)); len(got.Readings) != 8 {
		t.Errorf("%d readings after one was taken out", len(got.Readings))
	}
	if err := s.AddReading(d.ID, d.Readings[8]); err != nil {
		t.Fatal(err)
	}
	id := sealVisit(t, s, d, m, noon)
	if left := must[[]Draft](t)(s.Drafts()); len(left) != 0 {
		t.Errorf("%d visits left after sealing", len(left))
	}
	r, text, err := s.Record(id)
	if err != nil {
		t.Fatal(err)
	}
	if again, err := record.Read("r", text); err != nil || again.SHA256 != r.SHA256 {
		t.Errorf("the bytes kept are not the record: %v", err)
	}
	if r.Monitor.Serial != "EV-1" || r.Assessment.Verdict == "" || len(r.Readings) != 9 {
		t.Errorf("%+v", r)
	}
	if last, err := s.LastRecord(m.ID); err != nil || last.SHA256 != r.SHA256 {
		t.Errorf("%v", err)
	}
	if _, err := s.SealDraft(d, r, text); err == nil {
		t.Error("a visit was sealed twice")
	}
}

func TestNothingIsJudgedWithoutLight(t *testing.T) {
	d := Draft{Readings: []readings.Reading{{Level: 0, Luminance: 1, Role: readings.Series}, {Level: 255, Luminance: 300, Role: readings.Series}}}
	if _, _, err := d.Judge(testMonitor(), nil, nil); err == nil {
		t.Error("judged")
	}
	for _, k := range []LightKind{LightMeasured, LightIlluminance, LightDark, LightInside} {
		d.Light = Light{Kind: k, Ambient: .1, Illuminance: 20}
		if _, a, err := d.Judge(testMonitor(), nil, nil); err != nil || a.LuminanceMax < 300 {
			t.Errorf("%s: %v, %v", k, a.LuminanceMax, err)
		}
	}
}

// TestMeterFactor: readings and ambient luminance go over to the reference meter, and the record says by what.
func TestMeterFactor(t *testing.T) {
	d := Draft{Head: Head{Kind: "check", Light: Light{Kind: LightMeasured, Ambient: .2}}}
	for i, l := range []photometry.CdM2{1, 30, 100, 300} {
		d.Readings = append(d.Readings, readings.Reading{Level: i * 85, Luminance: l, Role: readings.Series, Time: noon})
	}
	meter := &Meter{Name: "m", Kind: Contact, Factor: 1.02}
	_, a, err := d.Judge(testMonitor(), meter, nil)
	if err != nil {
		t.Fatal(err)
	}
	if want := 1.02 * 300.2; a.LuminanceMax < want-1e-9 || a.LuminanceMax > want+1e-9 { // rounding
		t.Errorf("L'max %v, want %v", a.LuminanceMax, want)
	}
	if got := *a.Ambient; got < .204-1e-12 || got > .204+1e-12 {
		t.Errorf("ambient %v, want 0.204", got)
	}
	doc := must[record.Record](t)(d.Document(testMonitor(), meter, nil, "evenstep test", noon))
	if doc.Meter.Factor != 1.02 || doc.Readings[3].Luminance != 306 {
		t.Errorf("%+v, %+v", doc.Meter, doc.Readings)
	}
}

func TestSearchAndRejudge(t *testing.T) {
	s := newStore(t)
	m := testMonitor()
	m.ID = must[int64](t)(s.SaveMonitor(m))
	for i := range 5 {
		sealVisit(t, s, visit(t, s, m.ID, 1-.08*float64(i)), m, noon.AddDate(0, i, 0))
	}
	all := must[[]Entry](t)(s.Records(Search{}))
	if len(all) != 5 || all[0].Time < all[4].Time || all[0].Monitor != "left" {
		t.Fatalf("%+v", all)
	}
	for words, want := range map[string]int{"EV-1": 5, "ev-1 p-001": 5, "2027-01": 1, "nothing": 0, "100%": 0, "fails": 2, "left check": 5} {
		if got := must[[]Entry](t)(s.Records(Search{Words: words})); len(got) != want && words != "fails" {
			t.Errorf("%q finds %d, want %d", words, len(got), want)
		}
		if n, err := s.CountRecords(Search{Words: words}); err != nil || n != len(must[[]Entry](t)(s.Records(Search{Words: words}))) {
			t.Errorf("%q counts %d, %v", words, n, err)
		}
	}
	if got := must[[]Entry](t)(s.Records(Search{Limit: 2, Offset: 2})); len(got) != 2 || got[0].ID != all[2].ID {
		t.Errorf("%+v", got)
	}

	seen := map[int64]criteria.Verdict{}
	last := 0
	err := s.Rejudge(context.Background(), limits(t, "tg18-2005", "secondary"), func(r Rejudged) {
		if r.Err != nil {
			t.Errorf("record %d: %v", r.ID, r.Err)
		}
		seen[r.ID] = r.After
	}, func(done, all int) { last = done })
	if err != nil || len(seen) != 5 || last != 5 {
		t.Fatalf("%v, %d judged, told of %d", err, len(seen), last)
	}
	for id, v := range seen {
		r, _, err := s.Record(id)
		if err != nil {
			t.Fatal(err)
		}
		again := criteria.Assess(must[criteria.Visit](t)(r.Measured()), limits(t, "tg18-2005", "secondary"))
		if again.Verdict != v {
			t.Errorf("record %d: %q, alone %q", id, v, again.Verdict)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if err := s.Rejudge(ctx, limits(t, "tg18-2005", "secondary"), func(Rejudged) {}, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

// TestAlteredRecordIsFound changes a record behind the store's back.
func TestAlteredRecordIsFound(t *testing.T) {
	s := newStore(t)
	m := testMonitor()
	m.ID = must[int64](t)(s.SaveMonitor(m))
	id := sealVisit(t, s, visit(t, s, m.ID, 1), m, noon)
	if _, err := s.write.Exec(`UPDATE records SET text = replace(text, '"luminance_cd_m2":470', '"luminance_cd_m2":471')`); err != nil {
		t.Fatal(err)
	}
	if _, _, err := s.Record(id); !errors.Is(err, record.ErrAltered) {
		t.Errorf("%v; want %v", err, record.ErrAltered)
	}
	var got Rejudged
	if err := s.Rejudge(context.Background(), limits(t, "tg18-2005", "secondary"), func(r Rejudged) { got = r }, nil); err != nil || !errors.Is(got.Err, record.ErrAltered) {
		t.Errorf("%v, %+v", err, got)
	}
}

func TestManyAtOnce(t *testing.T) {
	s := newStore(t)
	m := testMonitor()
	m.ID = must[int64](t)(s.SaveMonitor(m))
	other := must[*Store](t)(Open(s.Path())) // as another process would
	defer other.Close()
	d := must[Draft](t)(s.StartDraft(m.ID, Head{Kind: "check"}, noon))
	var group sync.WaitGroup
	errs := make(chan error, 400)
	for g := range 8 {
		group.Go(func() {
			use := s
			if g%2 == 1 {
				use = other
			}
			for i := range 25 {
				if err := use.AddReading(d.ID, readings.Reading{Level: g*25 + i, Luminance: 1, Role: readings.Series, Time: noon}); err != nil {
					errs <- err
				}
				if _, err := use.Drafts(); err != nil {
					errs <- err
				}
			}
		})
	}
	group.Wait()
	close(errs)
	for err := range errs {
		t.Error(err)
	}
	if got := must[Draft](t)(s.Draft(d.ID)); len(got.Readings) != 200 {
		t.Errorf("%d readings, want 200", len(got.Readings))
	}
}

func TestFilesThatAreNoRegister(t *testing.T) {
	dir := t.TempDir()
	good := filepath.Join(dir, "good.db")
	s := must[*Store](t)(Open(good))
	for i := range 50 {
		must[int64](t)(s.SaveRoom(Room{Name: fmt.Sprint(i), Notes: strings.Repeat("x", 2000)}))
	}
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	whole := must[[]byte](t)(os.ReadFile(good))
	put := func(name string, text []byte) string {
		t.Helper()
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, text, 0o644); err != nil {
			t.Fatal(err)
		}
		return path
	}
	newer := put("newer.db", whole)
	db := must[*Store](t)(Open(newer))
	if _, err := db.write.Exec("PRAGMA user_version = 99"); err != nil {
		t.Fatal(err)
	}
	if err := db.Close(); err != nil {
		t.Fatal(err)
	}
	other := bytes.Clone(whole)
	copy(other[68:72], []byte{0, 0, 0, 1})
	damaged := bytes.Clone(whole)
	for i := 4096; i < len(damaged); i += 97 {
		damaged[i] ^= 0xff
	}
	for _, c := range []struct {
		name string
		path string
		want error
	}{
		{"text", put("text.db", []byte("level,luminance\n")), ErrForeign},
		{"another program's", put("other.db", other), ErrForeign},
		{"half", put("half.db", whole[:len(whole)/2]), ErrDamaged},
		{"damaged", put("damaged.db", damaged), ErrDamaged},
		{"newer", newer, ErrNewer},
		{"a folder", dir, ErrForeign},
	} {
		t.Run(c.name, func(t *testing.T) {
			before, _ := os.ReadFile(c.path)
			_, err := Open(c.path)
			if !errors.Is(err, c.want) || strings.ContainsAny(err.Error(), "\r\n") {
				t.Errorf("%v; want one line with %q", err, c.want)
			}
			if after, _ := os.ReadFile(c.path); !bytes.Equal(before, after) {
				t.Error("the file was touched")
			}
		})
	}
	if s, err := Open(put("empty.db", nil)); err != nil {
		t.Errorf("an empty file: %v", err)
	} else {
		s.Close()
	}
}

func TestBackupAndRestore(t *testing.T) {
	s := newStore(t)
	must[int64](t)(s.SaveRoom(Room{Name: "before"}))
	copyPath := filepath.Join(t.TempDir(), "backup.db")
	if err := s.Backup(copyPath); err != nil {
		t.Fatal(err)
	}
	if err := s.Backup(copyPath); !errors.Is(err, fs.ErrExist) {
		t.Errorf("written over: %v", err)
	}
	must[int64](t)(s.SaveRoom(Room{Name: "after"}))
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	if _, err := Restore(filepath.Join(t.TempDir(), "none"), s.Path(), noon); err == nil {
		t.Error("restored from nothing")
	}
	bad := filepath.Join(t.TempDir(), "bad.db")
	if err := os.WriteFile(bad, []byte("no database, but long enough to be looked at in the first hundred bytes of what it says it is, or not"), 0o644); err != nil {
		t.Fatal(err)
	}
	if _, err := Restore(bad, s.Path(), noon); !errors.Is(err, ErrForeign) {
		t.Errorf("%v; want %v", err, ErrForeign)
	}
	kept, err := Restore(copyPath, s.Path(), noon)
	if err != nil {
		t.Fatal(err)
	}
	again := must[*Store](t)(Open(s.Path()))
	defer again.Close()
	if rooms := must[[]Room](t)(again.Rooms()); len(rooms) != 1 || rooms[0].Name != "before" {
		t.Errorf("%+v", rooms)
	}
	old := must[*Store](t)(Open(kept))
	defer old.Close()
	if rooms := must[[]Room](t)(old.Rooms()); len(rooms) != 2 {
		t.Errorf("what was set aside has %+v", rooms)
	}
}

// TestRestoreWhileOpen replaces a register that is open and goes on with it.
func TestRestoreWhileOpen(t *testing.T) {
	s := newStore(t)
	must[int64](t)(s.SaveRoom(Room{Name: "before"}))
	copyPath := filepath.Join(t.TempDir(), "backup.db")
	if err := s.Backup(copyPath); err != nil {
		t.Fatal(err)
	}
	must[int64](t)(s.SaveRoom(Room{Name: "after"}))
	if _, err := s.RestoreFrom(filepath.Join(t.TempDir(), "none.db"), noon); err == nil {
		t.Error("restored from nothing")
	}
	if rooms := must[[]Room](t)(s.Rooms()); len(rooms) != 2 {
		t.Errorf("a failed restore changed the register: %+v", rooms)
	}
	if _, err := s.RestoreFrom(copyPath, noon); err != nil {
		t.Fatal(err)
	}
	must[int64](t)(s.SaveRoom(Room{Name: "later"}))
	if rooms := must[[]Room](t)(s.Rooms()); len(rooms) != 2 || rooms[0].Name != "before" || rooms[1].Name != "later" {
		t.Errorf("%+v", rooms)
	}
}

func TestDefaultPath(t *testing.T) {
	env := func(kv ...string) func(string) string {
		return func(k string) string {
			for i := 0; i < len(kv); i += 2 {
				if kv[i] == k {
					return kv[i+1]
				}
			}
			return ""
		}
	}
	for _, c := range []struct {
		env  func(string) string
		want string
	}{
		{env("EVENSTEP_REGISTER", "/a/b.db", "HOME", "/h"), "/a/b.db"},
		{env("XDG_DATA_HOME", "/d", "HOME", "/h"), "/d/evenstep/register.db"},
		{env("HOME", "/h"), "/h/.local/share/evenstep/register.db"},
	} {
		if got, err := DefaultPath(c.env); err != nil || filepath.ToSlash(got) != c.want {
			t.Errorf("%q, %v; want %q", got, err, c.want)
		}
	}
	if _, err := DefaultPath(env()); err == nil {
		t.Error("no place is a place")
	}
}

// TestNetworkShare reads a list of mounts as Linux gives it in /proc/mounts (proc(5)).
func TestNetworkShare(t *testing.T) {
	mounts := "/dev/sda1 / ext4 rw 0 0\nserver:/x /mnt/share nfs4 rw 0 0\n//s/y /mnt/my\\040disk cifs rw 0 0\n/dev/sdb1 /mnt/share/local ext4 rw 0 0\n"
	for path, warned := range map[string]bool{
		"/mnt/share/a.db": true, "/mnt/my disk/a.db": true, "/mnt/shared/a.db": false, "/mnt/share/local/a.db": false, "/x.db": false,
	} {
		if got := networkMount(mounts, path); (got != "") != warned {
			t.Errorf("%s: %q", path, got)
		}
	}
}

func TestImport(t *testing.T) {
	s := newStore(t)
	must[int64](t)(s.SaveMonitor(testMonitor()))
	list := "\ufeffSerial;Room;Station;Label;Scheme;Class;Bits;Rd\n" +
		"EV-1;room 1;A;left;acr-aapm-siim-2012;other;8;0,004\n" +
		"EV-2;room 1;A;right;acr-aapm-siim-2012;diagnostic;10;\n" +
		"EV-3;room 2;;;;;;\n"
	plan := must[[]Change](t)(s.PlanImport("list.csv", strings.NewReader(list)))
	var said []string
	for _, c := range plan {
		said = append(said, fmt.Sprintf("%d %s %s %v %s", c.Line, c.Serial, c.What, c.Fields, c.Err))
	}
	want := []string{
		"2 EV-1 changed [class: diagnostic -> other rd: not stated -> 0.004 room:  -> room 1 station:  -> A] ",
		"3 EV-2 new [] ", "4 EV-3 new [] ",
	}
	if strings.Join(said, "\n") != strings.Join(want, "\n") {
		t.Errorf("planned:\n%s\nwant:\n%s", strings.Join(said, "\n"), strings.Join(want, "\n"))
	}
	if all := must[[]Monitor](t)(s.Monitors()); len(all) != 1 {
		t.Error("planning changed the register")
	}
	if err := s.Import(plan); err != nil {
		t.Fatal(err)
	}
	all := must[[]Monitor](t)(s.Monitors())
	if len(all) != 3 || all[0].Title() != "room 1 › A › left" || all[0].Class != "other" || all[1].Bits != 10 || all[2].Title() != "room 2 › room 2" {
		t.Errorf("%+v", all)
	}
	for _, c := range must[[]Change](t)(s.PlanImport("list.csv", strings.NewReader(list))) {
		if c.What != "same" {
			t.Errorf("again: %+v", c)
		}
	}
}

func TestImportRefuses(t *testing.T) {
	s := newStore(t)
	for _, c := range []struct{ name, list, want string }{
		{"empty", "", "is empty"},
		{"no serials", "room\nx\n", "no column serial"},
		{"unknown column", "serial,colour\nx,y\n", `column "colour" is not known`},
		{"column twice", "serial,serial\nx,y\n", "stands twice"},
		{"open quote", "serial\n\"x\n", "l.csv:2"},
	} {
		if _, err := s.PlanImport("l.csv", strings.NewReader(c.list)); err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s: %v; want %q", c.name, err, c.want)
		}
	}
	for _, c := range []struct{ name, list, want string }{
		{"bits", "serial,bits\nx,many\n", "whole number"},
		{"bits too many", "serial,bits\nx,99\n", "1 to 16"},
		{"rd", "serial,rd\nx,dark\n", "a number"},
		{"scheme", "serial,scheme,class\nx,no-such,y\n", "is not known"},
		{"class", "serial,scheme,class\nx,tg18-2005,y\n", "class"},
		{"calibrated in", "serial,calibrated_in\nx,nowhere\n", "one of"},
		{"no serial", "serial,room\n,x\n", "serial is empty"},
		{"twice", "serial\nx\nx\n", "stands on line 2"},
		{"station alone", "serial,station\nx,A\n", "without a room"},
	} {
		plan, err := s.PlanImport("l.csv", strings.NewReader(c.list))
		if err != nil || !strings.Contains(plan[len(plan)-1].Err, c.want) {
			t.Errorf("%s: %+v, %v; want %q", c.name, plan, err, c.want)
			continue
		}
		if err := s.Import(plan); err == nil {
			t.Errorf("%s: imported all the same", c.name)
		}
	}
	if all := must[[]Monitor](t)(s.Monitors()); len(all) != 0 {
		t.Errorf("%d monitors came in", len(all))
	}
}

func FuzzPlanImport(f *testing.F) {
	f.Add("serial;room\nEV-1;x\n")
	f.Add("serial,rd\nx,0.1\n\"")
	s := newStore(f)
	f.Fuzz(func(t *testing.T, list string) {
		if _, err := s.PlanImport("l.csv", strings.NewReader(list)); err != nil && strings.ContainsAny(err.Error(), "\r\n") {
			t.Errorf("error of several lines: %q", err)
		}
	})
}
