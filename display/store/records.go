package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"runtime"
	"strings"
	"sync"
	"time"

	"evenstep/display/criteria"
	"evenstep/display/record"
)

// Entry is a sealed record as a list shows it.
type Entry struct {
	ID                         int64
	SHA256                     string
	MonitorID                  *int64
	Monitor                    string // title of the monitor now
	Serial, Time, Kind, Person string
	Scheme, Class              string
	Verdict                    criteria.Verdict
	MaxDeviation               *float64
	LuminanceMax, LuminanceMin float64
}

func insertRecord(tx *sql.Tx, monitor int64, r *record.Record, text []byte) (id int64, err error) {
	var m any
	if monitor != 0 {
		m = monitor
	}
	person := ""
	if len(r.Persons) > 0 {
		person = r.Persons[0].ID
	}
	at, err := time.Parse(time.RFC3339, r.Visit.Time)
	if err != nil {
		return 0, bad(fmt.Sprintf("the time of the visit is %q", r.Visit.Time), "RFC 3339, as 2026-11-30T09:15:00Z", "correct it")
	}
	a := r.Assessment
	err = tx.QueryRow(`INSERT INTO records (sha256, monitor_id, serial, time, kind, person, scheme, class, verdict, max_deviation, luminance_max_cd_m2, luminance_min_cd_m2, text)
		VALUES ($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11, $12, $13) RETURNING id`,
		r.SHA256, m, r.Monitor.Serial, toSecond(at), r.Visit.Kind, person, a.Scheme, a.Class, string(a.Verdict), a.MaxDeviation, a.LuminanceMax, a.LuminanceMin, text).Scan(&id)
	return id, err
}

// AddRecords keeps sealed records of monitors, all or none.
func (s *Store) AddRecords(ctx context.Context, monitors []int64, rs []*record.Record, texts [][]byte) error {
	return s.in(ctx, func(tx *sql.Tx) error {
		for i, r := range rs {
			if _, err := insertRecord(tx, monitors[i], r, texts[i]); err != nil {
				return err
			}
		}
		return nil
	})
}

// Search says which records are wanted. Words must all be found in serial, monitor, room, station,
// person, kind, verdict, scheme or time.
type Search struct {
	Words     string
	MonitorID int64     // 0: all
	From, To  time.Time // of the visit, To itself not; zero: open
	Limit     int       // 0: all
	Offset    int
}

func (q Search) where() (string, []any) {
	var parts []string
	var args []any
	for _, w := range strings.Fields(q.Words) {
		args = append(args, "%"+strings.NewReplacer(`\`, `\\`, "%", `\%`, "_", `\_`).Replace(strings.ToLower(w))+"%")
		parts = append(parts, fmt.Sprintf(`lower(x.serial || ' ' || coalesce(r.name, '') || ' ' || coalesce(st.name, '') || ' ' || coalesce(m.label, '') || ' ' || x.person || ' ' || x.kind || ' ' || x.verdict || ' ' || x.scheme || ' ' || x.time) LIKE $%d ESCAPE '\'`, len(args)))
	}
	if q.MonitorID != 0 {
		args = append(args, q.MonitorID)
		parts = append(parts, fmt.Sprintf("x.monitor_id = $%d", len(args)))
	}
	for _, end := range []struct {
		at   time.Time
		sign string
	}{{q.From, ">="}, {q.To, "<"}} {
		if !end.at.IsZero() {
			args = append(args, toSecond(end.at))
			parts = append(parts, fmt.Sprintf("x.time %s $%d", end.sign, len(args)))
		}
	}
	if len(parts) == 0 {
		return "", nil
	}
	return "WHERE " + strings.Join(parts, " AND "), args
}

const recordJoin = ` FROM records x LEFT JOIN monitors m ON m.id = x.monitor_id LEFT JOIN stations st ON st.id = m.station_id LEFT JOIN rooms r ON r.id = st.room_id `

// Records returns the records that are wanted, the latest first.
func (s *Store) Records(q Search) ([]Entry, error) {
	where, args := q.where()
	text := `SELECT x.id, x.sha256, x.monitor_id, coalesce(r.name, ''), coalesce(st.name, ''), coalesce(m.label, ''), x.serial, x.time, x.kind, x.person,
		x.scheme, x.class, x.verdict, x.max_deviation, x.luminance_max_cd_m2, x.luminance_min_cd_m2` + recordJoin + where + " ORDER BY x.time DESC, x.id DESC"
	if q.Limit > 0 {
		text += fmt.Sprintf(" LIMIT %d OFFSET %d", q.Limit, q.Offset)
	}
	return query(s, text, func(r *sql.Rows) (e Entry, err error) {
		var room, station, label, verdict string
		err = r.Scan(&e.ID, &e.SHA256, &e.MonitorID, &room, &station, &label, &e.Serial, &e.Time, &e.Kind, &e.Person,
			&e.Scheme, &e.Class, &verdict, &e.MaxDeviation, &e.LuminanceMax, &e.LuminanceMin)
		e.Verdict = criteria.Verdict(verdict)
		e.Monitor = Monitor{Room: room, Station: station, Label: label, Serial: e.Serial}.Title()
		return e, err
	}, args...)
}

// CountRecords is how many records are wanted, whatever Limit says.
func (s *Store) CountRecords(q Search) (n int, err error) {
	where, args := q.where()
	err = s.reader().QueryRow("SELECT count(*)"+recordJoin+where, args...).Scan(&n)
	return n, s.fault(err)
}

// Record returns a sealed record, verified, with its bytes.
func (s *Store) Record(id int64) (*record.Record, []byte, error) {
	var text []byte
	err := s.reader().QueryRow("SELECT text FROM records WHERE id = $1", id).Scan(&text)
	if errors.Is(err, sql.ErrNoRows) {
		return nil, nil, fmt.Errorf("record %d %w", id, ErrNotFound)
	}
	if err != nil {
		return nil, nil, s.fault(err)
	}
	r, err := record.Read(fmt.Sprintf("%s, record %d", s.Path(), id), text)
	return r, text, err
}

// LastRecord is the latest sealed record of a monitor; nil where there is none.
func (s *Store) LastRecord(monitor int64) (*record.Record, error) {
	all, err := s.Records(Search{MonitorID: monitor, Limit: 1})
	if err != nil || len(all) == 0 {
		return nil, err
	}
	r, _, err := s.Record(all[0].ID)
	return r, err
}

// Rejudged is what a record comes to under other limits. The record is not touched.
type Rejudged struct {
	ID            int64
	Serial, Time  string
	Before, After criteria.Verdict
	Err           error // the record could not be read; the rest are judged all the same
}

// Rejudge judges every record again under the limits given and hands the outcome of each to report, in
// no order, one at a time. progress is told now and then how many of how many are done. It ends early,
// with its error, when ctx does.
func (s *Store) Rejudge(ctx context.Context, used *criteria.Used, report func(Rejudged), progress func(done, all int)) error {
	total, err := s.CountRecords(Search{})
	if err != nil {
		return err
	}
	rows, err := s.reader().QueryContext(ctx, "SELECT id, text FROM records ORDER BY id")
	if err != nil {
		return s.fault(err)
	}
	defer rows.Close()
	type job struct {
		id   int64
		text []byte
	}
	jobs := make(chan job, 64)
	results := make(chan Rejudged, 64)
	var workers sync.WaitGroup
	for range max(1, runtime.GOMAXPROCS(0)) {
		workers.Go(func() {
			for j := range jobs {
				results <- rejudge(j.id, j.text, used)
			}
		})
	}
	done := make(chan struct{})
	go func() {
		n := 0
		for r := range results {
			report(r)
			if n++; progress != nil && (n%256 == 0 || n == total) {
				progress(n, total)
			}
		}
		close(done)
	}()
	for rows.Next() {
		var j job
		if err = rows.Scan(&j.id, &j.text); err != nil {
			break
		}
		select {
		case jobs <- j:
		case <-ctx.Done():
			err = ctx.Err()
		}
		if err != nil {
			break
		}
	}
	close(jobs)
	workers.Wait()
	close(results)
	<-done
	if err == nil {
		err = rows.Err()
	}
	if ctx.Err() != nil {
		return ctx.Err()
	}
	return s.fault(err)
}

func rejudge(id int64, text []byte, used *criteria.Used) Rejudged {
	r, err := record.Read(fmt.Sprintf("record %d", id), text)
	if err != nil {
		return Rejudged{ID: id, Err: err}
	}
	out := Rejudged{ID: id, Serial: r.Monitor.Serial, Time: r.Visit.Time, Before: r.Assessment.Verdict}
	v, err := r.Measured()
	if err != nil {
		out.Err = err
		return out
	}
	out.After = criteria.Outcome(v, used)
	return out
}

// Latest is the latest record of each monitor, by the monitor's ID.
func (s *Store) Latest() (map[int64]Entry, error) {
	es, err := query(s, `SELECT x.id, x.monitor_id, x.serial, x.time, x.kind, x.verdict, x.max_deviation, x.luminance_max_cd_m2, x.luminance_min_cd_m2
		FROM records x JOIN (SELECT monitor_id AS m, max(time) AS t FROM records WHERE monitor_id IS NOT NULL GROUP BY monitor_id) y ON y.m = x.monitor_id AND y.t = x.time
		ORDER BY x.id`, func(r *sql.Rows) (e Entry, err error) {
		var verdict string
		err = r.Scan(&e.ID, &e.MonitorID, &e.Serial, &e.Time, &e.Kind, &verdict, &e.MaxDeviation, &e.LuminanceMax, &e.LuminanceMin)
		e.Verdict = criteria.Verdict(verdict)
		return e, err
	})
	if err != nil {
		return nil, err
	}
	out := map[int64]Entry{}
	for _, e := range es {
		out[*e.MonitorID] = e
	}
	return out, nil
}
