package readings

import (
	"fmt"
	"io"
	"strings"
	"time"
)

// The kinds of column, by the names that messages use.
const (
	levelColumn     = "level"
	luminanceColumn = "luminance"
	roleColumn      = "role"
	ambientColumn   = "ambient_included"
	timeColumn      = "time"
)

var readingHeadings = []heading{
	{"level", levelColumn},
	{"ddl", levelColumn},
	{"p_value", levelColumn},
	{"luminance_cd_m2", luminanceColumn},
	{"luminance", luminanceColumn},
	{"luminance_fl", luminanceColumn},
	{"role", roleColumn},
	{"ambient_included", ambientColumn},
	{"time", timeColumn},
}

// Parse reads a file of readings. name stands for it in File.Name and in errors, and is not opened.
//
// The file is UTF-8 text, at most 4 MiB, with or without byte-order mark; lines end with LF, CRLF or
// CR, and those that begin with "#" are comments. The first other line names the columns, in any order
// and case: level or ddl (or p_value, for a calibrated chain); one of luminance_cd_m2, luminance
// (cd/m2) or luminance_fl; and, where wanted, role (series where empty), ambient_included (yes, no,
// or empty for not stated) and time (RFC 3339; a space may stand for the T, and a time without zone
// is kept as UTC). Cells are separated by commas, or by semicolons or tabs, and then decimal commas
// may stand in place of points, but not beside them. The series must hold the lowest and the highest level of
// the bit depth and each level once; repeats and drifts need a series reading of their level.
//
// Comments of the form "# key: value" fill Metadata; its fields name the keys. Ambient luminance is 0
// to 1000 cd/m2, illuminance 0 to 100000 lx, rd 0 to 1, repeatability 0 to 0.2 or "0 %" to "20 %",
// noise_floor 0 to 10 cd/m2, bits 1 to 16, luminance 0 to 100000 cd/m2. A key that looks mistyped is
// refused, any other comment is passed over.
//
// Every error is a *FormatError; errors.Is finds the error of r in it.
func Parse(name string, r io.Reader) (*File, error) {
	s, err := readSheet(name, r, readingHeadings, levelColumn, luminanceColumn)
	if err != nil {
		return nil, err
	}
	n := &numbers{sheet: s}
	f := &File{Name: name, SHA256: s.sha256, Scale: DDL, Unit: s.unit()}
	if s.heading[levelColumn] == "p_value" {
		f.Scale = PValue
	}
	if f.Metadata, err = n.metadata(); err != nil {
		return nil, err
	}
	f.Readings = make([]Reading, 0, len(s.rows))
	for _, r := range s.rows {
		reading, err := n.reading(r, f.Metadata.Bits)
		if err != nil {
			return nil, err
		}
		f.Readings = append(f.Readings, reading)
	}
	if err := s.checkSeries(f); err != nil {
		return nil, err
	}
	return f, nil
}

func (n *numbers) reading(r row, bits int) (Reading, error) {
	reading := Reading{Line: r.line}
	var err error
	if reading.Level, err = n.level(r.line, n.heading[levelColumn], n.cell(r, levelColumn), 1<<bits-1); err != nil {
		return reading, err
	}
	if reading.Luminance, err = n.luminance(r); err != nil {
		return reading, err
	}
	switch role := n.cell(r, roleColumn); Role(strings.ToLower(role)) {
	case "", Series:
		reading.Role = Series
	case Repeat:
		reading.Role = Repeat
	case Drift:
		reading.Role = Drift
	default:
		return reading, n.fail(r.line, "role "+quote(role), "series, repeat or drift", "correct the role or leave the cell empty")
	}
	switch included := n.cell(r, ambientColumn); strings.ToLower(included) {
	case "":
		reading.Ambient = Unstated
	case "yes":
		reading.Ambient = Included
	case "no":
		reading.Ambient = Excluded
	default:
		return reading, n.fail(r.line, "ambient_included "+quote(included), "yes or no", "write whether the reading holds the ambient light, or leave the cell empty")
	}
	cell := n.cell(r, timeColumn)
	if reading.Time, err = readTime(cell); err != nil {
		return reading, n.fail(r.line, "time "+quote(cell), "a time such as 2026-11-02T14:05:00+01:00 or 2026-11-02 14:05:00", "correct the time or leave the cell empty")
	}
	return reading, nil
}

// readTime reads a time, zero where the cell is empty. The zone is its offset alone: a name would
// depend on where the program runs.
func readTime(s string) (time.Time, error) {
	if s == "" {
		return time.Time{}, nil
	}
	const day, second = len("2026-11-02"), len("2026-11-02T14:05:00")
	if len(s) >= second {
		if s[day] == ' ' {
			s = s[:day] + "T" + s[day+1:]
		}
		if !strings.ContainsAny(s[second:], "Z+-") {
			s += "Z"
		}
	}
	var t time.Time
	if err := t.UnmarshalText([]byte(s)); err != nil {
		return t, err
	}
	if _, offset := t.Zone(); offset != 0 && !t.IsZero() {
		return t.In(time.FixedZone("", offset)), nil
	}
	return t.UTC(), nil
}

// checkSeries refuses what cannot be judged whatever the luminances.
func (s *sheet) checkSeries(f *File) error {
	top := 1<<f.Metadata.Bits - 1
	what := s.heading[levelColumn]
	line := map[int]int{}
	for _, r := range f.Readings {
		if r.Role != Series {
			continue
		}
		if before, twice := line[r.Level]; twice {
			return s.fail(r.Line, fmt.Sprintf("%s %d a second time after line %d", what, r.Level, before), "each level once in the series", `mark the later reading as "repeat" or "drift" in the column role, or delete it`)
		}
		line[r.Level] = r.Line
	}
	for _, r := range f.Readings {
		if _, ok := line[r.Level]; !ok {
			return s.fail(r.Line, fmt.Sprintf("a %s of %s %d", r.Role, what, r.Level), "a series reading of the same level", "add that reading, or correct the level or the role")
		}
	}
	for _, end := range []struct {
		name  string
		level int
	}{{"lowest", 0}, {"highest", top}} {
		if _, ok := line[end.level]; !ok {
			return s.fail(0, fmt.Sprintf("no reading of %s %d", what, end.level), fmt.Sprintf("the %s level of %d bits in the series", end.name, f.Metadata.Bits), `measure it, or state the bit depth in a line such as "# bits: 8"`)
		}
	}
	return nil
}
