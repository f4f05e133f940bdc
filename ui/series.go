package ui

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
)

// journal keeps readings. A reading is on disk when add returns.
type journal interface {
	add(readings.Reading) error
	undo() error
}

// series is a series of readings while it is taken: which level is next, what was typed, what is asked.
// It knows no widget.
type series struct {
	plan     []int
	at       int // index into plan of the level that is asked for
	taken    []readings.Reading
	earlier  []response.LevelReading
	noise    response.Noise
	ambient  readings.Ambient
	unit     unit
	next     readings.Role // of the next reading: repeat where "r" was pressed
	question string        // what is asked about the pending reading; "" where nothing
	pending  float64       // cd/m2
	journal  journal
	now      func() time.Time
}

// unit is the unit that is typed.
type unit string

const (
	perSquareMetre unit = "cd/m²"
	footLambert    unit = "fL"
)

func newSeries(plan []int, j journal, now func() time.Time) *series {
	return &series{plan: plan, journal: j, now: now, unit: perSquareMetre, next: readings.Series, ambient: readings.Excluded}
}

// resume takes up a series that was left: the readings there are, and the first level without one.
func (s *series) resume(taken []readings.Reading) {
	s.taken = taken
	s.at = 0
	s.forward()
}

// level is the level that is asked for; false where the plan is done.
func (s *series) level() (int, bool) {
	if s.at >= len(s.plan) {
		return 0, false
	}
	return s.plan[s.at], true
}

// has says whether a level has its series reading, and what it is.
func (s *series) has(level int) (photometry.CdM2, bool) {
	for _, r := range s.taken {
		if r.Level == level && r.Role == readings.Series {
			return r.Luminance, true
		}
	}
	return 0, false
}

func (s *series) done() int {
	n := 0
	for _, l := range s.plan {
		if _, ok := s.has(l); ok {
			n++
		}
	}
	return n
}

func (s *series) levels() []response.LevelReading {
	var out []response.LevelReading
	for _, r := range s.taken {
		if r.Role == readings.Series {
			out = append(out, response.LevelReading{Level: r.Level, Luminance: r.Luminance})
		}
	}
	return out
}

// expected is what the level asked for should read, in the unit that is typed.
func (s *series) expected() (float64, bool) {
	level, ok := s.level()
	if !ok {
		return 0, false
	}
	l, ok := response.Expect(level, s.levels(), s.earlier)
	return s.shown(l), ok
}

// foreseen are the readings so far, with those to come as the last visit lets expect them. It reports
// false where there was no last visit.
func (s *series) foreseen() ([]readings.Reading, int, bool) {
	if len(s.earlier) == 0 || len(s.taken) == 0 {
		return nil, 0, false
	}
	out := append([]readings.Reading(nil), s.taken...)
	n := 0
	for _, l := range s.plan {
		if _, ok := s.has(l); ok {
			continue
		}
		v, ok := response.Expect(l, s.levels(), s.earlier)
		if !ok {
			return nil, 0, false
		}
		out = append(out, readings.Reading{Level: l, Luminance: v, Role: readings.Series, Ambient: s.ambient})
		n++
	}
	return out, n, true
}

func (s *series) shown(l photometry.CdM2) float64 {
	if s.unit == footLambert {
		return float64(l) / float64(photometry.FootLambert(1).CdM2())
	}
	return float64(l)
}

// number reads what was typed: a decimal point or a decimal comma.
func number(text string) (float64, error) {
	t := strings.TrimSpace(text)
	if strings.Count(t, ",") == 1 && !strings.Contains(t, ".") {
		t = strings.Replace(t, ",", ".", 1)
	}
	v, err := strconv.ParseFloat(t, 64)
	if err != nil || math.IsNaN(v) || math.IsInf(v, 0) || strings.ContainsAny(t, "xXpP_") {
		return 0, fmt.Errorf("%q is no number; type the luminance, as 12.3 or 12,3", text)
	}
	return v, nil
}

// enter takes what was typed for the level asked for. A reading that looks odd is held back and asked
// about once: the same entered again, or an empty line, keeps it. It says whether a reading was kept.
func (s *series) enter(text string) (kept bool, err error) {
	level, ok := s.level()
	if !ok {
		return false, fmt.Errorf("every level has its reading; go back to a level to take it again, or seal the record")
	}
	if strings.TrimSpace(text) == "" {
		if s.question == "" {
			return false, fmt.Errorf("nothing was typed; type the luminance of level %d", level)
		}
		return true, s.keep(level, s.pending)
	}
	v, err := number(text)
	if err != nil {
		return false, err
	}
	if v < 0 || v > 100000 {
		return false, fmt.Errorf("%g %s is out of range; expected 0 to 100000; look at the meter again", v, s.unit)
	}
	l := v
	if s.unit == footLambert {
		l = float64(photometry.FootLambert(v).CdM2())
	}
	if s.question != "" && l == s.pending {
		return true, s.keep(level, l)
	}
	s.question = ""
	if odd := response.Odd(response.LevelReading{Level: level, Luminance: photometry.CdM2(l)}, s.others(level), s.earlier, s.noise); odd != "" {
		s.question, s.pending = fmt.Sprintf("%s %s is %s. Enter keeps it, or type it again.", short(v), s.unit, odd), l
		return false, nil
	}
	return true, s.keep(level, l)
}

// others are the readings at other levels.
func (s *series) others(level int) []response.LevelReading {
	var out []response.LevelReading
	for _, r := range s.levels() {
		if r.Level != level {
			out = append(out, r)
		}
	}
	return out
}

func (s *series) keep(level int, l float64) error {
	r := readings.Reading{Level: level, Luminance: photometry.CdM2(l), Role: readings.Series, Ambient: s.ambient, Time: s.now()}
	if _, there := s.has(level); there {
		r.Role = readings.Repeat
		if s.next == readings.Drift {
			r.Role = readings.Drift
		}
	}
	if err := s.journal.add(r); err != nil {
		return err
	}
	s.taken = append(s.taken, r)
	s.question, s.pending, s.next = "", 0, readings.Series
	s.forward()
	return nil
}

// forward goes to the first level of the plan, from here on and then from the start, that has no reading.
func (s *series) forward() {
	for i := range len(s.plan) {
		k := (s.at + i) % len(s.plan)
		if _, ok := s.has(s.plan[k]); !ok {
			s.at = k
			return
		}
	}
	s.at = len(s.plan)
}

// back takes the last reading out again and asks for its level.
func (s *series) back() error {
	s.question = ""
	if len(s.taken) == 0 {
		return nil
	}
	if err := s.journal.undo(); err != nil {
		return err
	}
	last := s.taken[len(s.taken)-1]
	s.taken = s.taken[:len(s.taken)-1]
	s.goTo(last.Level)
	return nil
}

// goTo asks for a level again: what is then entered is a repeat of it.
func (s *series) goTo(level int) {
	for i, l := range s.plan {
		if l == level {
			s.at, s.question, s.next = i, "", readings.Series
		}
	}
}

// repeatLast asks for the last level again.
func (s *series) repeatLast() {
	if n := len(s.taken); n > 0 {
		s.goTo(s.taken[n-1].Level)
	}
}

// drift asks for the first bright level again, to compare it with its first reading.
func (s *series) drift() {
	for i := len(s.plan) - 1; i >= 0; i-- {
		if _, ok := s.has(s.plan[i]); ok {
			s.goTo(s.plan[i])
			s.next = readings.Drift
			return
		}
	}
}

// toggleUnit changes the unit that is typed.
func (s *series) toggleUnit() {
	s.question = ""
	if s.unit == perSquareMetre {
		s.unit = footLambert
	} else {
		s.unit = perSquareMetre
	}
}

// paste takes lines of two columns, level and luminance, or of one column, luminances in the order of
// the plan from here on. It takes all or nothing.
func (s *series) paste(clip string) (int, error) {
	rs, err := readings.ParsePaste(clip, s.restOfPlan())
	if err != nil {
		return 0, err
	}
	for _, r := range rs {
		if _, there := s.has(r.Level); there {
			return 0, fmt.Errorf("level %d has a reading already; expected levels that are still to come; undo it first, or paste fewer lines", r.Level)
		}
	}
	for _, r := range rs {
		r.Ambient, r.Role, r.Time = s.ambient, readings.Series, s.now()
		if s.unit == footLambert {
			r.Luminance = photometry.FootLambert(r.Luminance).CdM2()
		}
		if err := s.journal.add(r); err != nil {
			return 0, err
		}
		s.taken = append(s.taken, r)
	}
	s.forward()
	return len(rs), nil
}

func (s *series) restOfPlan() []int {
	if s.at >= len(s.plan) {
		return nil
	}
	return s.plan[s.at:]
}

// short writes a figure as a meter shows it.
func short(v float64) string {
	switch {
	case v == 0:
		return "0"
	case math.Abs(v) >= 1000:
		return strconv.FormatFloat(v, 'f', 0, 64)
	case math.Abs(v) >= 100:
		return strconv.FormatFloat(v, 'f', 1, 64)
	case math.Abs(v) >= 1:
		return strconv.FormatFloat(v, 'f', 2, 64)
	}
	return strconv.FormatFloat(v, 'f', 3, 64)
}
