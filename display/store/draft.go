package store

import (
	"context"
	"crypto/sha256"
	"database/sql"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"slices"
	"time"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/record"
	"evenstep/display/response"
)

// Head is what a visit says beside its readings.
type Head struct {
	Kind     string `json:"kind"` // of record.Kinds
	Person   string `json:"person"`
	Reviewer string `json:"reviewer,omitempty"`
	MeterID  int64  `json:"meter_id"` // 0: none chosen
	Scheme   string `json:"scheme"`
	Class    string `json:"class"`
	Plan     []int  `json:"plan"` // levels, in the order in which they are asked for
	Light    Light  `json:"light"`
	// ReadingsHoldAmbient: the meter sees the ambient light with the screen's.
	ReadingsHoldAmbient bool `json:"readings_hold_ambient"`

	Places    []readings.Place    `json:"places,omitempty"`
	Neighbour *criteria.Neighbour `json:"neighbour,omitempty"`
	OtherOne  string              `json:"other_one,omitempty"` // serial of the neighbour
	Notes     string              `json:"notes,omitempty"`
	Table     *record.Table       `json:"table,omitempty"` // made from the readings so far
}

// LightKind says how the room light of a visit is stated.
type LightKind string

// The ways to state the room light. Nothing is judged while it is not stated.
const (
	LightUnstated    LightKind = ""
	LightMeasured    LightKind = "ambient luminance"
	LightIlluminance LightKind = "illuminance"
	LightDark        LightKind = "dark room"
	LightInside      LightKind = "in the readings" // and its size is not known
)

// Light is the room light as it was stated.
type Light struct {
	Kind        LightKind          `json:"kind"`
	Ambient     photometry.CdM2    `json:"ambient_cd_m2,omitempty"`
	Illuminance photometry.Lux     `json:"illuminance_lx,omitempty"`
	Rd          *photometry.PerLux `json:"rd,omitempty"` // nil: assumed
}

// Response is the light as the response takes it.
func (l Light) Response() (response.Light, error) {
	switch l.Kind {
	case LightMeasured:
		var lux *photometry.Lux
		if l.Illuminance > 0 {
			lux = &l.Illuminance
		}
		return response.MeasuredAmbient(l.Ambient, lux), nil
	case LightIlluminance:
		return response.FromIlluminance(l.Illuminance, l.Rd), nil
	case LightDark:
		return response.DarkRoom(), nil
	case LightInside:
		return response.AmbientInReadings(), nil
	}
	return response.Light{}, fmt.Errorf("room light: %w; expected its luminance, the illuminance, or a dark room; state it", response.ErrAmbientUnknown)
}

// Draft is a visit while it is measured.
type Draft struct {
	ID        int64
	MonitorID int64
	Started   time.Time
	Head
	Readings []readings.Reading // as the meter gave them
}

// Input is what the response is computed from.
func (d Draft) Input(m Monitor, meter *Meter) (response.Input, error) {
	light, err := d.Light.Response()
	if err != nil {
		return response.Input{}, err
	}
	in := response.Input{Bits: m.Bits, Scale: readings.DDL, Light: light, Readings: append([]readings.Reading(nil), d.Readings...)}
	factor := meter.factor() // what the meter gives goes over to the site's reference meter, the ambient luminance too
	if d.Light.Kind == LightMeasured && factor != 1 {
		in.Light = response.MeasuredAmbient(d.Light.Ambient*factor, light.Illuminance)
	}
	in.Noise = response.Noise{Repeatability: response.RepeatabilityDefault, Floor: response.FloorDefault, Assumed: true}
	if meter != nil {
		in.Noise = meter.Noise()
	}
	// What the head says of ambient light holds for the whole visit: it may be stated after the readings.
	for i := range in.Readings {
		in.Readings[i].Luminance *= factor
		in.Readings[i].Ambient = readings.Excluded
		if d.ReadingsHoldAmbient || d.Light.Kind == LightInside {
			in.Readings[i].Ambient = readings.Included
		}
	}
	return in, nil
}

// beside is what was read beside the levels, over to the reference meter as they are: the two screens of a
// pair are compared.
func (d Draft) beside(meter *Meter) ([]readings.Place, *criteria.Neighbour) {
	factor := meter.factor()
	if factor == 1 {
		return d.Places, d.Neighbour
	}
	places := slices.Clone(d.Places)
	for i := range places {
		places[i].Luminance *= factor
	}
	if d.Neighbour == nil {
		return places, nil
	}
	other := *d.Neighbour
	if other.LuminanceMax != nil {
		l := *other.LuminanceMax * factor
		other.LuminanceMax = &l
	}
	return places, &other
}

// ReadingsSHA256 identifies the readings so far: the hash of one line a reading, of level, luminance in
// cd/m2, role and time.
func (d Draft) ReadingsSHA256() string {
	h := sha256.New()
	for _, r := range d.Readings {
		fmt.Fprintf(h, "%d,%v,%s,%s\n", r.Level, float64(r.Luminance), r.Role, instant(r.Time))
	}
	return hex.EncodeToString(h.Sum(nil))
}

// Judge says everything that can be said of the visit so far. It fails while the ends of the range or
// the room light are missing.
func (d Draft) Judge(m Monitor, meter *Meter, used *criteria.Used) (*response.Response, criteria.Assessment, error) {
	in, err := d.Input(m, meter)
	if err != nil {
		return nil, criteria.Assessment{}, err
	}
	r, err := response.Evaluate(in)
	if err != nil {
		return nil, criteria.Assessment{}, err
	}
	places, other := d.beside(meter)
	return r, criteria.Assess(criteria.Visit{Response: r, Places: places, Neighbour: other}, used), nil
}

// Document is the visit as a record that is not sealed yet.
func (d Draft) Document(m Monitor, meter *Meter, used *criteria.Used, program string, now time.Time) (record.Record, error) {
	in, err := d.Input(m, meter)
	if err != nil {
		return record.Record{}, err
	}
	_, a, err := d.Judge(m, meter, used)
	if err != nil {
		return record.Record{}, err
	}
	r := record.Record{
		Program: program,
		Visit:   record.Visit{Kind: d.Kind, Time: now.UTC().Format(time.RFC3339), Notes: d.Notes},
		Monitor: record.Monitor{Serial: m.Serial, Name: m.Title()},
		Scheme:  used, Assessment: a, Table: d.Table,
	}
	if n := []rune(r.Monitor.Name); len(n) > 64 {
		r.Monitor.Name = string(n[:63]) + "…"
	}
	for _, who := range []record.Person{{ID: d.Person, Part: "measured"}, {ID: d.Reviewer, Part: "reviewed"}} {
		if who.ID != "" {
			r.Persons = append(r.Persons, who)
		}
	}
	if meter != nil {
		r.Meter = record.Meter{ID: meter.Name, Kind: meter.Kind, CalibratedOn: meter.CalibratedOn}
		if meter.Factor != 1 {
			r.Meter.Factor = meter.Factor
		}
	}
	if d.Neighbour != nil {
		r.Neighbour = &record.Neighbour{Serial: d.OtherOne}
	}
	places, other := d.beside(meter)
	r.Take(in, places, other)
	return r, nil
}

// StartDraft keeps a new visit and returns it with its ID.
func (s *Store) StartDraft(monitor int64, h Head, now time.Time) (Draft, error) {
	d := Draft{MonitorID: monitor, Started: now.UTC(), Head: h}
	head, err := json.Marshal(h)
	if err != nil {
		return d, fmt.Errorf("visit: %w", err)
	}
	d.ID, err = s.save("drafts", 0, []string{"monitor_id", "started", "head"}, monitor, instant(now), string(head))
	return d, err
}

// SaveHead keeps what a visit says beside its readings.
func (s *Store) SaveHead(draft int64, h Head) error {
	head, err := json.Marshal(h)
	if err != nil {
		return fmt.Errorf("visit: %w", err)
	}
	_, err = s.save("drafts", draft, []string{"head"}, string(head))
	return err
}

// AddReading keeps one reading. It is on disk when AddReading returns.
func (s *Store) AddReading(draft int64, r readings.Reading) error {
	return s.in(context.Background(), func(tx *sql.Tx) error {
		_, err := tx.Exec(`INSERT INTO draft_readings (draft_id, seq, level, luminance_cd_m2, role, ambient, time)
			VALUES ($1, (SELECT coalesce(max(seq), 0) + 1 FROM draft_readings WHERE draft_id = $1), $2, $3, $4, $5, $6)`,
			draft, r.Level, float64(r.Luminance), string(r.Role), string(r.Ambient), instant(r.Time))
		return err
	})
}

// UndoReading takes the last reading of a visit out again.
func (s *Store) UndoReading(draft int64) error {
	return s.in(context.Background(), func(tx *sql.Tx) error {
		_, err := tx.Exec("DELETE FROM draft_readings WHERE draft_id = $1 AND seq = (SELECT max(seq) FROM draft_readings WHERE draft_id = $1)", draft)
		return err
	})
}

// DropDraft removes a visit that is not to be sealed.
func (s *Store) DropDraft(draft int64) error {
	return s.in(context.Background(), func(tx *sql.Tx) error {
		_, err := tx.Exec("DELETE FROM drafts WHERE id = $1", draft)
		return err
	})
}

// Drafts returns the visits that are not sealed yet, the latest first.
func (s *Store) Drafts() ([]Draft, error) {
	ds, err := query(s, "SELECT id, monitor_id, started, head FROM drafts ORDER BY started DESC, id DESC", func(r *sql.Rows) (d Draft, err error) {
		var started, head string
		if err := r.Scan(&d.ID, &d.MonitorID, &started, &head); err != nil {
			return d, err
		}
		if d.Started, err = time.Parse(time.RFC3339Nano, started); err != nil {
			return d, err
		}
		return d, json.Unmarshal([]byte(head), &d.Head)
	})
	if err != nil {
		return nil, err
	}
	for i := range ds {
		if ds[i].Readings, err = s.draftReadings(ds[i].ID); err != nil {
			return nil, err
		}
	}
	return ds, nil
}

// Draft returns one visit that is not sealed yet.
func (s *Store) Draft(id int64) (Draft, error) {
	all, err := s.Drafts()
	if err != nil {
		return Draft{}, err
	}
	for _, d := range all {
		if d.ID == id {
			return d, nil
		}
	}
	return Draft{}, fmt.Errorf("visit %d %w", id, ErrNotFound)
}

func (s *Store) draftReadings(draft int64) ([]readings.Reading, error) {
	return query(s, "SELECT level, luminance_cd_m2, role, ambient, time FROM draft_readings WHERE draft_id = $1 ORDER BY seq", func(r *sql.Rows) (o readings.Reading, err error) {
		var role, ambient, at string
		if err := r.Scan(&o.Level, (*float64)(&o.Luminance), &role, &ambient, &at); err != nil {
			return o, err
		}
		o.Role, o.Ambient = readings.Role(role), readings.Ambient(ambient)
		o.Time, err = time.Parse(time.RFC3339Nano, at)
		return o, err
	}, draft)
}

// SealDraft keeps a sealed record in place of the visit it was made from, in one transaction.
func (s *Store) SealDraft(d Draft, r *record.Record, text []byte) (int64, error) {
	var id int64
	err := s.in(context.Background(), func(tx *sql.Tx) (err error) {
		if id, err = insertRecord(tx, d.MonitorID, r, text); err != nil {
			return err
		}
		res, err := tx.Exec("DELETE FROM drafts WHERE id = $1", d.ID)
		if err != nil {
			return err
		}
		if n, err := res.RowsAffected(); err != nil || n == 0 {
			return errors.Join(fmt.Errorf("visit %d %w: it was sealed or dropped before", d.ID, ErrNotFound), err)
		}
		return nil
	})
	return id, err
}
