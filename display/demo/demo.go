// Package demo makes an invented site: rooms, stations, monitors, a meter, persons and years of
// visits, with monitors that are good, near the limit, failing, overdue and swapped. Everything in it
// is made up; it serves to look at the program and to time it.
package demo

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"sync"
	"time"

	"evenstep/display/criteria"
	"evenstep/display/gsdf"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/record"
	"evenstep/display/store"
)

// Options say how large the site is.
type Options struct {
	Monitors int // 0: sixteen
	Visits   int // a monitor; 0: seven
	Seed     uint64
	Now      time.Time // the day the site is looked at
	Program  string    // name and version, for the records
}

// ErrNotEmpty is returned for a register that has monitors or records already.
var ErrNotEmpty = errors.New("the register is not empty; expected an empty one; name another file")

// fate is what becomes of a monitor over the years.
type fate int

const (
	good fate = iota
	borderline
	failing   // its table was lost before the last visit
	dimming   // will fall below its limit
	overdue   // nobody came for more than a year
	swappedIn // came in place of another, not long ago
)

var fates = []fate{good, good, borderline, good, dimming, good, failing, good, overdue, good, swappedIn}

// panel is an invented monitor as it was when it was new.
type panel struct {
	lmax, lmin float64 // cd/m2, emitted
	ripple     float64 // greatest deviation of a step, a fraction
	loss       float64 // of lmax a year, a fraction
	fate       fate
}

// Fill fills an empty register. progress is told how many of how many visits are done.
func Fill(ctx context.Context, s *store.Store, o Options, progress func(done, all int)) error {
	if o.Monitors <= 0 {
		o.Monitors = 16
	}
	if o.Visits <= 0 {
		o.Visits = 7
	}
	monitors, err := s.Monitors()
	if err != nil {
		return err
	}
	n, err := s.CountRecords(store.Search{})
	if err != nil {
		return err
	}
	if len(monitors) > 0 || n > 0 {
		return fmt.Errorf("%s: %w", s.Path(), ErrNotEmpty)
	}
	rng := rand.New(rand.NewPCG(o.Seed, 0x6576656e73746570))
	if err := s.SaveSite("Harbour clinic (invented)", ""); err != nil {
		return err
	}
	for _, p := range []store.Person{
		{ID: "p-001", Role: "physicist", Name: "Mira Tolle"}, {ID: "p-002", Role: "technician", Name: "Jonas Wiek"}, {ID: "p-003", Role: "head", Name: "Senna Arkady"},
	} {
		if err := s.SavePerson(p); err != nil {
			return err
		}
	}
	r, floor := .002, photometry.CdM2(.002)
	meter := store.Meter{
		Name: "meter-01", Kind: store.Contact, GainUncertainty: .03, GainK: 2, Repeatability: &r, NoiseFloor: &floor, Resolution: .01,
		CalibratedOn: o.Now.AddDate(0, -7, 0).Format(time.DateOnly), DueOn: o.Now.AddDate(0, 5, 0).Format(time.DateOnly),
	}
	if meter.ID, err = s.SaveMeter(meter); err != nil {
		return err
	}
	all, panels, err := build(s, o, rng)
	if err != nil {
		return err
	}
	return visits(ctx, s, o, meter, all, panels, progress)
}

// build makes rooms, stations and monitors: two monitors a station, four stations a room.
func build(s *store.Store, o Options, rng *rand.Rand) ([]store.Monitor, []panel, error) {
	names := []string{"reading room north", "reading room south", "mammography reading", "emergency reading", "ward viewing"}
	var all []store.Monitor
	var panels []panel
	var station int64
	for i := range o.Monitors {
		if i%8 == 0 {
			k := i / 8
			name := names[k%len(names)]
			if k >= len(names) {
				name = fmt.Sprintf("%s %d", name, k/len(names)+1)
			}
			lx := photometry.Lux(20 + 5*(k%4))
			room, err := s.SaveRoom(store.Room{Name: name, Illuminance: &lx})
			if err != nil {
				return nil, nil, err
			}
			for st := range 4 {
				id, err := s.SaveStation(store.Station{RoomID: room, Name: fmt.Sprintf("station %c", 'A'+st), Place: st})
				if err != nil {
					return nil, nil, err
				}
				if st == 0 {
					station = id
				}
			}
		}
		p := panel{
			lmax: 430 + 60*rng.Float64(), lmin: 1.05 + .2*rng.Float64(), ripple: .02 + .03*rng.Float64(), loss: .015 + .01*rng.Float64(),
			fate: fates[i%len(fates)],
		}
		switch p.fate {
		case borderline:
			p.ripple = .092
		case dimming:
			p.lmax, p.loss = 430, .06
		}
		at := station + int64(i%8)/2
		hours := math.Round(4000 + 9000*rng.Float64())
		m := store.Monitor{
			StationID: &at, Place: i%2 + 1, Serial: fmt.Sprintf("HC-%05d", 10001+i), Model: "invented panel, 3 megapixel", Label: []string{"left", "right"}[i%2],
			Scheme: "acr-aapm-siim-2012", Class: "diagnostic", CalibratedIn: store.InMonitor, Bits: 8, Orientation: "portrait", BacklightHours: &hours,
		}
		var err error
		if m.ID, err = s.SaveMonitor(m); err != nil {
			return nil, nil, err
		}
		all, panels = append(all, m), append(panels, p)
		if p.fate == swappedIn {
			old := m
			old.ID, old.StationID, old.Serial, old.Retired, old.Label = 0, nil, m.Serial+"-before", true, "taken out: backlight"
			if _, err := s.SaveMonitor(old); err != nil {
				return nil, nil, err
			}
		}
	}
	return all, panels, nil
}

// job is one visit to be made.
type job struct {
	monitor, visit int
	at             time.Time
}

// batch is how many records go into one transaction.
const batch = 256

func visits(ctx context.Context, s *store.Store, o Options, meter store.Meter, all []store.Monitor, panels []panel, progress func(done, all int)) error {
	scheme, err := criteria.Find("acr-aapm-siim-2012")
	if err != nil {
		return err
	}
	used, err := scheme.Use("diagnostic", nil)
	if err != nil {
		return err
	}
	var jobs []job
	for m := range all {
		for v := range o.Visits {
			months := 6 * (o.Visits - 1 - v) // the last one this month
			if panels[m].fate == overdue {
				months += 14
			}
			if panels[m].fate == swappedIn && v < o.Visits-1 {
				continue
			}
			at := o.Now.AddDate(0, -months, -(m % 20)).Truncate(time.Minute)
			jobs = append(jobs, job{m, v, at})
		}
	}
	done := 0
	for len(jobs) > 0 {
		part := jobs[:min(batch, len(jobs))]
		jobs = jobs[len(part):]
		records := make([]*record.Record, len(part))
		texts := make([][]byte, len(part))
		ids := make([]int64, len(part))
		errs := make([]error, len(part))
		var group sync.WaitGroup
		next := make(chan int, len(part))
		for i := range part {
			next <- i
		}
		close(next)
		for range runtime.GOMAXPROCS(0) {
			group.Go(func() {
				for i := range next {
					ids[i] = all[part[i].monitor].ID
					records[i], texts[i], errs[i] = one(o, meter, all[part[i].monitor], panels[part[i].monitor], part[i], used)
				}
			})
		}
		group.Wait()
		if err := errors.Join(errs...); err != nil {
			return err
		}
		if err := s.AddRecords(ctx, ids, records, texts); err != nil {
			return err
		}
		if done += len(part); progress != nil {
			progress(done, done+len(jobs))
		}
		if ctx.Err() != nil {
			return ctx.Err()
		}
	}
	return nil
}

// one makes one visit and seals it. The same options make the same visit whatever the order.
func one(o Options, meter store.Meter, m store.Monitor, p panel, j job, used *criteria.Used) (*record.Record, []byte, error) {
	rng := rand.New(rand.NewPCG(o.Seed+uint64(j.monitor)<<20, uint64(j.visit)))
	const ambient = .1 // cd/m2
	years := .5 * float64(j.visit)
	lmax, lmin := p.lmax*math.Pow(1-p.loss, years), p.lmin*math.Pow(1-p.loss/2, years)
	last := j.visit == o.Visits-1
	d := store.Draft{MonitorID: m.ID, Head: store.Head{
		Kind: "constancy", Person: "p-001", MeterID: meter.ID, Scheme: m.Scheme, Class: m.Class, Light: store.Light{Kind: store.LightMeasured, Ambient: ambient},
	}}
	if j.visit == 0 || p.fate == swappedIn {
		d.Kind = "acceptance"
	}
	low, err := gsdf.Index(photometry.CdM2(lmin + ambient))
	if err != nil {
		return nil, nil, fmt.Errorf("demo: %w", err)
	}
	high, err := gsdf.Index(photometry.CdM2(lmax + ambient))
	if err != nil {
		return nil, nil, fmt.Errorf("demo: %w", err)
	}
	phase := 2 * math.Pi * rng.Float64()
	for i := range 18 {
		t := float64(i) / 17
		// A slow wave along the index bends the steps by up to ripple.
		const waves = 2.0
		bend := p.ripple / (2 * math.Pi * waves) * (math.Sin(2*math.Pi*waves*t+phase) - math.Sin(phase))
		if i == 17 {
			bend = 0
		}
		l, err := gsdf.Luminance(low + (high-low)*gsdf.JND(min(1, max(0, t+bend))))
		if err != nil {
			return nil, nil, fmt.Errorf("demo: %w", err)
		}
		v := float64(l) - ambient
		if p.fate == failing && last {
			v = lmin + (lmax-lmin)*math.Pow(t, 2.2)
		}
		v *= 1 + .0015*rng.NormFloat64()
		digits := 100.0
		if v >= 100 {
			digits = 10
		}
		d.Readings = append(d.Readings, readings.Reading{
			Level: 15 * i, Luminance: photometry.CdM2(math.Round(v*digits) / digits), Role: readings.Series, Ambient: readings.Excluded,
			Time: j.at.Add(time.Duration(i) * 9 * time.Second),
		})
	}
	doc, err := d.Document(m, &meter, used, o.Program, j.at.Add(4*time.Minute))
	if err != nil {
		return nil, nil, fmt.Errorf("demo: %w", err)
	}
	return record.Seal(doc)
}
