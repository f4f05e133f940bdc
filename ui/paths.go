package ui

import (
	"os"
	"path/filepath"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/widget"
)

// askPath asks for a file by its path, which can be typed, or looked up with the toolkit's own dialog.
func (s *shell) askPath(title, suggested, button string, save bool, then func(path string)) {
	f := newField(s.keys)
	f.SetText(suggested)
	take := func() {
		path := strings.TrimSpace(f.Text)
		if path == "" {
			s.say("no file was named")
			return
		}
		if home, err := os.UserHomeDir(); err == nil && strings.HasPrefix(path, "~/") {
			path = filepath.Join(home, path[2:])
		}
		s.closeDialog()
		if _, err := os.Stat(path); save && err == nil {
			s.confirm("Write over it", path+" is there already.", "Write over it", func() { then(path) })
			return
		}
		then(path)
	}
	f.OnSubmitted = func(string) { take() }
	browse := newPress("Look for it", s.keys, func() {
		if save {
			b := dialog.NewFolderOpen(func(dir fyne.ListableURI, err error) {
				s.fail(err)
				if dir != nil {
					f.SetText(filepath.Join(dir.Path(), filepath.Base(f.Text)))
				}
				s.focus(f)
			}, s.window)
			b.Show()
			return
		}
		b := dialog.NewFileOpen(func(r fyne.URIReadCloser, err error) {
			s.fail(err)
			if r != nil {
				f.SetText(r.URI().Path())
				r.Close()
			}
			s.focus(f)
		}, s.window)
		b.Show()
	})
	ok := newPress(button, s.keys, take)
	ok.Importance = widget.HighImportance
	cancel := newPress("Leave it", s.keys, s.closeDialog)
	s.ask(title, container.NewVBox(f, container.NewHBox(ok, browse, cancel)), 760, f)
}

// papersFolder is where papers go unless the person says otherwise.
func papersFolder() string {
	home, err := os.UserHomeDir()
	if err != nil {
		return ""
	}
	if docs := filepath.Join(home, "Documents"); isFolder(docs) {
		return docs
	}
	return home
}

func isFolder(path string) bool {
	info, err := os.Stat(path)
	return err == nil && info.IsDir()
}
