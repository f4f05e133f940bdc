package ui

import (
	"image"
	"image/color"
	"image/draw"
	"math"
	"sync"

	"golang.org/x/image/font"
	"golang.org/x/image/font/gofont/gobold"
	"golang.org/x/image/font/gofont/gomono"
	"golang.org/x/image/font/gofont/goregular"
	"golang.org/x/image/font/opentype"
	"golang.org/x/image/math/fixed"
	"golang.org/x/image/vector"

	"evenstep/display/report"
)

// picture draws charts into an image of the window's grays: what is black on paper is light here.
type picture struct {
	img   *image.RGBA
	scale float64 // pixels a unit
	pen   vector.Rasterizer
	path  [][]corner // closed outlines that are filled together
}

// corner is a place in pixels.
type corner struct{ x, y float64 }

var _ report.Painter = (*picture)(nil)

func newPicture(w, h int, scale float64) *picture {
	p := &picture{img: image.NewRGBA(image.Rect(0, 0, w, h)), scale: scale}
	draw.Draw(p.img, p.img.Bounds(), image.NewUniform(gray(ground)), image.Point{}, draw.Src)
	return p
}

// ink turns an ink for paper into one for the dark window.
func ink(g report.Gray) color.Color {
	return gray(uint8(math.Round(text - float64(g)*(text-ground))))
}

// fill fills the outlines gathered in path. Only the pixels around them are touched: the rasterizer works
// through all that it is given, and most shapes of a chart are small.
func (p *picture) fill(g report.Gray) {
	x0, y0, x1, y1 := math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)
	for _, outline := range p.path {
		for _, c := range outline {
			x0, y0, x1, y1 = min(x0, c.x), min(y0, c.y), max(x1, c.x), max(y1, c.y)
		}
	}
	if !(x0 <= x1 && y0 <= y1) || math.IsInf(x1-x0, 0) || math.IsInf(y1-y0, 0) {
		p.path = p.path[:0]
		return
	}
	edge := func(v float64) int { return int(min(max(v, -1e6), 1e6)) }
	box := image.Rect(edge(math.Floor(x0)), edge(math.Floor(y0)), edge(math.Ceil(x1))+1, edge(math.Ceil(y1))+1).Intersect(p.img.Bounds())
	if !box.Empty() {
		p.pen.Reset(box.Dx(), box.Dy())
		p.pen.DrawOp = draw.Over
		left, top := float64(box.Min.X), float64(box.Min.Y)
		for _, outline := range p.path {
			for i, c := range outline {
				x, y := float32(c.x-left), float32(c.y-top)
				if i == 0 {
					p.pen.MoveTo(x, y)
				} else {
					p.pen.LineTo(x, y)
				}
			}
			p.pen.ClosePath()
		}
		p.pen.Draw(p.img, box, image.NewUniform(ink(g)), image.Point{})
	}
	p.path = p.path[:0]
}

// Polygon implements report.Painter.
func (p *picture) Polygon(at []report.XY, g report.Gray) {
	outline := make([]corner, len(at))
	for i, a := range at {
		outline[i] = corner{a.X * p.scale, a.Y * p.scale}
	}
	p.path = append(p.path, outline)
	p.fill(g)
}

// Polyline implements report.Painter.
func (p *picture) Polyline(at []report.XY, s report.Stroke) {
	width := max(1, s.Width*p.scale)
	for i := 1; i < len(at); i++ {
		a, b := at[i-1], at[i]
		if s.Dash <= 0 {
			p.segment(a, b, width)
			continue
		}
		length := math.Hypot(b.X-a.X, b.Y-a.Y)
		for d := 0.0; d < length; d += 2 * s.Dash {
			from, to := d/length, min(1, (d+s.Dash)/length)
			p.segment(between(a, b, from), between(a, b, to), width)
		}
	}
	p.fill(s.Gray)
}

func between(a, b report.XY, t float64) report.XY {
	return report.XY{X: a.X + (b.X-a.X)*t, Y: a.Y + (b.Y-a.Y)*t}
}

// segment adds a straight stroke, width pixels wide. Level and upright ones are set on whole pixels,
// so that they stay sharp.
func (p *picture) segment(a, b report.XY, width float64) {
	ax, ay, bx, by := a.X*p.scale, a.Y*p.scale, b.X*p.scale, b.Y*p.scale
	snap := func(v float64) float64 { return math.Round(v-width/2) + width/2 }
	width = max(1, math.Round(width*2)/2)
	switch {
	case ax == bx:
		ax = snap(ax)
		bx = ax
	case ay == by:
		ay = snap(ay)
		by = ay
	}
	length := math.Hypot(bx-ax, by-ay)
	if length == 0 {
		return
	}
	nx, ny := -(by-ay)/length*width/2, (bx-ax)/length*width/2
	p.path = append(p.path, []corner{{ax + nx, ay + ny}, {ax - nx, ay - ny}, {bx - nx, by - ny}, {bx + nx, by + ny}})
}

// Text implements report.Painter.
func (p *picture) Text(at report.XY, s string, t report.Type) {
	face := faceOf(t.Face, t.Size*p.scale)
	if face == nil {
		return
	}
	x := at.X * p.scale
	switch w := float64(font.MeasureString(face, s)) / 64; t.Align {
	case report.Centre:
		x -= w / 2
	case report.Right:
		x -= w
	}
	d := font.Drawer{Dst: p.img, Src: image.NewUniform(ink(t.Gray)), Face: face}
	d.Dot = fixed.Point26_6{X: fixed.Int26_6(math.Round(x * 64)), Y: fixed.Int26_6(math.Round(at.Y*p.scale)) * 64}
	d.DrawString(s)
}

// TextWidth implements report.Painter.
func (p *picture) TextWidth(s string, t report.Type) float64 {
	face := faceOf(t.Face, t.Size*p.scale)
	if face == nil {
		return 0
	}
	return float64(font.MeasureString(face, s)) / 64 / p.scale
}

// faces holds the typefaces by size in half pixels. The window draws from one goroutine at a time, but
// a picture for a file may be drawn from another.
var faces struct {
	sync.Mutex
	fonts map[report.Face]*opentype.Font
	sized map[faceSize]font.Face
}

type faceSize struct {
	face report.Face
	half int
}

func faceOf(f report.Face, pixels float64) font.Face {
	faces.Lock()
	defer faces.Unlock()
	key := faceSize{f, int(math.Round(pixels * 2))}
	if face, ok := faces.sized[key]; ok {
		return face
	}
	if faces.fonts == nil {
		faces.fonts = map[report.Face]*opentype.Font{}
		faces.sized = map[faceSize]font.Face{}
		for f, data := range map[report.Face][]byte{report.Regular: goregular.TTF, report.Bold: gobold.TTF, report.Mono: gomono.TTF} {
			if parsed, err := opentype.Parse(data); err == nil {
				faces.fonts[f] = parsed
			}
		}
	}
	parsed := faces.fonts[f]
	if parsed == nil {
		return nil // the fonts are part of the program: a test holds that they parse
	}
	face, err := opentype.NewFace(parsed, &opentype.FaceOptions{Size: float64(key.half) / 2, DPI: 72, Hinting: font.HintingVertical})
	if err != nil {
		return nil
	}
	faces.sized[key] = face
	return face
}
