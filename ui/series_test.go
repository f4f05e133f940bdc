package ui

import (
	"errors"
	"strings"
	"testing"
	"time"

	"evenstep/display/readings"
	"evenstep/display/response"
)

// notebook is a journal in memory; full makes it fail.
type notebook struct {
	kept []readings.Reading
	full bool
}

func (n *notebook) add(r readings.Reading) error {
	if n.full {
		return errors.New("the disk is full")
	}
	n.kept = append(n.kept, r)
	return nil
}

func (n *notebook) undo() error {
	n.kept = n.kept[:len(n.kept)-1]
	return nil
}

func testSeries(plan ...int) (*series, *notebook) {
	n := &notebook{}
	s := newSeries(plan, n, func() time.Time { return time.Date(2026, 11, 30, 9, 0, 0, 0, time.UTC) })
	s.noise = response.Noise{Repeatability: .005, Floor: .005}
	return s, n
}

func enter(t *testing.T, s *series, texts ...string) {
	t.Helper()
	for _, x := range texts {
		if kept, err := s.enter(x); err != nil || !kept {
			t.Fatalf("%q: kept %v, %v, asked %q", x, kept, err, s.question)
		}
	}
}

func TestSeriesIsTypedThrough(t *testing.T) {
	s, n := testSeries(0, 128, 255)
	enter(t, s, "0,64", "60")
	if level, _ := s.level(); level != 255 || s.done() != 2 || len(n.kept) != 2 || n.kept[0].Luminance != .64 {
		t.Fatalf("level %d, %d done, %+v kept", level, s.done(), n.kept)
	}
	enter(t, s, "300")
	if _, ok := s.level(); ok || s.done() != 3 {
		t.Error("the plan is not done")
	}
	if _, err := s.enter("5"); err == nil {
		t.Error("a reading was taken for no level")
	}
	if err := s.back(); err != nil || len(n.kept) != 2 {
		t.Errorf("%v, %+v kept", err, n.kept)
	}
	if level, _ := s.level(); level != 255 {
		t.Errorf("after going back level %d is asked for", level)
	}
}

func TestOddReadingIsAskedAboutOnce(t *testing.T) {
	s, n := testSeries(0, 64, 128, 255)
	enter(t, s, "1", "15")
	if kept, err := s.enter("600"); kept || err != nil || !strings.Contains(s.question, "ten times") {
		t.Fatalf("kept %v, %v, asked %q", kept, err, s.question)
	}
	if len(n.kept) != 2 {
		t.Error("a reading that is asked about was kept")
	}
	enter(t, s, "60") // typed again
	if n.kept[2].Luminance != 60 || s.question != "" {
		t.Errorf("%+v, asked %q", n.kept[2], s.question)
	}
	if kept, _ := s.enter("3000"); kept {
		t.Error("not asked")
	}
	enter(t, s, "") // kept as it is
	if n.kept[3].Luminance != 3000 {
		t.Errorf("%+v", n.kept[3])
	}
}

func TestWhatCannotBeTyped(t *testing.T) {
	s, n := testSeries(0, 255)
	for _, x := range []string{"", "abc", "1.2.3", "1,2,3", "0x10", "1_0", "-1", "1e9", "nan", "inf", "1.000,5"} {
		if kept, err := s.enter(x); kept || err == nil {
			t.Errorf("%q: kept %v, %v", x, kept, err)
		}
	}
	n.full = true
	if kept, err := s.enter("1"); kept && err == nil || len(s.taken) != 0 {
		t.Error("a reading that is not on disk counts as taken")
	}
}

func TestRepeatDriftAndUnit(t *testing.T) {
	s, n := testSeries(0, 255)
	enter(t, s, "1", "300")
	s.repeatLast()
	enter(t, s, "301")
	s.drift()
	enter(t, s, "299")
	if n.kept[2].Role != readings.Repeat || n.kept[3].Role != readings.Drift || n.kept[3].Level != 255 {
		t.Errorf("%+v", n.kept[2:])
	}
	s.goTo(0)
	s.toggleUnit()
	enter(t, s, "0.2919") // 1.0001 cd/m²
	if l := float64(n.kept[4].Luminance); l < 1 || l > 1.001 {
		t.Errorf("foot-lambert gave %v cd/m²", l)
	}
}

func TestPasteTakesAllOrNothing(t *testing.T) {
	s, n := testSeries(0, 128, 255)
	enter(t, s, "1")
	if _, err := s.paste("0\t1\n128\t60\n"); err == nil || len(n.kept) != 1 {
		t.Errorf("%v, %d kept", err, len(n.kept))
	}
	if got, err := s.paste("60\n300"); err != nil || got != 2 || n.kept[1].Level != 128 {
		t.Errorf("%d, %v, %+v", got, err, n.kept)
	}
	if _, ok := s.level(); ok {
		t.Error("the plan is not done")
	}
}

func TestResume(t *testing.T) {
	s, _ := testSeries(0, 128, 255)
	s.resume([]readings.Reading{{Level: 0, Luminance: 1, Role: readings.Series}})
	if level, _ := s.level(); level != 128 {
		t.Errorf("level %d is asked for", level)
	}
}
