package report

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"evenstep/display/criteria"
	"evenstep/display/record"
	"evenstep/display/response"
)

// program skips the test where a checking program is missing, and fails it on the build server.
func program(t *testing.T, name string) string {
	t.Helper()
	path, err := exec.LookPath(name)
	if err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatalf("%s is missing; install the Debian packages qpdf and poppler-utils", name)
		}
		t.Skipf("%s is missing", name)
	}
	return path
}

func output(t *testing.T, path string, args ...string) string {
	t.Helper()
	out, err := exec.Command(path, args...).CombinedOutput()
	if err != nil {
		t.Fatalf("%s %s: %v\n%s", filepath.Base(path), strings.Join(args, " "), err, out)
	}
	return string(out)
}

func render(t *testing.T, r *record.Record, o Options) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := PDF(&b, r, o); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func saved(t *testing.T, r *record.Record, o Options) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "report.pdf")
	if err := os.WriteFile(path, render(t, r, o), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

// eachSample runs a check for every sample on both papers.
func eachSample(t *testing.T, check func(t *testing.T, name string, r *record.Record, p Paper)) {
	for name, r := range samples(t) {
		for _, p := range []Paper{A4, Letter} {
			t.Run(name+" on "+string(p), func(t *testing.T) { check(t, name, r, p) })
		}
	}
}

// TestTableIsNamed: a table that was made in the visit is named on the page, as a prediction.
func TestTableIsNamed(t *testing.T) {
	got := tableWords(&record.Table{InBits: 8, OutBits: 10, AimMin: 1.2, AimMax: 420, MaxDeviation: .013, Warnings: []string{"w"}})
	for _, want := range []string{"8 to 10 bits", "predicted deviation 1.3 %", "1 warning"} {
		if !strings.Contains(got, want) {
			t.Errorf("%q; want %q in it", got, want)
		}
	}
}

func TestSameRecordGivesSameBytes(t *testing.T) {
	eachSample(t, func(t *testing.T, _ string, r *record.Record, p Paper) {
		if !bytes.Equal(render(t, r, Options{p}), render(t, r, Options{p})) {
			t.Error("two runs differ")
		}
	})
	if !bytes.Equal(render(t, sampleRecord(t), Options{}), render(t, sampleRecord(t), Options{A4})) {
		t.Error("the paper is not A4 where none is asked for")
	}
}

// The fonts are shared by all runs, so runs side by side must not touch them. Meant for -race as well.
func TestRunsSideBySide(t *testing.T) {
	r := sampleRecord(t)
	want := render(t, r, Options{})
	var wait sync.WaitGroup
	for range 4 {
		wait.Go(func() {
			var b bytes.Buffer
			if err := PDF(&b, r, Options{}); err != nil || !bytes.Equal(b.Bytes(), want) {
				t.Errorf("another file, or %v", err)
			}
		})
	}
	wait.Wait()
}

// qpdf reads the file as a stranger would: structure, streams, cross-reference table.
func TestStructureHolds(t *testing.T) {
	qpdf := program(t, "qpdf")
	eachSample(t, func(t *testing.T, name string, r *record.Record, p Paper) {
		path := saved(t, r, Options{p})
		output(t, qpdf, "--check", path)
		pages := strings.TrimSpace(output(t, qpdf, "--show-npages", path))
		if pages != "1" && pages != "2" {
			t.Errorf("%s pages; expected one or two", pages)
		}
	})
}

func TestFontsAreEmbedded(t *testing.T) {
	pdffonts := program(t, "pdffonts")
	eachSample(t, func(t *testing.T, _ string, r *record.Record, p Paper) {
		out := output(t, pdffonts, saved(t, r, Options{p}))
		lines := strings.Split(strings.TrimSpace(out), "\n")[2:]
		if len(lines) == 0 {
			t.Fatalf("no fonts:\n%s", out)
		}
		for _, l := range lines {
			// Columns from the right: object number in two, uni, sub, emb.
			f := strings.Fields(l)
			if n := len(f); n < 6 || f[n-5] != "yes" || f[n-3] != "yes" {
				t.Errorf("font is not embedded with a Unicode map: %s", l)
			}
			if !strings.Contains(l, "TrueType") || strings.Contains(l, "Type 1") {
				t.Errorf("font is not TrueType: %s", l)
			}
		}
	})
}

func TestTextCanBeReadBack(t *testing.T) {
	pdftotext := program(t, "pdftotext")
	wants := map[string][]string{
		"usual": {
			"Monitor conformance record", "Meets within uncertainty", "Example scheme A, edition 2021, class diagnostic",
			"EX-20417", "≥ 350 cd/m²", "≤ 10 %", "Δu'v'", "not stated", "limit not confirmed", "0.5 % and 0.005 cd/m² (assumed)",
			"2023-11-02", "luminance uniformity: no places were measured", "from 2.4 lx (below it greatest contrast deviation binds)",
			"Deviation of contrast, step by step", "standard function", "+10 %", "−10 %", "reviewed by", "3F7A-91C2-04BE",
			"3f7a91c204be5d68a1f09b7723c45e8810d2aa64f5b91c3e7786240fde5513ab", "evenstep 0.1.0", "do not read", "12 readings a level",
		},
		"stress": {
			"Fails", "Łódź", "Ωμέγα", "ЖЩ", "≥ 350 cd/m²", "provisional", "limit not confirmed", "0.005 cd/m² per lx (assumed)", "about 250 to 450",
			"confirmed by p-002", "in place of the scheme's ≤ 50 lx", "drift during the series", "What to do:", "−2.4 %", "level 204", "□□□ and a□turned",
			"page 2 of 2", "site-limits.toml", "a limit that is not confirmed",
		},
		"dark": {"Not assessed", "No scheme was asked for", "not sealed", "below the range", "dark room, as stated", "page 1 of 1"},
	}
	eachSample(t, func(t *testing.T, name string, r *record.Record, p Paper) {
		text := output(t, pdftotext, "-layout", saved(t, r, Options{p}), "-")
		flat := strings.ToLower(strings.Join(strings.Fields(text), " "))
		for _, want := range wants[name] {
			if !strings.Contains(flat, strings.ToLower(want)) {
				t.Errorf("%q is not in the text:\n%s", want, text)
			}
		}
	})
}

// On every page, at every setting that is tried, each text lies within the margins and on no other.
func TestNothingOverlapsOrLeavesThePage(t *testing.T) {
	m, err := newRuler()
	if err != nil {
		t.Fatal(err)
	}
	eachSample(t, func(t *testing.T, _ string, r *record.Record, p Paper) {
		for i, tight := range tightness {
			for _, a := range []arrangement{{}, {parted: true}, {parted: true, stacked: true}, {told: true}} {
				s := &sheet{ruler: m, tight: tight, paper: papers[p], arrangement: a}
				newBody(r, time.Date(2024, 5, 17, 9, 30, 0, 0, time.UTC)).compose(s)
				for n, page := range s.pages {
					const footer = 32
					checkOps(t, fmt.Sprintf("setting %d, %+v, page %d", i, a, n+1), page.ops,
						Box{side, head, s.width(), s.paper.height - head - foot + footer})
				}
			}
		}
	})
}

// What cannot stand on two pages goes on: nothing is left out, and the first page says so.
func TestMoreThanTwoPages(t *testing.T) {
	r := stressRecord(t)
	for len(r.Assessment.Findings) < 60 {
		r.Assessment.Findings = append(r.Assessment.Findings, r.Assessment.Findings...)
	}
	s, err := fit(r, time.Date(2024, 5, 17, 9, 30, 0, 0, time.UTC), papers[A4])
	if err != nil {
		t.Fatal(err)
	}
	if len(s.pages) < 3 {
		t.Fatalf("%d pages; expected three or more", len(s.pages))
	}
	words := func(p *page) string {
		var all []string
		for _, o := range p.ops {
			all = append(all, o.text)
		}
		return strings.Join(all, "\n")
	}
	if !strings.Contains(words(s.pages[0]), "more than two pages") {
		t.Error("the first page does not say that there are more than two")
	}
	limits := 0
	for i, p := range s.pages {
		if want := fmt.Sprintf("page %d of %d", i+1, len(s.pages)); !strings.Contains(words(p), want) {
			t.Errorf("page %d does not say %q", i+1, want)
		}
		limits += strings.Count(words(p), "\nmaximum luminance L'max\n")
	}
	want := 0
	for _, f := range r.Assessment.Findings {
		if f.Quantity == "luminance_max" {
			want++
		}
	}
	if limits != want {
		t.Errorf("%d findings of maximum luminance are shown; expected %d", limits, want)
	}
}

// A record may hold any text and any number that JSON can carry.
func TestHostileRecords(t *testing.T) {
	m, err := newRuler()
	if err != nil {
		t.Fatal(err)
	}
	at := time.Date(2024, 5, 17, 9, 30, 0, 0, time.UTC)
	for name, change := range map[string]func(r *record.Record){
		"empty": func(r *record.Record) { *r = record.Record{} },
		"huge numbers": func(r *record.Record) {
			a := &r.Assessment
			a.LuminanceMax, a.LuminanceMin = 1e308, -1e308
			for i := range a.Steps {
				a.Steps[i].Deviation, a.Steps[i].DeviationInterval = 1e300, criteria.Interval{-1e300, 1e300}
			}
			for i := range a.Findings {
				a.Findings[i].Value, a.Findings[i].Interval, a.Findings[i].Limit = 1e300, criteria.Interval{-1e300, 1e300}, 1e300
			}
			a.MaxDeviation, a.Drift, a.RepeatsNeeded = ptr(1e300), ptr(-1e300), ptr(1<<62)
			r.Readings[3].Luminance = 1e308
		},
		"huge texts": func(r *record.Record) {
			long := strings.Repeat("W", 200000)
			r.Program, r.SHA256, r.Visit.Kind, r.Visit.Notes, r.Monitor.Serial = long, long, long, long, long
			r.Scheme.Name, r.Scheme.Class, r.Assessment.Formula, r.Assessment.AmbientSource, r.Assessment.Scale = long, long, long, long, long
			r.Assessment.Verdict = criteria.Verdict(long)
			for i := range r.Assessment.Findings {
				f := &r.Assessment.Findings[i]
				f.Quantity, f.Note, f.Source, f.Unit, f.Comparison, f.Verdict = long, long, long, long, long, criteria.Verdict(long)
			}
			r.Assessment.NotAssessed = append(r.Assessment.NotAssessed, criteria.Unassessed{Quantity: long, Reason: long})
			r.Assessment.Causes = []response.Cause{{Causes: []string{long}, Evidence: long, Advice: long}}
			r.Places = []record.Place{{Position: long, Luminance: 1}, {Position: "centre", Level: -1, Luminance: 1e300}}
			r.Assessment.IlluminanceRange = criteria.LuxRange{Reason: long}
		},
		"many places": func(r *record.Record) {
			for level := range 30 {
				r.Places = append(r.Places, record.Place{Position: "centre", Level: level, Luminance: 100})
			}
		},
	} {
		t.Run(name, func(t *testing.T) {
			r := sampleRecord(t)
			change(r)
			for _, tight := range []tight{tightness[0], tightness[len(tightness)-1]} {
				s := &sheet{ruler: m, tight: tight, paper: papers[A4]}
				newBody(r, at).compose(s)
				for n, page := range s.pages {
					const footer = 32
					checkOps(t, fmt.Sprintf("page %d", n+1), page.ops, Box{side, head, s.width(), s.paper.height - head - foot + footer})
				}
			}
			r.Visit.Time = at.Format(time.RFC3339)
			if n := len(render(t, r, Options{})); n < 1000 || n > 1<<20 {
				t.Errorf("the file has %d bytes", n)
			}
		})
	}
}

// The luminances of the chart are those that package response computes from the same readings.
func TestPointsAreThoseOfTheAssessment(t *testing.T) {
	r := sampleRecord(t)
	r.Readings = append(r.Readings,
		record.Reading{Level: 255, Luminance: 430, Role: "repeat"},
		record.Reading{Level: 255, Luminance: 1, Role: "drift"},
		record.Reading{Level: 0, Luminance: 0.61, Role: "repeat", AmbientIncluded: true},
	)
	got := points(r)
	if n := len(got); n != 18 {
		t.Fatalf("%d points; expected 18", n)
	}
	const rounding = 1e-9
	for _, c := range []struct {
		i    int
		want float64
	}{
		{0, 0.61},                  // read as 0.5 without and 0.61 with 0.11 of ambient light
		{17, (420+430)/2.0 + 0.11}, // the mean of series and repeat, ambient light added
	} {
		if d := float64(got[c.i].Luminance) - c.want; d > rounding || d < -rounding {
			t.Errorf("level %d has %v cd/m2; expected %v", got[c.i].Level, got[c.i].Luminance, c.want)
		}
	}
}
