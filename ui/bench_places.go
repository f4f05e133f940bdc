package ui

import (
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/store"
)

// ninePlaces are the places of a uniform field, in reading order.
var ninePlaces = []readings.Position{
	readings.TopLeft, readings.Top, readings.TopRight, readings.Left, readings.Centre, readings.Right,
	readings.BottomLeft, readings.Bottom, readings.BottomRight,
}

// showPlaces is the phase in which uniformity is read, and colour where there is a meter for it.
func (b *bench) showPlaces() {
	k := b.shell.keys
	level := newField(k)
	level.SetPlaceHolder("level of the field, as 204")
	grid := container.New(layout.NewGridLayout(3))
	type cell struct{ l, u, v *field }
	cells := map[readings.Position]cell{}
	for _, p := range ninePlaces {
		c := cell{newField(k), newField(k), newField(k)}
		c.l.SetPlaceHolder("cd/m²")
		c.u.SetPlaceHolder("u'")
		c.v.SetPlaceHolder("v'")
		for _, old := range b.draft.Places {
			if old.Position == p {
				c.l.SetText(plain(float64(old.Luminance)))
				if old.Colour != nil {
					c.u.SetText(plain(old.Colour.U))
					c.v.SetText(plain(old.Colour.V))
				}
				if old.Level >= 0 {
					level.SetText(fmt.Sprint(old.Level))
				}
			}
		}
		cells[p] = c
		grid.Add(container.NewPadded(labelled(string(p), container.NewGridWithColumns(3, c.l, c.u, c.v))))
	}
	done := func() {
		places, err := readPlaces(level.Text, b.monitor.Bits, func(p readings.Position) (l, u, v string) {
			c := cells[p]
			return c.l.Text, c.u.Text, c.v.Text
		})
		if err != nil {
			b.shell.fail(err)
			return
		}
		b.draft.Places = places
		if b.saveHead() {
			b.shell.say("%d places kept", len(places))
			b.showLevels()
		}
	}
	ok := newPress("Done", k, done)
	ok.Importance = widget.HighImportance
	for _, p := range ninePlaces {
		c := cells[p]
		for _, f := range []*field{c.l, c.u, c.v} {
			f.OnSubmitted = func(string) { done() }
		}
	}
	b.put(container.NewVScroll(container.NewVBox(
		prose("The centre and the four corners at least; empty places are left out, all empty takes the places away. Tab goes from place to place, Enter is done."),
		labelled("field", level), grid, container.NewHBox(ok))))
	b.shell.focus(cells[readings.TopLeft].l)
}

// readPlaces reads the places from their fields.
func readPlaces(level string, bits int, at func(readings.Position) (l, u, v string)) ([]readings.Place, error) {
	field := -1
	if s := strings.TrimSpace(level); s != "" {
		if _, err := fmt.Sscan(s, &field); err != nil || field < 0 || field >= 1<<bits {
			return nil, fmt.Errorf("level of the field is %q; expected 0 to %d; correct it, or leave it empty", level, 1<<bits-1)
		}
	}
	var out []readings.Place
	for _, p := range ninePlaces {
		l, u, v := at(p)
		if strings.TrimSpace(l) == "" {
			continue
		}
		x, err := number(l)
		if err != nil || x < 0 || x > 100000 {
			return nil, fmt.Errorf("%s: luminance is %q; expected 0 to 100000 cd/m²; correct it", p, l)
		}
		place := readings.Place{Position: p, Level: field, Luminance: cdm2(x)}
		if strings.TrimSpace(u+v) != "" {
			a, errU := number(u)
			c, errV := number(v)
			if errU != nil || errV != nil || !(a > 0 && a < .7 && c > 0 && c < .7) {
				return nil, fmt.Errorf("%s: colour is %q, %q; expected u' and v' of CIE 1976, as 0.198 and 0.468; convert it", p, u, v)
			}
			place.Colour = &photometry.UV{U: a, V: c}
		}
		out = append(out, place)
	}
	if len(out) == 0 {
		return nil, nil
	}
	for _, need := range []readings.Position{readings.TopLeft, readings.TopRight, readings.Centre, readings.BottomLeft, readings.BottomRight} {
		if !slices.ContainsFunc(out, func(p readings.Place) bool { return p.Position == need }) {
			return nil, fmt.Errorf("%s is missing; expected the centre and the four corners; measure it", need)
		}
	}
	return out, nil
}

// showNeighbour is the phase in which the pair is compared.
func (b *bench) showNeighbour() {
	k := b.shell.keys
	serial, lmax, u, v, ownU, ownV := newField(k), newField(k), newField(k), newField(k), newField(k), newField(k)
	if n := b.draft.Neighbour; n != nil {
		serial.SetText(b.draft.OtherOne)
		if n.LuminanceMax != nil {
			lmax.SetText(plain(float64(*n.LuminanceMax)))
		}
		if n.White != nil {
			u.SetText(plain(n.White.U))
			v.SetText(plain(n.White.V))
		}
		if n.OwnWhite != nil {
			ownU.SetText(plain(n.OwnWhite.U))
			ownV.SetText(plain(n.OwnWhite.V))
		}
	} else {
		serial.SetText(b.neighbourSerial())
	}
	done := func() {
		n := &criteria.Neighbour{}
		if strings.TrimSpace(lmax.Text) != "" {
			x, err := number(lmax.Text)
			if err != nil || !(x > 0 && x <= 100000) {
				b.shell.fail(fmt.Errorf("the neighbour's luminance is %q; expected more than 0 cd/m²; correct it", lmax.Text))
				return
			}
			l := cdm2(x)
			n.LuminanceMax = &l
		}
		colour := func(u, v *field) (*photometry.UV, error) {
			if strings.TrimSpace(u.Text+v.Text) == "" {
				return nil, nil
			}
			a, errU := number(u.Text)
			c, errV := number(v.Text)
			if errU != nil || errV != nil || !(a > 0 && a < .7 && c > 0 && c < .7) {
				return nil, fmt.Errorf("colour is %q, %q; expected u' and v' of CIE 1976, as 0.198 and 0.468; convert it", u.Text, v.Text)
			}
			return &photometry.UV{U: a, V: c}, nil
		}
		var err error
		if n.White, err = colour(u, v); err == nil {
			n.OwnWhite, err = colour(ownU, ownV)
		}
		if err != nil {
			b.shell.fail(err)
			return
		}
		b.draft.Neighbour, b.draft.OtherOne = n, strings.TrimSpace(serial.Text)
		if n.LuminanceMax == nil && n.White == nil {
			b.draft.Neighbour, b.draft.OtherOne = nil, ""
		}
		if b.saveHead() {
			b.shell.say("")
			b.showLevels()
		}
	}
	ok := newPress("Done", k, done)
	ok.Importance = widget.HighImportance
	for _, f := range []*field{serial, lmax, u, v, ownU, ownV} {
		f.OnSubmitted = func(string) { done() }
	}
	b.put(container.NewVScroll(container.NewVBox(
		prose("The highest level of the other screen, measured as this series was. Colours are of white, in u', v' of CIE 1976."),
		container.NewGridWithColumns(2, labelled("serial of the neighbour", serial), labelled("its highest level, cd/m²", lmax),
			labelled("its white u'", u), labelled("its white v'", v), labelled("this screen's white u'", ownU), labelled("this screen's white v'", ownV)),
		container.NewHBox(ok))))
	b.shell.focus(lmax)
}

// neighbourSerial is the other monitor of the station, where there are two.
func (b *bench) neighbourSerial() string {
	if b.monitor.StationID == nil {
		return ""
	}
	all, err := b.deps.Store.Monitors()
	if err != nil {
		b.shell.fail(err)
	}
	found := ""
	for _, m := range all {
		if m.StationID != nil && *m.StationID == *b.monitor.StationID && m.ID != b.monitor.ID && !m.Retired {
			if found != "" {
				return ""
			}
			found = m.Serial
		}
	}
	return found
}

func (b *bench) showNotes() {
	e := newField(b.shell.keys)
	e.MultiLine, e.Wrapping = true, fyne.TextWrapWord
	e.SetText(b.draft.Notes)
	ok := newPress("Keep the notes", b.shell.keys, func() {
		b.draft.Notes = e.Text
		if b.saveHead() {
			b.showLevels()
		}
	})
	ok.Importance = widget.HighImportance
	b.put(container.NewBorder(small("notes for the record (Tab is a tab here; Ctrl+L goes back without keeping them)"), container.NewHBox(ok), nil, nil, e))
	b.shell.focus(e)
}

// loadFile takes a readings file into the visit.
func (b *bench) loadFile() {
	b.shell.askPath("Load a readings file", "", "Load", false, func(path string) {
		f, err := os.Open(path)
		if err != nil {
			b.shell.fail(err)
			return
		}
		defer f.Close()
		file, err := readings.Parse(filepath.Base(path), f)
		if err == nil {
			err = b.takeFile(file)
		}
		b.shell.fail(err)
	})
}

// takeFile puts the readings of a file into a visit that has none yet.
func (b *bench) takeFile(f *readings.File) error {
	s := b.levels.series
	switch {
	case f.Metadata.Bits != b.monitor.Bits:
		return fmt.Errorf("%s: levels of %d bits, but this monitor has %d; expected the same; correct the register or the file", f.Name, f.Metadata.Bits, b.monitor.Bits)
	case f.Scale == readings.PValue:
		return fmt.Errorf("%s: levels are P-values; expected driving levels; judge this file with the command \"evenstep assess\"", f.Name)
	case f.Metadata.Serial != "" && f.Metadata.Serial != b.monitor.Serial:
		return fmt.Errorf("%s: of monitor %s, but %s is on the bench; expected the same; choose the other monitor or file", f.Name, f.Metadata.Serial, b.monitor.Serial)
	case len(s.taken) > 0:
		return fmt.Errorf("%s: this visit has readings already; expected none; drop the visit, or go on by hand", f.Name)
	}
	var plan []int
	for _, r := range f.Readings {
		if r.Role == readings.Series {
			plan = append(plan, r.Level)
		}
	}
	slices.Sort(plan)
	h := &b.draft.Head
	h.Plan = plan
	if h.Light.Kind == store.LightUnstated && f.Metadata.Ambient != nil {
		h.Light = store.Light{Kind: store.LightMeasured, Ambient: *f.Metadata.Ambient}
	}
	if f.Readings[0].Ambient != readings.Unstated {
		h.ReadingsHoldAmbient = f.Readings[0].Ambient == readings.Included
	}
	for _, r := range f.Readings {
		if r.Time.IsZero() {
			r.Time = b.deps.Now()
		}
		if err := b.add(r); err != nil {
			return err
		}
		s.taken = append(s.taken, r)
	}
	b.saveHead()
	s.forward()
	b.levels.use(s)
	b.changed()
	b.shell.say("%d readings taken from %s", len(f.Readings), f.Name)
	return nil
}
