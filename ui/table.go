package ui

import (
	"fmt"
	"path/filepath"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/calibrate"
	"evenstep/display/photometry"
	"evenstep/display/record"
	"evenstep/display/report"
)

// madeTable is a table with what it was made of.
type madeTable struct {
	curve      *calibrate.Curve
	result     calibrate.Result
	prediction *calibrate.Prediction
}

// showTable is the phase in which a table is made from the readings.
func (b *bench) showTable() {
	k := b.shell.keys
	in, out := newChoice([]string{"8", "10", "12"}, k, nil), newChoice([]string{"8", "10", "12", "16"}, k, nil)
	in.SetSelected("8")
	out.SetSelected("10")
	low, high, ratio := newField(k), newField(k), newField(k)
	for _, f := range []*field{low, high, ratio} {
		f.SetPlaceHolder("as measured")
	}
	result := container.NewStack(prose("The table follows from the readings of this visit. It is a prediction: load it, measure again and judge."))
	put := func(o fyne.CanvasObject) {
		result.Objects = []fyne.CanvasObject{o}
		result.Refresh()
	}
	var maker *press
	run := func() {
		aim, err := aimOf(low, high, ratio)
		if err != nil {
			b.shell.fail(err)
			return
		}
		inBits, _ := strconv.Atoi(in.Selected)
		outBits, _ := strconv.Atoi(out.Selected)
		input, err := b.draft.Input(b.monitor, b.meter)
		if err != nil {
			b.shell.fail(err)
			return
		}
		maker.Disable()
		visit := b.draft.ID
		go func() { // the fit of a long series takes a while
			m, err := makeTable(calibrate.Input{Bits: input.Bits, Scale: input.Scale, Readings: input.Readings, Light: input.Light, Noise: input.Noise}, aim, inBits, outBits)
			fyne.Do(func() {
				maker.Enable()
				switch {
				case err != nil:
					b.shell.fail(err)
					put(prose(err.Error()))
				case b.draft.ID == visit: // else another visit has come to the bench meanwhile
					b.draft.Table = m.forRecord()
					b.saveHead()
					put(b.tableView(m))
				}
			})
		}()
	}
	maker = newPress("Make the table", k, run)
	maker.Importance = widget.HighImportance
	for _, f := range []*field{low, high, ratio} {
		f.OnSubmitted = func(string) { run() }
	}
	form := container.NewGridWithColumns(5, labelled("P-values, bits", in), labelled("levels, bits", out),
		labelled("lowest, cd/m²", low), labelled("highest, cd/m²", high), labelled("ratio", ratio))
	b.put(container.NewBorder(container.NewVBox(form, container.NewHBox(maker)), nil, nil, nil, result))
	b.shell.focus(maker)
}

// aimOf reads the aim; empty fields are as measured.
func aimOf(low, high, ratio *field) (calibrate.Aim, error) {
	var a calibrate.Aim
	for _, f := range []struct {
		from *field
		what string
		into **photometry.CdM2
	}{{low, "the lowest luminance", &a.Min}, {high, "the highest luminance", &a.Max}} {
		v, err := figureOf(f.from, f.what)
		if err != nil {
			return a, err
		}
		*f.into = (*photometry.CdM2)(v)
	}
	var err error
	a.Ratio, err = figureOf(ratio, "the ratio")
	return a, err
}

func makeTable(in calibrate.Input, aim calibrate.Aim, inBits, outBits int) (*madeTable, error) {
	curve, err := calibrate.NewCurve(in)
	if err != nil {
		return nil, err
	}
	res, err := curve.Table(aim, inBits, outBits)
	if err != nil {
		return nil, err
	}
	p, err := curve.Predict(res.Table, calibrate.Path{})
	if err != nil {
		return nil, err
	}
	return &madeTable{curve, res, p}, nil
}

func (m *madeTable) warnings() []calibrate.Warning {
	return append(append([]calibrate.Warning(nil), m.curve.Warnings...), m.result.Warnings...)
}

// forRecord is the table as a record keeps it.
func (m *madeTable) forRecord() *record.Table {
	t := &record.Table{
		InBits: m.result.Table.InBits, OutBits: m.result.Table.OutBits, AimMin: float64(m.result.Range.Min), AimMax: float64(m.result.Range.Max),
		MaxDeviation: m.prediction.Greatest, Entries: make([]int, len(m.result.Table.Entries)),
	}
	for i, e := range m.result.Table.Entries {
		t.Entries[i] = int(e)
	}
	for _, w := range m.warnings() {
		t.Warnings = append(t.Warnings, w.Text)
	}
	return t
}

// tableView shows the curve with its band, what the table will do, and what to mind.
func (b *bench) tableView(m *madeTable) fyne.CanvasObject {
	var lines []string
	for _, l := range calibrate.Words(m.result, m.prediction) {
		text := l.Text
		if l.Label != "" {
			text = l.Label + ": " + text
		}
		lines = append(lines, text)
	}
	for _, w := range m.warnings() {
		lines = append(lines, "▲ "+w.Text)
	}
	plot := newChartView(fyne.NewSize(220, 120))
	plot.show(curveChart(m.curve))
	save := newPress("Save the table", b.shell.keys, func() { b.saveTable(m) })
	return container.NewBorder(nil, container.NewHBox(save), nil, nil, container.NewVSplit(container.NewVScroll(caption(strings.Join(lines, "\n"))), plot))
}

// curveChart is the curve of the panel with its 95 % band, and the readings.
func curveChart(c *calibrate.Curve) report.Chart {
	var line []report.CurvePoint
	const pieces = 64
	for i := range pieces + 1 {
		d := calibrate.Drive(float64(i) / pieces)
		band := c.Band(d)
		line = append(line, report.CurvePoint{Drive: float64(d), Luminance: float64(band.Luminance), Low: float64(band.Low), High: float64(band.High)})
	}
	var points []report.CurvePoint
	top := float64(int(1)<<c.Bits - 1)
	for _, p := range c.Points {
		points = append(points, report.CurvePoint{Drive: float64(p.Level) / top, Luminance: float64(p.Luminance)})
	}
	return report.CurveChart(line, points)
}

func (b *bench) saveTable(m *madeTable) {
	name := fmt.Sprintf("%s table %s.json", safeName(b.monitor.Serial), b.deps.Now().Format("2006-01-02"))
	origin := calibrate.Provenance{
		Monitor: b.monitor.Title(), Serial: b.monitor.Serial, Date: b.deps.Now(), ReadingsSHA256: b.draft.ReadingsSHA256(), Program: b.deps.Program,
	}
	b.shell.askPath("Save the table (.json, .csv, or a profile: .icc, .icm)", filepath.Join(papersFolder(), name), "Save", true, func(path string) {
		text, err := calibrate.Encode(path, m.curve, m.result, origin)
		if err == nil {
			err = record.WriteFile(path, text, true)
		}
		if err != nil {
			b.shell.fail(err)
			return
		}
		b.shell.say("saved: %s", path)
	})
}
