package ui

import (
	"fmt"
	"strconv"
	"strings"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/report"
)

// criteriaPage shows the published limits, one scheme and class at a time, and takes the site's word on
// them.
type criteriaPage struct {
	deps    Deps
	shell   *shell
	schemes []*criteria.Scheme
	scheme  *choice
	class   *choice
	note    *widget.Label
	list    *rows
	detail  *fyne.Container
	box     fyne.CanvasObject
	shown   []criteria.Limit
	marked  int
}

func newCriteriaPage(d Deps) (*criteriaPage, error) {
	all, err := criteria.Schemes()
	if err != nil {
		return nil, err
	}
	return &criteriaPage{deps: d, schemes: all}, nil
}

func (p *criteriaPage) name() string { return "Criteria" }

func (p *criteriaPage) actions() []action {
	return []action{
		{"Open the marked limit", nil, "Enter", p.open},
		{"Confirm the marked limit", control(fyne.KeyK), "Ctrl+K", p.confirm},
		{"Put the site's own limit in its place", control(fyne.KeyO), "Ctrl+O", p.override},
	}
}

func (p *criteriaPage) content() fyne.CanvasObject {
	if p.box != nil {
		return p.box
	}
	var ids []string
	for _, s := range p.schemes {
		ids = append(ids, s.ID)
	}
	p.note = caption("")
	p.detail = container.NewStack()
	p.list = newRows(func() int { return len(p.shown) }, listRow, p.row, p.shell.keys)
	p.list.OnHighlighted = func(i widget.ListItemID) { p.list.marked, p.marked = i, i; p.open() }
	p.list.OnSelected = func(i widget.ListItemID) { p.marked = i; p.list.Refresh(); p.open() }
	p.class = newChoice(nil, p.shell.keys, func(string) { p.marked = 0; p.fill() })
	p.scheme = newChoice(ids, p.shell.keys, func(string) {
		var classes []string
		for _, c := range p.current().Classes {
			classes = append(classes, c.ID)
		}
		p.class.SetOptions(classes)
		p.class.SetSelectedIndex(0)
	})
	top := container.NewVBox(
		heading("Limits by scheme, with their source and how well each is known"),
		container.NewGridWithColumns(2, labelled("scheme", p.scheme), labelled("class", p.class)),
		p.note,
	)
	split := container.NewHSplit(p.list, container.NewPadded(container.NewVScroll(p.detail)))
	split.Offset = .5
	p.box = container.NewBorder(top, container.NewVBox(rule(), caption(strings.ReplaceAll(cautions, "\n", " "))), nil, nil, split)
	p.scheme.SetSelectedIndex(0)
	return p.box
}

func (p *criteriaPage) entered() {
	p.fill()
	p.shell.focus(p.scheme)
}

func (p *criteriaPage) current() *criteria.Scheme { return p.schemes[max(0, p.scheme.SelectedIndex())] }

func (p *criteriaPage) fill() {
	s := p.current()
	if p.class.Selected == "" {
		return
	}
	used, err := limitsOf(p.deps.Store, s.ID, p.class.Selected)
	if err != nil {
		p.shell.fail(err)
		return
	}
	p.note.SetText(fmt.Sprintf("%s, edition %s. %s", s.Name, s.Edition, s.Note))
	p.shown = used.Limits
	p.marked = min(p.marked, max(0, len(p.shown)-1))
	p.list.Refresh()
	p.open()
}

func limitText(l criteria.Limit) string {
	f := criteria.Finding{Quantity: string(l.Quantity), Comparison: l.Comparison, Limit: l.Limit, LimitHigh: l.LimitHigh, Unit: l.Unit}
	return report.Name(string(l.Quantity)) + "   " + report.Limit(f)
}

// stand says in a few words what a limit may do.
func stand(l criteria.Limit) string {
	decides, why := l.Deciding()
	switch {
	case l.Override != nil:
		return "decides, the site's own"
	case l.Confirmed != nil && decides:
		return "decides, confirmed by the site"
	case decides:
		return "decides, " + string(l.Confidence)
	}
	why, _, _ = strings.Cut(why, ":")
	return why
}

func (p *criteriaPage) row(i int, o fyne.CanvasObject) {
	l := p.shown[i]
	detail := stand(l)
	for _, more := range []string{l.Formula, string(l.Basis)} {
		if more != "" {
			detail += "   " + more
		}
	}
	setRow(o, i == p.marked, limitText(l), detail, "")
}

func (p *criteriaPage) limit() (criteria.Limit, bool) {
	if p.marked < 0 || p.marked >= len(p.shown) {
		return criteria.Limit{}, false
	}
	return p.shown[p.marked], true
}

func (p *criteriaPage) put(os ...fyne.CanvasObject) {
	p.detail.Objects = []fyne.CanvasObject{container.NewVBox(os...)}
	p.detail.Refresh()
}

func (p *criteriaPage) open() {
	l, ok := p.limit()
	if !ok {
		p.put(prose("This class has no limits."))
		return
	}
	decides, why := l.Deciding()
	if decides {
		why = "It decides."
	} else {
		why = "It does not decide: " + why + "."
	}
	os := []fyne.CanvasObject{headline(limitText(l)), prose(why), prose("How it is known: " + report.Confidence(string(l.Confidence)) + ".\nSource: " + l.Source + ".")}
	for _, line := range []struct{ label, text string }{{"Section", l.Section}, {"Formula", l.Formula}, {"Luminance meant", string(l.Basis)}, {"Note", l.Note}} {
		if line.text != "" {
			os = append(os, prose(line.label+": "+line.text))
		}
	}
	if c := l.Confirmed; c != nil {
		os = append(os, prose(fmt.Sprintf("Confirmed in %s, page %s, by %s on %s.", c.Document, c.Page, c.Person, c.Date)))
	}
	if o := l.Override; o != nil {
		os = append(os, prose(fmt.Sprintf("In place of the scheme's %s %v, by %s on %s: %s.", o.Comparison, o.Limit, o.Name, o.Date, o.Reason)))
	}
	buttons := container.NewHBox()
	if l.Override == nil && l.Confirmed == nil && l.Advisory == "" && (l.Confidence == criteria.Weak || l.Confidence == criteria.FromMemory) {
		buttons.Add(newPress("Confirm it: we have read it in the document", p.shell.keys, p.confirm))
	}
	if l.Override == nil && l.Formula != criteria.OpenFormula {
		buttons.Add(newPress("Put our own limit in its place", p.shell.keys, p.override))
	}
	p.put(append(os, buttons)...)
}

// confirm takes the site's word that a limit stands in the document as it stands here.
func (p *criteriaPage) confirm() {
	l, ok := p.limit()
	if !ok {
		return
	}
	if l.Override != nil || l.Confirmed != nil || l.Advisory != "" || (l.Confidence != criteria.Weak && l.Confidence != criteria.FromMemory) {
		p.shell.say("there is nothing to confirm here: %s", stand(l))
		return
	}
	k := p.shell.keys
	document, page, person := newField(k), newField(k), newField(k)
	done := func() {
		p.word(criteria.Word{
			Quantity: l.Quantity, Formula: l.Formula, Limit: l.Limit, LimitHigh: nil,
			Document: strings.TrimSpace(document.Text), Page: strings.TrimSpace(page.Text), Person: strings.TrimSpace(person.Text),
		})
	}
	p.ask(l, "What was read, and by whom. It goes into every record that the limit decides.", done,
		named{"document and edition", document}, named{"page", page}, named{"person (id)", person})
}

// override puts the site's own limit in the place of the scheme's.
func (p *criteriaPage) override() {
	l, ok := p.limit()
	if !ok {
		return
	}
	k := p.shell.keys
	own, high, reason, name := newField(k), newField(k), newField(k), newField(k)
	own.SetText(strconv.FormatFloat(l.Limit, 'g', -1, 64))
	fields := []named{{"limit, in " + unitWord(l), own}}
	if l.LimitHigh != nil {
		high.SetText(strconv.FormatFloat(*l.LimitHigh, 'g', -1, 64))
		fields = append(fields, named{"upper end", high})
	}
	fields = append(fields, named{"reason", reason}, named{"person (id)", name})
	p.ask(l, "The site's own limit decides in place of the scheme's, and every record says so.", func() {
		v, err := number(own.Text)
		if err != nil {
			p.shell.fail(err)
			return
		}
		w := criteria.Word{Quantity: l.Quantity, Formula: l.Formula, Limit: v, Reason: strings.TrimSpace(reason.Text), Name: strings.TrimSpace(name.Text)}
		if l.LimitHigh != nil {
			h, err := number(high.Text)
			if err != nil {
				p.shell.fail(err)
				return
			}
			w.LimitHigh = &h
		}
		if w.Reason == "" || w.Name == "" {
			p.shell.fail(fmt.Errorf("reason or person is missing; expected both; say why and who"))
			return
		}
		p.word(w)
	}, fields...)
}

func unitWord(l criteria.Limit) string {
	if l.Unit == "1" {
		return "fractions, as 0.1 for 10 %"
	}
	return l.Unit
}

type named struct {
	label string
	field *field
}

func (p *criteriaPage) ask(l criteria.Limit, text string, done func(), fields ...named) {
	grid := container.New(layout.NewGridLayout(1))
	for _, f := range fields {
		f.field.OnSubmitted = func(string) { done() }
		grid.Add(labelled(f.label, f.field))
	}
	keep := newPress("Keep", p.shell.keys, done)
	keep.Importance = widget.HighImportance
	p.put(headline(limitText(l)), prose(text), grid, container.NewHBox(keep, newPress("Leave it", p.shell.keys, p.open)))
	p.shell.focus(fields[0].field)
}

// word keeps the site's word on the marked limit.
func (p *criteriaPage) word(w criteria.Word) {
	w.Scheme, w.Class, w.Date = p.current().ID, p.class.Selected, p.deps.Now()
	site, limits, err := p.deps.Store.Site()
	if err != nil {
		p.shell.fail(err)
		return
	}
	if strings.TrimSpace(site) == "" {
		site = "this site"
	}
	out, err := criteria.AddWord("the site's limits", []byte(limits), site, w)
	if err != nil {
		p.shell.fail(err)
		return
	}
	name, _, err := p.deps.Store.Site()
	if err == nil {
		err = p.deps.Store.SaveSite(name, string(out))
	}
	if err != nil {
		p.shell.fail(err)
		return
	}
	p.fill()
	p.shell.focus(p.scheme)
	p.shell.say("kept on %s", w.Date.Format(time.DateOnly))
}
