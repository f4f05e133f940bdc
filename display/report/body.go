package report

import (
	"fmt"
	"strings"
	"time"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/record"
	"evenstep/display/response"
)

const title = "Monitor conformance record"

const caution = "This record supports qualified persons; by itself it declares no monitor fit for diagnosis. " +
	"The verdict depends on the edition of the scheme and on how well each limit is known. " +
	"Local rules and licensed practice decide. Do not read clinically on a monitor that fails."

const monitorKey = "monitor"

const notStated = "not stated"

// body is the content of a report.
type body struct {
	r  *record.Record
	a  criteria.Assessment
	at time.Time
}

func newBody(r *record.Record, at time.Time) *body {
	b := &body{r: r, a: r.Assessment, at: at}
	if b.a.Verdict == "" {
		b.a.Verdict = criteria.NotAssessed
	}
	return b
}

func (b *body) compose(s *sheet) {
	s.top = b.runningHead
	s.turn()
	b.head(s)
	b.verdict(s)
	b.identity(s)
	b.findings(s)
	b.unassessed(s)
	b.figures(s)
	b.charts(s)
	b.causes(s)
	b.places(s)
	b.notes(s)
	b.close(s)
	b.footers(s)
}

func (b *body) head(s *sheet) {
	big := Type{Face: Bold, Size: s.body * 1.9}
	s.Text(XY{s.left(), s.y + big.Size}, title, big)
	code := Type{Face: Mono, Size: s.body * 1.25, Align: Right}
	right := s.left() + s.width()
	s.Text(XY{right, s.y + big.Size}, b.code(), code)
	label := s.quiet()
	label.Align = Right
	s.Text(XY{right - s.TextWidth(b.code(), code) - 6, s.y + big.Size}, "code", label)
	s.y += big.Size*1.45 + 5
}

// runningHead stands on every page but the first.
func (b *body) runningHead(s *sheet) {
	t := s.quiet()
	code := "code " + b.code()
	w := s.width() - s.TextWidth(code, t) - 12
	s.Text(XY{s.left(), s.y + t.Size}, shorten(s, s.printable(title+" · "+b.serial()+" · "+b.when(), t.Face), t, w), t)
	t.Align = Right
	s.Text(XY{s.left() + s.width(), s.y + t.Size}, code, t)
	s.y += leading(t) + 2
	s.rule(s.y, Stroke{Width: 0.4, Gray: middle})
	s.y += 8
}

// verdict is the band with the outcome: shape and word, and what it was judged by.
func (b *body) verdict(s *sheet) {
	word := Type{Face: Bold, Size: s.body * 1.75}
	text := s.plain()
	const pad = 9.0
	mark := word.Size * 1.05
	x := s.left() + pad + mark + 9
	w := s.left() + s.width() - pad - x
	var lines []string
	for _, l := range b.judgedBy() {
		lines = append(lines, s.lines(l, text, w, 3)...)
	}
	h := pad*2 + leading(word) + float64(len(lines))*leading(text) - 2
	box := Box{s.left(), s.y, s.width(), h}
	s.Polygon(rectangle(box), pale)
	if !b.a.Verdict.Holds() && b.a.Verdict != criteria.NotAssessed {
		edge := rectangle(box)
		s.Polyline(append(edge, edge[0], edge[1]), Stroke{Width: 1.6, Gray: black})
	}
	y := s.y + pad - 2
	MarkerOf(b.a.Verdict).Draw(s, XY{s.left() + pad + mark/2, y + word.Size*0.68}, mark*0.85, black)
	s.Text(XY{x, y + word.Size}, shorten(s, capital(s.printable(string(b.a.Verdict), word.Face)), word, w), word)
	s.setLines(lines, x, y+leading(word), text)
	s.y += h
}

// judgedBy names scheme, edition, class and formula, and what the verdict leaves open.
func (b *body) judgedBy() []string {
	u := b.r.Scheme
	if u == nil {
		return []string{"No scheme was asked for: figures only, nothing was judged."}
	}
	out := []string{fmt.Sprintf("%s, edition %s, class %s", u.Name, stated(u.Edition), stated(u.Class))}
	if b.a.Formula != "" {
		out = append(out, "Contrast deviation by "+b.a.Formula)
	}
	if u.Site != nil {
		out = append(out, "With the limits of the site file "+u.Site.File+" of "+u.Site.Site)
	}
	decide, provisional, open := 0, 0, 0
	for _, f := range b.a.Findings {
		if f.Verdict != criteria.NotAssessed {
			decide++
		}
		if f.Provisional {
			provisional++
		}
		if unconfirmed(f) {
			open++
		}
	}
	tally := fmt.Sprintf("%s judged, %s", count(decide, "limit"), "the worst gives the verdict")
	if decide == 0 {
		tally = "No limit could be judged"
	}
	if n := len(b.a.Findings) - decide; n > 0 {
		tally += fmt.Sprintf("; %d compared only", n)
	}
	if n := len(b.a.NotAssessed); n > 0 {
		tally += fmt.Sprintf("; %d not assessed", n)
	}
	if provisional > 0 {
		tally += fmt.Sprintf("; %d provisional", provisional)
	}
	if open > 0 {
		tally += fmt.Sprintf("; %s not confirmed", count(open, "limit"))
	}
	return append(out, tally+".")
}

func (b *body) identity(s *sheet) {
	if s.told {
		s.y += s.gap * 0.6
		s.paragraph("This record needs more than two pages; every page names its number and the count.", s.left(), s.quiet(), 1)
	}
	s.y += s.gap + 2
	r := b.r
	who := []pair{
		{monitorKey, b.serial()},
	}
	if r.Monitor.Name != "" {
		who = append(who, pair{"name", r.Monitor.Name})
	}
	who = append(who,
		pair{"visit", stated(r.Visit.Kind) + ", " + b.when()},
		pair{"measured by", b.persons("measured")},
		pair{"reviewed by", b.persons("reviewed")},
		pair{"meter", stated(r.Meter.ID)},
		pair{"meter calibrated", stated(r.Meter.CalibratedOn)},
		pair{"ramp", stated(r.Monitor.Ramp)},
		pair{"readings", b.readings()},
	)
	a := b.a
	room := []pair{
		{"ambient luminance", reasoned(a.Ambient, a.AmbientReason, func(v float64) string { return trimmed(decimal(v, 4)) + " cd/m²" })},
		{"from", AmbientSource(a.AmbientSource)},
	}
	illuminance := notStated
	if a.Illuminance != nil {
		illuminance = lux(*a.Illuminance) + " lx on the screen"
	}
	rd := notStated
	if a.Rd != nil {
		rd = concise(*a.Rd) + " cd/m² per lx"
		if a.RdAssumed {
			rd += " (assumed)"
		}
	}
	noise := percent(a.Noise.Repeatability) + " and " + concise(a.Noise.FloorCdM2) + " cd/m²"
	if a.Noise.Assumed {
		noise += " (assumed)"
	}
	gain := notStated + ", not in the intervals"
	if a.Noise.GainStandard > 0 {
		gain = percent(a.Noise.GainStandard) + " standard uncertainty"
	}
	room = append(room,
		pair{"illuminance", illuminance},
		pair{"Rd", rd},
		pair{"meter noise", noise},
		pair{"meter gain", gain},
		pair{"levels", b.levels()},
	)
	s.columns(who, room, s.nameLines)
}

func (b *body) serial() string { return stated(b.r.Monitor.Serial) }

// when is the time of the visit as the record has it, to the minute, with its offset.
func (b *body) when() string { return b.at.Format("2006-01-02 15:04 -07:00") }

func (b *body) persons(part string) string {
	var ids []string
	for _, p := range b.r.Persons {
		if p.Part == part {
			ids = append(ids, p.ID)
		}
	}
	return stated(strings.Join(ids, ", "))
}

func (b *body) readings() string {
	s := count(len(b.r.Readings), "reading")
	if f := b.r.File; f != nil {
		return s + ", " + f.Name
	}
	return s + ", typed"
}

func (b *body) levels() string {
	scale := map[string]string{"ddl": "DDL", "p_value": "P-values"}[b.a.Scale]
	if scale == "" {
		scale = stated(b.a.Scale)
	}
	return fmt.Sprintf("%d bit, %s", b.a.Bits, scale)
}

// figures gives what the verdict does not rest on.
func (b *body) figures(s *sheet) {
	a := b.a
	keep := leading(s.plain()) * 4
	s.heading("Room light and further figures", keep)
	s.paragraph(RoomLight(a.IlluminanceRange), s.left(), s.plain(), 4)
	s.y += 3
	plain := func(v float64) string { return decimal(v, 1) }
	one := []pair{
		{"L'min, L'max", luminance(a.LuminanceMin) + ", " + luminance(a.LuminanceMax)},
		{"L'max/L'min", reasoned(a.LuminanceRatio, a.LuminanceRatioReason, plain)},
		{"JND index", reasoned(a.JNDMin, a.JNDReason, plain) + endOf(a.JNDMax, " to ", plain)},
		{"greatest deviation", b.greatest()},
	}
	two := []pair{
		{"repeats needed", Repeats(a)},
		{"drift", reasoned(a.Drift, a.DriftReason, signedPercent)},
		{"JNDs a step", reasoned(a.JNDStep.MaxDeviation, a.JNDStep.Reason, signedPercent) + information},
		{"PS3.14 Annex C", b.annexC() + information},
	}
	if t := b.r.Table; t != nil {
		two = append(two, pair{"table made", tableWords(t)})
	}
	const most = 5
	s.columns(one, two, most)
}

// tableWords says what a table that was made in the visit is, and that it is a prediction.
func tableWords(t *record.Table) string {
	s := fmt.Sprintf("%d to %d bits, aim %s to %s, predicted deviation %s", t.InBits, t.OutBits, luminance(t.AimMin), luminance(t.AimMax), percent(t.MaxDeviation))
	switch n := len(t.Warnings); {
	case n == 1:
		s += "; 1 warning, in the record"
	case n > 1:
		s += fmt.Sprintf("; %d warnings, in the record", n)
	}
	return s
}

const information = " (information)"

func (b *body) greatest() string {
	a := b.a
	if a.MaxDeviation == nil && a.MaxDeviationReason == a.JNDReason && a.JNDReason != "" {
		return "none, for the same reason"
	}
	s := reasoned(a.MaxDeviation, a.MaxDeviationReason, percent)
	if a.MaxDeviation != nil && a.MaxDeviationInterval != nil {
		s += " (95 %: " + decimal(100*a.MaxDeviationInterval[0], 1) + " to " + percent(a.MaxDeviationInterval[1]) + ")"
	}
	if a.MaxDeviationFromLevel != nil && a.MaxDeviationToLevel != nil {
		s += fmt.Sprintf(", levels %d to %d", *a.MaxDeviationFromLevel, *a.MaxDeviationToLevel)
	}
	return s
}

func (b *body) annexC() string {
	c := b.a.AnnexC
	if c.Mean == nil || c.LUM == nil {
		return reasoned(nil, c.Reason, nil)
	}
	return "mean " + decimal(*c.Mean, 2) + ", LUM " + decimal(*c.LUM, 2) + " JNDs an interval"
}

func (b *body) charts(s *sheet) {
	const gutter = 20
	s.y += s.gap + 4
	luminance, deviation := ResponseChart(b.a, points(b.r)), DeviationChart(b.a)
	w, h := (s.width()-gutter)/2, s.chart
	if luminance.Empty != "" && deviation.Empty != "" {
		h = s.body * 9
	}
	if s.parted && len(s.pages) == 1 {
		s.turn()
	}
	s.charted = len(s.pages)
	if s.stacked {
		left, right := deviation.margins(s, s.small)
		l, r := luminance.margins(s, s.small)
		for _, c := range []Chart{deviation, luminance} {
			s.need(h)
			c.draw(s, Box{s.left(), s.y, s.width(), h}, s.small, max(left, l), max(right, r)) // one above the other, JND for JND
			s.y += h + s.gap
		}
		return
	}
	s.need(h)
	s.charted = len(s.pages)
	luminance.Draw(s, Box{s.left(), s.y, w, h}, s.small)
	deviation.Draw(s, Box{s.left() + w + gutter, s.y, w, h}, s.small)
	s.y += h
}

// points are the luminances of the levels as the assessment took them: series and repeats averaged,
// the ambient light added where the reading does not hold it.
func points(r *record.Record) []response.Point {
	var ambient float64
	if r.Assessment.Ambient != nil {
		ambient = *r.Assessment.Ambient
	}
	var out []response.Point
	where := map[int]int{}
	for _, rd := range r.Readings {
		if rd.Role == "drift" {
			continue
		}
		l := rd.Luminance
		if !rd.AmbientIncluded {
			l += ambient
		}
		i, ok := where[rd.Level]
		if !ok {
			i = len(out)
			where[rd.Level] = i
			out = append(out, response.Point{Level: rd.Level})
		}
		p := &out[i]
		n := float64(p.Readings)
		p.Luminance = photometry.CdM2((float64(p.Luminance)*n + l) / (n + 1))
		p.Readings++
	}
	return out
}

func stated(s string) string {
	if strings.TrimSpace(s) == "" {
		return notStated
	}
	return s
}

// reasoned writes a figure, or why there is none.
func reasoned(v *float64, reason string, write func(float64) string) string {
	switch {
	case v != nil:
		return write(*v)
	case reason != "":
		return "none: " + prose(reason)
	}
	return notStated
}

func endOf(v *float64, join string, write func(float64) string) string {
	if v == nil {
		return ""
	}
	return join + write(*v)
}

func luminance(v float64) string {
	f := criteria.Finding{Value: v, Unit: "cd/m2", Limit: v}
	return Value(f)
}

func count(n int, of string) string {
	if n == 1 {
		return "1 " + of
	}
	return fmt.Sprintf("%d %ss", n, of)
}

func capital(s string) string {
	if s == "" {
		return s
	}
	return strings.ToUpper(s[:1]) + s[1:]
}
