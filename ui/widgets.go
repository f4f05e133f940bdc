package ui

import (
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/report"
)

// The toolkit gives a key to the widget that has the focus and to nobody else. The widgets here hand on
// those that they have no use for, so that the keys of the window work everywhere.

// keys is what a widget asks about a key before it takes it for itself; true: it was used.
type keys func(*fyne.KeyEvent) bool

// field is a line to type in.
type field struct {
	widget.Entry
	keys  keys
	runes func(rune) bool          // asked before a character is taken; true: it was used
	paste func(clip string) bool   // asked before text is pasted; true: it was used
	other func(fyne.Shortcut) bool // asked about a shortcut; true: it was used
}

func newField(k keys) *field {
	f := &field{keys: k}
	f.ExtendBaseWidget(f)
	return f
}

func (f *field) TypedKey(e *fyne.KeyEvent) {
	if f.keys == nil || !f.keys(e) {
		f.Entry.TypedKey(e)
	}
}

func (f *field) TypedRune(r rune) {
	if f.runes == nil || !f.runes(r) {
		f.Entry.TypedRune(r)
	}
}

func (f *field) TypedShortcut(s fyne.Shortcut) {
	if p, ok := s.(*fyne.ShortcutPaste); ok && f.paste != nil && p.Clipboard != nil && f.paste(p.Clipboard.Content()) {
		return
	}
	if f.other == nil || !f.other(s) {
		f.Entry.TypedShortcut(s)
	}
}

// press is a button that Enter works as well as Space.
type press struct {
	widget.Button
	keys keys
}

func newPress(label string, k keys, do func()) *press {
	b := &press{keys: k}
	b.Text, b.OnTapped = label, do
	b.ExtendBaseWidget(b)
	return b
}

func (b *press) TypedKey(e *fyne.KeyEvent) {
	switch {
	case e.Name == fyne.KeyReturn || e.Name == fyne.KeyEnter:
		if !b.Disabled() && b.OnTapped != nil {
			b.OnTapped()
		}
	case b.keys != nil && b.keys(e):
	default:
		b.Button.TypedKey(e)
	}
}

// choice is a choice out of a few.
type choice struct {
	widget.Select
	keys keys
}

func newChoice(options []string, k keys, changed func(string)) *choice {
	c := &choice{keys: k}
	c.Options, c.OnChanged = options, changed
	c.ExtendBaseWidget(c)
	return c
}

func (c *choice) TypedKey(e *fyne.KeyEvent) {
	if c.keys == nil || !c.keys(e) {
		c.Select.TypedKey(e)
	}
}

// tick is a box to tick.
type tick struct {
	widget.Check
	keys keys
}

func newTick(label string, k keys) *tick {
	c := &tick{keys: k}
	c.Text = label
	c.ExtendBaseWidget(c)
	return c
}

func (c *tick) TypedKey(e *fyne.KeyEvent) {
	if c.keys == nil || !c.keys(e) {
		c.Check.TypedKey(e)
	}
}

// actionBar shows what a page can do as buttons, each with its key.
func actionBar(k keys, actions []action) fyne.CanvasObject {
	bar := container.New(layout.NewRowWrapLayout())
	for _, a := range actions {
		b := newPress(a.label+"  "+a.show, k, a.do)
		b.Importance = widget.LowImportance
		bar.Add(b)
	}
	return bar
}

// rows is a list in which Enter opens what is marked, and Home, End and the page keys move.
type rows struct {
	widget.List
	keys   keys
	marked int
	page   int
	open   func(int) // Enter or Space on a row
}

func newRows(length func() int, create func() fyne.CanvasObject, update func(int, fyne.CanvasObject), k keys) *rows {
	r := &rows{keys: k, page: 10}
	r.Length, r.CreateItem, r.UpdateItem = length, create, update
	r.OnHighlighted = func(i widget.ListItemID) { r.marked = i }
	r.ExtendBaseWidget(r)
	return r
}

func (r *rows) TypedKey(e *fyne.KeyEvent) {
	step := func(n int, name fyne.KeyName) {
		for range n {
			r.List.TypedKey(&fyne.KeyEvent{Name: name})
		}
	}
	switch e.Name {
	case fyne.KeyReturn, fyne.KeyEnter:
		if r.marked < r.Length() {
			r.Select(r.marked)
			if r.open != nil {
				r.open(r.marked)
			}
		}
	case fyne.KeyHome:
		step(r.marked, fyne.KeyUp)
	case fyne.KeyEnd:
		step(r.Length()-1-r.marked, fyne.KeyDown)
	case fyne.KeyPageUp:
		step(min(r.page, r.marked), fyne.KeyUp)
	case fyne.KeyPageDown:
		step(min(r.page, r.Length()-1-r.marked), fyne.KeyDown)
	default:
		if r.keys == nil || !r.keys(e) {
			r.List.TypedKey(e)
		}
	}
}

// heading is a line that names what follows.
func heading(s string) *canvas.Text {
	t := canvas.NewText(s, gray(text))
	t.TextSize, t.TextStyle.Bold = 17, true
	return t
}

// headline is a heading whose text may be long: what has no room is cut.
func headline(s string) *widget.Label {
	l := widget.NewLabelWithStyle(s, fyne.TextAlignLeading, fyne.TextStyle{Bold: true})
	l.SizeName, l.Truncation = theme.SizeNameSubHeadingText, fyne.TextTruncateEllipsis
	return l
}

// small is a line of less weight.
func small(s string) *canvas.Text {
	t := canvas.NewText(s, gray(muted))
	t.TextSize = 12
	return t
}

// prose is text that breaks into lines.
func prose(s string) *widget.Label {
	l := widget.NewLabel(s)
	l.Wrapping = fyne.TextWrapWord
	return l
}

// caption is prose of less weight.
func caption(s string) *widget.Label {
	l := prose(s)
	l.SizeName = theme.SizeNameCaptionText
	l.Importance = widget.LowImportance
	return l
}

// listRow is a row of a list: a title, and below it a state and a line of detail. What has no room is
// cut, the state last.
func listRow() fyne.CanvasObject {
	title, detail := widget.NewLabel(""), widget.NewLabel("")
	title.Truncation, detail.Truncation = fyne.TextTruncateEllipsis, fyne.TextTruncateEllipsis
	detail.SizeName, detail.Importance = theme.SizeNameCaptionText, widget.LowImportance
	state := canvas.NewText("", gray(text))
	state.TextSize, state.TextStyle.Bold = 12, true
	return container.New(layout.NewCustomPaddedVBoxLayout(-8), title, container.NewBorder(nil, nil, container.NewHBox(space(22, 1), centred(state)), nil, detail))
}

// setRow fills a listRow.
func setRow(o fyne.CanvasObject, marked bool, title, detail string, v criteria.Verdict) {
	outer := o.(*fyne.Container)
	mark := "    "
	if marked {
		mark = "▸ "
	}
	outer.Objects[0].(*widget.Label).SetText(mark + title)
	line := outer.Objects[1].(*fyne.Container)
	line.Objects[0].(*widget.Label).SetText(detail)
	state := line.Objects[1].(*fyne.Container).Objects[1].(*fyne.Container).Objects[1].(*canvas.Text)
	state.Text = ""
	if v != "" {
		state.Text, state.Color = report.Sign(v)+" "+string(v), stateColour(v)
	}
	state.Refresh()
	line.Refresh()
}

// stateText is a verdict as sign and word; the colour only repeats them.
func stateText(v criteria.Verdict) *canvas.Text {
	t := canvas.NewText(report.Sign(v)+" "+string(v), stateColour(v))
	t.TextStyle.Bold = true
	return t
}

// labelled puts a small label over a widget.
func labelled(label string, o fyne.CanvasObject) fyne.CanvasObject {
	return container.New(layout.NewCustomPaddedVBoxLayout(2), small(label), o)
}

// rule is a thin line.
func rule() fyne.CanvasObject {
	r := canvas.NewRectangle(gray(edge))
	r.SetMinSize(fyne.NewSize(1, 1))
	return r
}

// space is room of a fixed size.
func space(w, h float32) fyne.CanvasObject {
	r := canvas.NewRectangle(color.Transparent)
	r.SetMinSize(fyne.NewSize(w, h))
	return r
}

// control makes the shortcut of a key with Ctrl.
func control(k fyne.KeyName) fyne.Shortcut {
	return &desktop.CustomShortcut{KeyName: k, Modifier: fyne.KeyModifierControl}
}
