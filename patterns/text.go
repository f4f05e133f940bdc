package patterns

import (
	"fmt"
	"image"
	"sync"
	"unicode/utf8"

	"golang.org/x/image/font"
	"golang.org/x/image/font/gofont/goregular"
	"golang.org/x/image/font/opentype"
	"golang.org/x/image/math/fixed"
)

// textSizes are the heights of type that the sheets use, in pixels per em. A short list keeps the glyphs few
// enough to be made once and kept.
var textSizes = [...]int{10, 12, 14, 16, 20, 24, 28, 32, 40, 48, 64, 80, 96, 128, 160}

// Latin-1 is kept as it stands; these are the further signs that labels of measurements use.
var furtherSigns = [...]rune{'−', '≤', '≥', '≈', 'Δ', 'Ω', 'µ', '…', '→'}

const (
	firstSign    = 0x20 // the space
	latinSigns   = 0x100 - firstSign
	missingSign  = 0xffff // no character, so that no font has it
	glyphCount   = latinSigns + len(furtherSigns) + 1
	missingGlyph = glyphCount - 1
)

// typeface is the glyphs of one size as runs of set pixels: no gray edges, so that a letter is drawn in one
// exact level.
type typeface struct {
	ascent, height int // pixels above the base line, and from line to line
	glyphs         [glyphCount]glyph
	runs           []run
}

type glyph struct {
	advance     int
	first, last int // runs[first:last]
}

type run struct{ y, from, to int16 } // a row relative to the base line, and columns relative to the pen

var (
	faces    [len(textSizes)]func() (*typeface, error)
	fontFile = sync.OnceValues(func() (*opentype.Font, error) { return opentype.Parse(goregular.TTF) })
)

func init() {
	for i, size := range textSizes {
		faces[i] = sync.OnceValues(func() (*typeface, error) { return newTypeface(size) })
	}
}

func newTypeface(size int) (*typeface, error) {
	file, err := fontFile()
	if err != nil {
		return nil, fmt.Errorf("font: %w; expected the one built in; build the program anew", err)
	}
	// At 72 dots per inch a point is a pixel.
	face, err := opentype.NewFace(file, &opentype.FaceOptions{Size: float64(size), DPI: 72, Hinting: font.HintingFull})
	if err != nil {
		return nil, fmt.Errorf("font at %d pixels: %w; expected the one built in; build the program anew", size, err)
	}
	defer face.Close()
	m := face.Metrics()
	t := &typeface{ascent: m.Ascent.Ceil(), height: (m.Ascent + m.Descent).Ceil()}
	for i := range latinSigns {
		t.add(face, i, rune(firstSign+i))
	}
	for i, r := range furtherSigns {
		t.add(face, latinSigns+i, r)
	}
	t.add(face, missingGlyph, missingSign)
	return t, nil
}

// hollow adds the runs of an empty frame, to stand for a sign that the font lacks, and says how far on the
// next sign begins.
func (t *typeface) hollow() int {
	height := int16(t.ascent * 3 / 4)
	width := max(height/2, 3)
	for y := -height; y < 0; y++ {
		if y == -height || y == -1 {
			t.runs = append(t.runs, run{y, 1, 1 + width})
			continue
		}
		t.runs = append(t.runs, run{y, 1, 2}, run{y, width, 1 + width})
	}
	return int(width) + 2
}

// add thresholds one glyph. Where half a pixel or more is covered it is set; small type would lose its hair
// lines by that, so there a third is enough.
func (t *typeface) add(face font.Face, i int, r rune) {
	const half, third, smallAscent = 0x80, 0x58, 12
	threshold := uint8(half)
	if t.ascent <= smallAscent {
		threshold = third
	}
	first := len(t.runs)
	box, mask, at, advance, ok := face.Glyph(fixed.Point26_6{}, r)
	alpha, isAlpha := mask.(*image.Alpha)
	switch {
	case !ok:
		advance = fixed.I(t.hollow())
	case isAlpha:
		for y := range box.Dy() {
			from := -1
			for x := range box.Dx() + 1 {
				set := x < box.Dx() && alpha.AlphaAt(at.X+x, at.Y+y).A >= threshold
				switch {
				case set && from < 0:
					from = x
				case !set && from >= 0:
					t.runs = append(t.runs, run{
						int16(box.Min.Y + y), int16(box.Min.X + from), int16(box.Min.X + x),
					})
					from = -1
				}
			}
		}
	}
	t.glyphs[i] = glyph{advance.Round(), first, len(t.runs)}
}

func (t *typeface) glyph(r rune) *glyph {
	switch {
	case r >= firstSign && r < firstSign+latinSigns:
		return &t.glyphs[r-firstSign]
	default:
		for i, f := range furtherSigns {
			if f == r {
				return &t.glyphs[latinSigns+i]
			}
		}
		return &t.glyphs[missingGlyph]
	}
}

func (t *typeface) width(s []byte) int {
	w := 0
	for len(s) > 0 {
		r, n := utf8.DecodeRune(s)
		w += t.glyph(r).advance
		s = s[n:]
	}
	return w
}

// face is the type of the greatest listed size that is at most px, or the smallest there is. It is nil, and
// the canvas holds the reason, when the font cannot be read.
func (c *canvas) face(px int) *typeface {
	i := 0
	for i+1 < len(textSizes) && textSizes[i+1] <= px {
		i++
	}
	t, err := faces[i]()
	if err != nil {
		c.err = err
		return &typeface{height: px}
	}
	return t
}

// labelSize is the usual size of labels, in pixels, for the size of the plane.
func (c *canvas) labelSize() int { return c.short / 48 }

// write sets s with its base line at y, beginning at column x.
func (c *canvas) write(t *typeface, x, y int, s []byte, v uint16) {
	for len(s) > 0 {
		r, n := utf8.DecodeRune(s)
		s = s[n:]
		g := t.glyph(r)
		for _, k := range t.runs[g.first:g.last] {
			row := y + int(k.y)
			from, to := max(x+int(k.from), 0), min(x+int(k.to), c.Width)
			if row < 0 || row >= c.Height || from >= to {
				continue
			}
			set := c.Row(row)[from:to]
			for i := range set { // too short for fillRun to gain anything
				set[i] = v
			}
		}
		x += g.advance
	}
}

// label writes s in the middle of r, no larger than px and never wider than r: first in smaller type, then
// cut short.
func (c *canvas) label(r image.Rectangle, px int, s []byte, v uint16) {
	t := c.face(px)
	for i := len(textSizes) - 1; i >= 0 && (t.width(s) > r.Dx() || t.height > r.Dy()); i-- {
		if textSizes[i] < px {
			t = c.face(textSizes[i])
		}
	}
	for len(s) > 0 && t.width(s) > r.Dx() {
		_, n := utf8.DecodeLastRune(s)
		s = s[:len(s)-n]
	}
	x := r.Min.X + (r.Dx()-t.width(s))/2
	c.write(t, x, r.Min.Y+(r.Dy()-t.height)/2+t.ascent, s, v)
}
