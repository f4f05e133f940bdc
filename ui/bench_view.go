package ui

import (
	"fmt"
	"image/color"
	"math"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/readings"
	"evenstep/display/report"
	"evenstep/display/response"
)

// large is the theme of the reading field: figures that are read at arm's length.
type large struct{ dim }

func (l large) Size(n fyne.ThemeSizeName) float32 {
	switch n {
	case theme.SizeNameText:
		return 34
	case theme.SizeNameInnerPadding:
		return 10
	}
	return l.dim.Size(n)
}

// levelsView is the phase of a visit in which the levels are read.
type levelsView struct {
	shell    *shell
	series   *series
	changed  func() // after each reading
	level    *canvas.Text
	count    *canvas.Text
	field    *field
	unit     *canvas.Text
	expected *canvas.Text
	question *widget.Label
	strip    *fyne.Container
	cells    []*levelCell
	box      fyne.CanvasObject
}

func newLevelsView(sh *shell, changed func()) *levelsView {
	v := &levelsView{shell: sh, changed: changed}
	v.level = canvas.NewText("", gray(text))
	v.level.TextSize, v.level.TextStyle.Bold = 26, true
	v.count = canvas.NewText("", gray(muted))
	v.count.TextSize = 15
	v.unit = canvas.NewText("", gray(muted))
	v.unit.TextSize = 18
	v.expected = canvas.NewText("", gray(muted))
	v.expected.TextSize = 15
	v.question = widget.NewLabel("")
	v.question.Wrapping = fyne.TextWrapWord
	v.field = newField(v.keys)
	v.field.OnSubmitted = func(string) { v.submit() }
	v.field.runes = v.runes
	v.field.paste = v.paste
	v.strip = container.New(layout.NewGridWrapLayout(fyne.NewSize(84, 46)))
	entry := container.New(fixedWidth(190), container.NewThemeOverride(v.field, large{}))
	top := container.NewHBox(v.level, space(18, 1), centred(v.count))
	line := container.New(layout.NewRowWrapLayout(), entry, container.NewHBox(space(2, 56), centred(v.unit), space(10, 1), centred(v.expected)))
	v.box = container.NewBorder(
		container.NewVBox(top, line, v.question, caption("Enter takes it, Backspace goes back, r again, d drift, u unit, arrows: another level")),
		nil, nil, nil, container.NewVScroll(v.strip))
	return v
}

// fixedWidth is a layout that gives its one object a width.
type fixedWidth float32

func (w fixedWidth) MinSize(o []fyne.CanvasObject) fyne.Size {
	return fyne.NewSize(float32(w), o[0].MinSize().Height)
}

func (w fixedWidth) Layout(o []fyne.CanvasObject, s fyne.Size) {
	o[0].Resize(s)
	o[0].Move(fyne.NewPos(0, 0))
}

// centred puts a text at the height of the middle of its neighbours.
func centred(o fyne.CanvasObject) fyne.CanvasObject {
	return container.NewVBox(layout.NewSpacer(), o, layout.NewSpacer())
}

// use shows another series.
func (v *levelsView) use(s *series) {
	v.series = s
	v.strip.RemoveAll()
	v.cells = nil
	for _, l := range s.plan {
		c := newLevelCell(func() { s.goTo(l); v.refresh(); v.shell.focus(v.field) })
		v.cells = append(v.cells, c)
		v.strip.Add(c)
	}
	v.field.SetText("")
	v.refresh()
}

func (v *levelsView) refresh() {
	s := v.series
	v.count.Text = fmt.Sprintf("%d of %d", s.done(), len(s.plan))
	v.unit.Text = string(s.unit)
	v.expected.Text = ""
	if level, ok := s.level(); ok {
		v.level.Text = fmt.Sprintf("level %d", level)
		if _, there := s.has(level); there {
			again := "again"
			if s.next == readings.Drift {
				again = "again, for drift"
			}
			v.level.Text += ", " + again
		}
		if l, ok := s.expected(); ok {
			v.expected.Text = fmt.Sprintf("about %s expected", short(l))
		}
	} else {
		v.level.Text = "all levels read"
	}
	v.question.SetText(s.question)
	if s.question == "" {
		v.question.Hide() // an empty line takes room that a small window does not have
	} else {
		v.question.Show()
	}
	for _, t := range []*canvas.Text{v.level, v.count, v.unit, v.expected} {
		t.Refresh()
	}
	now, asking := s.level()
	for i, c := range v.cells {
		l := s.plan[i]
		value, there := s.has(l)
		n := 0
		for _, r := range s.taken {
			if r.Level == l {
				n++
			}
		}
		text := ""
		if there {
			text = short(s.shown(value))
			if n > 1 {
				text += fmt.Sprintf(" ×%d", n)
			}
		}
		c.show(l, text, asking && l == now)
	}
}

func (v *levelsView) submit() {
	kept, err := v.series.enter(v.field.Text)
	switch {
	case err != nil:
		v.shell.fail(err)
		v.refresh()
		return
	case kept:
		v.shell.say("")
	}
	v.field.SetText("")
	v.refresh()
	if kept {
		v.changed()
	}
}

func (v *levelsView) keys(e *fyne.KeyEvent) bool {
	switch e.Name {
	case fyne.KeyBackspace:
		if v.field.Text != "" {
			return false
		}
		if err := v.series.back(); err != nil {
			v.shell.fail(err)
		}
		v.refresh()
		v.changed()
		return true
	case fyne.KeyUp, fyne.KeyDown:
		step := 1
		if e.Name == fyne.KeyUp {
			step = -1
		}
		s := v.series
		if n := len(s.plan); n > 0 {
			at := min(max(s.at+step, 0), n-1)
			s.goTo(s.plan[at])
			v.refresh()
		}
		return true
	}
	return v.shell.keys(e)
}

// runes takes the letters that are commands; figures go into the field.
func (v *levelsView) runes(r rune) bool {
	switch r {
	case 'u', 'U':
		v.series.toggleUnit()
	case 'r', 'R':
		v.series.repeatLast()
	case 'd', 'D':
		v.series.drift()
	default:
		return false
	}
	v.refresh()
	return true
}

func (v *levelsView) paste(clip string) bool {
	if _, err := number(clip); err == nil {
		return false // a single figure goes into the field
	}
	n, err := v.series.paste(clip)
	if err != nil {
		v.shell.fail(err)
		return true
	}
	v.shell.say("%d readings taken from the clipboard", n)
	v.refresh()
	v.changed()
	return true
}

// levelCell is one level of the strip: done, now or to come.
type levelCell struct {
	widget.BaseWidget
	back         *canvas.Rectangle
	level, value *canvas.Text
	tapped       func()
}

func newLevelCell(tapped func()) *levelCell {
	c := &levelCell{back: canvas.NewRectangle(color.Transparent), level: small(""), value: canvas.NewText("", gray(text)), tapped: tapped}
	c.back.StrokeWidth = 2
	c.value.TextSize = 14
	c.ExtendBaseWidget(c)
	return c
}

func (c *levelCell) show(level int, value string, now bool) {
	c.level.Text, c.value.Text = fmt.Sprint(level), value
	c.back.FillColor, c.back.StrokeColor = gray(0x21), color.Transparent
	if value == "" {
		c.back.FillColor = color.Transparent
		c.back.StrokeColor = gray(edge)
	}
	if now {
		c.level.Text = "▸ " + c.level.Text
		c.back.StrokeColor = gray(focused)
	}
	c.Refresh()
}

// Tapped implements fyne.Tappable.
func (c *levelCell) Tapped(*fyne.PointEvent) { c.tapped() }

// CreateRenderer implements fyne.Widget.
func (c *levelCell) CreateRenderer() fyne.WidgetRenderer {
	return widget.NewSimpleRenderer(container.NewStack(c.back, container.New(layout.NewCustomPaddedLayout(2, 2, 7, 4),
		container.New(layout.NewCustomPaddedVBoxLayout(0), c.level, c.value))))
}

// verdictBand shows what is known so far; it is there from the first reading on.
type verdictBand struct {
	box    *fyne.Container
	first  *fyne.Container
	second *widget.Label
}

func newVerdictBand() *verdictBand {
	b := &verdictBand{first: container.New(layout.NewRowWrapLayout()), second: prose("")}
	b.second.SizeName = theme.SizeNameCaptionText
	// Three lines, and more by scrolling: the work above must keep its room in a small window.
	lines := container.NewVScroll(b.second)
	lines.SetMinSize(fyne.NewSize(100, 62))
	b.box = container.NewStack(canvas.NewRectangle(gray(0x16)), container.NewPadded(container.NewVBox(b.first, lines)))
	return b
}

// waiting shows how far the series is while nothing can be judged yet.
func (b *verdictBand) waiting(line string) {
	b.first.RemoveAll()
	b.first.Add(stateText(criteria.NotAssessed))
	b.second.SetText(line)
	b.first.Refresh()
}

// show puts an assessment in the band; a word before it says what it rests on beside the readings.
func (b *verdictBand) show(a criteria.Assessment, before string) {
	b.first.RemoveAll()
	overall := stateText(a.Verdict)
	overall.TextSize = 18
	b.first.Add(overall)
	shape := "Nothing wrong found in the shape.   "
	for _, f := range a.Findings {
		if f.Verdict == criteria.NotAssessed {
			continue
		}
		if f.Quantity == string(criteria.ContrastDeviation) && !f.Verdict.Holds() {
			shape = "No known cause fits the shape.   "
		}
		value := canvas.NewText(report.Value(f)+"  ", gray(text))
		b.first.Add(container.NewHBox(space(14, 1), centred(small(report.Quantity(f)+"  ")), centred(value), centred(stateText(f.Verdict)), centred(small(" "+report.Limit(f)))))
	}
	line := ""
	if before != "" {
		line = before + "   "
	}
	if n := len(a.NotAssessed); n > 0 {
		line += fmt.Sprintf("%d not assessed.   ", n)
	}
	switch {
	case len(a.Causes) == 0:
		line += shape
	default:
		for _, c := range a.Causes {
			line += "Looks like: " + join(c.Causes, ", or ") + " (" + c.Evidence + "): " + c.Advice + ".   "
		}
	}
	if a.Scheme == "" {
		line += "No limits are chosen, so nothing is judged (Ctrl+E)."
	}
	if a.Scheme != "" {
		line += report.RoomLight(a.IlluminanceRange)
		if a.RepeatsNeeded == nil || *a.RepeatsNeeded > 0 {
			line += "   Repeats: " + report.Repeats(a) + "."
		}
	}
	b.second.SetText(line)
	b.first.Refresh()
}

func join(parts []string, sep string) string {
	out := ""
	for i, p := range parts {
		if i > 0 {
			out += sep
		}
		out += p
	}
	return out
}

// charts are the two plots of the bench, one over the other.
type charts struct {
	response, deviation *chartView
	box                 fyne.CanvasObject
}

func newCharts() *charts {
	c := &charts{response: newChartView(fyne.NewSize(220, 90)), deviation: newChartView(fyne.NewSize(220, 90))}
	c.box = container.NewGridWithRows(2, c.response, c.deviation)
	c.clear("The curve appears when the lowest and the highest level are read.")
	return c
}

func (c *charts) clear(why string) {
	c.response.show(report.Chart{Title: "Luminance over JND index", Empty: why})
	c.deviation.show(report.Chart{Title: "Deviation of contrast, step by step", Empty: why})
}

// soFar shows the readings of a series of which an end is missing.
func (c *charts) soFar(taken []response.LevelReading, top int, why string) {
	c.clear(why)
	if len(taken) > 1 {
		c.response.show(report.SeriesChart(taken, top))
	}
}

func (c *charts) show(a criteria.Assessment, r *response.Response) {
	c.response.show(report.ResponseChart(a, r.Points))
	c.deviation.show(report.DeviationChart(a))
}

// minutes writes how long a monitor has been warming up.
func minutes(m float64) string { return fmt.Sprintf("%.0f min", math.Floor(m)) }
