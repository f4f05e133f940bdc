package main

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"testing"
	"time"

	"evenstep/display/criteria"
	"evenstep/display/store"
)

// goodSeries are 18 readings of an invented monitor, without ambient light.
var goodSeries = []string{
	"1.15", "2.397", "4.278", "6.80", "10.06", "14.46", "20.15", "27.51", "36.87", "48.72", "63.47", "82.18", "105.9", "136.8", "176.5", "229.5", "302.6", "402",
}

// newSite makes a register with what a visit needs and closes it.
func newSite(t *testing.T, monitors ...string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "register.db")
	s, err := store.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	if err := s.SavePerson(store.Person{ID: "p-001", Role: "physicist"}); err != nil {
		t.Fatal(err)
	}
	r := .002
	if _, err := s.SaveMeter(store.Meter{Name: "meter-01", Kind: store.Contact, Repeatability: &r}); err != nil {
		t.Fatal(err)
	}
	for _, m := range monitors {
		if _, err := s.SaveMonitor(store.Monitor{Serial: m, Bits: 8, CalibratedIn: store.InMonitor, Orientation: "portrait", Scheme: "acr-aapm-siim-2012", Class: "diagnostic"}); err != nil {
			t.Fatal(err)
		}
	}
	return path
}

func readingsKept(s *store.Store) int {
	ds, err := s.Drafts()
	if err != nil || len(ds) == 0 {
		return -1
	}
	return len(ds[0].Readings)
}

func records(s *store.Store) []store.Entry {
	es, err := s.Records(store.Search{})
	if err != nil {
		return nil
	}
	return es
}

// firstVisit goes through the setup of a monitor's first visit: room light by its luminance, then levels.
func (d *desk) firstVisit(ambient string) {
	d.keys("Return")       // the marked monitor
	d.keys("Right", "Tab") // room light stated by: ambient luminance
	d.typed(ambient)       // Enter ends the setup
}

// TestVisitByKeyboard: a new monitor, a visit of 18 typed readings, the record, its PDF.
func TestVisitByKeyboard(t *testing.T) {
	if testing.Short() {
		t.Skip("works a real window for half a minute")
	}
	d := newDesk(t, "1280x800x24")
	path := newSite(t)
	c := d.open(path)
	d.picture("empty")
	d.keys("ctrl+2", "ctrl+n")
	d.typed("EV-77")
	d.until(path, "the new monitor is kept", func(s *store.Store) bool {
		ms, err := s.Monitors()
		return err == nil && len(ms) == 1 && ms[0].Serial == "EV-77"
	})
	d.picture("register")
	d.keys("ctrl+1")
	d.firstVisit("0.12")
	for i, v := range goodSeries {
		d.typed(v)
		if i == 8 {
			d.picture("half")
		}
	}
	d.until(path, "18 readings are kept", func(s *store.Store) bool { return readingsKept(s) == 18 })
	d.picture("levels")
	d.keys("ctrl+t", "Return")
	d.until(path, "the table is kept", func(s *store.Store) bool {
		ds, err := s.Drafts()
		return err == nil && len(ds) == 1 && ds[0].Table != nil
	})
	d.picture("table")
	d.keys("ctrl+Return")
	d.until(path, "the record is sealed", func(s *store.Store) bool { return len(records(s)) == 1 })
	pdf := filepath.Join(t.TempDir(), "report.pdf")
	d.click(45, 125) // Records, in the rail
	d.keys("Return", "ctrl+s", "ctrl+a")
	d.typed(pdf)
	d.until(path, "the PDF is written", func(*store.Store) bool {
		b, err := os.ReadFile(pdf)
		return err == nil && bytes.HasPrefix(b, []byte("%PDF-"))
	})
	d.picture("records")
	d.quit(c)

	s, err := store.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	r, _, err := s.Record(records(s)[0].ID)
	if err != nil {
		t.Fatal(err)
	}
	if r.Table == nil || len(r.Table.Entries) != 256 || r.Table.Entries[255] != 1023 {
		t.Errorf("the table in the record: %+v", r.Table)
	}
	if len(r.Readings) != 18 || r.Readings[17].Luminance != 402 || *r.Assessment.Ambient != .12 || r.Monitor.Serial != "EV-77" {
		t.Errorf("%+v, ambient %v", r.Readings, *r.Assessment.Ambient)
	}
}

// TestKnownMonitorTakesFewKeys: the second visit at a monitor takes the readings and at most six keys.
func TestKnownMonitorTakesFewKeys(t *testing.T) {
	if testing.Short() {
		t.Skip("works a real window for half a minute")
	}
	d := newDesk(t, "1280x800x24")
	path := newSite(t, "EV-1", "EV-2")
	c := d.open(path)
	d.firstVisit("0.12")
	for _, v := range goodSeries {
		d.typed(v)
	}
	d.until(path, "18 readings are kept", func(s *store.Store) bool { return readingsKept(s) == 18 })
	d.keys("ctrl+Return")
	d.until(path, "the first record is sealed", func(s *store.Store) bool { return len(records(s)) == 1 })

	d.until(path, "the verdict is that of a monitor whose last step is 19 % off", func(s *store.Store) bool { return records(s)[0].Verdict == criteria.Fails })

	presses := 0
	press := func(names ...string) {
		presses += len(names)
		d.keys(names...)
	}
	press("Return") // the monitor is the first of the list
	for _, v := range goodSeries {
		d.typed(v)
	}
	d.until(path, "18 readings are kept again", func(s *store.Store) bool { return readingsKept(s) == 18 })
	press("ctrl+Return")
	d.until(path, "the second record is sealed", func(s *store.Store) bool { return len(records(s)) == 2 })
	if presses > 6 {
		t.Errorf("%d keys beside the readings, at most 6", presses)
	}
	d.quit(c)
}

// TestKilledAndResumed: a power cut in the middle of a series loses at most the keystroke in progress,
// and the next start offers to go on.
func TestKilledAndResumed(t *testing.T) {
	if testing.Short() {
		t.Skip("works a real window for half a minute")
	}
	d := newDesk(t, "1280x800x24")
	path := newSite(t, "EV-1")
	c := d.open(path)
	d.firstVisit("0.12")
	for _, v := range goodSeries[:7] {
		d.typed(v)
	}
	d.until(path, "7 readings are kept", func(s *store.Store) bool { return readingsKept(s) == 7 })
	d.do("xdotool", "type", "27.") // a keystroke in progress
	kill(t, c)

	c = d.open(path)
	d.picture("go-on")
	d.keys("Return") // the visit that was left stands first
	for _, v := range goodSeries[7:] {
		d.typed(v)
	}
	d.until(path, "18 readings are kept", func(s *store.Store) bool { return readingsKept(s) == 18 })
	d.keys("ctrl+Return")
	d.until(path, "the record is sealed", func(s *store.Store) bool { return len(records(s)) == 1 })
	d.quit(c)
}

// TestPastedSeries: a series with decimal commas comes from the clipboard, at 200 % scale.
func TestPastedSeries(t *testing.T) {
	if testing.Short() {
		t.Skip("works a real window for half a minute")
	}
	d := newDesk(t, "1920x1200x24")
	path := newSite(t, "EV-1")
	c := d.open(path, "FYNE_SCALE=2")
	d.firstVisit("0,12")
	var clip bytes.Buffer
	for i, v := range goodSeries {
		fmt.Fprintf(&clip, "%d\t%s\n", 15*i, bytes.ReplaceAll([]byte(v), []byte("."), []byte(",")))
	}
	x := d.command("xclip", "-selection", "clipboard")
	x.Stdin = &clip
	if err := x.Run(); err != nil {
		t.Fatal(err)
	}
	d.keys("ctrl+v")
	d.until(path, "18 readings are kept", func(s *store.Store) bool { return readingsKept(s) == 18 })
	d.picture("scale-2")
	d.keys("ctrl+Return")
	d.until(path, "the record is sealed", func(s *store.Store) bool { return len(records(s)) == 1 })
	d.quit(c)
}

// TestKilledManyTimes kills the window at random moments of a driven series: whatever was kept before
// is there afterwards.
func TestKilledManyTimes(t *testing.T) {
	if testing.Short() {
		t.Skip("works a real window for a minute")
	}
	times := 8
	d := newDesk(t, "1280x800x24")
	path := newSite(t, "EV-1")
	for i := range times {
		before := 0
		c := d.open(path)
		if i == 0 {
			d.firstVisit("0.12")
		} else {
			d.keys("Return")
		}
		d.until(path, "the visit is on the bench", func(s *store.Store) bool { before = readingsKept(s); return before >= 0 })
		for k := range 2 {
			d.typed(goodSeries[min(before+k, len(goodSeries)-1)])
		}
		time.AfterFunc(time.Duration(i*37%90)*time.Millisecond, func() { _ = c.Process.Kill() })
		_ = c.Wait()
		s, err := store.Open(path)
		if err != nil {
			t.Fatal(err)
		}
		if after := readingsKept(s); after < before || after > before+2 {
			t.Errorf("start %d: %d readings before, %d after", i, before, after)
		}
		s.Close()
	}
}

// TestNoDisplay: without a display the program says so in one sentence and names the commands.
func TestNoDisplay(t *testing.T) {
	need(t, "go")
	program := filepath.Join(t.TempDir(), "evenstep-desktop")
	d := &desk{t: t, home: t.TempDir(), display: ":4095"}
	if out, err := exec.Command("go", "build", "-o", program, ".").CombinedOutput(); err != nil {
		t.Skipf("%v: %s", err, out)
	}
	out, err := d.command(program, "--register", filepath.Join(t.TempDir(), "r.db")).CombinedOutput()
	if err == nil || bytes.Count(out, []byte("\n")) != 1 || !bytes.Contains(out, []byte("no window can be opened")) || !bytes.Contains(out, []byte("evenstep help")) {
		t.Errorf("%v: %s", err, out)
	}
}
