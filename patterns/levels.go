package patterns

import "image"

// wedgeGrid says how the levels are spread: in bands of equally many levels, each level a cell of the same
// width and height, so that all of them have the same area.
type wedgeGrid struct {
	bands, perBand int
	cell           image.Point // pixels
	origin, pitch  image.Point // top left of the first band; from band to band
}

func newWedgeGrid(width, height, depth, labelSize int) wedgeGrid {
	levels := 1 << depth
	const leastCell = 2 // pixels: a cell of one could hide in the structure of the panel
	bands := 1
	for width*bands/levels < leastCell {
		bands *= 2
	}
	g := wedgeGrid{bands: bands, perBand: levels / bands}
	g.cell.X = width / g.perBand
	g.pitch.Y = height / bands
	g.cell.Y = g.pitch.Y
	if g.pitch.Y >= roomForLabel {
		g.cell.Y -= min(g.pitch.Y/5, 3*labelSize)
	}
	g.origin = image.Pt((width-g.cell.X*g.perBand)/2, (height-g.pitch.Y*bands)/2)
	if bands == 1 {
		g.cell.Y = g.pitch.Y * 4 / 5
		g.origin.Y = (height - g.cell.Y) / 2
	}
	return g
}

// roomForLabel is the height of a band, in pixels, from which on a line of figures goes below it.
const roomForLabel = 60

// wedge draws every level once, in order.
func wedge(c *canvas, _ int) {
	surround := c.surround(c.frac(1, 2))
	c.Fill(surround)
	ink := c.ink(surround, 1, 3)
	g := newWedgeGrid(c.Width, c.Height, c.Bits, c.labelSize())
	for b := range g.bands {
		band := image.Rect(0, 0, g.cell.X*g.perBand, g.cell.Y).Add(g.origin).Add(image.Pt(0, b*g.pitch.Y))
		top := c.Row(band.Min.Y)
		for i := range g.perBand {
			x := band.Min.X + i*g.cell.X
			fillRun(top[x:x+g.cell.X], uint16(b*g.perBand+i))
		}
		c.repeat(band, 1)
		if g.cell.Y < g.pitch.Y {
			c.wedgeLabels(&g, b, band, ink)
		}
	}
}

// wedgeLabels writes levels below a band: at eight places of a wedge in one piece, else at its ends.
func (c *canvas) wedgeLabels(g *wedgeGrid, b int, band image.Rectangle, ink uint16) {
	parts := 1
	if g.bands == 1 {
		parts = 8
	}
	room := min(g.pitch.Y-g.cell.Y, c.labelSize()*2)
	size := min(c.labelSize(), room*2/3)
	t := c.face(size)
	for k := range parts + 1 {
		i := min(k*g.perBand/parts, g.perBand-1)
		s := c.number(b*g.perBand + i)
		wide := t.width(s)
		x := band.Min.X + i*g.cell.X + (g.cell.X-wide)/2
		x = min(max(x, band.Min.X), band.Max.X-wide)
		c.label(image.Rect(x, band.Max.Y, x+wide, band.Max.Y+room), size, s, ink)
	}
}

// toothSteps is how many levels a tooth of the sawtooth climbs through.
const toothSteps = 4

// sawGrid says how the teeth are spread over bands.
type sawGrid struct {
	teeth, perBand, bands int
	step                  int // width of a level in pixels
	left                  int // column of the first tooth
	height, pitch         int // of a band, and from band to band, pixels
}

func newSawGrid(width, height, depth, margin int) sawGrid {
	g := sawGrid{teeth: 1<<depth - toothSteps + 1}
	// More bands make wider and lower teeth: stop when a tooth is no more than twice as high as wide.
	for g.bands = 1; ; g.bands++ {
		g.perBand = (g.teeth + g.bands - 1) / g.bands
		g.step = (width - margin) / (toothSteps * g.perBand)
		g.pitch = height / g.bands
		if g.step >= 1 && (2*toothSteps*g.step >= g.pitch || g.pitch == 1) {
			break
		}
	}
	g.left = margin + (width-margin-toothSteps*g.step*g.perBand)/2
	g.height = g.pitch
	if g.pitch >= 8 {
		g.height = g.pitch * 7 / 8
	}
	return g
}

// sawtooth climbs four levels, falls back three, and so on up the range: each tooth stands one level above
// the one before, and all look alike where no level is lost, doubled or swapped.
func sawtooth(c *canvas, _ int) {
	surround := c.surround(c.frac(1, 2))
	c.Fill(surround)
	ink := c.ink(surround, 1, 3)
	size := c.labelSize() * 3 / 4
	margin := 0
	g := newSawGrid(c.Width, c.Height, c.Bits, 0)
	if t := c.face(size); g.height >= t.height {
		margin = t.width(c.number(c.max)) * 3 / 2
		g = newSawGrid(c.Width, c.Height, c.Bits, margin)
	}
	top := (c.Height - g.pitch*g.bands + g.pitch - g.height) / 2
	for b := range g.bands {
		first := b * g.perBand
		n := min(g.perBand, g.teeth-first)
		if n <= 0 {
			break
		}
		y := top + b*g.pitch
		row := c.Row(y)
		x := g.left
		for t := first; t < first+n; t++ {
			for k := range toothSteps {
				fillRun(row[x:x+g.step], uint16(t+k))
				x += g.step
			}
		}
		band := image.Rect(g.left, y, x, y+g.height)
		c.repeat(band, 1)
		if margin > 0 {
			c.label(image.Rect(0, y, margin, y+g.height), size, c.number(first), ink)
		}
	}
}

func darkEnd(c *canvas, _ int)   { c.end(false) }
func brightEnd(c *canvas, _ int) { c.end(true) }

const endSteps = 16

// end draws the last levels as stairs whose treads stand on one base: at 8 bits one flight, at more bits a
// flight of single levels and one of steps as large as those of 8 bits. The bright end is the dark end
// subtracted from the highest level.
func (c *canvas) end(bright bool) {
	level := func(v int) uint16 {
		if bright {
			v = c.max - v
		}
		return uint16(v)
	}
	c.Fill(level(0))
	flights := 1
	if c.Bits > 8 {
		flights = 2
	}
	size := c.labelSize()
	text := c.face(size).height
	for f := range flights {
		unit := 1 << (f * (c.Bits - 8))
		r := endFlight(c.Width, c.Height, f, flights, text)
		for k := 1; k <= endSteps; k++ {
			tread := cell(r, k-1, endSteps, 0, 1)
			v := level(k * unit)
			c.rect(image.Rect(tread.Min.X, r.Max.Y-r.Dy()*k/endSteps, tread.Max.X, r.Max.Y), v)
			c.label(image.Rect(tread.Min.X+1, r.Max.Y+text/4, tread.Max.X-1, r.Max.Y+text/4+text),
				size, c.number(int(v)), level(int(c.frac(1, 5))))
		}
	}
}

// endFlight is the box of one flight of stairs, with room for the labels below.
func endFlight(width, height, f, flights, text int) image.Rectangle {
	r := cell(image.Rect(0, 0, width, height), 0, 1, f, flights)
	r = image.Rect(r.Min.X+width/20, r.Min.Y+height/20, r.Max.X-width/20, r.Max.Y-height/20)
	r.Max.Y -= text * 5 / 4
	return r
}
