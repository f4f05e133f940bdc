package store

import (
	"flag"
	"fmt"
	"os"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "write golden files anew")

func importList(t *testing.T, s *Store) {
	must[int64](t)(s.SaveMonitor(testMonitor()))
	list := string(must[[]byte](t)(os.ReadFile("testdata/list.csv")))
	plan := must[[]Change](t)(s.PlanImport("list.csv", strings.NewReader(list)))
	var said strings.Builder
	for _, c := range plan {
		fmt.Fprintf(&said, "line %d %s: %s %s%s\n", c.Line, c.Serial, c.What, strings.Join(c.Fields, ", "), c.Err)
	}
	golden(t, "testdata/plan.golden", said.String())
	if all := must[[]Monitor](t)(s.Monitors()); len(all) != 1 {
		t.Error("planning changed the register")
	}
	if err := s.Import(plan); err != nil {
		t.Fatal(err)
	}
	all := must[[]Monitor](t)(s.Monitors())
	if len(all) != 3 || all[0].Title() != "room 1 › A › left" || all[0].Class != "other" || all[1].Bits != 10 || all[2].Title() != "room 2 › room 2" {
		t.Errorf("%+v", all)
	}
	for _, c := range must[[]Change](t)(s.PlanImport("list.csv", strings.NewReader(list))) {
		if c.What != "same" {
			t.Errorf("again: %+v", c)
		}
	}
}

func importRefuses(t *testing.T, s *Store) {
	for _, c := range []struct{ name, list, want string }{
		{"empty", "", "is empty"},
		{"no serials", "room\nx\n", "no column serial"},
		{"unknown column", "serial,colour\nx,y\n", `column "colour" is not known`},
		{"column twice", "serial,serial\nx,y\n", "stands twice"},
		{"not UTF-8", "serial,room\nx,\xd6st\n", "l.csv:2: holds bytes that are no UTF-8"},
		{"UTF-16", "\xff\xfes\x00e\x00", "no UTF-8"},
		{"open quote", "serial\n\"x\n", "l.csv:2"},
	} {
		if _, err := s.PlanImport("l.csv", strings.NewReader(c.list)); err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s: %v; want %q", c.name, err, c.want)
		}
	}
	for _, c := range []struct{ name, list, want string }{
		{"bits", "serial,bits\nx,many\n", "whole number"},
		{"bits too many", "serial,bits\nx,99\n", "1 to 16"},
		{"rd", "serial,rd\nx,dark\n", "a number"},
		{"scheme", "serial,scheme,class\nx,no-such,y\n", "is not known"},
		{"class", "serial,scheme,class\nx,tg18-2005,y\n", "class"},
		{"calibrated in", "serial,calibrated_in\nx,nowhere\n", "one of"},
		{"no serial", "serial,room\n,x\n", "serial is empty"},
		{"long room", "serial,room\nx," + strings.Repeat("r", 65) + "\n", "at most 64"},
		{"two lines in a cell", "serial,room\nx,\"a\nb\"\n", "line break"},
		{"bell in the serial", "serial\nx\ay\n", "cannot be shown"},
		{"twice", "serial\nx\nx\n", "stands on line 2"},
		{"station alone", "serial,station\nx,A\n", "without a room"},
	} {
		plan, err := s.PlanImport("l.csv", strings.NewReader(c.list))
		if err != nil || !strings.Contains(plan[len(plan)-1].Err, c.want) {
			t.Errorf("%s: %+v, %v; want %q", c.name, plan, err, c.want)
			continue
		}
		if err := s.Import(plan); err == nil {
			t.Errorf("%s: imported all the same", c.name)
		}
	}
	if all := must[[]Monitor](t)(s.Monitors()); len(all) != 0 {
		t.Errorf("%d monitors came in", len(all))
	}
}

// golden compares with a file, or writes it anew with -update.
func golden(t *testing.T, path, got string) {
	t.Helper()
	if *update {
		if err := os.WriteFile(path, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	if want := string(must[[]byte](t)(os.ReadFile(path))); got != want {
		t.Errorf("%s:\n%s\nwant:\n%s", path, got, want)
	}
}

// FuzzPlanImport holds a plan to its word: carried out, the same list has nothing left to do.
func FuzzPlanImport(f *testing.F) {
	f.Add("serial;room\nEV-1;x\n")
	f.Add("serial,rd\nx,0.1\n\"")
	f.Add("serial\tplace\tbits\tbacklight_hours\nx\t007\t08\t1e3\n")
	f.Add("serial,room,station,rd\nx,r,s,-0\ny,q,,\n")
	f.Add("serial,scheme,class\nx,tg18-2005,secondary\n")
	s := newStore(f)
	f.Fuzz(func(t *testing.T, list string) {
		plan, err := s.PlanImport("l.csv", strings.NewReader(list))
		if err != nil {
			if strings.ContainsAny(err.Error(), "\r\n") {
				t.Errorf("error of several lines: %q", err)
			}
			return
		}
		for _, c := range plan {
			if strings.ContainsAny(c.Err, "\r\n") {
				t.Errorf("error of several lines: %q", c.Err)
			}
			if c.Err != "" {
				return
			}
		}
		if err := s.Import(plan); err != nil {
			t.Fatalf("planned and not carried out: %v", err)
		}
		for _, c := range must[[]Change](t)(s.PlanImport("l.csv", strings.NewReader(list))) {
			if c.What != "same" {
				t.Errorf("carried out and still to do: %+v", c)
			}
		}
	})
}
