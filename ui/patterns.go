package ui

import (
	"crypto/rand"
	"fmt"
	"image"
	"path/filepath"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"
	"golang.org/x/image/draw"

	"evenstep/display/criteria"
	"evenstep/display/record"
	"evenstep/display/sheet"
	"evenstep/patterns"
)

// patternsPage shows the test patterns, what to look for on each, and writes them to files.
type patternsPage struct {
	deps    Deps
	shell   *shell
	all     []patterns.Info
	list    *rows
	size    *field
	bits    *choice
	picture *canvas.Image
	words   *widget.Label
	title   *widget.Label
	box     fyne.CanvasObject
	marked  int
	small   map[string]image.Image // thumbnails that are drawn already
}

func newPatternsPage(d Deps) *patternsPage {
	return &patternsPage{deps: d, all: patterns.List(), small: map[string]image.Image{}}
}

func (p *patternsPage) name() string { return "Patterns" }

func (p *patternsPage) actions() []action {
	return []action{
		{"Save as PNG, TIFF or DICOM", control(fyne.KeyS), "Ctrl+S", p.save},
	}
}

func (p *patternsPage) content() fyne.CanvasObject {
	if p.box != nil {
		return p.box
	}
	p.list = newRows(func() int { return len(p.all) }, listRow, func(i int, o fyne.CanvasObject) {
		setRow(o, i == p.marked, p.all[i].Name, p.all[i].Purpose, criteria.Verdict(""))
	}, p.shell.keys)
	p.list.OnHighlighted = func(i widget.ListItemID) { p.list.marked = i; p.show(i) }
	p.list.OnSelected = func(i widget.ListItemID) { p.show(i) }
	p.size = newField(p.shell.keys)
	width, height := p.deps.Width, p.deps.Height
	if width < 800 || height < 600 {
		width, height = 1600, 1200
	}
	p.size.SetText(fmt.Sprintf("%dx%d", width, height))
	p.size.OnSubmitted = func(string) { p.save() }
	p.bits = newChoice([]string{"8", "10", "12", "16"}, p.shell.keys, nil)
	p.bits.SetSelected("8")
	p.picture = canvas.NewImageFromImage(image.NewGray(image.Rect(0, 0, 1, 1)))
	p.picture.FillMode = canvas.ImageFillContain
	p.picture.SetMinSize(fyne.NewSize(200, 150))
	p.words, p.title = prose(""), headline("")
	form := container.NewGridWithColumns(2, labelled("size, the monitor's native pixels", p.size), labelled("bits", p.bits))
	right := container.NewBorder(
		container.NewVBox(p.title, p.words), container.NewVBox(form, actionBar(p.shell.keys, p.actions())), nil, nil, container.NewPadded(p.picture))
	split := container.NewHSplit(container.NewBorder(heading("Patterns by purpose"), nil, nil, nil, p.list), container.NewPadded(right))
	split.Offset = .36
	p.box = split
	return p.box
}

func (p *patternsPage) entered() {
	p.show(p.marked)
	p.shell.focus(p.list)
}

// show puts a pattern's words and its picture beside the list.
func (p *patternsPage) show(i int) {
	p.marked = i
	info := p.all[i]
	p.title.SetText(info.Name)
	p.words.SetText(info.Purpose + ".\n" + info.Look + "\nServes " + info.Serves + ".")
	p.list.Refresh()
	thumb, ok := p.small[info.Name]
	if !ok {
		var err error
		if thumb, err = thumbnail(info); err != nil {
			p.shell.fail(err)
			return
		}
		p.small[info.Name] = thumb
	}
	p.picture.Image = thumb
	p.picture.Refresh()
}

// thumbnail draws a pattern small: at the least size that it is laid out for, then scaled. It shows what the
// pattern looks like and serves for no judgement.
func thumbnail(info patterns.Info) (image.Image, error) {
	s := patterns.Spec{Width: 800, Height: 600, Bits: 8}
	var img image.Image
	if info.Colour {
		rgb, err := patterns.DrawRGB(info.Name, s)
		if err != nil {
			return nil, err
		}
		img = rgb.Image()
	} else {
		plane, err := patterns.Draw(info.Name, s)
		if err != nil {
			return nil, err
		}
		img = plane.Image()
	}
	out := image.NewRGBA(image.Rect(0, 0, 800, 600)) // the toolkit draws no other kind without a copy
	draw.Draw(out, out.Bounds(), img, image.Point{}, draw.Src)
	return out, nil
}

func (p *patternsPage) save() {
	info := p.all[p.marked]
	w, h, ok := strings.Cut(strings.ToLower(strings.TrimSpace(p.size.Text)), "x")
	width, errW := strconv.Atoi(strings.TrimSpace(w))
	height, errH := strconv.Atoi(strings.TrimSpace(h))
	bits, errB := strconv.Atoi(p.bits.Selected)
	if !ok || errW != nil || errH != nil || errB != nil {
		p.shell.fail(fmt.Errorf("size is %q; expected pixels as 1536x2048; give the native size of the monitor", p.size.Text))
		p.shell.focus(p.size)
		return
	}
	name := fmt.Sprintf("%s %dx%d %d bit.png", info.Name, width, height, bits)
	p.shell.askPath("Save the pattern (.png, .tif or .dcm)", filepath.Join(papersFolder(), name), "Save", true, func(path string) {
		spec := patterns.Spec{Width: width, Height: height, Bits: bits}
		b, err := sheet.Encode(path, info.Name, spec, p.deps.Program, p.deps.Now(), rand.Reader)
		if err == nil {
			err = record.WriteFile(path, b, true)
		}
		if err != nil {
			p.shell.fail(err)
			return
		}
		p.shell.say("saved: %s", path)
	})
}
