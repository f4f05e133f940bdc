package store

import (
	"errors"
	"flag"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"testing/fstest"
)

var fixture = flag.Bool("fixture", false, "write a register of the schema as it is to testdata, for later ones to open")

// patched is a register file of another program version.
type patched struct {
	*sqliteFile
	files fs.FS
}

func (p patched) migrations() fs.FS { return p.files }

// later are the migrations there are, and more.
func later(t *testing.T, more ...string) fstest.MapFS {
	t.Helper()
	all := fstest.MapFS{}
	files := (&sqliteFile{}).migrations()
	for _, name := range must[[]string](t)(fs.Glob(files, "*.sql")) {
		all[name] = &fstest.MapFile{Data: must[[]byte](t)(fs.ReadFile(files, name))}
	}
	for _, text := range more {
		all[fmt.Sprintf("%03d.sql", len(all)+1)] = &fstest.MapFile{Data: []byte(text)}
	}
	return all
}

func closedRegister(t *testing.T) string {
	t.Helper()
	s := newStore(t)
	must[int64](t)(s.SaveRoom(Room{Name: "kept"}))
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	return s.Path()
}

func TestMigration(t *testing.T) {
	path := closedRegister(t)
	s, err := openWith(patched{&sqliteFile{path: path}, later(t, "ALTER TABLE rooms ADD COLUMN floor INTEGER;\nUPDATE rooms SET floor = 3")})
	if err != nil {
		t.Fatal(err)
	}
	var floor, applied int
	if err := s.read.QueryRow("SELECT floor FROM rooms WHERE name = 'kept'").Scan(&floor); err != nil || floor != 3 {
		t.Errorf("floor %d, %v", floor, err)
	}
	if err := s.read.QueryRow("SELECT count(*) FROM migrations").Scan(&applied); err != nil || applied != knownSchema()+1 {
		t.Errorf("%d migrations are noted, %v", applied, err)
	}
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	before := must[[]byte](t)(os.ReadFile(path))
	if _, err := Open(path); !errors.Is(err, ErrNewer) {
		t.Errorf("%v; want %v", err, ErrNewer)
	}
	if after := must[[]byte](t)(os.ReadFile(path)); string(before) != string(after) {
		t.Error("the newer file was touched")
	}
}

// TestMigrationIsWholeOrNothing: a file of the schema that fails in its middle leaves the register as it was.
func TestMigrationIsWholeOrNothing(t *testing.T) {
	path := closedRegister(t)
	_, err := openWith(patched{&sqliteFile{path: path}, later(t, "CREATE TABLE half (id INTEGER);\nINSERT INTO nowhere VALUES (1)")})
	if err == nil || !strings.Contains(err.Error(), fmt.Sprintf("schema %d", knownSchema()+1)) {
		t.Fatalf("%v; want an error that names the schema", err)
	}
	s := openAt(t, path)
	var n int
	if err := s.read.QueryRow("SELECT count(*) FROM sqlite_master WHERE name = 'half'").Scan(&n); err != nil || n != 0 {
		t.Errorf("half of the migration is there: %d, %v", n, err)
	}
	if rooms := must[[]Room](t)(s.Rooms()); len(rooms) != 1 {
		t.Errorf("%+v", rooms)
	}
}

func TestOtherSchemaOfTheSameNumber(t *testing.T) {
	path := closedRegister(t)
	files := later(t)
	files["001.sql"] = &fstest.MapFile{Data: append([]byte("-- another\n"), files["001.sql"].Data...)}
	if _, err := openWith(patched{&sqliteFile{path: path}, files}); !errors.Is(err, ErrForeign) {
		t.Errorf("%v; want %v", err, ErrForeign)
	}
	files = later(t)
	for name, f := range files { // a checkout with other line ends
		files[name] = &fstest.MapFile{Data: []byte(strings.ReplaceAll(string(f.Data), "\n", "\r\n"))}
	}
	s, err := openWith(patched{&sqliteFile{path: path}, files})
	if err != nil {
		t.Fatal(err)
	}
	s.Close()
}

// TestOlderRegisters opens registers that earlier schemas made. testdata holds one of each, written by
// this program with -fixture when the schema was new.
func TestOlderRegisters(t *testing.T) {
	newest := fmt.Sprintf("testdata/register-%d.db", knownSchema())
	if *fixture {
		s := newStore(t)
		fill(t, s)
		if err := s.Backup(newest); err != nil {
			t.Fatal(err)
		}
	}
	all := must[[]string](t)(filepath.Glob("testdata/register-*.db"))
	if _, err := os.Stat(newest); err != nil {
		t.Errorf("%v; run this test once with -fixture", err)
	}
	for _, old := range all {
		t.Run(filepath.Base(old), func(t *testing.T) {
			path := filepath.Join(t.TempDir(), "r.db")
			if err := os.WriteFile(path, must[[]byte](t)(os.ReadFile(old)), 0o644); err != nil {
				t.Fatal(err)
			}
			s := openAt(t, path)
			ms := must[[]Monitor](t)(s.Monitors())
			if len(ms) != 1 || ms[0].Title() != "reading room › A › left" || ms[0].Serial != "EV-1" {
				t.Fatalf("%+v", ms)
			}
			ds := must[[]Draft](t)(s.Drafts())
			if len(ds) != 1 || len(ds[0].Readings) != 9 || ds[0].Readings[8].Luminance != 470 || ds[0].Person != "p-001" {
				t.Errorf("%+v", ds)
			}
			es := must[[]Entry](t)(s.Records(Search{Words: "reading room"}))
			if len(es) != 1 || es[0].Time != "2026-11-30T12:00:00Z" {
				t.Fatalf("%+v", es)
			}
			if r, _, err := s.Record(es[0].ID); err != nil || len(r.Readings) != 9 {
				t.Errorf("%v", err)
			}
			if meters := must[[]Meter](t)(s.Meters()); len(meters) != 1 || meters[0].Name != "meter-01" {
				t.Errorf("%+v", meters)
			}
			if p := must[[]Person](t)(s.Persons()); len(p) != 1 || p[0].Name != "A. Person" {
				t.Errorf("%+v", p)
			}
		})
	}
}

// fill makes the site that TestOlderRegisters looks for.
func fill(t *testing.T, s *Store) {
	t.Helper()
	room := must[int64](t)(s.SaveRoom(Room{Name: "reading room"}))
	station := must[int64](t)(s.SaveStation(Station{RoomID: room, Name: "A", Place: 1}))
	m := testMonitor()
	m.StationID = &station
	id := must[int64](t)(s.SaveMonitor(m))
	m = must[Monitor](t)(s.Monitor(id))
	must[int64](t)(s.SaveMeter(Meter{Name: "meter-01", Kind: Contact}))
	if err := s.SavePerson(Person{ID: "p-001", Role: "physicist", Name: "A. Person"}); err != nil {
		t.Fatal(err)
	}
	sealVisit(t, s, visit(t, s, m.ID, 1), m, noon)
	visit(t, s, m.ID, 1)
}
