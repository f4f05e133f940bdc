package main

import (
	"fmt"
	"io"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"

	"evenstep/display/criteria"
	"evenstep/display/readings"
	"evenstep/display/record"
	"evenstep/display/report"
)

// textWidth is the line length that text output keeps to.
const textWidth = 100

// print writes the assessment as text.
func (a *assessFlags) print(w io.Writer, f *readings.File, r *record.Record) error {
	t := &page{}
	s := &r.Assessment
	monitor := ""
	if r.Monitor.Serial != "" {
		monitor = ", monitor " + r.Monitor.Serial
	}
	t.paragraph("", fmt.Sprintf("%s%s: %d levels of %d bits", f.Name, monitor, len(s.Steps)+levelsWithoutSteps(s, r), s.Bits))
	t.line("")
	if s.Scheme != "" {
		t.entry("scheme", fmt.Sprintf("%s, edition %s, class %s", s.Scheme, s.Edition, s.Class))
	}
	ambient := "not known"
	if s.Ambient != nil {
		ambient = short(*s.Ambient) + " cd/m²"
	}
	t.entry("ambient", ambient+", "+report.AmbientSource(s.AmbientSource))
	ratio := "none: " + s.LuminanceRatioReason
	if s.LuminanceRatio != nil {
		ratio = short(*s.LuminanceRatio)
	}
	t.entry("luminance", fmt.Sprintf("L'min %s cd/m², L'max %s cd/m², ratio %s", short(s.LuminanceMin), short(s.LuminanceMax), ratio))
	if s.JNDMin != nil {
		t.entry("JND", fmt.Sprintf("%.1f to %.1f", *s.JNDMin, *s.JNDMax))
	} else {
		t.entry("JND", "none: "+s.JNDReason)
	}
	if s.MaxDeviation != nil {
		t.entry("deviation", fmt.Sprintf("%.1f %% at most (95 %%: %.1f to %.1f %%), between levels %d and %d",
			100**s.MaxDeviation, 100*s.MaxDeviationInterval[0], 100*s.MaxDeviationInterval[1], *s.MaxDeviationFromLevel, *s.MaxDeviationToLevel))
	}
	noise := fmt.Sprintf("repeatability %s %%, floor %s cd/m²", short(100*s.Noise.Repeatability), short(s.Noise.FloorCdM2))
	if s.Noise.Assumed {
		noise += " (assumed)"
	}
	if s.Noise.GainStandard == 0 {
		noise += "; calibration uncertainty not stated, not in the intervals"
	}
	t.entry("meter", noise)
	if s.Drift != nil {
		t.entry("drift", fmt.Sprintf("%+.2f %%", 100**s.Drift))
	}
	t.places(s)
	if len(s.Findings) > 0 {
		t.findings(s.Findings)
	}
	if missing(s) {
		t.line("")
		t.line("not assessed")
		for _, n := range s.NotAssessed {
			if inTable(s.Findings, n) {
				continue
			}
			name, formula, _ := strings.Cut(n.Quantity, " (")
			if formula != "" {
				formula = " (" + formula
			}
			t.paragraph("  ", report.Name(name)+formula+": "+n.Reason)
		}
	}
	if len(s.Causes) > 0 {
		t.line("")
		t.line("what the deviations point to")
		for _, c := range s.Causes {
			t.paragraph("  ", strings.Join(c.Causes, ", or ")+": "+c.Evidence+"; "+c.Advice)
		}
	}
	t.line("")
	if s.Scheme != "" {
		t.entry("room light", report.RoomLight(s.IlluminanceRange))
		t.entry("repeats", report.Repeats(*s))
	}
	verdict := report.Sign(s.Verdict) + " " + string(s.Verdict)
	if s.Scheme == "" {
		verdict += ": no scheme was asked for"
	} else {
		decided := 0
		for _, f := range s.Findings {
			if f.Verdict != criteria.NotAssessed {
				decided++
			}
		}
		verdict += fmt.Sprintf(": %d of %d limits judged", decided, len(r.Scheme.Limits))
	}
	t.entry("verdict", verdict)
	if s.Scheme != "" {
		t.line("")
		t.paragraph("", caution)
	}
	if a.record != "" {
		t.entry("record", a.record+", code "+r.Code())
	}
	if a.pdf != "" {
		t.entry("report", a.pdf)
	}
	if a.csv != "" {
		t.entry("CSV", a.csv)
	}
	_, err := io.WriteString(w, t.String())
	return err
}

// inTable says whether a limit that was not judged stands in the table of findings, with its reason.
func inTable(fs []criteria.Finding, n criteria.Unassessed) bool {
	name, formula, _ := strings.Cut(strings.TrimSuffix(n.Quantity, ")"), " (")
	for _, f := range fs {
		if f.Quantity == name && f.Verdict == criteria.NotAssessed && strings.Contains(f.Formula, formula) {
			return true
		}
	}
	return false
}

func missing(s *criteria.Assessment) bool {
	return slices.ContainsFunc(s.NotAssessed, func(n criteria.Unassessed) bool { return !inTable(s.Findings, n) })
}

// levelsWithoutSteps is what has to be added to the number of steps to give the number of levels.
func levelsWithoutSteps(s *criteria.Assessment, r *record.Record) int {
	if len(s.Steps) > 0 {
		return 1
	}
	levels := map[int]bool{}
	for _, rd := range r.Readings {
		levels[rd.Level] = true
	}
	return len(levels)
}

// page is text that keeps to textWidth.
type page struct{ strings.Builder }

func (t *page) line(s string) { t.WriteString(s + "\n") }

// entry writes a label and its text, with the text's further lines below its first.
func (t *page) entry(label, text string) {
	const column = 12
	lines := wrap(text, textWidth-column)
	for i, l := range lines {
		if i > 0 {
			label = ""
		}
		t.line(strings.TrimRight(pad(label, column)+l, " "))
	}
}

func (t *page) paragraph(indent, text string) {
	for i, l := range wrap(text, textWidth-len(indent)-2) {
		if i > 0 && indent != "" {
			l = "  " + l
		}
		t.line(indent + l)
	}
}

func (t *page) places(s *criteria.Assessment) {
	for i, u := range s.Uniformity {
		label := ""
		if i == 0 {
			label = "uniformity"
		}
		at := ""
		if u.Level != nil {
			at = fmt.Sprintf(", field at level %d", *u.Level)
		}
		t.entry(label, fmt.Sprintf("%.2f %% by %s, %d places%s", 100*u.Value, u.Formula, u.Places, at))
	}
	for i, u := range s.PairMatch {
		label := ""
		if i == 0 {
			label = "pair"
		}
		t.entry(label, fmt.Sprintf("%.2f %% %s", 100*u.Value, u.Formula))
	}
	if s.ColourUniformity != nil {
		t.entry("colour", fmt.Sprintf("greatest distance over the places %.4f u'v'", *s.ColourUniformity))
	}
	if s.ColourMatch != nil {
		t.entry("colour", fmt.Sprintf("distance between the screens %.4f u'v'", *s.ColourMatch))
	}
}

// findings writes the table of findings: one line each, notes below.
func (t *page) findings(fs []criteria.Finding) {
	rows := [][]string{{"quantity", "value", "95 % interval", "limit", "verdict"}}
	for _, f := range fs {
		verdict := report.Sign(f.Verdict) + " " + string(f.Verdict)
		if f.Provisional {
			verdict += ", provisional"
		}
		value := report.Value(f)
		_, unit, _ := strings.Cut(value, " ")
		interval := strings.TrimSpace(strings.TrimSuffix(report.Interval(f), unit))
		rows = append(rows, []string{report.Quantity(f), value, interval, report.Limit(f), verdict})
	}
	width := make([]int, 5)
	for _, r := range rows {
		for i, cell := range r {
			width[i] = max(width[i], utf8.RuneCountInString(cell))
		}
	}
	t.line("")
	for k, r := range rows {
		if total := width[0] + width[1] + width[2] + width[3] + width[4] + 8; total <= textWidth {
			t.line(strings.TrimRight(pad(r[0], width[0])+"  "+left(r[1], width[1])+"  "+pad(r[2], width[2])+"  "+pad(r[3], width[3])+"  "+r[4], " "))
		} else { // a long interval or verdict: the quantity takes a line of its own
			t.line(r[0])
			t.line(strings.TrimRight("  "+left(r[1], width[1])+"  "+pad(r[2], width[2])+"  "+pad(r[3], width[3])+"  "+r[4], " "))
		}
		if k == 0 {
			continue
		}
		f := fs[k-1]
		t.paragraph("    ", notes(f))
	}
}

// notes says in one text what a reader must know beside the figures.
func notes(f criteria.Finding) string {
	var out []string
	if f.Quantity == string(criteria.Uniformity) || f.Quantity == string(criteria.PairMatch) {
		out = append(out, f.Formula)
	}
	if f.ProvisionalReason != "" {
		out = append(out, f.ProvisionalReason)
	}
	if f.Verdict == criteria.NotAssessed {
		out = append(out, "held against the limit: "+string(f.Against))
	}
	if f.Note != "" {
		out = append(out, f.Note)
	}
	switch {
	case f.Override != nil:
		out = append(out, fmt.Sprintf("the site's own limit in place of %s %v (%s, %s)", f.Override.Comparison, f.Override.Limit, f.Override.Name, f.Override.Date))
	case f.Confirmed != nil:
		out = append(out, fmt.Sprintf("limit confirmed in %s, page %s (%s, %s)", f.Confirmed.Document, f.Confirmed.Page, f.Confirmed.Person, f.Confirmed.Date))
	case !strings.Contains(f.Note, "("+f.Confidence+")"):
		out = append(out, "limit "+f.Confidence)
	}
	return strings.Join(out, "; ")
}

// short writes a figure with four significant digits at least and no exponent.
func short(x float64) string {
	switch {
	case x >= 1000:
		return strconv.FormatFloat(x, 'f', 0, 64)
	case x == 0:
		return "0"
	}
	return strconv.FormatFloat(x, 'g', 4, 64)
}

// pad fills s with spaces on the right, left on the left, to a width in characters.
func pad(s string, width int) string {
	return s + strings.Repeat(" ", max(0, width-utf8.RuneCountInString(s)))
}

func left(s string, width int) string {
	return strings.Repeat(" ", max(0, width-utf8.RuneCountInString(s))) + s
}

// wrap breaks text into lines of at most width characters, between words where it can.
func wrap(text string, width int) []string {
	var lines []string
	line := ""
	for _, word := range strings.Fields(text) {
		for utf8.RuneCountInString(word) > width { // a word longer than a line, as a path
			cut := 0
			for range width {
				_, n := utf8.DecodeRuneInString(word[cut:])
				cut += n
			}
			if line != "" {
				lines, line = append(lines, line), ""
			}
			lines, word = append(lines, word[:cut]), word[cut:]
		}
		switch {
		case line == "":
			line = word
		case utf8.RuneCountInString(line)+1+utf8.RuneCountInString(word) <= width:
			line += " " + word
		default:
			lines, line = append(lines, line), word
		}
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}
