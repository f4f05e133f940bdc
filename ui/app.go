package ui

import (
	"fyne.io/fyne/v2"
)

// Start fills the window and brings the bench to the front.
func Start(app fyne.App, w fyne.Window, d Deps) error {
	app.Settings().SetTheme(dim{})
	limits, err := newCriteriaPage(d)
	if err != nil {
		return err
	}
	b := newBench(d)
	reg, recs, sheets := newRegisterPage(d), newRecordsPage(d), newPatternsPage(d)
	s := newShell(w, b, reg, recs, sheets, limits)
	b.shell, reg.shell, recs.shell, sheets.shell, limits.shell = s, s, s, s, s
	w.Resize(sizeFor(d.Width, d.Height, w.Canvas().Scale()))
	s.open(0)
	for _, line := range d.Store.Warnings() {
		s.say("%s", line)
	}
	return nil
}

// sizeFor is the size of the window: what the pages are laid out for, or what the screen has room for
// with the window's frame.
func sizeFor(width, height int, scale float32) fyne.Size {
	want := fyne.NewSize(1280, 800)
	if width > 0 && height > 0 && scale > 0 {
		const frame = 40 // a title bar and edges, in pixels
		want = want.Min(fyne.NewSize((float32(width)-frame/4)/scale, (float32(height)-frame)/scale))
	}
	return want
}
