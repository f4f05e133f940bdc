package report

import (
	"bytes"
	"encoding/csv"
	"errors"
	"strconv"
	"strings"
	"testing"

	"evenstep/display/criteria"
)

// rounded takes away the digits in which processors differ (fused multiplication), so that the
// golden files hold everywhere.
func rounded(a *criteria.Assessment) {
	round := func(values ...*float64) {
		for _, v := range values {
			if v != nil {
				*v, _ = strconv.ParseFloat(strconv.FormatFloat(*v, 'g', 6, 64), 64)
			}
		}
	}
	round(&a.LuminanceMin, &a.LuminanceMax, a.LuminanceRatio, a.MaxDeviation, a.Ambient)
	for i := range a.Steps {
		s := &a.Steps[i]
		round(&s.JNDFrom, &s.JNDTo, &s.ContrastPerJND, &s.Expected, &s.Deviation, &s.DeviationInterval[0], &s.DeviationInterval[1])
	}
	for i := range a.Findings {
		f := &a.Findings[i]
		round(&f.Value, &f.Interval[0], &f.Interval[1])
	}
}

func TestCSVGolden(t *testing.T) {
	for name, r := range samples(t) {
		rounded(&r.Assessment)
		var b bytes.Buffer
		if err := CSV(&b, r); err != nil {
			t.Fatal(err)
		}
		golden(t, name+".csv", b.Bytes())
	}
}

// Steps read back are the steps of the record, bit for bit; every row has the columns of its table.
func TestCSVReadsBack(t *testing.T) {
	r := stressRecord(t)
	var b bytes.Buffer
	if err := CSV(&b, r); err != nil {
		t.Fatal(err)
	}
	in := csv.NewReader(&b)
	in.Comment, in.FieldsPerRecord = '#', -1
	rows, err := in.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	a := r.Assessment
	if want := 3 + len(a.Steps) + len(a.Findings) + len(a.NotAssessed); len(rows) != want {
		t.Fatalf("%d rows; expected %d", len(rows), want)
	}
	for i, s := range a.Steps {
		row := rows[1+i]
		if len(row) != len(rows[0]) || row[0] != strconv.Itoa(s.FromLevel) {
			t.Fatalf("row %q under %q", row, rows[0])
		}
		if v, err := strconv.ParseFloat(row[6], 64); err != nil || v != s.Deviation {
			t.Errorf("deviation %q; expected %v", row[6], s.Deviation)
		}
	}
	head := rows[1+len(a.Steps)]
	for _, row := range rows[2+len(a.Steps) : 2+len(a.Steps)+len(a.Findings)] {
		if len(row) != len(head) {
			t.Errorf("row %q has %d cells; expected %d", row, len(row), len(head))
		}
	}
}

func TestCSVKeepsFormulasFromRunning(t *testing.T) {
	r := sampleRecord(t)
	attack := "=HYPERLINK(\"http://example.invalid\",\"x\")"
	r.Monitor.Serial, r.Meter.ID, r.Program = attack, "m,\n"+attack, "+1"
	r.Assessment.Findings[0].Note, r.Assessment.Findings[0].Source = attack, "-2+3; @SUM(1)"
	r.Assessment.Findings[0].Value = -4
	r.Assessment.NotAssessed[0].Reason = "\t=1+1"
	var b bytes.Buffer
	if err := CSV(&b, r); err != nil {
		t.Fatal(err)
	}
	text := b.String()
	for _, want := range []string{
		"# monitor_serial: '=HYPERLINK", "# meter: m, '=HYPERLINK", "# program: '+1", "'-2+3; '@SUM(1)", ",\"'=HYPERLINK", ",-4,", ", '=1+1",
	} {
		if want == ", '=1+1" {
			want = ",\" '=1+1\"" // a cell that begins with a space is quoted
		}
		if !strings.Contains(text, want) {
			t.Errorf("%q is not in the file:\n%s", want, text)
		}
	}
}

// Wherever a spreadsheet may split the text, no piece begins with the sign of a formula.
func FuzzGuarded(f *testing.F) {
	for _, s := range []string{"", "=1", " =1", "a,=1", "a;\"=1\"", "a\t+1", "'=", "-,-;-", "a\u00a0,\u00a0@x", "＝1"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		got := safeLine(s)
		if strings.ContainsAny(got, "\r\n\t") {
			t.Errorf("%q holds a line end or a tab", got)
		}
		for _, piece := range strings.FieldsFunc(got, func(r rune) bool { return r == ',' || r == ';' }) {
			bare := strings.TrimLeft(strings.TrimSpace(piece), "\"")
			if bare != "" && strings.ContainsAny(bare[:1], "=+-@") {
				t.Errorf("piece %q of %q begins as a formula", piece, got)
			}
		}
		if strings.ReplaceAll(got, "'", "") != strings.ReplaceAll(oneLine(s), "'", "") {
			t.Errorf("%q became %q: more than apostrophes was changed", s, got)
		}
	})
}

type failing struct{}

var errFull = errors.New("no space left")

func (failing) Write([]byte) (int, error) { return 0, errFull }

func TestErrors(t *testing.T) {
	late := sampleRecord(t)
	late.Visit.Time = "yesterday"
	for _, c := range []struct {
		name string
		run  func() error
		want string
	}{
		{"csv without record", func() error { return CSV(&bytes.Buffer{}, nil) }, "there is no record"},
		{"csv to a full disk", func() error { return CSV(failing{}, sampleRecord(t)) }, "no space left"},
		{"pdf without record", func() error { return PDF(&bytes.Buffer{}, nil, Options{}) }, "there is no record"},
		{"pdf to a full disk", func() error { return PDF(failing{}, sampleRecord(t), Options{}) }, "no space left"},
		{"paper", func() error { return PDF(&bytes.Buffer{}, sampleRecord(t), Options{Paper: "A0"}) }, "expected A4 or Letter"},
		{"time", func() error { return PDF(&bytes.Buffer{}, late, Options{}) }, "expected RFC 3339"},
	} {
		t.Run(c.name, func(t *testing.T) {
			err := c.run()
			if err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
				t.Fatalf("got %v; expected one line with %q", err, c.want)
			}
			if strings.Contains(c.want, "space") && !errors.Is(err, errFull) {
				t.Errorf("%v does not wrap what the writer said", err)
			}
		})
	}
}
