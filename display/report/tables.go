package report

import (
	"fmt"
	"strings"
	"unicode/utf8"

	"evenstep/display/criteria"
	"evenstep/display/record"
)

// The columns of the findings, as parts of the width.
var findingColumns = []struct {
	head string
	part float64
}{
	{"verdict", 0.235}, {"quantity", 0.285}, {"value", 0.14}, {"95 % interval", 0.205}, {"limit", 0.135},
}

func (b *body) findings(s *sheet) {
	if len(b.a.Findings) == 0 {
		s.heading("Findings", leading(s.plain()))
		why := "None: no limit could be judged."
		if b.r.Scheme == nil {
			why = "None: no scheme was asked for."
		}
		s.paragraph(why, s.left(), s.plain(), 2)
		return
	}
	s.heading("Findings", leading(s.quiet())*4)
	open := false
	b.findingHead(s)
	for i, f := range b.a.Findings {
		row := b.row(s, f)
		if s.y+row.height > s.bottom() {
			s.turn()
			b.findingHead(s)
		} else if i > 0 {
			s.rule(s.y-1.6, Stroke{Width: 0.3, Gray: light})
		}
		row.set(s)
		open = open || unconfirmed(f)
	}
	if open {
		s.paragraph("Limit not confirmed: the document was not read. Such a limit decides once the site has confirmed that it stands there, unless it is unsure or for information only.",
			s.left(), s.quiet(), 2)
	}
}

func (b *body) findingHead(s *sheet) {
	x := s.left()
	t := s.quiet()
	for _, c := range findingColumns {
		s.Text(XY{x, s.y + t.Size}, c.head, t)
		x += c.part * s.width()
	}
	s.y += leading(t) + 2
}

// row is one finding, broken into the lines of its cells.
type row struct {
	verdict criteria.Verdict
	cells   [][]string
	under   []string // below the verdict
	detail  []string
	height  float64
}

const cellGap = 6

func (b *body) row(s *sheet, f criteria.Finding) row {
	r := row{verdict: f.Verdict}
	texts := []string{string(f.Verdict), Quantity(f), Value(f), Interval(f), Limit(f)}
	main := 1
	for i, c := range findingColumns {
		w := c.part*s.width() - cellGap
		t := s.plain()
		if i == 0 {
			w -= s.body + 3
			t = s.bold()
		}
		cell := s.lines(texts[i], t, w, 3)
		r.cells = append(r.cells, cell)
		if i > 0 { // the details stand beside the verdict, however long that is
			main = max(main, len(cell))
		}
	}
	if f.Provisional {
		r.under = append(r.under, "provisional")
	}
	if unconfirmed(f) {
		r.under = append(r.under, "limit not confirmed")
	}
	const most = 7
	r.detail = s.lines(strings.Join(Details(f), string(tie)+"· "), s.quiet(), s.width()*(1-findingColumns[0].part), most)
	under := float64(len(r.cells[0]))*leading(s.plain()) + float64(len(r.under))*leading(s.quiet())
	beside := float64(main)*leading(s.plain()) + float64(len(r.detail))*leading(s.quiet())
	r.height = max(under, beside) + 5
	return r
}

func (r row) set(s *sheet) {
	x, y := s.left(), s.y
	main := 0
	for i, c := range findingColumns {
		t, at := s.plain(), x
		if i == 0 {
			t = s.bold()
			at += s.body + 3
			MarkerOf(r.verdict).Draw(s, XY{x + s.body*0.45, y + s.body*0.68}, s.body*0.78, black)
		} else {
			main = max(main, len(r.cells[i]))
		}
		below := s.setLines(r.cells[i], at, y, t)
		if i == 0 {
			s.setLines(r.under, at, below, s.quiet())
		}
		x += c.part * s.width()
	}
	s.setLines(r.detail, s.left()+findingColumns[0].part*s.width(), y+float64(main)*leading(s.plain()), s.quiet())
	s.y += r.height
}

func (b *body) unassessed(s *sheet) {
	if len(b.a.NotAssessed) == 0 {
		return
	}
	s.heading("Not assessed", leading(s.plain()))
	for _, u := range b.a.NotAssessed {
		b.item(s, Marker{Shape: Dash}, Name(u.Quantity), prose(u.Reason))
	}
}

// item is a marker, bold words and text that runs on after them.
func (b *body) item(s *sheet, m Marker, words, text string) {
	t := s.plain()
	indent := s.body + 5
	const most = 6
	lines := s.lines(words+": "+text, t, s.width()-indent, most)
	s.need(float64(min(2, len(lines))) * leading(t))
	m.Draw(s, XY{s.left() + s.body*0.45, s.y + s.body*0.68}, s.body*0.7, dark)
	for _, l := range lines {
		s.need(leading(t))
		s.y = s.setLines([]string{l}, s.left()+indent, s.y, t)
	}
	s.y += 1.5
}

func (b *body) causes(s *sheet) {
	if len(b.a.Causes) == 0 {
		return
	}
	s.heading("What the deviations point to", leading(s.plain())*3)
	for _, c := range b.a.Causes {
		const most = 6
		names := s.lines(strings.Join(c.Causes, ", or "), s.bold(), s.width(), 2)
		text := append(s.lines("Evidence: "+prose(c.Evidence), s.plain(), s.width(), most),
			s.lines("What to do: "+prose(c.Advice), s.plain(), s.width(), most)...)
		s.need(float64(len(names)+len(text)) * leading(s.plain()))
		s.y = s.setLines(names, s.left(), s.y, s.bold())
		s.y = s.setLines(text, s.left(), s.y, s.plain()) + 3
	}
}

// grid is where a position stands on the screen: column and row, 0 to 2.
var grid = map[string][2]int{
	"top left": {0, 0}, "top": {1, 0}, "top right": {2, 0},
	"left": {0, 1}, "centre": {1, 1}, "right": {2, 1},
	"bottom left": {0, 2}, "bottom": {1, 2}, "bottom right": {2, 2},
}

// places draws every uniform field as the screen lies before the eye, in cd/m2 as read.
func (b *body) places(s *sheet) {
	fields, other := fieldsOf(b.r.Places)
	if len(fields) == 0 && len(other) == 0 {
		return
	}
	cell := Box{W: 52, H: leading(s.plain())*1.15 + 1}
	h := 3*cell.H + leading(s.quiet()) + 4
	s.heading("Places, cd/m² as read", h)
	x := s.left()
	for _, f := range fields {
		if x+3*cell.W > s.left()+s.width() {
			x = s.left()
			s.y += h + 4
			s.need(h)
		}
		t := s.quiet()
		s.Text(XY{x, s.y + t.Size}, f.name, t)
		top := s.y + leading(t) + 1
		value := s.plain()
		value.Align = Centre
		for _, pos := range positions {
			at := grid[pos]
			box := Box{x + float64(at[0])*cell.W, top + float64(at[1])*cell.H, cell.W, cell.H}
			edge := rectangle(box)
			s.Polyline(append(edge, edge[0]), Stroke{Width: 0.35, Gray: middle})
			if v, ok := f.values[pos]; ok {
				s.Text(XY{box.X + box.W/2, box.Y + box.H/2 + value.Size*0.36}, shorten(s, v, value, cell.W-4), value)
			}
		}
		x += 3*cell.W + 24
	}
	if len(fields) > 0 {
		s.y += h
	}
	if len(other) > 0 {
		s.paragraph("Also: "+strings.Join(other, "; "), s.left(), s.plain(), 3)
	}
	b.byFormula(s)
}

var positions = []string{
	"top left", "top", "top right", "left", "centre", "right", "bottom left", "bottom", "bottom right",
}

type field struct {
	name   string
	values map[string]string
}

// fieldsOf sorts places by the level of their field; other holds what has no place on the grid.
func fieldsOf(places []record.Place) (fields []field, other []string) {
	index := map[int]int{}
	for _, p := range places {
		v := strings.TrimSuffix(luminance(p.Luminance), " cd/m²")
		if _, ok := grid[p.Position]; !ok {
			other = append(other, fmt.Sprintf("%s %s", p.Position, v))
			continue
		}
		i, ok := index[p.Level]
		if !ok {
			i = len(fields)
			index[p.Level] = i
			name := fmt.Sprintf("level %d", p.Level)
			if p.Level < 0 {
				name = "level not stated"
			}
			fields = append(fields, field{name, map[string]string{}})
		}
		fields[i].values[p.Position] = v
	}
	return fields, other
}

// byFormula names the figures of places and pair by every formula, as information.
func (b *body) byFormula(s *sheet) {
	var parts []string
	add := func(what string, list []criteria.PlacesFigure) {
		for _, f := range list {
			part := what + " " + percent(f.Value) + " by " + f.Formula
			if f.Level != nil {
				part += fmt.Sprintf(" (level %d)", *f.Level)
			}
			parts = append(parts, part)
		}
	}
	add("uniformity", b.a.Uniformity)
	add("pair", b.a.PairMatch)
	if len(parts) > 0 {
		s.y += 2
		s.paragraph("By formula, for information: "+strings.Join(parts, "; ")+".", s.left(), s.quiet(), 4)
	}
}

func (b *body) notes(s *sheet) {
	if strings.TrimSpace(b.r.Visit.Notes) == "" {
		return
	}
	s.heading("Notes", leading(s.plain()))
	s.paragraph(b.r.Visit.Notes, s.left(), s.plain(), longest) // cut by its length, not by its lines
	if utf8.RuneCountInString(b.r.Visit.Notes) > longest {
		s.paragraph("The notes go on; the record holds them whole.", s.left(), s.quiet(), 1)
	}
}

// close sets the caution and the lines for signatures, together, at the foot of the last page.
func (b *body) close(s *sheet) {
	t := s.plain()
	lines := s.lines(caution, t, s.width()-16, 5)
	cautionHeight := float64(len(lines))*leading(t) + 10
	const signing = 40
	h := cautionHeight + signing
	s.y += s.gap
	s.need(h)
	y := max(s.y, s.bottom()-h)
	s.slack = y - s.y
	s.Polyline([]XY{{s.left(), y}, {s.left(), y + cautionHeight - 4}}, Stroke{Width: 2, Gray: dark})
	s.setLines(lines, s.left()+12, y+2, t)
	y += cautionHeight + signing - 14
	x := s.left()
	label := s.quiet()
	for _, f := range []struct {
		name string
		part float64
	}{{"measured by", 0.38}, {"reviewed by", 0.38}, {"date", 0.24}} {
		w := f.part*s.width() - 14
		s.Polyline([]XY{{x, y}, {x + w, y}}, Stroke{Width: 0.5, Gray: dark})
		s.Text(XY{x, y + label.Size + 3}, f.name, label)
		x += f.part * s.width()
	}
	s.y = s.bottom()
}

// footers is drawn last, when the number of pages is known.
func (b *body) footers(s *sheet) {
	t := Type{Size: 6.6, Gray: dark}
	mono := Type{Face: Mono, Size: 6.2, Gray: dark}
	hash := "not sealed: no SHA-256"
	if b.r.SHA256 != "" {
		hash = "SHA-256 " + b.r.SHA256
	}
	all := s.pages
	for i := range all {
		s.pages = all[:i+1]
		y := s.bottom() + 10
		s.rule(y, Stroke{Width: 0.4, Gray: middle})
		number := t
		number.Align = Right
		right := s.left() + s.width()
		s.Text(XY{right, y + 10.5}, fmt.Sprintf("page %d of %d", i+1, len(all)), number)
		s.Text(XY{s.left(), y + 10.5}, shorten(s, s.printable(hash, Mono), mono, s.width()-70), mono)
		program := s.printable(stated(b.r.Program)+" · record edition "+fmt.Sprint(b.r.Version), Regular)
		s.Text(XY{s.left(), y + 19.5}, shorten(s, program, t, s.width()-70), t)
	}
	s.pages = all
}

// code is the short form of the hash, to be read aloud.
func (b *body) code() string {
	if c := b.r.Code(); c != "" {
		return c
	}
	return "not sealed"
}
