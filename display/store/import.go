package store

import (
	"context"
	"database/sql"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"slices"
	"strconv"
	"strings"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
)

// Change is what one line of an imported list would do.
type Change struct {
	Line   int
	Serial string
	What   string   // "new", "changed", "same", "error"
	Fields []string // of a change: "class: other -> diagnostic"
	Err    string

	monitor       Monitor
	room, station string
}

// The columns of a list of monitors; serial is needed, the rest may be missing.
var importColumns = []string{
	"serial", "room", "station", "place", "label", "model", "scheme", "class", "calibrated_in", "bits", "rd", "orientation", "backlight_hours", "notes",
}

// The bounds of a list: no site has more monitors.
const (
	longestList = 16 << 20
	mostLines   = 100000
)

// PlanImport reads a list of monitors as a spreadsheet writes it (CSV with commas or semicolons, the
// first line names the columns) and says what Import would do with each line. It changes nothing. A
// cell that is empty leaves what is there.
func (s *Store) PlanImport(name string, r io.Reader) ([]Change, error) {
	rows, at, err := readList(name, r)
	if err != nil {
		return nil, err
	}
	all, err := s.Monitors()
	if err != nil {
		return nil, err
	}
	known := map[string]Monitor{}
	for _, m := range all {
		known[m.Serial] = m
	}
	seen := map[string]int{}
	var plan []Change
	for _, row := range rows {
		c := planRow(row.cells, at, known)
		c.Line = row.line
		if first, twice := seen[c.Serial]; twice && c.Err == "" {
			c.What, c.Err = "error", fmt.Sprintf("serial %q stands on line %d already; expected each once; remove one", c.Serial, first)
		}
		seen[c.Serial] = row.line
		plan = append(plan, c)
	}
	return plan, nil
}

type listRow struct {
	line  int
	cells []string
}

func readList(name string, r io.Reader) (rows []listRow, at map[string]int, err error) {
	text, err := io.ReadAll(io.LimitReader(r, longestList+1))
	if err != nil {
		return nil, nil, fmt.Errorf("%s: %w; expected a list of monitors", name, err)
	}
	if len(text) > longestList {
		return nil, nil, fmt.Errorf("%s: more than %d bytes; expected a list of monitors; is it the right file?", name, longestList)
	}
	body := strings.TrimPrefix(string(text), "\ufeff")
	if i := strings.Index(strings.ToValidUTF8(body, "\x00"), "\x00"); i >= 0 {
		return nil, nil, fmt.Errorf("%s:%d: holds bytes that are no UTF-8 text; expected CSV in UTF-8; save the list as that", name, strings.Count(body[:i], "\n")+1)
	}
	head, _, _ := strings.Cut(body, "\n")
	c := csv.NewReader(strings.NewReader(body))
	c.FieldsPerRecord = -1
	c.TrimLeadingSpace = true
	for _, sep := range []rune{';', '\t'} {
		if strings.ContainsRune(head, sep) {
			c.Comma = sep
		}
	}
	for {
		cells, err := c.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			var p *csv.ParseError
			if errors.As(err, &p) {
				return nil, nil, fmt.Errorf("%s:%d: %w; expected lines of cells; correct the line", name, p.Line, p.Err)
			}
			return nil, nil, fmt.Errorf("%s: %w; expected lines of cells", name, err)
		}
		line, _ := c.FieldPos(0)
		if at == nil {
			at = map[string]int{}
			for i, h := range cells {
				key := strings.ReplaceAll(strings.ToLower(strings.TrimSpace(h)), " ", "_")
				if key == "" {
					continue
				}
				if !slices.Contains(importColumns, key) {
					return nil, nil, fmt.Errorf("%s:%d: column %q is not known; expected columns out of %s; rename or remove it", name, line, h, strings.Join(importColumns, ", "))
				}
				if _, twice := at[key]; twice {
					return nil, nil, fmt.Errorf("%s:%d: column %q stands twice; expected once; remove one", name, line, h)
				}
				at[key] = i
			}
			if _, ok := at["serial"]; !ok {
				return nil, nil, fmt.Errorf("%s:%d: there is no column serial; expected one; name the column that holds the serials", name, line)
			}
			continue
		}
		if len(strings.Join(cells, "")) == 0 {
			continue
		}
		if len(rows) == mostLines {
			return nil, nil, fmt.Errorf("%s:%d: more than %d monitors; expected a site's list; split it", name, line, mostLines)
		}
		rows = append(rows, listRow{line, cells})
	}
	if at == nil {
		return nil, nil, fmt.Errorf("%s: is empty; expected a line of column names and one line a monitor", name)
	}
	return rows, at, nil
}

func planRow(cells []string, at map[string]int, known map[string]Monitor) Change {
	cell := func(key string) string {
		i, ok := at[key]
		if !ok || i >= len(cells) {
			return ""
		}
		return strings.TrimSpace(cells[i])
	}
	c := Change{Serial: cell("serial")}
	old, there := known[c.Serial]
	m := old
	if !there {
		m = Monitor{Serial: c.Serial, Bits: 8, CalibratedIn: NotCalibrated, Orientation: "landscape"}
	}
	fail := func(err error) Change {
		c.What, c.Err = "error", err.Error()
		return c
	}
	note := func(field, was, is string) {
		if was != is {
			c.Fields = append(c.Fields, fmt.Sprintf("%s: %s -> %s", field, was, is))
		}
	}
	text := func(field string, into *string) {
		if v := cell(field); v != "" {
			note(field, *into, v)
			*into = v
		}
	}
	for field, into := range map[string]*string{
		"label": &m.Label, "model": &m.Model, "scheme": &m.Scheme, "class": &m.Class,
		"calibrated_in": &m.CalibratedIn, "orientation": &m.Orientation, "notes": &m.Notes,
	} {
		text(field, into)
	}
	c.room, c.station = old.Room, old.Station
	text("room", &c.room)
	text("station", &c.station)
	if c.room != old.Room && cell("station") == "" {
		c.station = ""
	}
	for field, into := range map[string]*int{"place": &m.Place, "bits": &m.Bits} {
		v := cell(field)
		if v == "" {
			continue
		}
		n, err := strconv.Atoi(v)
		if err != nil {
			return fail(bad(fmt.Sprintf("%s is %q", field, v), "a whole number", "correct it"))
		}
		note(field, strconv.Itoa(*into), strconv.Itoa(n))
		*into = n
	}
	figure := func(field string, was *float64) (*float64, error) {
		v := cell(field)
		if v == "" {
			return was, nil
		}
		f, err := strconv.ParseFloat(strings.Replace(v, ",", ".", 1), 64)
		if err != nil {
			return nil, bad(fmt.Sprintf("%s is %q", field, v), "a number", "correct it")
		}
		f += 0 // a zero has no sign
		before := "not stated"
		if was != nil {
			before = strconv.FormatFloat(*was, 'g', -1, 64)
		}
		note(field, before, strconv.FormatFloat(f, 'g', -1, 64))
		return &f, nil
	}
	rd, err := figure("rd", (*float64)(m.Rd))
	if err != nil {
		return fail(err)
	}
	m.Rd = (*photometry.PerLux)(rd)
	if m.BacklightHours, err = figure("backlight_hours", m.BacklightHours); err != nil {
		return fail(err)
	}
	if err := firstOf(errors.Join(m.check(), checkText("the room", c.room, false), checkText("the station", c.station, false))); err != nil {
		return fail(err)
	}
	if c.station != "" && c.room == "" {
		return fail(bad("a station stands without a room", "both", "fill in the room"))
	}
	if m.Scheme != "" {
		sch, err := criteria.Find(m.Scheme)
		if err != nil {
			return fail(err)
		}
		if _, err := sch.FindClass(m.Class); err != nil {
			return fail(err)
		}
	}
	c.monitor = m
	slices.Sort(c.Fields)
	switch {
	case !there:
		c.What, c.Fields = "new", nil
	case len(c.Fields) == 0:
		c.What = "same"
	default:
		c.What = "changed"
	}
	return c
}

// Import carries out a plan, all or nothing. A plan with an error in it is refused.
func (s *Store) Import(plan []Change) error {
	for _, c := range plan {
		if c.Err != "" {
			return fmt.Errorf("line %d: %s; nothing was imported", c.Line, c.Err)
		}
	}
	return s.in(context.Background(), func(tx *sql.Tx) error {
		for _, c := range plan {
			if c.What == "same" {
				continue
			}
			m := c.monitor
			m.StationID = nil
			if c.room != "" {
				room, err := findOrAdd(tx, "SELECT id FROM rooms WHERE name = $1", "INSERT INTO rooms (name) VALUES ($1) RETURNING id", c.room)
				if err != nil {
					return err
				}
				name := c.station
				if name == "" {
					name = c.room // a room with one place of work
				}
				station, err := findOrAdd(tx, "SELECT id FROM stations WHERE room_id = $1 AND name = $2", "INSERT INTO stations (room_id, name) VALUES ($1, $2) RETURNING id", room, name)
				if err != nil {
					return err
				}
				m.StationID = &station
			}
			if _, err := saveRow(tx, "monitors", m.ID, monitorColumns, m.values()); err != nil {
				if said := s.wrong(err); said != nil {
					err = said
				}
				return fmt.Errorf("line %d: %w", c.Line, err)
			}
		}
		return nil
	})
}

func findOrAdd(tx *sql.Tx, find, add string, args ...any) (id int64, err error) {
	err = tx.QueryRow(find, args...).Scan(&id)
	if errors.Is(err, sql.ErrNoRows) {
		err = tx.QueryRow(add, args...).Scan(&id)
	}
	return id, err
}
