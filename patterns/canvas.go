package patterns

import (
	"image"
	"strconv"
)

// canvas is a plane with what the drawing functions need at hand. Nothing in it is allocated anew for a
// sheet, so that a moving sheet can be drawn picture after picture.
type canvas struct {
	*Plane
	spec  *Spec
	max   int      // highest level, as an int to calculate with
	short int      // the shorter side, pixels: marks and labels are sized by it
	steps [16]Step // room for a sheet's own steps
	sizes [16]int  // room for a sheet's own sizes
	words [48]byte // room for a label
	err   error    // the fonts could not be read
}

// frac is the level num/den of the way up, rounded half up.
func (c *canvas) frac(num, den int) uint16 { return uint16((2*c.max*num + den) / (2 * den)) }

// field and surround are the levels asked for, or the sheet's own.
func (c *canvas) field(own uint16) uint16    { return or(c.spec.Field, own) }
func (c *canvas) surround(own uint16) uint16 { return or(c.spec.Surround, own) }

func or(given *uint16, own uint16) uint16 {
	if given != nil {
		return *given
	}
	return own
}

// ink is a level that can be read on bg without glare: num/den of the whole range away from it, at most
// half of it.
func (c *canvas) ink(bg uint16, num, den int) uint16 {
	d := c.frac(num, den)
	if int(bg) <= c.max/2 {
		return bg + d
	}
	return bg - d
}

// bounds is the whole plane.
func (c *canvas) bounds() image.Rectangle { return image.Rect(0, 0, c.Width, c.Height) }

// cell is the cell in column i of cols and row j of rows of an even division of r. Cells lie edge to edge
// and differ by one pixel at most.
func cell(r image.Rectangle, i, cols, j, rows int) image.Rectangle {
	return image.Rect(
		r.Min.X+r.Dx()*i/cols, r.Min.Y+r.Dy()*j/rows,
		r.Min.X+r.Dx()*(i+1)/cols, r.Min.Y+r.Dy()*(j+1)/rows)
}

// number is v in digits, good until the next call.
func (c *canvas) number(v int) []byte { return appendInt(c.words[:0], v) }

func appendInt(b []byte, v int) []byte { return strconv.AppendInt(b, int64(v), 10) }

// stepLabel is what to write beside a step, good until the next call.
func (c *canvas) stepLabel(s *Step) []byte {
	if s.Label != "" {
		return append(c.words[:0], s.Label...)
	}
	return appendInt(append(c.number(int(s.Low)), " to "...), int(s.High))
}

// middle is the box of the given size in the middle of r.
func middle(r image.Rectangle, w, h int) image.Rectangle {
	x, y := r.Min.X+(r.Dx()-w)/2, r.Min.Y+(r.Dy()-h)/2
	return image.Rect(x, y, x+w, y+h)
}
