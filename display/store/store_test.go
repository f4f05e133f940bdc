package store

import (
	"context"
	"errors"
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

// suite is what every engine must do. open gives an empty register, again a second one on the same place,
// as another process would have it.
func suite(t *testing.T, open func(testing.TB) *Store, again func(testing.TB, *Store) *Store) {
	for name, test := range map[string]func(*testing.T, *Store){
		"a site is kept": siteIsKept, "what is refused": whatIsRefused, "visit to record": visitToRecord,
		"search and judge again": searchAndRejudge, "an altered record is found": alteredRecordIsFound,
		"search without case": searchWithoutCase, "import": importList, "import refuses": importRefuses,
	} {
		t.Run(name, func(t *testing.T) { test(t, open(t)) })
	}
	t.Run("many at once", func(t *testing.T) {
		s := open(t)
		manyAtOnce(t, s, again(t, s))
	})
}

func TestFileRegister(t *testing.T) {
	suite(t, newStore, func(t testing.TB, s *Store) *Store { return openAt(t, s.Path()) })
}

func newStore(t testing.TB) *Store {
	t.Helper()
	return openAt(t, filepath.Join(t.TempDir(), "register.db"))
}

func openAt(t testing.TB, path string) *Store {
	t.Helper()
	s, err := Open(path)
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

func siteIsKept(t *testing.T, s *Store) {
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

func whatIsRefused(t *testing.T, s *Store) {
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

func visitToRecord(t *testing.T, s *Store) {
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
	// Two screens that read the same match whatever the meter's factor, and the draft stays as it was typed.
	same := photometry.CdM2(300)
	d.Neighbour, d.OtherOne = &criteria.Neighbour{LuminanceMax: &same}, "EV-2"
	if _, a, err = d.Judge(testMonitor(), meter, nil); err != nil || len(a.PairMatch) == 0 || a.PairMatch[0].Value > 1e-12 { // rounding
		t.Errorf("pair match %+v, %v; want 0", a.PairMatch, err)
	}
	doc := must[record.Record](t)(d.Document(testMonitor(), meter, nil, "evenstep test", noon))
	if same != 300 || *doc.Neighbour.LuminanceMax != 306 || doc.Neighbour.Serial != "EV-2" {
		t.Errorf("neighbour %v, in the record %+v", same, doc.Neighbour)
	}
	if doc.Meter.Factor != 1.02 || doc.Readings[3].Luminance != 306 {
		t.Errorf("%+v, %+v", doc.Meter, doc.Readings)
	}
}

func searchAndRejudge(t *testing.T, s *Store) {
	m := testMonitor()
	m.ID = must[int64](t)(s.SaveMonitor(m))
	for i := range 5 {
		sealVisit(t, s, visit(t, s, m.ID, 1-.08*float64(i)), m, noon.AddDate(0, i, 0))
	}
	all := must[[]Entry](t)(s.Records(Search{}))
	if len(all) != 5 || all[0].Time < all[4].Time || all[0].Monitor != "left" {
		t.Fatalf("%+v", all)
	}
	for words, want := range map[string]int{"EV-1": 5, "ev-1 p-001": 5, "2027-01": 1, "nothing": 0, "100%": 0, "left check": 5} {
		if got := must[[]Entry](t)(s.Records(Search{Words: words})); len(got) != want {
			t.Errorf("%q finds %d, want %d", words, len(got), want)
		}
		if n, err := s.CountRecords(Search{Words: words}); err != nil || n != len(must[[]Entry](t)(s.Records(Search{Words: words}))) {
			t.Errorf("%q counts %d, %v", words, n, err)
		}
	}
	for _, c := range []struct {
		from, to time.Time
		want     int
	}{
		{noon.AddDate(0, 1, 0), time.Time{}, 4}, // its own moment is in
		{time.Time{}, noon.AddDate(0, 1, 0), 1}, // and the other end's is not
		{noon.AddDate(0, 1, 0).In(time.FixedZone("east", 7200)), noon.AddDate(0, 3, 0), 2},
		{noon.AddDate(1, 0, 0), time.Time{}, 0},
	} {
		q := Search{From: c.from, To: c.to, Words: "check"}
		if n, err := s.CountRecords(q); err != nil || n != c.want || len(must[[]Entry](t)(s.Records(q))) != c.want {
			t.Errorf("%s to %s: %d, %v; want %d", c.from, c.to, n, err, c.want)
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

// alteredRecordIsFound changes a record behind the store's back.
func alteredRecordIsFound(t *testing.T, s *Store) {
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

func manyAtOnce(t *testing.T, s, other *Store) {
	m := testMonitor()
	m.ID = must[int64](t)(s.SaveMonitor(m))
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

func searchWithoutCase(t *testing.T, s *Store) {
	room := must[int64](t)(s.SaveRoom(Room{Name: "ÖSTLICHER Raum"}))
	station := must[int64](t)(s.SaveStation(Station{RoomID: room, Name: "a_b"}))
	m := testMonitor()
	m.StationID = &station
	m.ID = must[int64](t)(s.SaveMonitor(m))
	sealVisit(t, s, visit(t, s, m.ID, 1), m, noon)
	for words, want := range map[string]int{"östlicher RAUM": 1, "Östlicher": 1, "ostlicher": 0, "a_b": 1, "aXb": 0} {
		if n, err := s.CountRecords(Search{Words: words}); err != nil || n != want {
			t.Errorf("%q finds %d, %v; want %d", words, n, err, want)
		}
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
