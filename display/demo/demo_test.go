package demo

import (
	"context"
	"errors"
	"path/filepath"
	"testing"
	"time"

	"evenstep/display/criteria"
	"evenstep/display/store"
)

func TestSiteHasEveryFate(t *testing.T) {
	s, err := store.Open(filepath.Join(t.TempDir(), "r.db"))
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	o := Options{Seed: 1, Now: time.Date(2026, 11, 30, 12, 0, 0, 0, time.UTC), Program: "evenstep test"}
	told := 0
	if err := Fill(context.Background(), s, o, func(done, all int) { told = all }); err != nil {
		t.Fatal(err)
	}
	monitors, err := s.Monitors()
	if err != nil {
		t.Fatal(err)
	}
	entries, err := s.Records(store.Search{})
	if err != nil {
		t.Fatal(err)
	}
	if len(monitors) != 17 || len(entries) != told || told != 16*7-6 {
		t.Fatalf("%d monitors, %d records, told of %d", len(monitors), len(entries), told)
	}
	latest := map[string]store.Entry{}
	for _, e := range entries { // the latest first
		if _, ok := latest[e.Serial]; !ok {
			latest[e.Serial] = e
		}
		if _, _, err := s.Record(e.ID); err != nil {
			t.Errorf("record %d: %v", e.ID, err)
		}
	}
	seen := map[criteria.Verdict]int{}
	for _, e := range latest {
		seen[e.Verdict]++
	}
	if seen[criteria.Fails] == 0 || seen[criteria.Meets] < 5 || seen[criteria.MeetsUncertainly]+seen[criteria.FailsUncertainly] == 0 {
		t.Errorf("verdicts of the latest visits: %v; want good, doubtful and failing ones", seen)
	}
	if e := latest["HC-10009"]; e.Time > "2025-10-01" {
		t.Errorf("the overdue monitor was seen on %s", e.Time)
	}
	if e := latest["HC-10007"]; e.Verdict != criteria.Fails {
		t.Errorf("the monitor that lost its table: %s", e.Verdict)
	}
	if err := Fill(context.Background(), s, o, nil); !errors.Is(err, ErrNotEmpty) {
		t.Errorf("filled twice: %v", err)
	}
}

func TestSameSeedSameSite(t *testing.T) {
	o := Options{Monitors: 3, Visits: 2, Seed: 4, Now: time.Date(2026, 11, 30, 12, 0, 0, 0, time.UTC), Program: "evenstep test"}
	var first []store.Entry
	for range 2 {
		s, err := store.Open(filepath.Join(t.TempDir(), "r.db"))
		if err != nil {
			t.Fatal(err)
		}
		if err := Fill(context.Background(), s, o, nil); err != nil {
			t.Fatal(err)
		}
		entries, err := s.Records(store.Search{})
		if err != nil {
			t.Fatal(err)
		}
		s.Close()
		if first == nil {
			first = entries
			continue
		}
		for i := range entries {
			if entries[i].SHA256 != first[i].SHA256 {
				t.Errorf("record %d differs", i)
			}
		}
	}
}
