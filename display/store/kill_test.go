package store

import (
	"bufio"
	"errors"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"evenstep/display/photometry"
	"evenstep/display/readings"
)

// TestMain lets the test program stand in for another process: a bench that is killed, which adds readings
// one after the other and prints the number of each once it is kept; one that looks and goes; one that
// restores.
func TestMain(m *testing.M) {
	if path := os.Getenv("STORE_TEST_WRITER"); path != "" {
		os.Exit(writeReadings(path))
	}
	if path := os.Getenv("STORE_TEST_READER"); path != "" {
		os.Exit(readRooms(path))
	}
	if path := os.Getenv("STORE_TEST_RESTORER"); path != "" {
		if _, err := Restore(os.Getenv("STORE_TEST_BACKUP"), path, noon); err != nil {
			fmt.Println(err)
			os.Exit(1)
		}
		os.Exit(0)
	}
	os.Exit(m.Run())
}

func readRooms(path string) int {
	s, err := Open(path)
	if err != nil {
		fmt.Println(err)
		return 1
	}
	rooms, err := s.Rooms()
	if err = errors.Join(err, s.Close()); err != nil {
		fmt.Println(err)
		return 1
	}
	for _, r := range rooms {
		fmt.Println(r.Name)
	}
	return 0
}

func writeReadings(path string) int {
	s, err := Open(path)
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		return 1
	}
	ds, err := s.Drafts()
	if err != nil || len(ds) != 1 {
		fmt.Fprintln(os.Stderr, len(ds), err)
		return 1
	}
	n := len(ds[0].Readings)
	for {
		if err := s.AddReading(ds[0].ID, readings.Reading{Level: n, Luminance: photometry.CdM2(n) / 10, Role: readings.Series, Time: noon}); err != nil {
			fmt.Fprintln(os.Stderr, err)
			return 1
		}
		fmt.Println(n)
		n++
	}
}

// TestKilledInTheMiddle kills a writer at random moments. Every reading that it said was kept is there
// afterwards, in order, and the next start goes on.
func TestKilledInTheMiddle(t *testing.T) {
	times := 200
	if testing.Short() {
		times = 20
	}
	path := filepath.Join(t.TempDir(), "register.db")
	s := must[*Store](t)(Open(path))
	m := testMonitor()
	m.ID = must[int64](t)(s.SaveMonitor(m))
	must[Draft](t)(s.StartDraft(m.ID, Head{Kind: "check"}, noon))
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	rng := rand.New(rand.NewPCG(9, 9))
	said := -1
	for range times {
		c := exec.Command(os.Args[0])
		c.Env = append(os.Environ(), "STORE_TEST_WRITER="+path)
		var errs strings.Builder
		c.Stderr = &errs
		out, err := c.StdoutPipe()
		if err != nil {
			t.Fatal(err)
		}
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		lines := bufio.NewScanner(out)
		// The moment is counted in readings, then in a random part of the time that one takes.
		for wait := 1 + rng.IntN(6); wait > 0 && lines.Scan(); wait-- {
			said, _ = strconv.Atoi(lines.Text())
		}
		time.AfterFunc(time.Duration(rng.IntN(3000))*time.Microsecond, func() { _ = c.Process.Kill() })
		for lines.Scan() {
			said, _ = strconv.Atoi(lines.Text())
		}
		_ = c.Wait()
		if errs.Len() > 0 {
			t.Fatalf("the writer said: %s", errs.String())
		}
		s := must[*Store](t)(Open(path))
		ds := must[[]Draft](t)(s.Drafts())
		if err := s.Close(); err != nil {
			t.Fatal(err)
		}
		if n := len(ds[0].Readings); n < said+1 || n > said+2 {
			t.Fatalf("%d readings are there, %d were said to be kept", n, said+1)
		}
		for i, r := range ds[0].Readings {
			if r.Level != i || r.Luminance != photometry.CdM2(i)/10 {
				t.Fatalf("reading %d is %+v", i, r)
			}
		}
	}
	t.Logf("killed %d times, %d readings kept, none lost", times, said+1)
}
