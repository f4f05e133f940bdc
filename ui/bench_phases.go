package ui

import (
	"fmt"
	"slices"
	"strings"

	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/record"
	"evenstep/display/store"
)

// The plans offered in words.
const (
	planEighteen = "18 even levels"
	planEleven   = "11 even levels"
	planOwn      = "own list"
)

// lightKinds are the ways to state the room light, as they are offered.
var lightKinds = []string{string(store.LightMeasured), string(store.LightIlluminance), string(store.LightDark), string(store.LightInside)}

// showSetup is the phase in which a visit says who, with what, in which light, by which limits.
func (b *bench) showSetup() {
	d := &b.draft
	k := b.shell.keys
	note := func(err error) { b.shell.fail(err) }

	meters, err := b.deps.Store.Meters()
	note(err)
	persons, err := b.deps.Store.Persons()
	note(err)
	var meterNames, personIDs []string
	for _, m := range meters {
		meterNames = append(meterNames, m.Name)
	}
	for _, p := range persons {
		personIDs = append(personIDs, p.ID)
	}

	kind := newChoice(record.Kinds(), k, nil)
	kind.SetSelected(d.Kind)
	person, reviewer := newField(k), newField(k)
	for _, f := range []*field{person, reviewer} {
		f.SetPlaceHolder(strings.Join(personIDs, ", "))
	}
	person.SetText(d.Person)
	reviewer.SetText(d.Reviewer)
	meter := newChoice(meterNames, k, nil)
	if b.meter != nil {
		meter.SetSelected(b.meter.Name)
	}
	holds := newTick("the meter sees the room light with the screen's", k)
	holds.SetChecked(d.ReadingsHoldAmbient)
	meter.OnChanged = func(string) {
		if i := meter.SelectedIndex(); i >= 0 {
			holds.SetChecked(meters[i].Kind == store.Distance)
		}
	}

	all, err := criteria.Schemes()
	note(err)
	ids := []string{""}
	for _, s := range all {
		ids = append(ids, s.ID)
	}
	class := newChoice(nil, k, nil)
	scheme := newChoice(ids, k, nil)
	scheme.OnChanged = func(id string) {
		var classes []string
		for _, s := range all {
			if s.ID == id {
				for _, c := range s.Classes {
					classes = append(classes, c.ID)
				}
			}
		}
		class.SetOptions(classes)
		if !slices.Contains(classes, class.Selected) {
			class.ClearSelected()
			if len(classes) > 0 {
				class.SetSelectedIndex(0)
			}
		}
	}
	scheme.SetSelected(d.Scheme)
	class.SetSelected(d.Class)

	own := newField(k)
	own.SetText(strings.Trim(fmt.Sprint(d.Plan), "[]"))
	plan := newChoice([]string{planEighteen, planEleven, planOwn}, k, func(p string) {
		switch p {
		case planEighteen:
			own.SetText(strings.Trim(fmt.Sprint(evenPlan(b.monitor.Bits, 18)), "[]"))
		case planEleven:
			own.SetText(strings.Trim(fmt.Sprint(evenPlan(b.monitor.Bits, 11)), "[]"))
		}
	})

	switch {
	case slices.Equal(d.Plan, evenPlan(b.monitor.Bits, 18)):
		plan.SetSelected(planEighteen)
	case slices.Equal(d.Plan, evenPlan(b.monitor.Bits, 11)):
		plan.SetSelected(planEleven)
	default:
		plan.SetSelected(planOwn)
	}

	ambient, lux, rd := newField(k), newField(k), newField(k)
	ambient.SetPlaceHolder("cd/m², display off")
	lux.SetPlaceHolder("lx on the screen")
	rd.SetPlaceHolder("cd/m² per lx, empty: assumed")
	if d.Light.Kind == store.LightMeasured {
		ambient.SetText(plain(float64(d.Light.Ambient)))
	}
	if d.Light.Illuminance > 0 {
		lux.SetText(plain(float64(d.Light.Illuminance)))
	}
	switch {
	case d.Light.Rd != nil:
		rd.SetText(plain(float64(*d.Light.Rd)))
	case b.monitor.Rd != nil:
		rd.SetText(plain(float64(*b.monitor.Rd)))
	}
	light := newChoice(lightKinds, k, func(s string) {
		toggle := func(f *field, on bool) {
			if on {
				f.Enable()
			} else {
				f.Disable()
			}
		}
		toggle(ambient, s == string(store.LightMeasured))
		toggle(lux, s == string(store.LightIlluminance) || s == string(store.LightMeasured))
		toggle(rd, s == string(store.LightIlluminance))
	})
	light.SetSelected(string(d.Light.Kind))

	done := func() {
		h := d.Head
		h.Kind, h.Person, h.Reviewer = kind.Selected, strings.TrimSpace(person.Text), strings.TrimSpace(reviewer.Text)
		h.Scheme, h.Class = scheme.Selected, class.Selected
		h.MeterID = 0
		if i := meter.SelectedIndex(); i >= 0 {
			h.MeterID = meters[i].ID
		}
		h.ReadingsHoldAmbient = holds.Checked
		p, err := planOf(own.Text, b.monitor.Bits)
		if err != nil {
			note(err)
			b.shell.focus(own)
			return
		}
		h.Plan = p
		l, at, err := readLight(light.Selected, ambient, lux, rd)
		if err != nil {
			note(err)
			b.shell.focus(at)
			return
		}
		h.Light = l
		d.Head = h
		if b.saveHead() {
			b.shell.say("")
			b.showLevels()
		}
	}
	ok := newPress("Done, read the levels", k, done)
	ok.Importance = widget.HighImportance
	for _, f := range []*field{person, reviewer, own, ambient, lux, rd} {
		f.OnSubmitted = func(string) { done() }
	}
	form := container.New(layout.NewGridLayout(2),
		labelled("kind of visit", kind), labelled("plan", plan),
		labelled("measured by (id)", person), labelled("reviewed by (id)", reviewer),
		labelled("scheme", scheme), labelled("class", class),
		labelled("meter", meter), labelled("", holds),
		labelled("room light stated by", light), labelled("ambient luminance", ambient),
		labelled("illuminance", lux), labelled("Rd", rd),
	)
	b.put(container.NewVScroll(container.NewVBox(form, labelled("levels", own), container.NewHBox(ok))))
	b.shell.focus(light)
}

// readLight reads the room light from its fields; at is the field at fault.
func readLight(kind string, ambient, lux, rd *field) (l store.Light, at *field, err error) {
	l.Kind = store.LightKind(kind)
	figure := func(f *field, what string, most float64, unit string) (float64, error) {
		v, err := number(f.Text)
		if err == nil && (v < 0 || v > most) {
			err = fmt.Errorf("%s is %v; expected 0 to %v %s; check the figure and its unit", what, v, most, unit)
		}
		if err != nil {
			at = f
		}
		return v, err
	}
	var v float64
	switch l.Kind {
	case store.LightMeasured:
		if v, err = figure(ambient, "the ambient luminance", 1000, "cd/m²"); err != nil {
			return l, at, err
		}
		l.Ambient = cdm2(v)
		if strings.TrimSpace(lux.Text) != "" {
			if v, err = figure(lux, "the illuminance", 100000, "lx"); err != nil {
				return l, at, err
			}
			l.Illuminance = photometry.Lux(v)
		}
	case store.LightIlluminance:
		if v, err = figure(lux, "the illuminance", 100000, "lx"); err != nil {
			return l, at, err
		}
		l.Illuminance = photometry.Lux(v)
		if strings.TrimSpace(rd.Text) != "" {
			if v, err = figure(rd, "Rd", 1, "cd/m² per lx"); err != nil {
				return l, at, err
			}
			r := photometry.PerLux(v)
			l.Rd = &r
		}
	}
	return l, nil, nil
}

// plain writes a figure so that it can be typed on.
func plain(v float64) string { return fmt.Sprintf("%g", v) }
