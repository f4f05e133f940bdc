package ui

import (
	"strings"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/store"
)

// registerPage shows and changes the site: monitors, rooms, stations, meters, persons.
type registerPage struct {
	deps   Deps
	shell  *shell
	filter *field
	list   *rows
	form   *fyne.Container
	empty  *widget.Label
	box    fyne.CanvasObject

	shown  []siteRow
	marked int
}

// siteRow is one thing in the register.
type siteRow struct {
	text, detail string
	verdict      criteria.Verdict
	edit         func()
}

func newRegisterPage(d Deps) *registerPage { return &registerPage{deps: d} }

func (p *registerPage) name() string { return "Register" }

func (p *registerPage) content() fyne.CanvasObject {
	if p.box == nil {
		p.build()
	}
	return p.box
}

func (p *registerPage) entered() {
	p.load()
	p.shell.focus(p.filter)
}

func (p *registerPage) actions() []action {
	return []action{
		{"Open what is marked", nil, "Enter", p.open},
		{"New monitor", control(fyne.KeyN), "Ctrl+N", func() { p.editMonitor(store.Monitor{Bits: 8, CalibratedIn: store.InMonitor, Orientation: "portrait"}) }},
		{"New room", control(fyne.KeyR), "Ctrl+R", func() { p.editRoom(store.Room{}) }},
		{"New station", control(fyne.KeyT), "Ctrl+T", func() { p.editStation(store.Station{}) }},
		{"New meter", control(fyne.KeyE), "Ctrl+E", func() { p.editMeter(store.Meter{Kind: store.Contact, GainK: 2, Factor: 1}) }},
		{"New person", control(fyne.KeyP), "Ctrl+P", func() { p.editPerson(store.Person{}) }},
		{"Import a list", control(fyne.KeyI), "Ctrl+I", p.importList},
		{"Back up", control(fyne.KeyB), "Ctrl+B", p.backup},
		{"Restore", control(fyne.KeyO), "Ctrl+O", p.restore},
		{"Site's name", control(fyne.KeyG), "Ctrl+G", p.editSite},
	}
}

func (p *registerPage) build() {
	p.filter = newField(p.keys)
	p.filter.SetPlaceHolder("serial, room, meter, person, fails …")
	p.filter.OnChanged = func(string) { p.load() }
	p.filter.OnSubmitted = func(string) { p.open() }
	p.list = newRows(func() int { return len(p.shown) }, listRow, func(i int, o fyne.CanvasObject) {
		r := p.shown[i]
		setRow(o, i == p.marked, r.text, r.detail, r.verdict)
	}, p.shell.keys)
	p.list.open = func(i int) { p.marked = i; p.open() }
	p.list.OnSelected = func(i widget.ListItemID) { p.marked = i; p.list.Refresh(); p.open() }
	p.empty = prose("")
	p.form = container.NewStack()
	left := container.NewBorder(container.NewVBox(heading("The site"), p.filter, p.empty), actionBar(p.shell.keys, p.actions()[1:]), nil, nil, p.list)
	split := container.NewHSplit(left, container.NewPadded(p.form))
	split.Offset = .45
	p.box = split
	p.put(prose("Enter opens what is marked.\n\nRoles of persons are self-declared: this register lies on one computer and knows nobody's password."))
}

func (p *registerPage) put(o fyne.CanvasObject) {
	p.form.Objects = []fyne.CanvasObject{o}
	p.form.Refresh()
}

func (p *registerPage) keys(e *fyne.KeyEvent) bool {
	switch e.Name {
	case fyne.KeyDown:
		p.marked = min(p.marked+1, len(p.shown)-1)
	case fyne.KeyUp:
		p.marked = max(p.marked-1, 0)
	default:
		return p.shell.keys(e)
	}
	p.list.Refresh()
	if p.marked >= 0 && p.marked < len(p.shown) {
		p.list.ScrollTo(p.marked)
	}
	return true
}

// load reads the register anew and keeps what the filter leaves.
func (p *registerPage) load() {
	st := p.deps.Store
	words := strings.Fields(strings.ToLower(p.filter.Text))
	p.shown = nil
	add := func(r siteRow) {
		text := strings.ToLower(r.text + " " + r.detail + " " + string(r.verdict))
		for _, w := range words {
			if !strings.Contains(text, w) {
				return
			}
		}
		p.shown = append(p.shown, r)
	}
	monitors, err := st.Monitors()
	p.shell.fail(err)
	latest, err := st.Latest()
	p.shell.fail(err)
	for _, m := range monitors {
		r := siteRow{text: m.Title(), detail: "no. " + m.Serial + "   " + m.Class + "   " + m.Model, edit: func() { p.editMonitor(m) }}
		if e, ok := latest[m.ID]; ok {
			r.verdict = e.Verdict
			r.detail += "   last visit " + day(e.Time)
		} else {
			r.detail += "   no visit yet"
		}
		if m.Retired {
			r.verdict, r.detail = "", "taken out   "+r.detail
		}
		add(r)
	}
	rooms, err := st.Rooms()
	p.shell.fail(err)
	for _, o := range rooms {
		light := "illuminance not measured"
		if o.Illuminance != nil {
			light = short(float64(*o.Illuminance)) + " lx"
		}
		add(siteRow{text: "room: " + o.Name, detail: light + "   " + firstLine(o.Notes), edit: func() { p.editRoom(o) }})
	}
	stations, err := st.Stations()
	p.shell.fail(err)
	for _, o := range stations {
		add(siteRow{text: "station: " + o.Room + " › " + o.Name, detail: "", edit: func() { p.editStation(o) }})
	}
	meters, err := st.Meters()
	p.shell.fail(err)
	today := p.deps.Now().Format(time.DateOnly)
	for _, o := range meters {
		due := "calibration not stated"
		if o.CalibratedOn != "" {
			due = "calibrated " + o.CalibratedOn
		}
		if o.DueOn != "" {
			due += ", due " + o.DueOn
			if o.DueOn < today {
				due += ", ▲ overdue"
			}
		}
		add(siteRow{text: "meter: " + o.Name, detail: o.Kind + "   " + due, edit: func() { p.editMeter(o) }})
	}
	persons, err := st.Persons()
	p.shell.fail(err)
	for _, o := range persons {
		add(siteRow{text: "person: " + o.ID, detail: o.Name + "   " + o.Role, edit: func() { p.editPerson(o) }})
	}
	p.marked = min(p.marked, max(0, len(p.shown)-1))
	if len(p.shown) == 0 {
		p.empty.SetText("Nothing here. Ctrl+N makes a new monitor.")
		p.empty.Show()
	} else {
		p.empty.Hide()
	}
	p.list.Refresh()
}

func firstLine(s string) string {
	s, _, _ = strings.Cut(s, "\n")
	return s
}

func (p *registerPage) open() {
	if p.marked >= 0 && p.marked < len(p.shown) {
		p.shown[p.marked].edit()
	}
}
