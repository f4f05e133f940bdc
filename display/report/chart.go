package report

import (
	"math"
	"strings"
	"unicode"
)

// Chart is what a chart shows, in data units, apart from any surface. Draw draws it.
type Chart struct {
	Title, Note string // the note is one line under the title
	X, Y        Axis
	Bands       []Band
	Lines       []Line
	Bars        []Bar
	Marks       []Mark
	Limits      []LimitLine
	Labels      []Label
	Key         []KeyEntry
	Empty       string // why there is nothing to show; "" where there is
}

// Band is the area between two values of Y, over the whole of X.
type Band struct{ Low, High float64 }

// Line is a line through places in data units.
type Line struct{ At []XY }

// Bar is an interval of Y at one X. Where it reaches beyond the axis it is cut there, with no end stroke.
type Bar struct{ X, Low, High float64 }

// Mark is a marker at a place in data units; Ring is drawn around it where it is not "".
type Mark struct {
	At     XY
	Marker Marker
	Ring   Shape
}

// LimitLine is a dashed line at one Y, named in the right margin.
type LimitLine struct {
	Y    float64
	Text string
}

// Label is a text beside a place in data units.
type Label struct {
	At   XY
	Text string
}

// KeyEntry says what a sign means. One without a marker names the dashed line.
type KeyEntry struct {
	Marker Marker
	Text   string
}

// Draw draws the chart within the box, its texts in sizes around size points.
func (c Chart) Draw(p Painter, box Box, size float64) {
	left, right := c.margins(p, size)
	c.draw(p, box, size, left, right)
}

// margins are the widths that the chart needs left and right of its frame.
func (c Chart) margins(p Painter, size float64) (left, right float64) {
	small := Type{Size: size * 0.9}
	right = size * 0.5
	for _, t := range c.Y.Ticks {
		left = max(left, p.TextWidth(t.Text, small))
	}
	for _, l := range c.Limits {
		right = max(right, p.TextWidth(l.Text, small)+size*0.5)
	}
	return left + size*0.8, right
}

// draw is Draw with margins that may be wider than needed, so that frames can be made to line up.
func (c Chart) draw(p Painter, box Box, size, left, right float64) {
	title := Type{Face: Bold, Size: size * 1.1, Gray: black}
	small := Type{Size: size * 0.9, Gray: dark}
	y := box.Y + title.Size
	p.Text(XY{box.X, y}, shorten(p, c.Title, title, box.W), title)
	if c.Note != "" {
		y += size * 1.45
		p.Text(XY{box.X, y}, shorten(p, c.Note, small, box.W), small)
	}
	if c.Empty != "" {
		c.drawEmpty(p, Box{box.X, y + size*0.8, box.W, box.Y + box.H - y - size*0.8}, size)
		return
	}
	if len(c.Key) > 0 {
		y += size * 1.6
		c.drawKey(p, XY{box.X, y}, box.W, small)
	}
	y += size * 1.8
	p.Text(XY{box.X, y}, shorten(p, c.Y.Label, small, box.W), small)
	y += size * 0.8

	frame := Box{box.X + left, y, box.W - left - right, box.Y + box.H - y - size*3.1}
	f := framed{Chart: c, p: p, box: frame, size: size, small: small}
	f.drawGround()
	f.drawData()
	x := small
	x.Align = Centre
	p.Text(XY{frame.X + frame.W/2, box.Y + box.H - size*0.3}, c.X.Label, x)
}

func (c Chart) drawEmpty(p Painter, box Box, size float64) {
	p.Polygon(rectangle(box), pale)
	t := Type{Size: size, Gray: dark, Align: Centre}
	lines := wrap(p, c.Empty, t, box.W-4*size)
	fit := max(1, int(box.H/(size*1.4))-1)
	if len(lines) > fit {
		lines = lines[:fit]
		lines[fit-1] = shorten(p, lines[fit-1]+"…", t, box.W-4*size)
	}
	y := box.Y + box.H/2 - float64(len(lines)-1)*size*0.7 + size*0.35
	for _, l := range lines {
		p.Text(XY{box.X + box.W/2, y}, l, t)
		y += size * 1.4
	}
}

func (c Chart) drawKey(p Painter, at XY, w float64, t Type) {
	x := at.X
	for _, k := range c.Key {
		sign := t.Size
		if k.Marker.Shape == "" {
			sign = t.Size * 2
		}
		width := sign + t.Size*0.5 + p.TextWidth(k.Text, t)
		if x+width > at.X+w {
			return // an entry that finds no room is left out whole
		}
		middle := XY{x + sign/2, at.Y - t.Size*0.34}
		if k.Marker.Shape == "" {
			p.Polyline([]XY{{x, middle.Y}, {x + sign, middle.Y}}, limitStroke)
		} else {
			k.Marker.Draw(p, middle, t.Size*0.72, black)
		}
		p.Text(XY{x + sign + t.Size*0.5, at.Y}, k.Text, t)
		x += width + t.Size*1.3
	}
}

var limitStroke = Stroke{Width: 0.7, Gray: dark, Dash: 3}

// framed is a chart while it is drawn, with the frame that its axes span.
type framed struct {
	Chart
	p     Painter
	box   Box
	size  float64
	small Type
}

// at is where a place in data units stands on the surface, kept within the frame.
func (f framed) at(d XY) XY {
	within := func(v float64) float64 { return min(1, max(0, v)) }
	return XY{
		f.box.X + f.box.W*within(f.X.place(d.X)),
		f.box.Y + f.box.H*(1-within(f.Y.place(d.Y))),
	}
}

func (f framed) drawGround() {
	b, tick := f.box, f.size*0.35
	for _, band := range f.Bands {
		lo, hi := f.at(XY{f.X.Min, band.Low}), f.at(XY{f.X.Max, band.High})
		f.p.Polygon(rectangle(Box{b.X, hi.Y, b.W, lo.Y - hi.Y}), pale)
	}
	text := f.small
	text.Align = Right
	for _, t := range f.Y.thinned(b.H / (f.small.Size * 1.15)) {
		y := f.at(XY{f.X.Min, t.At}).Y
		if t.Text == "" {
			f.p.Polyline([]XY{{b.X - tick*0.6, y}, {b.X, y}}, Stroke{Width: 0.35, Gray: middle})
			continue
		}
		f.p.Polyline([]XY{{b.X - tick, y}, {b.X + b.W, y}}, Stroke{Width: 0.3, Gray: light})
		f.p.Text(XY{b.X - tick - f.size*0.25, y + f.small.Size*0.34}, t.Text, text)
	}
	text.Align = Centre
	widest := f.p.TextWidth("0000 ", f.small)
	for _, t := range f.X.thinned(b.W / widest) {
		x := f.at(XY{t.At, f.Y.Min}).X
		f.p.Polyline([]XY{{x, b.Y + b.H}, {x, b.Y + b.H + tick}}, Stroke{Width: 0.5, Gray: middle})
		f.p.Text(XY{x, b.Y + b.H + tick + f.small.Size*1.05}, t.Text, text)
	}
	text.Align = Left
	for _, l := range f.Limits {
		y := f.at(XY{f.X.Min, l.Y}).Y
		f.p.Polyline([]XY{{b.X, y}, {b.X + b.W, y}}, limitStroke)
		f.p.Text(XY{b.X + b.W + f.size*0.35, y + f.small.Size*0.34}, l.Text, text)
	}
	f.p.Polyline([]XY{{b.X, b.Y}, {b.X, b.Y + b.H}, {b.X + b.W, b.Y + b.H}}, Stroke{Width: 0.6, Gray: dark})
	if !f.Y.Log && f.Y.Min < 0 && f.Y.Max > 0 {
		zero := f.at(XY{f.X.Min, 0}).Y
		f.p.Polyline([]XY{{b.X, zero}, {b.X + b.W, zero}}, Stroke{Width: 0.5, Gray: dark})
	}
}

func (f framed) drawData() {
	for _, l := range f.Lines {
		at := make([]XY, len(l.At))
		for i, d := range l.At {
			at[i] = f.at(d)
		}
		f.p.Polyline(at, Stroke{Width: 0.8, Gray: middle})
	}
	// Series of every level would run into one blot: signs shrink with their number, to a third.
	const roomy = 60
	crowd := max(1.0/3, min(1, roomy/float64(max(1, len(f.Marks)))))
	ink, end := Stroke{Width: 0.7 * crowd, Gray: dark}, f.size*0.22
	if crowd < 1 {
		ink.Gray, end = middle, 0
	}
	for _, bar := range f.Bars {
		lo, hi := f.at(XY{bar.X, bar.Low}), f.at(XY{bar.X, bar.High})
		f.p.Polyline([]XY{lo, hi}, ink)
		if end > 0 && bar.Low >= f.Y.Min {
			f.p.Polyline([]XY{{lo.X - end, lo.Y}, {lo.X + end, lo.Y}}, ink)
		}
		if end > 0 && bar.High <= f.Y.Max {
			f.p.Polyline([]XY{{hi.X - end, hi.Y}, {hi.X + end, hi.Y}}, ink)
		}
	}
	for _, m := range f.Marks {
		at := f.at(m.At)
		if m.Ring != "" {
			edge := m.Ring.outline(at, f.size*0.62)
			f.p.Polyline(append(edge, edge[0], edge[1]), Stroke{Width: 0.7, Gray: black})
		}
		m.Marker.Draw(f.p, at, f.size*0.58*crowd, black)
	}
	for _, l := range f.Labels {
		f.drawLabel(l)
	}
}

// drawLabel sets the text right of its place and below it, clear of a rising line; where it would
// leave the frame, left and above.
func (f framed) drawLabel(l Label) {
	at, t, gap := f.at(l.At), f.small, f.size*0.7
	y := at.Y + t.Size*1.3
	if at.X+gap+f.p.TextWidth(l.Text, t) > f.box.X+f.box.W {
		t.Align, gap, y = Right, -gap, at.Y-t.Size*0.6
	}
	y = min(f.box.Y+f.box.H-f.size*0.4, max(f.box.Y+t.Size, y))
	f.p.Text(XY{at.X + gap, y}, l.Text, t)
}

// shorten cuts a text that is wider than w and ends it with an ellipsis.
func shorten(p Painter, text string, t Type, w float64) string {
	if p.TextWidth(text, t) <= w {
		return text
	}
	runes := []rune(text)
	lo, hi := 0, len(runes) // the longest cut that fits lies in [lo, hi)
	cut := func(n int) string { return strings.TrimRight(string(runes[:n]), " …") + "…" }
	for hi-lo > 1 {
		if mid := (lo + hi) / 2; p.TextWidth(cut(mid), t) <= w {
			lo = mid
		} else {
			hi = mid
		}
	}
	return cut(lo)
}

// wrap breaks a text into lines no wider than w, at spaces, and within a word that is wider itself.
func wrap(p Painter, text string, t Type, w float64) []string {
	var lines []string
	line, width := "", 0.0
	space := p.TextWidth(" ", t)
	for _, word := range strings.FieldsFunc(text, func(r rune) bool { return unicode.IsSpace(r) && r != tie }) {
		ww := p.TextWidth(word, t)
		if line != "" && width+space+ww <= w {
			line, width = line+" "+word, width+space+ww
			continue
		}
		if line != "" {
			lines = append(lines, line)
		}
		for ww > w {
			head := broken(p, word, t, w)
			lines = append(lines, word[:head])
			word = word[head:]
			ww = p.TextWidth(word, t)
		}
		line, width = word, ww
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}

// broken is the length in bytes of the longest head of a word that fits, one character at least. It
// ends after a hyphen or the like where one stands in its second half.
func broken(p Painter, word string, t Type, w float64) int {
	width, good := 0.0, 0
	for i, r := range word {
		width += p.TextWidth(string(r), t)
		if width > w && i > 0 {
			if good > i/2 {
				return good
			}
			return i
		}
		if strings.ContainsRune("-_/.:", r) {
			good = i + 1
		}
	}
	return len(word)
}

// finite says whether all values can be drawn.
func finite(values ...float64) bool {
	for _, v := range values {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
	}
	return true
}
