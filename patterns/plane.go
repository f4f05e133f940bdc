// Package patterns draws the test sheets that a person looks at, or holds a meter to, when a reading-room
// monitor is checked: exact integer gray levels, 8 to 16 bits deep, at any size from 800x600 to 8192x4320
// and upright too. Every sheet serves one purpose and is laid out anew for the size asked for, so that
// nothing is ever scaled and no level is ever blended with its neighbour.
//
// The package knows no monitor, no light and no GSDF: whoever calls it decides which levels matter (steps of
// a given number of JNDs, say) and hands them over with their labels. A level is a driving level: 0 is the
// darkest, 2^Bits-1 the brightest.
//
// The sheets are synthetic test objects of this project. They stand in for no published test image.
package patterns

import "image"

// Plane is a picture of gray levels, one sample per pixel, row by row from the top left.
type Plane struct {
	Width, Height int      // pixels
	Bits          int      // depth, 8 to 16
	Pix           []uint16 // levels 0 to Max, Width*Height of them
}

// Max is the highest level of the depth, 2^Bits-1.
func (p *Plane) Max() uint16 { return uint16(1<<p.Bits - 1) }

// Level is the level at column x and row y, both counted from 0 at the top left. Outside the plane it
// panics, as an index into a slice does.
func (p *Plane) Level(x, y int) uint16 { return p.Row(y)[x] }

// Row is row y of the plane itself, not a copy of it.
func (p *Plane) Row(y int) []uint16 {
	return p.Pix[y*p.Width : (y+1)*p.Width : (y+1)*p.Width]
}

// Fill sets every pixel to the level v.
func (p *Plane) Fill(v uint16) { fillRun(p.Pix, v) }

// RGB is a colour picture: one plane of levels per channel, all of the same size and depth. For a gray sheet
// the three are the same plane.
type RGB struct {
	R, G, B *Plane
}

// fillRun sets all of run to v. Doubling copies are several times faster than a loop over the samples.
func fillRun(run []uint16, v uint16) {
	if len(run) == 0 {
		return
	}
	const seed = 64
	n := min(seed, len(run))
	for i := range run[:n] {
		run[i] = v
	}
	for n < len(run) {
		n += copy(run[n:], run[:n])
	}
}

// clip cuts r to the plane.
func (p *Plane) clip(r image.Rectangle) image.Rectangle {
	return r.Intersect(image.Rect(0, 0, p.Width, p.Height))
}

// rect fills r, as far as it lies on the plane, with the level v.
func (p *Plane) rect(r image.Rectangle, v uint16) {
	r = p.clip(r)
	if r.Empty() {
		return
	}
	fillRun(p.Row(r.Min.Y)[r.Min.X:r.Max.X], v)
	p.repeat(r, 1)
}

// repeat copies the first n rows of r down to its end, over and over.
func (p *Plane) repeat(r image.Rectangle, n int) {
	r = p.clip(r)
	for y := r.Min.Y + n; y < r.Max.Y; y++ {
		copy(p.Row(y)[r.Min.X:r.Max.X], p.Row(y - n)[r.Min.X:r.Max.X])
	}
}

// frame draws the outline of r, width pixels wide, on the inside of r.
func (p *Plane) frame(r image.Rectangle, width int, v uint16) {
	p.rect(image.Rect(r.Min.X, r.Min.Y, r.Max.X, r.Min.Y+width), v)
	p.rect(image.Rect(r.Min.X, r.Max.Y-width, r.Max.X, r.Max.Y), v)
	p.rect(image.Rect(r.Min.X, r.Min.Y, r.Min.X+width, r.Max.Y), v)
	p.rect(image.Rect(r.Max.X-width, r.Min.Y, r.Max.X, r.Max.Y), v)
}

// disk fills the disk of the given diameter whose square box has its top left corner at (x, y): the pixels
// whose centre lies within the circle, so that every pixel is either all in or all out.
func (p *Plane) disk(x, y, diameter int, v uint16) {
	p.ring(x, y, diameter, 0, v)
}

// ring fills what lies between a circle and one of the diameter hole about the same centre.
func (p *Plane) ring(x, y, diameter, hole int, v uint16) {
	for row := range diameter {
		half := chord(diameter, 2*row+1-diameter)
		in := -1
		if hole > 0 {
			in = chord(hole, 2*row+1-diameter)
		}
		// Both chords are counted in half pixels from the middle of the box.
		left, right := (diameter-half)/2, (diameter+half+1)/2
		if in < 0 {
			p.rect(image.Rect(x+left, y+row, x+right, y+row+1), v)
			continue
		}
		inLeft, inRight := (diameter-in)/2, (diameter+in+1)/2
		p.rect(image.Rect(x+left, y+row, x+inLeft, y+row+1), v)
		p.rect(image.Rect(x+inRight, y+row, x+right, y+row+1), v)
	}
}

// chord is half the length of the chord of a circle at the distance dy from its middle, both counted in half
// pixels and the circle given by its diameter in pixels; -1 where the circle does not reach.
func chord(diameter, dy int) int {
	rest := diameter*diameter - dy*dy
	if rest < 0 {
		return -1
	}
	root := 0
	for bit := 1 << 14; bit > 0; bit >>= 1 {
		if next := root + bit; next*next <= rest {
			root = next
		}
	}
	return root
}
