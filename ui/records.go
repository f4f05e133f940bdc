package ui

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/record"
	"evenstep/display/report"
	"evenstep/display/response"
	"evenstep/display/store"
)

// recordsPage finds, opens, compares and hands over sealed records.
type recordsPage struct {
	deps   Deps
	shell  *shell
	filter *field
	count  *canvas.Text
	list   *rows
	detail *fyne.Container
	box    fyne.CanvasObject
	shown  []store.Entry
	marked int
	other  int64 // record to compare with; 0: none
}

// mostShown is how many records the list holds; the filter narrows what is beyond.
const mostShown = 500

func newRecordsPage(d Deps) *recordsPage { return &recordsPage{deps: d} }

func (p *recordsPage) name() string { return "Records" }

func (p *recordsPage) content() fyne.CanvasObject {
	if p.box == nil {
		p.build()
	}
	return p.box
}

func (p *recordsPage) entered() {
	p.find()
	p.shell.focus(p.filter)
}

func (p *recordsPage) actions() []action {
	return []action{
		{"Open the marked record", nil, "Enter", p.open},
		{"Mark as the earlier one", control(fyne.KeyB), "Ctrl+B", p.markOther},
		{"Compare with it", control(fyne.KeyK), "Ctrl+K", p.compare},
		{"PDF", control(fyne.KeyS), "Ctrl+S", func() { p.export("pdf") }},
		{"CSV", control(fyne.KeyT), "Ctrl+T", func() { p.export("csv") }},
		{"JSON", control(fyne.KeyJ), "Ctrl+J", func() { p.export("json") }},
		{"Other limits", control(fyne.KeyG), "Ctrl+G", p.rejudge},
		{"Whole register by other limits", control(fyne.KeyW), "Ctrl+W", p.rejudgeAll},
	}
}

func (p *recordsPage) build() {
	p.filter = newField(p.keys)
	p.filter.SetPlaceHolder("serial, room, person, verdict, 2026-11 …")
	p.filter.OnChanged = func(string) { p.find() }
	p.filter.OnSubmitted = func(string) { p.open() }
	p.count = small("")
	p.list = newRows(func() int { return len(p.shown) }, listRow, p.row, p.shell.keys)
	p.list.open = func(i int) { p.marked = i; p.open() }
	p.list.OnSelected = func(i widget.ListItemID) { p.marked = i; p.list.Refresh(); p.open() }
	p.detail = container.NewStack(prose("Enter opens a record."))
	left := container.NewBorder(container.NewVBox(heading("Sealed records"), p.filter, p.count), actionBar(p.shell.keys, p.actions()[1:]), nil, nil, p.list)
	split := container.NewHSplit(left, container.NewPadded(p.detail))
	split.Offset = .38
	p.box = split
}

func (p *recordsPage) row(i int, o fyne.CanvasObject) {
	e := p.shown[i]
	title := day(e.Time)[:10] + "   " + e.Serial
	if e.ID == p.other {
		title = "(earlier) " + title
	}
	detail := e.Monitor + "   " + e.Kind + "   " + e.Person
	if e.MaxDeviation != nil {
		detail += fmt.Sprintf("   greatest deviation %.1f %%", 100**e.MaxDeviation)
	}
	setRow(o, i == p.marked, title, detail, e.Verdict)
}

// day is the local day and time of a record.
func day(at string) string {
	t, err := time.Parse(time.RFC3339, at)
	if err != nil {
		return at + "          " // ten characters at least, as a day has
	}
	return t.Local().Format("2006-01-02 15:04")
}

func (p *recordsPage) keys(e *fyne.KeyEvent) bool {
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

func (p *recordsPage) find() {
	q := store.Search{Words: p.filter.Text, Limit: mostShown}
	var err error
	if p.shown, err = p.deps.Store.Records(q); err != nil {
		p.shell.fail(err)
	}
	n, err := p.deps.Store.CountRecords(q)
	if err != nil {
		p.shell.fail(err)
	}
	p.marked = 0
	p.count.Text = fmt.Sprintf("%d records", n)
	switch {
	case n > mostShown:
		p.count.Text += fmt.Sprintf(", the latest %d shown; type to narrow", mostShown)
	case n == 0 && p.filter.Text == "":
		p.count.Text = "no records yet: the bench seals them (Ctrl+1)"
	}
	p.count.Refresh()
	p.list.Refresh()
}

func (p *recordsPage) current() (store.Entry, bool) {
	if p.marked < 0 || p.marked >= len(p.shown) {
		return store.Entry{}, false
	}
	return p.shown[p.marked], true
}

// load reads and verifies the marked record.
func (p *recordsPage) load() (*record.Record, []byte, bool) {
	e, ok := p.current()
	if !ok {
		return nil, nil, false
	}
	r, text, err := p.deps.Store.Record(e.ID)
	if err != nil {
		p.shell.fail(err)
		p.put(prose(err.Error()))
		return nil, nil, false
	}
	return r, text, true
}

func (p *recordsPage) put(o fyne.CanvasObject) {
	p.detail.Objects = []fyne.CanvasObject{o}
	p.detail.Refresh()
}

func (p *recordsPage) open() {
	r, _, ok := p.load()
	if !ok {
		return
	}
	v, err := r.Measured()
	if err != nil {
		p.shell.fail(err)
		return
	}
	p.put(recordView(r, r.Assessment, v.Response, ""))
}

// recordView shows an assessment of a record: its own, or one by other limits.
func recordView(r *record.Record, a criteria.Assessment, resp *response.Response, note string) fyne.CanvasObject {
	verdict := stateText(a.Verdict)
	verdict.TextSize = 20
	top := container.NewVBox(
		container.NewBorder(nil, nil, nil, centred(verdict), headline(r.Monitor.Serial+"   "+day(r.Visit.Time))),
		prose(fmt.Sprintf("%s   %s   code %s", r.Monitor.Name, schemeLine(a), r.Code())))
	if note != "" {
		top.Add(prose(note))
	}
	table := container.NewHBox()
	if len(a.Findings) > 0 {
		var columns [4]*fyne.Container
		for i, h := range []string{"verdict", "quantity", "value (95 % interval)", "limit"} {
			columns[i] = container.NewVBox(small(h))
			table.Add(columns[i])
			table.Add(space(10, 1))
		}
		for _, f := range a.Findings {
			value := report.Value(f)
			_, unit, _ := strings.Cut(value, " ")
			value += "  (" + strings.TrimSpace(strings.TrimSuffix(report.Interval(f), unit)) + ")"
			for i, cell := range []*canvas.Text{stateText(f.Verdict), plainText(report.Quantity(f)), plainText(value), plainText(report.Limit(f))} {
				columns[i].Add(cell)
			}
		}
	}
	body := container.NewVBox(table)
	for _, c := range a.Causes {
		body.Add(prose("Looks like " + join(c.Causes, ", or ") + ": " + c.Evidence + "; " + c.Advice + "."))
	}
	if a.Scheme != "" {
		body.Add(prose(report.RoomLight(a.IlluminanceRange)))
	}
	for _, n := range a.NotAssessed {
		name, formula, _ := strings.Cut(n.Quantity, " (")
		if formula != "" {
			formula = " (" + formula
		}
		body.Add(caption("not assessed: " + report.Name(name) + formula + ": " + n.Reason))
	}
	plots := newCharts()
	plots.show(a, resp)
	both := container.NewGridWithColumns(2, plots.response, plots.deviation)
	return container.NewBorder(top, nil, nil, nil, container.NewVSplit(container.NewScroll(body), both))
}

func plainText(s string) *canvas.Text { return canvas.NewText(s, gray(text)) }

func schemeLine(a criteria.Assessment) string {
	if a.Scheme == "" {
		return "no scheme was asked for, so nothing was judged"
	}
	return fmt.Sprintf("%s, edition %s, class %s", a.Scheme, a.Edition, a.Class)
}

func (p *recordsPage) markOther() {
	if e, ok := p.current(); ok {
		p.other = e.ID
		p.list.Refresh()
		p.shell.say("%s of %s is the earlier one: mark another and press Ctrl+K", e.Serial, day(e.Time))
	}
}

func (p *recordsPage) compare() {
	e, ok := p.current()
	if !ok {
		return
	}
	if p.other == 0 || p.other == e.ID {
		p.shell.say("mark the earlier record with Ctrl+B first, then the later one")
		return
	}
	a, _, errA := p.deps.Store.Record(p.other)
	b, _, errB := p.deps.Store.Record(e.ID)
	if err := errors.Join(errA, errB); err != nil {
		p.shell.fail(err)
		return
	}
	if a.Visit.Time > b.Visit.Time {
		a, b = b, a
	}
	va, errA := a.Measured()
	vb, errB := b.Measured()
	if err := errors.Join(errA, errB); err != nil {
		p.shell.fail(err)
		return
	}
	table := container.New(layout.NewGridLayout(4))
	for _, h := range []string{"", day(a.Visit.Time), day(b.Visit.Time), "changed by more than the uncertainty"} {
		table.Add(small(h))
	}
	n := 0
	for _, c := range response.Compare(va.Response, vb.Response) {
		say := "○ no"
		if c.Beyond {
			say = "▲ yes"
			n++
		}
		table.Add(canvas.NewText(c.What, gray(text)))
		table.Add(canvas.NewText(figure(c.Before.Value, c.Unit), gray(text)))
		table.Add(canvas.NewText(figure(c.After.Value, c.Unit), gray(text)))
		table.Add(canvas.NewText(say, gray(text)))
	}
	plot := newChartView(fyne.NewSize(220, 120))
	plot.show(report.CompareChart(a.Assessment, b.Assessment, va.Response.Points, vb.Response.Points))
	title := headline(a.Monitor.Serial)
	if a.Monitor.Serial != b.Monitor.Serial {
		title = headline(a.Monitor.Serial + " and " + b.Monitor.Serial)
	}
	p.put(container.NewBorder(container.NewVBox(title, small(fmt.Sprintf("%d figures changed by more than the uncertainty", n))), nil, nil, nil,
		container.NewVSplit(container.NewScroll(table), plot)))
}

// figure writes a compared value with its unit.
func figure(v float64, unit string) string {
	switch unit {
	case "%":
		return fmt.Sprintf("%.1f %%", 100*v)
	case "1":
		return short(v)
	}
	return short(v) + " cd/m²"
}

// export writes the marked record beside the register, or where the person says.
func (p *recordsPage) export(kind string) {
	r, text, ok := p.load()
	if !ok {
		return
	}
	name := fmt.Sprintf("%s %s.%s", safeName(r.Monitor.Serial), strings.NewReplacer(":", "", "T", " ").Replace(strings.TrimSuffix(r.Visit.Time, "Z")), kind)
	p.shell.askPath("Write the "+strings.ToUpper(kind), filepath.Join(papersFolder(), name), "Write", true, func(path string) {
		if err := writePaper(path, kind, r, text); err != nil {
			p.shell.fail(err)
			return
		}
		p.shell.say("written: %s", path)
	})
}

// writePaper writes one form of a record to a file, whole or not at all.
func writePaper(path, kind string, r *record.Record, sealed []byte) error {
	var b bytes.Buffer
	var err error
	switch kind {
	case "pdf":
		err = report.PDF(&b, r, report.Options{Paper: paperHere(os.Getenv)})
	case "csv":
		err = report.CSV(&b, r)
	default:
		b.Write(sealed)
	}
	if err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	return record.WriteFile(path, b.Bytes(), true)
}

// paperHere is the paper that the country of the locale prints on.
func paperHere(getenv func(string) string) report.Paper {
	locale := ""
	for _, k := range []string{"LC_ALL", "LC_PAPER", "LANG"} {
		if locale = getenv(k); locale != "" {
			break
		}
	}
	for _, c := range []string{"_US", "_CA", "_MX", "_PH", "_CL", "_CO", "_VE"} { // countries that print on Letter (from memory)
		if strings.Contains(locale, c) {
			return report.Letter
		}
	}
	return report.A4
}

// safeName leaves out what a file name cannot hold.
func safeName(s string) string {
	s = strings.Map(func(r rune) rune {
		if strings.ContainsRune(`/\:*?"<>|`, r) || r < ' ' {
			return '-'
		}
		return r
	}, s)
	if s == "" || s == "." || s == ".." {
		return "monitor"
	}
	return s
}

// askLimits asks for a scheme and a class.
func (p *recordsPage) askLimits(title string, then func(*criteria.Used)) {
	all, err := criteria.Schemes()
	if err != nil {
		p.shell.fail(err)
		return
	}
	var ids []string
	for _, s := range all {
		ids = append(ids, s.ID)
	}
	class := newChoice(nil, p.shell.keys, nil)
	scheme := newChoice(ids, p.shell.keys, nil)
	scheme.OnChanged = func(string) {
		var classes []string
		for _, c := range all[scheme.SelectedIndex()].Classes {
			classes = append(classes, c.ID)
		}
		class.SetOptions(classes)
		class.SetSelectedIndex(0)
	}
	scheme.SetSelectedIndex(0)
	judge := newPress("Judge", p.shell.keys, func() {
		p.shell.closeDialog()
		used, err := limitsOf(p.deps.Store, scheme.Selected, class.Selected)
		if err != nil {
			p.shell.fail(err)
			return
		}
		then(used)
	})
	judge.Importance = widget.HighImportance
	leave := newPress("Leave it", p.shell.keys, p.shell.closeDialog)
	p.shell.ask(title, container.NewVBox(labelled("scheme", scheme), labelled("class", class), container.NewHBox(judge, leave)), 460, scheme)
}

func (p *recordsPage) rejudge() {
	r, _, ok := p.load()
	if !ok {
		return
	}
	p.askLimits("Judge this record by other limits", func(used *criteria.Used) {
		v, err := r.Measured()
		if err != nil {
			p.shell.fail(err)
			return
		}
		p.put(recordView(r, criteria.Assess(v, used), v.Response, "Judged again by other limits. The record itself is untouched and says: "+string(r.Assessment.Verdict)+"."))
	})
}

// rejudgeAll judges every record again, with progress, and can be stopped.
func (p *recordsPage) rejudgeAll() {
	p.askLimits("Judge every record by other limits", func(used *criteria.Used) {
		ctx, cancel := context.WithCancel(context.Background())
		bar := widget.NewProgressBar()
		stop := newPress("Stop", p.shell.keys, cancel)
		result := prose("")
		p.put(container.NewVBox(heading("Judging the whole register by "+used.ID+", "+used.Class), bar, container.NewHBox(stop), result))
		p.shell.focus(stop)
		began := time.Now()
		go func() {
			tally := map[criteria.Verdict]int{}
			changed, broken, n := 0, 0, 0
			err := p.deps.Store.Rejudge(ctx, used, func(r store.Rejudged) {
				n++
				switch {
				case r.Err != nil:
					broken++
				default:
					tally[r.After]++
					if r.After != r.Before {
						changed++
					}
				}
			}, func(done, all int) {
				fyne.Do(func() { bar.SetValue(float64(done) / float64(all)) })
			})
			fyne.Do(func() {
				cancel()
				stop.Disable()
				line := fmt.Sprintf("%d records in %s.", n, time.Since(began).Round(100*time.Millisecond))
				for _, v := range []criteria.Verdict{criteria.Meets, criteria.MeetsUncertainly, criteria.FailsUncertainly, criteria.Fails, criteria.NotAssessed} {
					line += fmt.Sprintf("\n%s %s: %d", report.Sign(v), v, tally[v])
				}
				line += fmt.Sprintf("\n%d come to another verdict than their own limits gave.", changed)
				if broken > 0 {
					line += fmt.Sprintf("\n▲ %d could not be read: verify the register.", broken)
				}
				if errors.Is(err, context.Canceled) {
					line = "Stopped. " + line
				} else if err != nil {
					p.shell.fail(err)
				}
				result.SetText(line + "\nNo record was changed.")
			})
		}()
	})
}
