package patterns

import (
	"image"
	"math"
)

// luminanceField draws the field that the meter looks at: a centred square of a tenth of the pixels.
func luminanceField(c *canvas, _ int) {
	c.Fill(c.surround(c.frac(6, 10)))
	side := int(math.Round(math.Sqrt(0.1 * float64(c.Width) * float64(c.Height))))
	c.rect(middle(c.bounds(), side, side), c.field(uint16(c.max)))
}

func uniform(c *canvas, _ int) { c.Fill(c.field(c.frac(8, 10))) }

var placeCounts = [...]int{5, 9, 13, 25}

// placeAt is where place i of n lies, in per cent of the width and of the height. Places are counted row by
// row from the top left, and the sets of 5, 13 and 25 are parts of one another.
func placeAt(n, i int) (x, y int) {
	switch n {
	case 5:
		return [...]int{10, 90, 50, 10, 90}[i], [...]int{10, 10, 50, 90, 90}[i]
	case 9:
		return 10 + 40*(i%3), 10 + 40*(i/3)
	case 13:
		// Rows of three at the edges and the middle, rows of two between them.
		pair, in := i/5, i%5
		if in < 3 {
			return 10 + 40*in, 10 + 40*pair
		}
		return 30 + 40*(in-3), 30 + 40*pair
	default:
		return 10 + 20*(i%5), 10 + 20*(i/5)
	}
}

// Places is where the middles of the places lie on a screen of width by height pixels, in the order of their
// numbers (the first is place 1, at the top left; then row by row). The outermost lie a tenth of the side in
// from the edge. It is nil when n is none of 5, 9, 13 and 25.
func Places(n, width, height int) []image.Point {
	for _, known := range placeCounts {
		if n != known {
			continue
		}
		points := make([]image.Point, n)
		for i := range points {
			points[i] = placePoint(n, i, width, height)
		}
		return points
	}
	return nil
}

func placePoint(n, i, width, height int) image.Point {
	x, y := placeAt(n, i)
	return image.Pt(width*x/100, height*y/100)
}

// uniformityPlaces marks where the meter goes. What it measures, the inside of the ring, keeps the level of
// the field; ring and number are faint, so that they add no light.
func uniformityPlaces(c *canvas, _ int) {
	level := c.field(c.frac(8, 10))
	ink := c.ink(level, 1, 6)
	c.Fill(level)
	n := c.spec.places()
	diameter := c.short * 12 / 100
	line := 1 + c.short/900
	size := c.labelSize()
	for i := range n {
		if c.spec.Place != 0 && c.spec.Place != i+1 {
			continue
		}
		at := placePoint(n, i, c.Width, c.Height)
		x, y := at.X-diameter/2, at.Y-diameter/2
		c.ring(x, y, diameter, diameter-2*line, ink)
		// The number stands on the side that has room: below, but above in the lower half.
		t := c.face(size)
		box := image.Rect(at.X-diameter, y+diameter+line, at.X+diameter, y+diameter+line+t.height)
		if at.Y > c.Height*6/10 {
			box = box.Sub(image.Pt(0, diameter+2*line+t.height))
		}
		c.label(box, size, c.number(i+1), ink)
	}
}

// pixelFaults draws an empty field with letters and figures along the edges to say where a fault lies.
func pixelFaults(c *canvas, _ int) {
	level := c.field(0)
	ink := c.ink(level, 1, 8)
	c.Fill(level)
	cols, rows := 12, 8
	if c.Width < c.Height {
		cols, rows = rows, cols
	}
	size := c.labelSize() * 3 / 4
	depth := c.face(size).height
	r := c.bounds()
	for i := range cols {
		k := cell(r, i, cols, 0, 1)
		name := append(c.words[:0], byte('A'+i))
		c.label(image.Rect(k.Min.X, 0, k.Max.X, depth), size, name, ink)
		c.label(image.Rect(k.Min.X, c.Height-depth, k.Max.X, c.Height), size, name, ink)
		if i > 0 {
			c.rect(image.Rect(k.Min.X, 0, k.Min.X+1, depth), ink)
			c.rect(image.Rect(k.Min.X, c.Height-depth, k.Min.X+1, c.Height), ink)
		}
	}
	for j := range rows {
		k := cell(r, 0, 1, j, rows)
		name := c.number(j + 1)
		c.label(image.Rect(0, k.Min.Y, 2*depth, k.Max.Y), size, name, ink)
		c.label(image.Rect(c.Width-2*depth, k.Min.Y, c.Width, k.Max.Y), size, name, ink)
		if j > 0 {
			c.rect(image.Rect(0, k.Min.Y, depth, k.Min.Y+1), ink)
			c.rect(image.Rect(c.Width-depth, k.Min.Y, c.Width, k.Min.Y+1), ink)
		}
	}
}
