package ui

import (
	"fmt"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"
)

// section is one page of the window.
type section interface {
	name() string
	content() fyne.CanvasObject
	// entered is called each time the page comes to the front; it puts the focus where typing goes.
	entered()
	// actions are what the page can do, for the menu and the key map.
	actions() []action
}

// action is something that can be done, with its key.
type action struct {
	label string
	key   fyne.Shortcut // nil: reached by Tab and Enter only
	show  string        // the key in words
	do    func()
}

// shell is the frame of the window: a rail of sections, one page at a time, one line of news.
type shell struct {
	window   fyne.Window
	sections []section
	rail     []*press
	page     *fyne.Container
	news     *widget.Label
	current  int
	dialogs  []*dialog.CustomDialog // open ones, the topmost last
}

func newShell(w fyne.Window, sections ...section) *shell {
	s := &shell{window: w, sections: sections, page: container.NewStack(), news: widget.NewLabel(""), current: -1}
	s.news.Truncation = fyne.TextTruncateEllipsis
	rail := container.NewVBox(space(104, 4))
	for i, sec := range sections {
		b := newPress(sec.name(), s.keys, func() { s.open(i) })
		b.Alignment = widget.ButtonAlignLeading
		b.Importance = widget.LowImportance
		s.rail = append(s.rail, b)
		rail.Add(b)
	}
	rail.Add(layout.NewSpacer())
	rail.Add(small("  F1 keys"))
	back := canvas.NewRectangle(gray(0x16))
	left := container.NewStack(back, container.NewBorder(nil, nil, nil, rule(), container.NewPadded(rail)))
	bottom := container.NewVBox(rule(), s.news)
	w.SetContent(container.NewBorder(nil, bottom, left, nil, container.NewPadded(s.page)))
	w.Canvas().SetOnTypedKey(func(e *fyne.KeyEvent) { s.keys(e) })
	return s
}

// open brings a section to the front.
func (s *shell) open(i int) {
	s.current = i
	for k, b := range s.rail {
		b.Importance = widget.LowImportance
		if k == i {
			b.Importance = widget.MediumImportance
		}
		b.Refresh()
	}
	s.page.Objects = []fyne.CanvasObject{s.sections[i].content()}
	s.page.Refresh()
	s.window.SetMainMenu(s.menu())
	s.say("")
	s.sections[i].entered()
}

// menu holds every action with its key: the toolkit looks here for shortcuts whatever has the focus.
func (s *shell) menu() *fyne.MainMenu {
	var goTo []*fyne.MenuItem
	for i, sec := range s.sections {
		item := fyne.NewMenuItem(sec.name(), func() { s.open(i) })
		item.Shortcut = control(fyne.KeyName(fmt.Sprint(i + 1)))
		goTo = append(goTo, item)
	}
	var here []*fyne.MenuItem
	for _, a := range s.sections[s.current].actions() {
		item := fyne.NewMenuItem(a.label, a.do)
		item.Shortcut = a.key
		here = append(here, item)
	}
	if len(here) == 0 {
		here = append(here, fyne.NewMenuItem("Keys", s.showKeys))
	}
	return fyne.NewMainMenu(
		fyne.NewMenu("Go to", goTo...),
		fyne.NewMenu(s.sections[s.current].name(), here...),
		fyne.NewMenu("Help", fyne.NewMenuItem("Keys (F1)", s.showKeys), fyne.NewMenuItem("Cautions", s.showCautions)),
	)
}

// keys uses the keys of the whole window; true: used.
func (s *shell) keys(e *fyne.KeyEvent) bool {
	switch e.Name {
	case fyne.KeyF1:
		if len(s.dialogs) == 0 {
			s.showKeys()
		}
		return true
	case fyne.KeyEscape:
		s.closeDialog()
		return true
	}
	return false
}

// ask opens a dialog. Its widgets must hand on their keys, so that Esc closes it.
func (s *shell) ask(title string, content fyne.CanvasObject, width float32, focus fyne.Focusable) {
	d := dialog.NewCustomWithoutButtons(title, content, s.window)
	s.dialogs = append(s.dialogs, d)
	d.Resize(fyne.NewSize(width, content.MinSize().Height))
	d.Show()
	s.focus(focus)
}

// closeDialog closes the topmost dialog and gives the keys back to the page.
func (s *shell) closeDialog() {
	if n := len(s.dialogs); n > 0 {
		d := s.dialogs[n-1]
		s.dialogs = s.dialogs[:n-1]
		d.Hide()
	}
}

// confirm asks before something that cannot be undone. Esc and Enter both leave it; yes takes a Tab.
func (s *shell) confirm(title, text, yes string, do func()) {
	no := newPress("Leave it", s.keys, s.closeDialog)
	ok := newPress(yes, s.keys, func() { s.closeDialog(); do() })
	s.ask(title, container.NewVBox(prose(text), container.NewHBox(no, ok)), 520, no)
}

// note shows something to be read.
func (s *shell) note(title string, content fyne.CanvasObject, width float32) {
	ok := newPress("Close", s.keys, s.closeDialog)
	s.ask(title, container.NewVBox(content, container.NewHBox(ok)), width, ok)
}

func (s *shell) showKeys() {
	var b strings.Builder
	add := func(key, what string) { fmt.Fprintf(&b, "%-14s %s\n", key, what) }
	for i, sec := range s.sections {
		add(fmt.Sprintf("Ctrl+%d", i+1), sec.name())
	}
	add("Tab, Shift+Tab", "next, previous field")
	add("Enter, Space", "press the button, open the row")
	add("Alt", "menu; arrows and Enter in it")
	add("Esc", "close a dialog")
	b.WriteString("\n" + s.sections[s.current].name() + "\n")
	for _, a := range s.sections[s.current].actions() {
		add(a.show, a.label)
	}
	grid := widget.NewTextGridFromString(b.String())
	s.note("Keys", container.NewPadded(grid), 460)
}

const cautions = `Evenstep supports a qualified person; it never declares a monitor fit for diagnosis by itself.
A verdict depends on the scheme, its edition and class, and on how well each limit is known.
Limits that rest on memory or on a single restatement decide nothing until the site has confirmed them.
Local rules and licensed practice decide.
Do not read clinically on a monitor that fails.`

func (s *shell) showCautions() {
	s.note("Cautions", prose(cautions), 760)
}

// say puts a line of news at the foot of the window.
func (s *shell) say(format string, args ...any) {
	s.news.SetText(fmt.Sprintf(format, args...))
}

// fail shows an error at the foot of the window, where it does not stand in the way of typing.
func (s *shell) fail(err error) {
	if err != nil {
		s.say("▲ %v", err)
	}
}

func (s *shell) focus(f fyne.Focusable) { s.window.Canvas().Focus(f) }
