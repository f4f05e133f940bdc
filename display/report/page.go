package report

import "strings"

// op is one drawing step on a page. Exactly one of line, area and text is set.
type op struct {
	line   []XY
	stroke Stroke
	area   []XY
	fill   Gray
	text   string
	at     XY // left end of the baseline
	set    Type
	width  float64 // of the text
}

// page is what stands on one page.
type page struct{ ops []op }

// tight says how closely a report is set.
type tight struct {
	body, small float64 // type sizes in points
	gap         float64 // between sections, in points
	chart       float64 // height of the charts in points
	nameLines   int     // most lines of a name, a serial and the like
}

// The least type is 6 points, which reads at arm's length on paper; nothing is set smaller.
var tightness = []tight{
	{9, 7.7, 17, 200, 3},
	{8.4, 7.2, 14, 180, 3},
	{8, 6.9, 11, 150, 3},
	{7.6, 6.6, 9, 126, 3},
	{7.2, 6.3, 7, 112, 2},
	{6.8, 6, 4, 96, 2},
}

// arrangement says how the parts of a report lie to each other.
type arrangement struct {
	parted  bool // the charts begin the second page
	stacked bool // the charts lie one above the other, as wide as the page
	told    bool // the first page says that there are more than two
}

// sheet is a document while it is laid out: pages of drawing steps, and where the next block goes.
// It is a Painter on its current page.
type sheet struct {
	*ruler
	tight
	paper paper
	pages []*page
	y     float64
	arrangement
	// slack is the height left free above the foot of the last page.
	slack float64
	// charted is the number of the page that the charts stand on.
	charted int
	// top is drawn at the head of every page after the first.
	top func(s *sheet)
}

type paper struct{ width, height float64 }

// Margins in points; the foot holds the hash and the page number.
const (
	side = 48.0
	head = 42.0
	foot = 56.0
)

func (s *sheet) left() float64   { return side }
func (s *sheet) width() float64  { return s.paper.width - 2*side }
func (s *sheet) bottom() float64 { return s.paper.height - foot }

func (s *sheet) turn() {
	s.pages = append(s.pages, &page{})
	s.y = head
	if len(s.pages) > 1 && s.top != nil {
		s.top(s)
	}
}

// need turns the page where the rest of this one is lower than h.
func (s *sheet) need(h float64) {
	if s.y+h > s.bottom() {
		s.turn()
	}
}

func (s *sheet) add(o op) {
	p := s.pages[len(s.pages)-1]
	p.ops = append(p.ops, o)
}

// Polyline implements Painter.
func (s *sheet) Polyline(at []XY, stroke Stroke) { s.add(op{line: at, stroke: stroke}) }

// Polygon implements Painter.
func (s *sheet) Polygon(at []XY, g Gray) { s.add(op{area: at, fill: g}) }

// Text implements Painter.
func (s *sheet) Text(at XY, text string, t Type) {
	if text == "" {
		return
	}
	text = strings.ReplaceAll(s.printable(text, t.Face), string(tie), " ")
	w := s.TextWidth(text, t)
	switch t.Align {
	case Centre:
		at.X -= w / 2
	case Right:
		at.X -= w
	}
	t.Align = Left
	s.add(op{text: text, at: at, set: t, width: w})
}

// Type styles of the page.
func (s *sheet) plain() Type { return Type{Size: s.body} }
func (s *sheet) bold() Type  { return Type{Face: Bold, Size: s.body} }
func (s *sheet) quiet() Type { return Type{Size: s.small, Gray: dark} }

// leading is the distance of lines of a type size.
func leading(t Type) float64 { return t.Size * 1.38 }

// ties keeps a value and its unit on one line.
var ties = strings.NewReplacer(" %", string(tie)+"%", " cd/m²", string(tie)+"cd/m²", " lx", string(tie)+"lx")

// lines breaks a text into lines of width w and at most most of them; the last is cut visibly.
func (s *sheet) lines(text string, t Type, w float64, most int) []string {
	out := wrap(s, ties.Replace(s.printable(text, t.Face)), t, w)
	if len(out) > most {
		out = out[:most]
		out[most-1] = shorten(s, out[most-1]+" …", t, w)
	}
	return out
}

// setLines sets lines from the top y and returns the y below them.
func (s *sheet) setLines(lines []string, x, y float64, t Type) float64 {
	for _, l := range lines {
		s.Text(XY{x, y + t.Size}, l, t)
		y += leading(t)
	}
	return y
}

// paragraph sets a text over the width from x, line by line over pages.
func (s *sheet) paragraph(text string, x float64, t Type, most int) {
	for _, l := range s.lines(text, t, s.left()+s.width()-x, most) {
		s.need(leading(t))
		s.y = s.setLines([]string{l}, x, s.y, t)
	}
}

// rule draws a hairline over the whole width.
func (s *sheet) rule(y float64, stroke Stroke) {
	s.Polyline([]XY{{s.left(), y}, {s.left() + s.width(), y}}, stroke)
}

// heading starts a section. keep is the height of what must stand on the same page below it.
func (s *sheet) heading(text string, keep float64) {
	t := s.bold()
	if s.y > head+1 {
		s.y += s.gap
	}
	s.need(leading(t) + 5 + keep)
	s.Text(XY{s.left(), s.y + t.Size}, text, t)
	s.y += leading(t) + 1
	s.rule(s.y, Stroke{Width: 0.5, Gray: middle})
	s.y += 4
}

// pair is a word and what it says.
type pair struct{ key, value string }

// identifying is how many lines a serial number may take: it is not cut to save room.
const identifying = 5

// pairs sets pairs in a column where set is true, each value on at most most lines, and returns
// their height.
func (s *sheet) pairs(list []pair, x, y, w float64, most int, set bool) float64 {
	key, value := s.quiet(), s.plain()
	keyWidth := 0.0
	for _, p := range list {
		keyWidth = max(keyWidth, s.TextWidth(p.key, key))
	}
	keyWidth = min(keyWidth+8, w*0.45)
	start := y
	for _, p := range list {
		allowed := most
		if p.key == monitorKey {
			allowed = identifying
		}
		lines := s.lines(p.value, value, w-keyWidth, allowed)
		if set {
			s.Text(XY{x, y + value.Size}, shorten(s, p.key, key, keyWidth-4), key)
			s.setLines(lines, x+keyWidth, y, value)
		}
		y += float64(max(1, len(lines)))*leading(value) + 0.8
	}
	return y - start
}

// columns sets two columns of pairs side by side.
func (s *sheet) columns(a, b []pair, most int) {
	const gutter = 22
	w := (s.width() - gutter) / 2
	h := max(s.pairs(a, 0, 0, w, most, false), s.pairs(b, 0, 0, w, most, false))
	s.need(h)
	s.pairs(a, s.left(), s.y, w, most, true)
	s.pairs(b, s.left()+w+gutter, s.y, w, most, true)
	s.y += h
}
