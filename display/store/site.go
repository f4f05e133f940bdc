package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"slices"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"

	"evenstep/display/photometry"
	"evenstep/display/response"
)

// Room is a room in which images are read.
type Room struct {
	ID          int64
	Name        string
	Illuminance *photometry.Lux // on the screens, as in use; nil: not measured
	Notes       string
}

// Station is a place of work with one or more monitors.
type Station struct {
	ID, RoomID int64
	Room       string // name of the room
	Name       string
	Place      int // order in the room
}

// The places where a monitor's grays are set.
const (
	InMonitor      = "monitor"
	InGraphicsCard = "graphics card"
	InViewer       = "viewer"
	NotCalibrated  = "none"
)

// CalibratedIn are the values of Monitor.CalibratedIn.
func CalibratedIn() []string { return []string{InMonitor, InGraphicsCard, InViewer, NotCalibrated} }

// Orientations are the values of Monitor.Orientation.
func Orientations() []string { return []string{"landscape", "portrait"} }

// Monitor is one screen. Its neighbours are the monitors of its station, in the order of Place.
type Monitor struct {
	ID             int64
	StationID      *int64 // nil: in no station
	Room, Station  string // names, for showing
	Place          int    // from the left, 1 is the leftmost
	Serial         string
	Model          string
	Label          string // what it is called at the site, as "left"
	Scheme, Class  string
	CalibratedIn   string
	Bits           int
	Rd             *photometry.PerLux // nil: assumed
	Orientation    string
	BacklightHours *float64
	Retired        bool
	Notes          string
}

// Title is what a monitor is called in a list.
func (m Monitor) Title() string {
	parts := []string{}
	for _, p := range []string{m.Room, m.Station, m.Label} {
		if p != "" {
			parts = append(parts, p)
		}
	}
	if len(parts) == 0 {
		return m.Serial
	}
	return strings.Join(parts, " › ")
}

// The kinds of meter.
const (
	Contact  = "contact"  // laid on the screen: sees no ambient light
	Distance = "distance" // sees what the eye sees, ambient light in it
)

// Meter is a luminance meter.
type Meter struct {
	ID              int64
	Name            string // id at the site
	Kind            string
	GainUncertainty float64 // expanded, a fraction; 0: not stated
	GainK           float64
	Repeatability   *float64         // a fraction; nil: assumed
	NoiseFloor      *photometry.CdM2 // nil: assumed
	Resolution      photometry.CdM2
	Factor          float64 // against the site's reference meter: readings are multiplied by it
	CalibratedOn    string  // day, ISO 8601; "": not stated
	DueOn           string
}

// Noise is what is known of the meter, as the response takes it.
func (m Meter) Noise() response.Noise {
	n := response.Noise{Repeatability: response.RepeatabilityDefault, Floor: response.FloorDefault, Resolution: m.Resolution}
	if m.Repeatability != nil {
		n.Repeatability = *m.Repeatability
	}
	if m.NoiseFloor != nil {
		n.Floor = *m.NoiseFloor
	}
	n.Assumed = m.Repeatability == nil || m.NoiseFloor == nil
	if m.GainUncertainty > 0 && m.GainK > 0 {
		n.Gain = m.GainUncertainty / m.GainK
	}
	return n
}

// factor is what readings are multiplied by; m may be nil.
func (m *Meter) factor() photometry.CdM2 {
	if m == nil || m.Factor <= 0 {
		return 1
	}
	return photometry.CdM2(m.Factor)
}

// Person is someone who measures or reviews. The name lives apart from the id and may be erased.
type Person struct {
	ID   string
	Role string // self-declared: "physicist", "technician", "head"
	Name string // "" where erased or never given
}

// Roles are the roles that persons may declare.
func Roles() []string { return []string{"physicist", "technician", "radiologist", "head"} }

func bad(what, expected, do string) error { return &Error{what, expected, do} }

// checkText holds a name to one line that fits a page.
func checkText(what, s string, needed bool) error {
	const longest = 64 // a record's ids have no more
	switch {
	case needed && strings.TrimSpace(s) == "":
		return bad(what+" is empty", "a text", "type it")
	case len([]rune(s)) > longest:
		return bad(fmt.Sprintf("%s has %d characters", what, len([]rune(s))), fmt.Sprintf("at most %d", longest), "shorten it")
	case !utf8.ValidString(s) || strings.ContainsFunc(s, unicode.IsControl):
		return bad(what+" has a line break or another sign that cannot be shown", "one line of text", "remove it")
	}
	return nil
}

func checkDay(what, s string) error {
	if s == "" {
		return nil
	}
	if _, err := time.Parse(time.DateOnly, s); err != nil {
		return bad(fmt.Sprintf("%s is %q", what, s), "a day as 2026-11-30", "correct it")
	}
	return nil
}

func within(what string, v *float64, lo, hi float64, unit string) error {
	if v != nil && !(*v >= lo && *v <= hi) {
		return bad(fmt.Sprintf("%s is %v", what, *v), fmt.Sprintf("%v to %v %s", lo, hi, unit), "check the figure and its unit")
	}
	return nil
}

// SaveRoom keeps a room; one without ID is new. It returns the ID.
func (s *Store) SaveRoom(r Room) (int64, error) {
	if err := errors.Join(checkText("the room's name", r.Name, true), within("the illuminance", (*float64)(r.Illuminance), 0, 100000, "lx")); err != nil {
		return 0, firstOf(err)
	}
	return s.save("rooms", r.ID, []string{"name", "illuminance_lx", "notes"}, r.Name, (*float64)(r.Illuminance), r.Notes)
}

// SaveStation keeps a station.
func (s *Store) SaveStation(st Station) (int64, error) {
	if err := checkText("the station's name", st.Name, true); err != nil {
		return 0, err
	}
	return s.save("stations", st.ID, []string{"room_id", "name", "place"}, st.RoomID, st.Name, st.Place)
}

func (m Monitor) check() error {
	return firstOf(errors.Join(
		checkText("the serial", m.Serial, true), checkText("the label", m.Label, false), checkText("the model", m.Model, false),
		oneOf("where it is calibrated", m.CalibratedIn, CalibratedIn()), oneOf("the orientation", m.Orientation, Orientations()),
		within("Rd", (*float64)(m.Rd), 0, 1, "cd/m2 per lx"), within("the backlight's hours", m.BacklightHours, 0, 1e6, "h"),
		bitsOf(m.Bits),
	))
}

func bitsOf(b int) error {
	if b < 1 || b > 16 {
		return bad(fmt.Sprintf("the bit depth is %d", b), "1 to 16, usually 8 or 10", "correct it")
	}
	return nil
}

func oneOf(what, s string, all []string) error {
	if !slices.Contains(all, s) {
		return bad(fmt.Sprintf("%s is %q", what, s), "one of "+strings.Join(all, ", "), "choose one")
	}
	return nil
}

// SaveMonitor keeps a monitor.
func (s *Store) SaveMonitor(m Monitor) (int64, error) {
	if err := m.check(); err != nil {
		return 0, err
	}
	return s.save("monitors", m.ID, monitorColumns, m.values()...)
}

var monitorColumns = []string{
	"station_id", "place", "serial", "model", "label", "scheme", "class", "calibrated_in", "bits", "rd",
	"orientation", "backlight_hours", "retired", "notes",
}

func (m Monitor) values() []any {
	return []any{
		m.StationID, m.Place, m.Serial, m.Model, m.Label, m.Scheme, m.Class, m.CalibratedIn, m.Bits, (*float64)(m.Rd),
		m.Orientation, m.BacklightHours, m.Retired, m.Notes,
	}
}

// SaveMeter keeps a meter.
func (s *Store) SaveMeter(m Meter) (int64, error) {
	if m.GainK == 0 {
		m.GainK = 2
	}
	if m.Factor == 0 {
		m.Factor = 1
	}
	res := float64(m.Resolution)
	if err := firstOf(errors.Join(
		checkText("the meter's id", m.Name, true), oneOf("the kind of meter", m.Kind, []string{Contact, Distance}),
		within("the calibration's uncertainty", &m.GainUncertainty, 0, .5, "(a fraction)"), within("k", &m.GainK, 1, 5, ""),
		within("the repeatability", m.Repeatability, 0, .2, "(a fraction)"), within("the noise floor", (*float64)(m.NoiseFloor), 0, 10, "cd/m2"),
		within("the resolution", &res, 0, 100, "cd/m2"), within("the factor", &m.Factor, .5, 2, ""),
		checkDay("the day of calibration", m.CalibratedOn), checkDay("the day it is due", m.DueOn),
	)); err != nil {
		return 0, err
	}
	return s.save("meters", m.ID, []string{
		"name", "kind", "gain_uncertainty", "gain_k", "repeatability", "noise_floor_cd_m2", "resolution_cd_m2", "factor", "calibrated_on", "due_on",
	}, m.Name, m.Kind, m.GainUncertainty, m.GainK, m.Repeatability, (*float64)(m.NoiseFloor), res, m.Factor, m.CalibratedOn, m.DueOn)
}

// SavePerson keeps a person. An empty name erases the one there was.
func (s *Store) SavePerson(p Person) error {
	if err := firstOf(errors.Join(checkText("the person's id", p.ID, true), checkText("the name", p.Name, false))); err != nil {
		return err
	}
	return s.in(context.Background(), func(tx *sql.Tx) error {
		_, err := tx.Exec("INSERT INTO persons (id, role) VALUES ($1, $2) ON CONFLICT (id) DO UPDATE SET role = excluded.role", p.ID, p.Role)
		if err != nil {
			return err
		}
		if p.Name == "" {
			_, err = tx.Exec("DELETE FROM person_names WHERE person_id = $1", p.ID)
			return err
		}
		_, err = tx.Exec("INSERT INTO person_names (person_id, name) VALUES ($1, $2) ON CONFLICT (person_id) DO UPDATE SET name = excluded.name", p.ID, p.Name)
		return err
	})
}

// save inserts or updates one row and returns its id.
func (s *Store) save(table string, id int64, columns []string, values ...any) (int64, error) {
	err := s.in(context.Background(), func(tx *sql.Tx) (err error) {
		id, err = saveRow(tx, table, id, columns, values)
		return err
	})
	return id, err
}

func saveRow(tx *sql.Tx, table string, id int64, columns []string, values []any) (int64, error) {
	marks := make([]string, len(columns))
	sets := make([]string, len(columns))
	for i, c := range columns {
		marks[i] = fmt.Sprintf("$%d", i+1)
		sets[i] = c + " = " + marks[i]
	}
	if id == 0 {
		err := tx.QueryRow(fmt.Sprintf("INSERT INTO %s (%s) VALUES (%s) RETURNING id", table, strings.Join(columns, ", "), strings.Join(marks, ", ")), values...).Scan(&id)
		return id, err
	}
	r, err := tx.Exec(fmt.Sprintf("UPDATE %s SET %s WHERE id = $%d", table, strings.Join(sets, ", "), len(columns)+1), append(values, id)...)
	if err != nil {
		return 0, err
	}
	if n, err := r.RowsAffected(); err != nil || n == 0 {
		return 0, errors.Join(fmt.Errorf("%s %d %w", strings.TrimSuffix(table, "s"), id, ErrNotFound), err)
	}
	return id, nil
}

func firstOf(err error) error {
	var joined interface{ Unwrap() []error }
	if errors.As(err, &joined) {
		for _, e := range joined.Unwrap() {
			if e != nil {
				return e
			}
		}
	}
	return err
}

// Rooms returns the rooms by name.
func (s *Store) Rooms() ([]Room, error) {
	return query(s, "SELECT id, name, illuminance_lx, notes FROM rooms ORDER BY name", func(r *sql.Rows) (o Room, err error) {
		var lx *float64
		err = r.Scan(&o.ID, &o.Name, &lx, &o.Notes)
		o.Illuminance = (*photometry.Lux)(lx)
		return o, err
	})
}

// Stations returns the stations in the order of their rooms.
func (s *Store) Stations() ([]Station, error) {
	return query(s, "SELECT st.id, st.room_id, r.name, st.name, st.place FROM stations st JOIN rooms r ON r.id = st.room_id ORDER BY r.name, st.place, st.name",
		func(r *sql.Rows) (o Station, err error) {
			err = r.Scan(&o.ID, &o.RoomID, &o.Room, &o.Name, &o.Place)
			return o, err
		})
}

const monitorSelect = `SELECT m.id, m.station_id, coalesce(r.name, ''), coalesce(st.name, ''), m.place, m.serial, m.model, m.label, m.scheme, m.class,
	m.calibrated_in, m.bits, m.rd, m.orientation, m.backlight_hours, m.retired, m.notes
	FROM monitors m LEFT JOIN stations st ON st.id = m.station_id LEFT JOIN rooms r ON r.id = st.room_id `

func scanMonitor(r interface{ Scan(...any) error }) (m Monitor, err error) {
	var rd *float64
	err = r.Scan(&m.ID, &m.StationID, &m.Room, &m.Station, &m.Place, &m.Serial, &m.Model, &m.Label, &m.Scheme, &m.Class,
		&m.CalibratedIn, &m.Bits, &rd, &m.Orientation, &m.BacklightHours, &m.Retired, &m.Notes)
	m.Rd = (*photometry.PerLux)(rd)
	return m, err
}

// Monitors returns the monitors in the order of rooms, stations and places.
func (s *Store) Monitors() ([]Monitor, error) {
	return query(s, monitorSelect+"ORDER BY r.name IS NULL, r.name, st.place, st.name, m.place, m.serial", func(r *sql.Rows) (Monitor, error) { return scanMonitor(r) })
}

// Monitor returns one monitor.
func (s *Store) Monitor(id int64) (Monitor, error) {
	m, err := scanMonitor(s.reader().QueryRow(monitorSelect+"WHERE m.id = $1", id))
	if errors.Is(err, sql.ErrNoRows) {
		return m, fmt.Errorf("monitor %d %w", id, ErrNotFound)
	}
	return m, s.fault(err)
}

// Meters returns the meters by name.
func (s *Store) Meters() ([]Meter, error) {
	return query(s, "SELECT id, name, kind, gain_uncertainty, gain_k, repeatability, noise_floor_cd_m2, resolution_cd_m2, factor, calibrated_on, due_on FROM meters ORDER BY name",
		func(r *sql.Rows) (m Meter, err error) {
			var floor *float64
			err = r.Scan(&m.ID, &m.Name, &m.Kind, &m.GainUncertainty, &m.GainK, &m.Repeatability, &floor, (*float64)(&m.Resolution), &m.Factor, &m.CalibratedOn, &m.DueOn)
			m.NoiseFloor = (*photometry.CdM2)(floor)
			return m, err
		})
}

// Persons returns the persons by id.
func (s *Store) Persons() ([]Person, error) {
	return query(s, "SELECT p.id, p.role, coalesce(n.name, '') FROM persons p LEFT JOIN person_names n ON n.person_id = p.id ORDER BY p.id",
		func(r *sql.Rows) (o Person, err error) {
			err = r.Scan(&o.ID, &o.Role, &o.Name)
			return o, err
		})
}

// Site returns the site's name and the text of its own limits (see criteria.ParseSite).
func (s *Store) Site() (name, limits string, err error) {
	err = s.reader().QueryRow("SELECT name, limits FROM site WHERE id = 1").Scan(&name, &limits)
	return name, limits, s.fault(err)
}

// SaveSite keeps the site's name and the text of its own limits.
func (s *Store) SaveSite(name, limits string) error {
	if err := checkText("the site's name", name, false); err != nil {
		return err
	}
	return s.in(context.Background(), func(tx *sql.Tx) error {
		_, err := tx.Exec("UPDATE site SET name = $1, limits = $2 WHERE id = 1", name, limits)
		return err
	})
}

// query reads all rows of a statement.
func query[T any](s *Store, text string, scan func(*sql.Rows) (T, error), args ...any) ([]T, error) {
	r, err := s.reader().Query(text, args...)
	if err != nil {
		return nil, s.fault(err)
	}
	defer r.Close()
	var out []T
	for r.Next() {
		o, err := scan(r)
		if err != nil {
			return nil, s.fault(err)
		}
		out = append(out, o)
	}
	return out, s.fault(r.Err())
}
