package report

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"unicode"

	"evenstep/display/record"
)

// CSV writes the steps and the findings of the record as comma-separated values for spreadsheets and
// scripts. Lines that begin with # hold metadata, "# key: value", and "# table: name" stands before
// each of the tables steps, findings and not_assessed, which have a line of column names. Fractions
// are fractions, not per cent, and decimals have a point. Text that a spreadsheet would take for a
// formula gets an apostrophe in front; numbers are never changed.
func CSV(w io.Writer, r *record.Record) error {
	if r == nil {
		return errors.New("report: there is no record; expected one; assess a visit first")
	}
	var out bytes.Buffer
	for _, p := range metadata(r) {
		fmt.Fprintf(&out, "# %s: %s\n", p.key, safeLine(p.value))
	}
	t := csv.NewWriter(&out)
	table := func(name string, columns ...string) {
		t.Flush()
		fmt.Fprintf(&out, "# table: %s\n", name)
		t.Write(columns)
	}
	a := r.Assessment
	table("steps", "from_level", "to_level", "jnd_from", "jnd_to", "contrast_per_jnd", "expected_contrast_per_jnd",
		"deviation_fraction", "deviation_low_fraction", "deviation_high_fraction")
	for _, s := range a.Steps {
		t.Write([]string{
			strconv.Itoa(s.FromLevel), strconv.Itoa(s.ToLevel), exact(s.JNDFrom), exact(s.JNDTo), exact(s.ContrastPerJND),
			exact(s.Expected), exact(s.Deviation), exact(s.DeviationInterval[0]), exact(s.DeviationInterval[1]),
		})
	}
	table("findings", "quantity", "value_in_unit", "interval_low_in_unit", "interval_high_in_unit", "comparison", "limit_in_unit",
		"limit_high_in_unit", "unit", "formula", "levels", "source", "confidence", "verdict", "against_limit", "provisional",
		"provisional_reason", "note")
	for _, f := range a.Findings {
		high := ""
		if f.LimitHigh != nil {
			high = exact(*f.LimitHigh)
		}
		t.Write([]string{
			safe(f.Quantity), exact(f.Value), exact(f.Interval[0]), exact(f.Interval[1]), safe(f.Comparison), exact(f.Limit), high,
			safe(f.Unit), safe(f.Formula), strconv.Itoa(f.Levels), safe(f.Source), safe(f.Confidence), safe(string(f.Verdict)),
			safe(string(f.Against)), strconv.FormatBool(f.Provisional), safe(f.ProvisionalReason), safe(f.Note),
		})
	}
	table("not_assessed", "quantity", "reason")
	for _, u := range a.NotAssessed {
		t.Write([]string{safe(u.Quantity), safe(u.Reason)})
	}
	t.Flush() // to memory, which does not fail
	if _, err := w.Write(out.Bytes()); err != nil {
		return fmt.Errorf("report: CSV: %w", err)
	}
	return nil
}

// metadata is what the lines at the head of a CSV say.
func metadata(r *record.Record) []pair {
	a := r.Assessment
	number := func(v *float64) string {
		if v == nil {
			return notStated
		}
		return exact(*v)
	}
	scheme := "none"
	if u := r.Scheme; u != nil {
		scheme = u.ID
	}
	verdict := string(a.Verdict)
	return []pair{
		{"document", title},
		{"program", r.Program},
		{"sha256", stated(r.SHA256)},
		{"monitor_serial", stated(r.Monitor.Serial)},
		{"visit", stated(r.Visit.Kind)},
		{"time", r.Visit.Time},
		{"meter", stated(r.Meter.ID)},
		{"meter_calibrated_on", stated(r.Meter.CalibratedOn)},
		{"scheme", scheme},
		{"edition", stated(a.Edition)},
		{"class", stated(a.Class)},
		{"formula", stated(a.Formula)},
		{"scale", stated(a.Scale)},
		{"bits", strconv.Itoa(a.Bits)},
		{"ambient_cd_m2", number(a.Ambient)},
		{"ambient_source", stated(a.AmbientSource)},
		{"illuminance_lx", number(a.Illuminance)},
		{"rd_per_lx", number(a.Rd)},
		{"rd_assumed", strconv.FormatBool(a.RdAssumed)},
		{"luminance_min_cd_m2", exact(a.LuminanceMin)},
		{"luminance_max_cd_m2", exact(a.LuminanceMax)},
		{"luminance_ratio", number(a.LuminanceRatio)},
		{"max_deviation_fraction", number(a.MaxDeviation)},
		{"repeatability_fraction", exact(a.Noise.Repeatability)},
		{"noise_floor_cd_m2", exact(a.Noise.FloorCdM2)},
		{"noise_assumed", strconv.FormatBool(a.Noise.Assumed)},
		{"verdict", stated(verdict)},
		{"caution", caution},
	}
}

// exact writes a number with the digits that give it back. An end without bound is empty.
func exact(v float64) string {
	if !finite(v) || math.Abs(v) >= math.MaxFloat64 {
		return ""
	}
	return strconv.FormatFloat(v, 'g', -1, 64)
}

// formulaSigns begin what a spreadsheet takes for a formula.
const formulaSigns = "=+-@＝＋－＠" // the wide forms as well: some spreadsheets take them

// safe keeps a text cell from being taken for a formula, also where a spreadsheet that expects
// another separator splits the cell.
func safe(s string) string { return guarded(oneLine(s), ";") }

// safeLine is safe for a metadata line, which is not quoted: there a comma splits too.
func safeLine(s string) string { return guarded(oneLine(s), ",;") }

// oneLine puts a space in place of every line end and tab, which end a cell as well.
func oneLine(s string) string {
	return strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f || r == 0x85 || r == 0x2028 || r == 0x2029 {
			return ' '
		}
		return r
	}, s)
}

// guarded puts an apostrophe before each sign of a formula that begins the text or follows a
// separator, white space and quotes between them or not.
func guarded(s, separators string) string {
	var out strings.Builder
	begins := true
	for _, r := range s {
		switch {
		case strings.ContainsRune(separators, r):
			begins = true
		case begins && strings.ContainsRune(formulaSigns, r):
			out.WriteByte('\'')
			begins = false
		case !unicode.IsSpace(r) && r != '"':
			begins = false
		}
		out.WriteRune(r)
	}
	return out.String()
}
