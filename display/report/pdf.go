package report

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"time"

	"codeberg.org/go-pdf/fpdf"

	"evenstep/display/record"
)

// Paper is a paper size.
type Paper string

// The paper sizes.
const (
	A4     Paper = "A4"
	Letter Paper = "Letter"
)

var papers = map[Paper]paper{
	A4:     {595.28, 841.89},
	Letter: {612, 792},
}

// Options says how a PDF is made. The zero value is A4.
type Options struct {
	Paper Paper
}

// PDF writes the record as PDF (1.3: every reader opens it) with its fonts embedded and its charts as vectors. The usual
// record takes one or two pages; type and charts grow smaller, to a floor, before a third is begun,
// and the first page then says so. The same record gives the same bytes: no clock is read, and the
// dates of the document are those of the visit. Nothing is written where it fails.
func PDF(w io.Writer, r *record.Record, o Options) error {
	if r == nil {
		return errors.New("report: there is no record; expected one; assess a visit first")
	}
	if o.Paper == "" {
		o.Paper = A4
	}
	paper, ok := papers[o.Paper]
	if !ok {
		return fmt.Errorf("report: paper is %q; expected %s or %s; choose one", o.Paper, A4, Letter)
	}
	at, err := time.Parse(time.RFC3339, r.Visit.Time)
	if err != nil {
		return fmt.Errorf("report: time of the visit is %q; expected RFC 3339, as 2024-05-17T09:30:00Z; correct the record: %w", r.Visit.Time, err)
	}
	s, err := fit(r, at, paper)
	if err != nil {
		return err
	}
	return write(w, s, r, at.UTC())
}

// fit lays the record out: on one page where that needs no small type, else as loosely as it can be
// on two, else on as many as it needs.
func fit(r *record.Record, at time.Time, p paper) (*sheet, error) {
	m, err := newRuler()
	if err != nil {
		return nil, err
	}
	compose := func(t tight, a arrangement) *sheet {
		s := &sheet{ruler: m, tight: t, paper: p, arrangement: a}
		newBody(r, at).compose(s)
		return s
	}
	const (
		usual      = 2
		highEnough = 150.0 // points; flatter charts as wide as the page show less than two side by side
		onePage    = 4     // so many kinds of setting are tried for one page
	)
	for _, t := range tightness[:onePage] {
		if s := compose(t, arrangement{}); len(s.pages) == 1 {
			return s.grown(compose), nil
		}
	}
	for _, t := range tightness {
		for _, a := range []arrangement{{parted: true, stacked: t.chart >= highEnough}, {parted: true}, {}} {
			if s := compose(t, a); len(s.pages) <= usual {
				return s.grown(compose), nil
			}
		}
	}
	last := compose(tightness[len(tightness)-1], arrangement{told: true})
	for _, t := range tightness {
		if s := compose(t, arrangement{told: true}); len(s.pages) <= len(last.pages) {
			return s.grown(compose), nil
		}
	}
	return last, nil
}

// grown gives the room that is left on the page of the charts to the charts.
func (s *sheet) grown(compose func(tight, arrangement) *sheet) *sheet {
	const tallest = 230.0 // points; taller charts show no more
	if s.charted != len(s.pages) || s.chart >= tallest {
		return s
	}
	t, room := s.tight, s.slack
	if s.stacked {
		room /= 2
	}
	t.chart = min(tallest, t.chart+room)
	if g := compose(t, s.arrangement); len(g.pages) == len(s.pages) {
		return g
	}
	return s
}

// write replays the laid-out pages into a PDF.
func write(w io.Writer, s *sheet, r *record.Record, at time.Time) error {
	pdf := fpdf.NewCustom(&fpdf.InitType{
		UnitStr: "pt",
		Size:    fpdf.SizeType{Wd: s.paper.width, Ht: s.paper.height},
	})
	pdf.SetCatalogSort(true) // with the two dates: byte for byte the same
	pdf.SetCreationDate(at)
	pdf.SetModificationDate(at)
	property := func(text string) string {
		const most = 120.0 // ems; readers show one line
		return shorten(s, s.printable(text, Regular), Type{Size: 1}, most)
	}
	pdf.SetProducer(property(r.Program), true)
	pdf.SetCreator(property(r.Program), true)
	pdf.SetTitle(property(title+" "+r.Monitor.Serial), true)
	pdf.SetLang("en")
	pdf.SetMargins(0, 0, 0)
	pdf.SetAutoPageBreak(false, 0)
	names := map[Face]string{Regular: "go", Bold: "gobold", Mono: "gomono"}
	for _, face := range []Face{Regular, Bold, Mono} {
		// A copy: fpdf writes into the bytes while it cuts the font down to the glyphs that are used.
		pdf.AddUTF8FontFromBytes(names[face], "", bytes.Clone(typefaces[face]))
	}
	for _, p := range s.pages {
		pdf.AddPage()
		pdf.SetLineCapStyle("butt")
		pdf.SetLineJoinStyle("miter")
		for _, o := range p.ops {
			draw(pdf, o, names)
		}
	}
	if err := pdf.Error(); err != nil {
		return fmt.Errorf("report: PDF: %w", err)
	}
	if err := pdf.Output(w); err != nil {
		return fmt.Errorf("report: PDF: %w", err)
	}
	return nil
}

func draw(pdf *fpdf.Fpdf, o op, names map[Face]string) {
	path := func(at []XY) {
		pdf.MoveTo(at[0].X, at[0].Y)
		for _, p := range at[1:] {
			pdf.LineTo(p.X, p.Y)
		}
	}
	switch {
	case len(o.line) > 1:
		level := o.stroke.Gray.level()
		pdf.SetDrawColor(level, level, level)
		pdf.SetLineWidth(o.stroke.Width)
		if o.stroke.Dash > 0 {
			pdf.SetDashPattern([]float64{o.stroke.Dash, o.stroke.Dash}, 0)
		} else {
			pdf.SetDashPattern([]float64{}, 0)
		}
		path(o.line)
		pdf.DrawPath("D")
	case len(o.area) > 2:
		level := o.fill.level()
		pdf.SetFillColor(level, level, level)
		path(o.area)
		pdf.DrawPath("F")
	case o.text != "":
		level := o.set.Gray.level()
		pdf.SetTextColor(level, level, level)
		pdf.SetFont(names[o.set.Face], "", o.set.Size)
		pdf.Text(o.at.X, o.at.Y, o.text)
	}
}

// level is the ink as an 8-bit level.
func (g Gray) level() int { return int(255*float64(g) + 0.5) }
