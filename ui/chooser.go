package ui

import (
	"context"
	"fmt"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/demo"
	"evenstep/display/photometry"
	"evenstep/display/response"
	"evenstep/display/store"
)

// chooser asks which monitor is on the bench: first the visits that were left, then the monitors.
type chooser struct {
	bench  *bench
	filter *field
	list   *rows
	empty  *widget.Label
	demo   *press
	box    fyne.CanvasObject

	drafts   []store.Draft
	monitors []store.Monitor
	titles   map[int64]store.Monitor
	shown    []choiceRow
	marked   int
}

type choiceRow struct {
	text, detail string
	draft        *store.Draft
	monitor      store.Monitor
}

func newChooser(b *bench) *chooser {
	c := &chooser{bench: b}
	c.filter = newField(c.keys)
	c.filter.SetPlaceHolder("serial, room, station …")
	c.filter.OnChanged = func(string) { c.narrow() }
	c.filter.OnSubmitted = func(string) { c.take() }
	c.list = newRows(func() int { return len(c.shown) }, listRow, func(i int, o fyne.CanvasObject) {
		setRow(o, i == c.marked, c.shown[i].text, c.shown[i].detail, "")
	}, b.shell.keys)
	c.list.open = func(i int) { c.marked = i; c.take() }
	c.list.OnSelected = func(i widget.ListItemID) { c.marked = i; c.list.Refresh() }
	c.empty = prose("")
	c.demo = newPress("Fill it with an invented site", b.shell.keys, c.fillDemo)
	c.box = container.NewBorder(
		container.NewVBox(heading("Which monitor is on the bench?"), c.filter, small("type to narrow the list, arrows mark, Enter begins the visit"), c.empty, container.NewHBox(c.demo)),
		nil, nil, nil, c.list)
	return c
}

func (c *chooser) keys(e *fyne.KeyEvent) bool {
	switch e.Name {
	case fyne.KeyDown:
		c.marked = min(c.marked+1, len(c.shown)-1)
	case fyne.KeyUp:
		c.marked = max(c.marked-1, 0)
	default:
		return c.bench.shell.keys(e)
	}
	c.list.Refresh()
	if c.marked >= 0 && c.marked < len(c.shown) {
		c.list.ScrollTo(c.marked)
	}
	return true
}

func (c *chooser) load() {
	st := c.bench.deps.Store
	var err error
	if c.monitors, err = st.Monitors(); err != nil {
		c.bench.shell.fail(err)
	}
	if c.drafts, err = st.Drafts(); err != nil {
		c.bench.shell.fail(err)
	}
	c.titles = map[int64]store.Monitor{}
	for _, m := range c.monitors {
		c.titles[m.ID] = m
	}
	c.filter.SetText("")
	c.narrow()
}

func (c *chooser) narrow() {
	c.shown = nil
	words := strings.Fields(strings.ToLower(c.filter.Text))
	fits := func(m store.Monitor) bool {
		text := strings.ToLower(m.Title() + " " + m.Serial + " " + m.Model + " " + m.Class)
		for _, w := range words {
			if !strings.Contains(text, w) {
				return false
			}
		}
		return true
	}
	for i, d := range c.drafts {
		m := c.titles[d.MonitorID]
		if fits(m) {
			c.shown = append(c.shown, choiceRow{
				text:   "go on: " + m.Title(),
				detail: "no. " + m.Serial + "   " + fmt.Sprintf("begun %s, %d readings kept", d.Started.Local().Format("2 Jan 2006 15:04"), len(d.Readings)),
				draft:  &c.drafts[i], monitor: m,
			})
		}
	}
	for _, m := range c.monitors {
		if fits(m) && !m.Retired {
			detail := m.Class
			if m.Scheme != "" {
				detail = m.Scheme + ", " + m.Class
			}
			c.shown = append(c.shown, choiceRow{text: m.Title(), detail: "no. " + m.Serial + "   " + detail + "   " + m.Model, monitor: m})
		}
	}
	c.marked = 0
	c.demo.Hide()
	switch {
	case len(c.monitors) == 0:
		c.empty.SetText("The register has no monitors yet. Register (Ctrl+2) adds them one by one or from a spreadsheet; to look around, it can be filled with an invented site.")
		c.empty.Show()
		c.demo.Show()
	case len(c.shown) == 0:
		c.empty.SetText("Nothing fits these words.")
		c.empty.Show()
	default:
		c.empty.Hide()
	}
	c.list.Refresh()
}

// fillDemo fills an empty register with an invented site.
func (c *chooser) fillDemo() {
	d := c.bench.deps
	c.demo.Disable()
	go func() {
		err := demo.Fill(context.Background(), d.Store, demo.Options{Seed: 1, Now: d.Now().UTC(), Program: d.Program}, nil)
		fyne.Do(func() {
			c.demo.Enable()
			c.bench.shell.fail(err)
			c.load()
			c.bench.shell.focus(c.filter)
		})
	}()
}

// take begins or goes on with the visit that is marked.
func (c *chooser) take() {
	if c.marked < 0 || c.marked >= len(c.shown) {
		return
	}
	r := c.shown[c.marked]
	if r.draft != nil {
		c.bench.resume(*r.draft)
		return
	}
	c.bench.start(r.monitor)
}

func cdm2(v float64) photometry.CdM2 { return photometry.CdM2(v) }

// lightOf is the room light of an earlier assessment as it was stated.
func lightOf(a criteria.Assessment) store.Light {
	l := store.Light{}
	if a.Illuminance != nil {
		l.Illuminance = photometry.Lux(*a.Illuminance)
	}
	switch response.AmbientSource(a.AmbientSource) {
	case response.AmbientMeasured:
		l.Kind = store.LightMeasured
		if a.Ambient != nil {
			l.Ambient = cdm2(*a.Ambient)
		}
	case response.AmbientFromRd, response.AmbientAssumedRd:
		l.Kind = store.LightIlluminance
		if !a.RdAssumed && a.Rd != nil {
			rd := photometry.PerLux(*a.Rd)
			l.Rd = &rd
		}
	case response.AmbientDarkRoom:
		l.Kind = store.LightDark
	case response.AmbientInside:
		l.Kind = store.LightInside
	}
	return l
}
