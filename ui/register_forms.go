package ui

import (
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/store"
)

// editor is a form of named fields with one button that keeps them.
type editor struct {
	page   *registerPage
	title  string
	grid   *fyne.Container
	first  fyne.Focusable
	fields []*field
	save   func() error
}

func (p *registerPage) editor(title string) *editor {
	return &editor{page: p, title: title, grid: container.New(layout.NewGridLayout(2))}
}

func (e *editor) text(label, value string) *field {
	f := newField(e.page.shell.keys)
	f.SetText(value)
	f.OnSubmitted = func(string) { e.done() }
	e.add(label, f, f)
	e.fields = append(e.fields, f)
	return f
}

func (e *editor) pick(label string, options []string, value string) *choice {
	c := newChoice(options, e.page.shell.keys, nil)
	c.SetSelected(value)
	e.add(label, c, c)
	return c
}

func (e *editor) add(label string, o fyne.CanvasObject, f fyne.Focusable) {
	e.grid.Add(labelled(label, o))
	if e.first == nil {
		e.first = f
	}
}

func (e *editor) show(save func() error) {
	e.save = save
	keep := newPress("Keep", e.page.shell.keys, e.done)
	keep.Importance = widget.HighImportance
	e.page.put(container.NewVScroll(container.NewVBox(headline(e.title), e.grid, container.NewHBox(keep))))
	e.page.shell.focus(e.first)
}

func (e *editor) done() {
	if err := e.save(); err != nil {
		e.page.shell.fail(err)
		return
	}
	e.page.shell.say("kept")
	e.page.load()
	e.page.shell.focus(e.page.filter)
}

// figures read from fields; an empty one is not stated.
func figureOf(f *field, what string) (*float64, error) {
	if strings.TrimSpace(f.Text) == "" {
		return nil, nil
	}
	v, err := number(f.Text)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", what, err)
	}
	return &v, nil
}

func shownFigure[T ~float64](v *T) string {
	if v == nil {
		return ""
	}
	return strconv.FormatFloat(float64(*v), 'g', -1, 64)
}

func (p *registerPage) editRoom(o store.Room) {
	e := p.editor("Room")
	name, lx, notes := e.text("name", o.Name), e.text("illuminance on the screens, lx, as in use", shownFigure(o.Illuminance)), e.text("notes", o.Notes)
	e.show(func() error {
		v, err := figureOf(lx, "illuminance")
		if err != nil {
			return err
		}
		o.Name, o.Illuminance, o.Notes = strings.TrimSpace(name.Text), (*photometry.Lux)(v), notes.Text
		_, err = p.deps.Store.SaveRoom(o)
		return err
	})
}

func (p *registerPage) editStation(o store.Station) {
	rooms, err := p.deps.Store.Rooms()
	p.shell.fail(err)
	if len(rooms) == 0 {
		p.shell.say("a station stands in a room: make the room first (Ctrl+R)")
		return
	}
	var names []string
	for _, r := range rooms {
		names = append(names, r.Name)
	}
	e := p.editor("Station")
	room, name, place := e.pick("room", names, o.Room), e.text("name", o.Name), e.text("order in the room", strconv.Itoa(o.Place))
	e.show(func() error {
		i := room.SelectedIndex()
		if i < 0 {
			return fmt.Errorf("no room is chosen; expected one; choose it")
		}
		n, err := strconv.Atoi(strings.TrimSpace(place.Text))
		if err != nil {
			return fmt.Errorf("order is %q; expected a whole number; correct it", place.Text)
		}
		o.RoomID, o.Name, o.Place = rooms[i].ID, strings.TrimSpace(name.Text), n
		_, err = p.deps.Store.SaveStation(o)
		return err
	})
}

func (p *registerPage) editMonitor(m store.Monitor) {
	stations, err := p.deps.Store.Stations()
	p.shell.fail(err)
	names := []string{"in no station"}
	chosen := names[0]
	for _, s := range stations {
		names = append(names, s.Room+" › "+s.Name)
		if m.StationID != nil && s.ID == *m.StationID {
			chosen = names[len(names)-1]
		}
	}
	all, err := criteria.Schemes()
	p.shell.fail(err)
	ids := []string{""}
	for _, s := range all {
		ids = append(ids, s.ID)
	}
	title := "New monitor"
	if m.ID != 0 {
		title = m.Title() + "   no. " + m.Serial
	}
	e := p.editor(title)
	serial, model := e.text("serial", m.Serial), e.text("model", m.Model)
	station, place := e.pick("station", names, chosen), e.text("place from the left", strconv.Itoa(m.Place))
	label, bits := e.text("what it is called, as left", m.Label), e.text("bits of its levels", strconv.Itoa(m.Bits))
	scheme := e.pick("scheme", ids, m.Scheme)
	class := e.pick("class", nil, "")
	classes := func(id string) {
		var cs []string
		for _, s := range all {
			if s.ID == id {
				for _, c := range s.Classes {
					cs = append(cs, c.ID)
				}
			}
		}
		class.SetOptions(cs)
		class.ClearSelected()
		if len(cs) > 0 {
			class.SetSelectedIndex(0)
		}
	}
	classes(m.Scheme)
	class.SetSelected(m.Class)
	scheme.OnChanged = classes
	where := e.pick("where its grays are set", store.CalibratedIn(), m.CalibratedIn)
	orientation := e.pick("orientation", store.Orientations(), m.Orientation)
	rd, hours := e.text("Rd measured, cd/m² per lx (empty: assumed)", shownFigure(m.Rd)), e.text("backlight hours", shownFigure(m.BacklightHours))
	state := e.pick("state", []string{"in use", "taken out"}, map[bool]string{false: "in use", true: "taken out"}[m.Retired])
	notes := e.text("notes", m.Notes)
	e.show(func() error {
		v, err := figureOf(rd, "Rd")
		if err != nil {
			return err
		}
		h, err := figureOf(hours, "backlight hours")
		if err != nil {
			return err
		}
		n, errN := strconv.Atoi(strings.TrimSpace(place.Text))
		b, errB := strconv.Atoi(strings.TrimSpace(bits.Text))
		if errN != nil || errB != nil {
			return fmt.Errorf("place is %q, bits are %q; expected whole numbers; correct them", place.Text, bits.Text)
		}
		m.Serial, m.Model, m.Label, m.Notes = strings.TrimSpace(serial.Text), strings.TrimSpace(model.Text), strings.TrimSpace(label.Text), notes.Text
		m.Place, m.Bits, m.Rd, m.BacklightHours = n, b, (*photometry.PerLux)(v), h
		m.Scheme, m.Class, m.CalibratedIn, m.Orientation = scheme.Selected, class.Selected, where.Selected, orientation.Selected
		m.Retired = state.Selected == "taken out"
		m.StationID = nil
		if i := station.SelectedIndex(); i > 0 {
			m.StationID = &stations[i-1].ID
		}
		_, err = p.deps.Store.SaveMonitor(m)
		return err
	})
}

func (p *registerPage) editMeter(o store.Meter) {
	e := p.editor("Meter")
	name, kind := e.text("id", o.Name), e.pick("kind (contact sees no room light, distance sees it)", []string{store.Contact, store.Distance}, o.Kind)
	gain, k := e.text("calibration uncertainty, %, from the certificate", percentText(o.GainUncertainty)), e.text("its k", plain(o.GainK))
	rep, floor := e.text("repeatability, % (empty: 0.5 assumed)", percentOf(o.Repeatability)), e.text("noise floor, cd/m² (empty: 0.005 assumed)", shownFigure(o.NoiseFloor))
	res, factor := e.text("least digit, cd/m²", plain(float64(o.Resolution))), e.text("factor against the reference meter", plain(o.Factor))
	on, due := e.text("calibrated on, as 2026-11-30", o.CalibratedOn), e.text("due on", o.DueOn)
	e.show(func() error {
		var firstErr error
		read := func(f *field, what string) float64 {
			v, err := figureOf(f, what)
			if err != nil && firstErr == nil {
				firstErr = err
			}
			if v == nil {
				return 0
			}
			return *v
		}
		o.Name, o.Kind = strings.TrimSpace(name.Text), kind.Selected
		o.GainUncertainty, o.GainK = read(gain, "uncertainty")/100, read(k, "k")
		o.Resolution, o.Factor = cdm2(read(res, "least digit")), read(factor, "factor")
		o.Repeatability, o.NoiseFloor = nil, nil
		if v, err := figureOf(rep, "repeatability"); err != nil {
			return err
		} else if v != nil {
			r := *v / 100
			o.Repeatability = &r
		}
		v, err := figureOf(floor, "noise floor")
		if err != nil {
			return err
		}
		o.NoiseFloor = (*photometry.CdM2)(v)
		o.CalibratedOn, o.DueOn = strings.TrimSpace(on.Text), strings.TrimSpace(due.Text)
		if firstErr != nil {
			return firstErr
		}
		_, err = p.deps.Store.SaveMeter(o)
		return err
	})
}

func percentText(v float64) string { return strconv.FormatFloat(100*v, 'g', 6, 64) }

func percentOf(v *float64) string {
	if v == nil {
		return ""
	}
	return percentText(*v)
}

func (p *registerPage) editPerson(o store.Person) {
	e := p.editor("Person")
	id := e.text("id, as it stands in records", o.ID)
	if o.ID != "" {
		id.Disable()
	}
	name, role := e.text("name (kept apart; empty erases it)", o.Name), e.pick("role, self-declared", store.Roles(), o.Role)
	e.show(func() error {
		return p.deps.Store.SavePerson(store.Person{ID: strings.TrimSpace(id.Text), Name: strings.TrimSpace(name.Text), Role: role.Selected})
	})
}

func (p *registerPage) editSite() {
	was, limits, err := p.deps.Store.Site()
	p.shell.fail(err)
	e := p.editor("The site")
	name := e.text("name", was)
	e.show(func() error { return p.deps.Store.SaveSite(strings.TrimSpace(name.Text), limits) })
}

// importList shows what a list would change before it changes anything.
func (p *registerPage) importList() {
	p.shell.askPath("Import a list of monitors (CSV)", "", "Look at it", false, func(path string) {
		f, err := os.Open(path)
		if err != nil {
			p.shell.fail(err)
			return
		}
		defer f.Close()
		plan, err := p.deps.Store.PlanImport(filepath.Base(path), f)
		if err != nil {
			p.shell.fail(err)
			return
		}
		p.showPlan(plan)
	})
}

func (p *registerPage) showPlan(plan []store.Change) {
	lines := container.NewVBox()
	count := map[string]int{}
	for _, c := range plan {
		count[c.What]++
		switch {
		case c.Err != "":
			lines.Add(prose(fmt.Sprintf("▲ line %d, %s: %s", c.Line, c.Serial, c.Err)))
		case c.What != "same":
			lines.Add(prose(fmt.Sprintf("%s: %s   %s", c.What, c.Serial, strings.Join(c.Fields, "; "))))
		}
	}
	carry := newPress("Import", p.shell.keys, func() {
		if err := p.deps.Store.Import(plan); err != nil {
			p.shell.fail(err)
			return
		}
		p.load()
		p.shell.say("%d new, %d changed", count["new"], count["changed"])
		p.put(prose("Imported."))
	})
	carry.Importance = widget.HighImportance
	if count["error"] > 0 {
		carry.Disable()
	}
	head := small(fmt.Sprintf("%d new, %d changed, %d the same, %d with errors; nothing is changed yet", count["new"], count["changed"], count["same"], count["error"]))
	p.put(container.NewBorder(container.NewVBox(heading("What the list would change"), head), container.NewHBox(carry), nil, nil, container.NewVScroll(lines)))
	p.shell.focus(carry)
}

func (p *registerPage) backup() {
	name := "register " + p.deps.Now().Format("2006-01-02 150405") + ".db"
	p.shell.askPath("Back up the register", filepath.Join(papersFolder(), name), "Back up", true, func(path string) {
		if err := p.deps.Store.Backup(path); err != nil {
			p.shell.fail(err)
			return
		}
		p.shell.say("backed up to %s", path)
	})
}

// restore puts a backup in the register's place, after asking.
func (p *registerPage) restore() {
	p.shell.askPath("Restore a backup", "", "Go on", false, func(path string) {
		text := "Everything in the register is replaced by what the backup holds. What is there now is kept beside it."
		p.shell.confirm("Restore a backup", text, "Restore", func() {
			kept, err := p.deps.Store.RestoreFrom(path, p.deps.Now())
			if err != nil {
				p.shell.fail(err)
				return
			}
			p.load()
			p.shell.say("restored; what was there is kept as %s", kept)
		})
	})
}
