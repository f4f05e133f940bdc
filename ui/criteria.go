package ui

import (
	"fmt"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/criteria"
	"evenstep/display/report"
)

// criteriaPage shows the published limits, one scheme and class at a time.
type criteriaPage struct {
	shell   *shell
	schemes []*criteria.Scheme
	scheme  *choice
	class   *choice
	note    *widget.Label
	table   *fyne.Container
	box     fyne.CanvasObject
	site    func() *criteria.SiteFile
}

func newCriteriaPage(site func() *criteria.SiteFile) (*criteriaPage, error) {
	all, err := criteria.Schemes()
	if err != nil {
		return nil, err
	}
	return &criteriaPage{schemes: all, site: site}, nil
}

func (p *criteriaPage) name() string      { return "Criteria" }
func (p *criteriaPage) actions() []action { return nil }

func (p *criteriaPage) content() fyne.CanvasObject {
	if p.box != nil {
		return p.box
	}
	var ids []string
	for _, s := range p.schemes {
		ids = append(ids, s.ID)
	}
	p.note = prose("")
	p.table = container.NewVBox()
	p.class = newChoice(nil, p.shell.keys, func(string) { p.fill() })
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
	foot := container.NewVBox(rule(), prose(cautions))
	p.box = container.NewBorder(top, foot, nil, nil, container.NewVScroll(p.table))
	p.scheme.SetSelectedIndex(0)
	return p.box
}

func (p *criteriaPage) entered() { p.shell.focus(p.scheme) }

func (p *criteriaPage) current() *criteria.Scheme { return p.schemes[max(0, p.scheme.SelectedIndex())] }

func (p *criteriaPage) fill() {
	s := p.current()
	used, err := s.Use(p.class.Selected, p.site())
	if err != nil {
		p.shell.fail(err)
		return
	}
	p.note.SetText(fmt.Sprintf("%s, edition %s. %s", s.Name, s.Edition, s.Note))
	p.table.RemoveAll()
	for _, l := range used.Limits {
		p.table.Add(limitRow(l))
		p.table.Add(rule())
	}
}

// limitRow is one limit: what, how much, whether it decides, and where it comes from.
func limitRow(l criteria.Limit) fyne.CanvasObject {
	f := criteria.Finding{Quantity: string(l.Quantity), Comparison: l.Comparison, Limit: l.Limit, LimitHigh: l.LimitHigh, Unit: l.Unit}
	name := canvas.NewText(report.Name(string(l.Quantity)), gray(text))
	limit := canvas.NewText(report.Limit(f), gray(text))
	limit.TextStyle.Bold = true
	how := string(l.Basis)
	if l.Formula != "" {
		how = l.Formula
	}
	decides, why := l.Deciding()
	state := "decides, " + string(l.Confidence)
	if !decides {
		state = why
	}
	source := l.Source
	if l.Section != "" {
		source += " (" + l.Section + ")"
	}
	if l.Note != "" {
		source += "; " + l.Note
	}
	detail := prose(state + ". " + source)
	detail.SizeName = theme.SizeNameCaptionText
	left := container.New(layout.NewGridLayout(3), name, limit, small(how))
	return container.NewVBox(left, detail)
}
