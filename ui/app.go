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
	reg, recs := newRegisterPage(d), newRecordsPage(d)
	s := newShell(w, b, reg, recs, limits)
	b.shell, reg.shell, recs.shell, limits.shell = s, s, s, s
	w.Resize(fyne.NewSize(1280, 800))
	s.open(0)
	for _, line := range d.Store.Warnings() {
		s.say("%s", line)
	}
	return nil
}
