package ui

import (
	"fmt"
	"slices"
	"strconv"
	"strings"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/readings"
	"evenstep/display/record"
	"evenstep/display/response"
	"evenstep/display/store"
)

// Deps is what the window is given.
type Deps struct {
	Store   *store.Store
	Now     func() time.Time
	Program string // name and version, for records
	// Width and Height are the pixels of the screen; 0: not known.
	Width, Height int
}

// bench is the page on which a visit is measured.
type bench struct {
	deps   Deps
	shell  *shell
	stack  *fyne.Container
	choose *chooser

	// The visit on the bench; draft.ID is 0 while there is none.
	draft   store.Draft
	monitor store.Monitor
	meter   *store.Meter
	used    *criteria.Used
	levels  *levelsView
	charts  *charts
	band    *verdictBand
	title   *widget.Label
	setup   *widget.Label
	phases  *fyne.Container
	work    *fyne.Container
	visit   fyne.CanvasObject
}

func newBench(d Deps) *bench { return &bench{deps: d, stack: container.NewStack()} }

func (b *bench) name() string               { return "Bench" }
func (b *bench) content() fyne.CanvasObject { return b.stack }

func (b *bench) entered() {
	if b.draft.ID == 0 {
		b.showChooser()
		return
	}
	b.showVisit()
}

func (b *bench) actions() []action {
	if b.draft.ID == 0 {
		return []action{{"Choose the marked monitor", nil, "Enter", func() { b.choose.take() }}}
	}
	return []action{
		{"Levels", control(fyne.KeyL), "Ctrl+L", b.showLevels},
		{"Setup and room light", control(fyne.KeyE), "Ctrl+E", b.showSetup},
		{"Places (uniformity)", control(fyne.KeyU), "Ctrl+U", b.showPlaces},
		{"Neighbour", control(fyne.KeyP), "Ctrl+P", b.showNeighbour},
		{"Table", control(fyne.KeyT), "Ctrl+T", b.showTable},
		{"Notes", control(fyne.KeyN), "Ctrl+N", b.showNotes},
		{"Load a readings file", control(fyne.KeyO), "Ctrl+O", b.loadFile},
		{"Seal the record", control(fyne.KeyReturn), "Ctrl+Enter", b.seal},
		{"Another monitor (this visit is kept)", control(fyne.KeyM), "Ctrl+M", b.leave},
		{"Drop this visit", &desktop.CustomShortcut{KeyName: fyne.KeyDelete, Modifier: fyne.KeyModifierControl}, "Ctrl+Delete", b.drop},
	}
}

// showChooser asks which monitor.
func (b *bench) showChooser() {
	if b.choose == nil {
		b.choose = newChooser(b)
	}
	b.stack.Objects = []fyne.CanvasObject{b.choose.box}
	b.stack.Refresh()
	b.choose.load()
	b.shell.focus(b.choose.filter)
}

// start begins a visit at a monitor with what the last one there says. Where there was none the setup
// comes first.
func (b *bench) start(m store.Monitor) {
	head, earlier, known := b.headFor(m)
	d, err := b.deps.Store.StartDraft(m.ID, head, b.deps.Now())
	if err != nil {
		b.shell.fail(err)
		return
	}
	b.take(d, m, earlier)
	if !known {
		b.showSetup()
		b.shell.say("The first visit at this monitor: say who, with which meter, in which light, by which limits.")
	}
}

// headFor is the head of a new visit and the levels of the last one.
func (b *bench) headFor(m store.Monitor) (h store.Head, earlier []response.LevelReading, known bool) {
	h = store.Head{Kind: "acceptance", Scheme: m.Scheme, Class: m.Class, Plan: evenPlan(m.Bits, 18)}
	last, err := b.deps.Store.LastRecord(m.ID)
	if err != nil {
		b.shell.fail(err)
	}
	if last == nil {
		return h, nil, false
	}
	h.Kind = "constancy"
	for _, p := range last.Persons {
		if p.Part == "measured" {
			h.Person = p.ID
		}
	}
	meters, err := b.deps.Store.Meters()
	if err != nil {
		b.shell.fail(err)
	}
	for _, mt := range meters {
		if mt.Name == last.Meter.ID {
			h.MeterID = mt.ID
		}
	}
	h.Light = lightOf(last.Assessment)
	var plan []int
	for _, r := range last.Readings {
		if r.Role == string(readings.Series) {
			plan = append(plan, r.Level)
			earlier = append(earlier, response.LevelReading{Level: r.Level, Luminance: cdm2(r.Luminance)})
		}
		h.ReadingsHoldAmbient = r.AmbientIncluded
	}
	if len(plan) >= 2 && last.Assessment.Bits == m.Bits {
		slices.Sort(plan)
		h.Plan = plan
	}
	return h, earlier, true
}

// resume takes up a visit that was left.
func (b *bench) resume(d store.Draft) {
	m, err := b.deps.Store.Monitor(d.MonitorID)
	if err != nil {
		b.shell.fail(err)
		return
	}
	_, earlier, _ := b.headFor(m)
	b.take(d, m, earlier)
}

// take puts a visit on the bench.
func (b *bench) take(d store.Draft, m store.Monitor, earlier []response.LevelReading) {
	b.draft, b.monitor = d, m
	if b.levels == nil {
		b.build()
	}
	b.load()
	s := newSeries(d.Plan, b, b.deps.Now)
	s.earlier = earlier
	s.noise = response.Noise{Repeatability: response.RepeatabilityDefault, Floor: response.FloorDefault}
	if b.meter != nil {
		s.noise = b.meter.Noise()
	}
	s.ambient = b.ambientFlag()
	s.resume(append([]readings.Reading(nil), d.Readings...))
	b.levels.use(s)
	b.shell.open(b.shell.current) // the actions are others now
}

// load finds meter and limits that the head names.
func (b *bench) load() {
	b.meter, b.used = nil, nil
	meters, err := b.deps.Store.Meters()
	if err != nil {
		b.shell.fail(err)
	}
	for i := range meters {
		if meters[i].ID == b.draft.MeterID {
			b.meter = &meters[i]
		}
	}
	if b.draft.Scheme == "" {
		return
	}
	used, err := limitsOf(b.deps.Store, b.draft.Scheme, b.draft.Class)
	if err != nil {
		b.shell.fail(err)
		return
	}
	b.used = used
}

// limitsOf joins a scheme with the site's own word.
func limitsOf(st *store.Store, scheme, class string) (*criteria.Used, error) {
	s, err := criteria.Find(scheme)
	if err != nil {
		return nil, err
	}
	site, err := siteOf(st)
	if err != nil {
		return nil, err
	}
	return s.Use(class, site)
}

func siteOf(st *store.Store) (*criteria.SiteFile, error) {
	_, text, err := st.Site()
	if err != nil || text == "" {
		return nil, err
	}
	return criteria.ParseSite("the site's limits", []byte(text))
}

func (b *bench) ambientFlag() readings.Ambient {
	if b.draft.ReadingsHoldAmbient || b.draft.Light.Kind == store.LightInside {
		return readings.Included
	}
	return readings.Excluded
}

func (b *bench) build() {
	b.levels = newLevelsView(b.shell, b.changed)
	b.charts = newCharts()
	b.band = newVerdictBand()
	b.title = widget.NewLabelWithStyle("", fyne.TextAlignLeading, fyne.TextStyle{Bold: true})
	b.title.Truncation = fyne.TextTruncateEllipsis
	b.setup = widget.NewLabel("")
	b.setup.Wrapping = fyne.TextWrapWord
	b.phases = container.New(layout.NewRowWrapLayout())
	b.work = container.NewStack()
	split := container.NewHSplit(container.NewBorder(b.phases, nil, nil, nil, container.NewPadded(b.work)), container.NewPadded(b.charts.box))
	split.Offset = .58
	top := container.NewVBox(container.NewBorder(nil, nil, nil, newPress("Seal the record", b.shell.keys, b.seal), b.title), b.setup, rule())
	b.visit = container.NewBorder(top, b.band.box, nil, nil, split)
}

func (b *bench) showVisit() {
	b.stack.Objects = []fyne.CanvasObject{b.visit}
	b.stack.Refresh()
	b.showLevels()
	b.changed()
}

// work puts a phase in the work area.
func (b *bench) put(o fyne.CanvasObject) {
	b.work.Objects = []fyne.CanvasObject{o}
	b.work.Refresh()
}

func (b *bench) showLevels() {
	b.put(b.levels.box)
	b.shell.focus(b.levels.field)
}

// changed follows every change of the visit: head line, phases, plots, verdict.
func (b *bench) changed() {
	d := &b.draft
	b.title.SetText(fmt.Sprintf("%s     %s   no. %s", b.monitor.Title(), b.monitor.Model, b.monitor.Serial))
	b.setup.SetText(b.setupLine())
	s := b.levels.series
	b.phases.Objects = []fyne.CanvasObject{
		b.phase("Setup", b.setupDone(), b.showSetup), b.phase(fmt.Sprintf("Levels %d of %d", s.done(), len(s.plan)), s.done() == len(s.plan), b.showLevels),
		b.phase("Places", len(d.Places) > 0, b.showPlaces), b.phase("Neighbour", d.Neighbour != nil, b.showNeighbour), b.phase("Table", d.Table != nil, b.showTable), b.phase("Notes", d.Notes != "", b.showNotes),
	}
	b.phases.Refresh()
	d.Readings = s.taken
	r, a, err := d.Judge(b.monitor, b.meter, b.used)
	if err == nil {
		b.band.show(a, "")
		b.charts.show(a, r)
		return
	}
	if all, n, ok := s.foreseen(); ok {
		ahead := *d
		ahead.Readings = all
		if r, a, err := ahead.Judge(b.monitor, b.meter, b.used); err == nil {
			b.band.show(a, fmt.Sprintf("Looking ahead: %d levels are still as the last visit lets expect them.", n))
			b.charts.show(a, r)
			return
		}
	}
	b.band.waiting(b.waitingFor())
	b.charts.soFar(s.levels(), 1<<b.monitor.Bits-1, b.waitingFor())
}

func (b *bench) phase(label string, done bool, show func()) fyne.CanvasObject {
	sign := "○ "
	if done {
		sign = "● "
	}
	p := newPress(sign+label, b.shell.keys, show)
	p.Importance = widget.LowImportance
	return p
}

func (b *bench) setupDone() bool {
	return b.draft.Light.Kind != store.LightUnstated && b.draft.Person != "" && b.draft.MeterID != 0
}

func (b *bench) waitingFor() string {
	if b.draft.Light.Kind == store.LightUnstated {
		return "The room light is not stated: nothing is judged until it is (Ctrl+E)."
	}
	s := b.levels.series
	line := fmt.Sprintf("%d of %d levels.", s.done(), len(s.plan))
	if l, ok := s.has(0); ok {
		line += fmt.Sprintf(" Lowest level %s cd/m².", short(float64(l)))
	}
	return line + " Steps and verdict appear when the lowest and the highest level are read."
}

// setupLine says in one line what is set up.
func (b *bench) setupLine() string {
	meter := "no meter chosen"
	if b.meter != nil {
		meter = "meter " + b.meter.Name + " (" + b.meter.Kind + ")"
		if b.meter.DueOn != "" && b.meter.DueOn < b.deps.Now().Format(time.DateOnly) {
			meter += ", calibration overdue since " + b.meter.DueOn
		}
	}
	scheme := "no limits chosen"
	if b.draft.Scheme != "" {
		scheme = b.draft.Scheme + ", " + b.draft.Class
	}
	person := b.draft.Person
	if person == "" {
		person = "nobody named"
	}
	warm := b.deps.Now().Sub(b.draft.Started).Minutes()
	return fmt.Sprintf("%s visit, %s    %s    %s    %s    on the bench for %s", b.draft.Kind, person, scheme, meter, lightLine(b.draft), minutes(warm))
}

func lightLine(d store.Draft) string {
	held := "added to the readings"
	if d.ReadingsHoldAmbient {
		held = "held by the readings"
	}
	switch l := d.Light; l.Kind {
	case store.LightMeasured:
		return fmt.Sprintf("ambient %s cd/m², measured, %s", short(float64(l.Ambient)), held)
	case store.LightIlluminance:
		rd := "Rd assumed"
		if l.Rd != nil {
			rd = "Rd " + short(float64(*l.Rd))
		}
		return fmt.Sprintf("room %s lx, %s, %s", short(float64(l.Illuminance)), rd, held)
	case store.LightDark:
		return "dark room"
	case store.LightInside:
		return "ambient light held by the readings, its size not known"
	}
	return "room light not stated"
}

// add implements journal.
func (b *bench) add(r readings.Reading) error {
	if err := b.dropTable(); err != nil {
		return err
	}
	return b.deps.Store.AddReading(b.draft.ID, r)
}

// undo implements journal.
func (b *bench) undo() error {
	if err := b.dropTable(); err != nil {
		return err
	}
	return b.deps.Store.UndoReading(b.draft.ID)
}

// dropTable takes a table out of the visit that was made from other readings than there are now.
func (b *bench) dropTable() error {
	if b.draft.Table == nil {
		return nil
	}
	b.draft.Table = nil
	b.shell.say("the readings changed: make the table again (Ctrl+T)")
	return b.deps.Store.SaveHead(b.draft.ID, b.draft.Head)
}

// saveHead keeps the head and shows what follows from it.
func (b *bench) saveHead() bool {
	if err := b.deps.Store.SaveHead(b.draft.ID, b.draft.Head); err != nil {
		b.shell.fail(err)
		return false
	}
	b.load()
	if s := b.levels.series; s != nil {
		s.ambient = b.ambientFlag()
		if b.meter != nil {
			s.noise = b.meter.Noise()
		}
		if !slices.Equal(s.plan, b.draft.Plan) {
			s.plan = b.draft.Plan
			s.at = 0
			s.forward()
			b.levels.use(s)
		}
	}
	b.changed()
	return true
}

func (b *bench) seal() {
	if b.draft.ID == 0 {
		return
	}
	doc, err := b.draft.Document(b.monitor, b.meter, b.used, b.deps.Program, b.deps.Now())
	if err != nil {
		b.shell.fail(err)
		return
	}
	sealed, text, err := record.Seal(doc)
	if err != nil {
		b.shell.fail(err)
		return
	}
	if _, err := b.deps.Store.SealDraft(b.draft, sealed, text); err != nil {
		b.shell.fail(err)
		return
	}
	b.draft = store.Draft{}
	b.shell.open(b.shell.current)
	b.shell.say("Sealed: %s, %s, code %s. Records (Ctrl+3) has the report.", sealed.Monitor.Serial, sealed.Assessment.Verdict, sealed.Code())
}

func (b *bench) leave() {
	b.draft = store.Draft{}
	b.shell.open(b.shell.current)
}

func (b *bench) drop() {
	if b.draft.ID == 0 {
		return
	}
	n := len(b.levels.series.taken)
	b.shell.confirm("Drop this visit", fmt.Sprintf("%d readings will be gone for good.", n), "Drop it", func() {
		if err := b.deps.Store.DropDraft(b.draft.ID); err != nil {
			b.shell.fail(err)
			return
		}
		b.leave()
	})
}

// evenPlan is n levels in equal steps over the range of a bit depth.
func evenPlan(bits, n int) []int {
	top := 1<<bits - 1
	plan := make([]int, n)
	for i := range plan {
		plan[i] = (2*top*i + n - 1) / (2 * (n - 1)) // rounded half up
	}
	return plan
}

// planOf reads a list of levels as it is typed.
func planOf(text string, bits int) ([]int, error) {
	top := 1<<bits - 1
	var plan []int
	for _, w := range strings.FieldsFunc(text, func(r rune) bool { return r == ' ' || r == ',' || r == ';' || r == '\t' || r == '\n' }) {
		n, err := strconv.Atoi(w)
		if err != nil || n < 0 || n > top {
			return nil, fmt.Errorf("level %q; expected whole numbers from 0 to %d; correct the list", w, top)
		}
		if slices.Contains(plan, n) {
			return nil, fmt.Errorf("level %d stands twice; expected each once; remove one", n)
		}
		plan = append(plan, n)
	}
	slices.Sort(plan)
	if len(plan) < 2 || plan[0] != 0 || plan[len(plan)-1] != top {
		return nil, fmt.Errorf("%d levels; expected at least 0 and %d among them; add them", len(plan), top)
	}
	return plan, nil
}
