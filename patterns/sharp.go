package patterns

import "image"

// stripes fills r with lines of the levels a and b in turn, each pitch pixels wide: upright ones if upright,
// else lying ones. The first line is of level a.
func (p *Plane) stripes(r image.Rectangle, pitch int, upright bool, a, b uint16) {
	r = p.clip(r)
	if r.Empty() {
		return
	}
	levels := [2]uint16{a, b}
	if upright {
		top := p.Row(r.Min.Y)[r.Min.X:r.Max.X]
		for x := range top {
			top[x] = levels[x/pitch%2]
		}
		p.repeat(r, 1)
		return
	}
	for y := range min(2*pitch, r.Dy()) {
		fillRun(p.Row(r.Min.Y + y)[r.Min.X:r.Max.X], levels[y/pitch%2])
	}
	p.repeat(r, 2*pitch)
}

// chequer fills r with single pixels of the levels a and b in turn.
func (p *Plane) chequer(r image.Rectangle, a, b uint16) {
	r = p.clip(r)
	levels := [2]uint16{a, b}
	for y := range min(2, r.Dy()) {
		row := p.Row(r.Min.Y + y)[r.Min.X:r.Max.X]
		for x := range row {
			row[x] = levels[(x+y)%2]
		}
	}
	p.repeat(r, 2)
}

const maxPitch = 4

// sharpness draws line pairs of one to four pixels a line, upright and lying, at full contrast and at low.
func sharpness(c *canvas, _ int) {
	surround := c.surround(c.frac(1, 2))
	c.Fill(surround)
	ink := c.ink(surround, 1, 3)
	low := Step{Low: c.frac(15, 32), High: c.frac(17, 32)}
	if c.spec.Steps != nil {
		low = c.spec.Steps[0]
	}
	full := Step{Low: 0, High: uint16(c.max)}
	size := c.labelSize()
	for j := range 4 {
		step := &full
		if j >= 2 {
			step = &low
		}
		for i := range maxPitch {
			tile, below := sharpTile(c.Width, c.Height, i, j)
			c.stripes(tile, i+1, j%2 == 0, step.Low, step.High)
			c.label(below, size, append(c.number(i+1), " px"...), ink)
		}
	}
}

// sharpTile is the tile in column i and row j of the sharpness sheet, and the room below it.
func sharpTile(width, height, i, j int) (tile, below image.Rectangle) {
	k := cell(image.Rect(0, 0, width, height), i, maxPitch, j, 4)
	tile = middle(k, k.Dx()*88/100, k.Dy()*76/100)
	tile = tile.Sub(image.Pt(0, k.Dy()/20))
	return tile, image.Rect(tile.Min.X, tile.Max.Y, tile.Max.X, k.Max.Y)
}

// geometry draws squares over the whole sheet, the diagonals, and along each edge a rule of pixels that ends
// with the outermost one.
func geometry(c *canvas, _ int) {
	surround := c.surround(c.frac(1, 10))
	c.Fill(surround)
	line := c.ink(surround, 1, 4)
	bright := c.ink(surround, 1, 2)
	size := c.labelSize() * 3 / 4
	t := c.face(size)
	long := c.short / 60
	wide := t.width(c.number(8888)) + 2*long
	inside := c.bounds().Inset(2*long + t.height)
	inside.Min.X, inside.Max.X = max(inside.Min.X, wide), min(inside.Max.X, c.Width-wide)
	net := squares(c, inside, line)
	diagonals(c, net, line)
	rules(c, t, long, bright)
	c.frame(c.bounds(), 1, bright)
}

// squares draws a net of square meshes in the middle of r and says how far it reaches.
func squares(c *canvas, r image.Rectangle, v uint16) image.Rectangle {
	mesh := max(c.short/12/10*10, 10)
	cols, rows := (r.Dx()-1)/mesh, (r.Dy()-1)/mesh
	net := middle(r, cols*mesh+1, rows*mesh+1)
	for i := range cols + 1 {
		c.rect(image.Rect(net.Min.X+i*mesh, net.Min.Y, net.Min.X+i*mesh+1, net.Max.Y), v)
	}
	for j := range rows + 1 {
		c.rect(image.Rect(net.Min.X, net.Min.Y+j*mesh, net.Max.X, net.Min.Y+j*mesh+1), v)
	}
	return net
}

// diagonals joins the corners of r, stepping along the longer side so that the lines have no gap.
func diagonals(c *canvas, r image.Rectangle, v uint16) {
	w, h := r.Dx()-1, r.Dy()-1
	for i := range max(w, h) + 1 {
		x, y := i, i
		if w >= h {
			y = (2*i*h + w) / (2 * w)
		} else {
			x = (2*i*w + h) / (2 * h)
		}
		row := c.Row(r.Min.Y + y)
		row[r.Min.X+x], row[r.Max.X-1-x] = v, v
	}
}

// rules draws a tick every 10 pixels along the edges and a long one with its number every 100 (200, where
// the numbers would touch).
func rules(c *canvas, t *typeface, long int, v uint16) {
	named := 100
	for t.width(c.number(8888))*3/2 > named {
		named += 100
	}
	tick := func(at int) int {
		if at%100 == 0 {
			return long
		}
		return long / 2
	}
	for x := 10; x < c.Width; x += 10 {
		n := tick(x)
		c.rect(image.Rect(x, 1, x+1, 1+n), v)
		c.rect(image.Rect(x, c.Height-1-n, x+1, c.Height-1), v)
		if w := t.width(c.number(x)); x%named == 0 && x+w < c.Width-2*long {
			c.write(t, x-w/2, 2+long+t.ascent, c.number(x), v)
			c.write(t, x-w/2, c.Height-2-long-t.height+t.ascent, c.number(x), v)
		}
	}
	for y := 10; y < c.Height; y += 10 {
		n := tick(y)
		c.rect(image.Rect(1, y, 1+n, y+1), v)
		c.rect(image.Rect(c.Width-1-n, y, c.Width-1, y+1), v)
		if y%named == 0 && y+t.height < c.Height-2*long {
			w := t.width(c.number(y))
			c.write(t, 3+long, y-t.height/2+t.ascent, c.number(y), v)
			c.write(t, c.Width-3-long-w, y-t.height/2+t.ascent, c.number(y), v)
		}
	}
}

// native draws fields of single-pixel structure that all come out as one even gray only where each sample
// lands on a pixel of its own, and blocks close to both ends of the range.
func native(c *canvas, _ int) {
	top := uint16(c.max)
	cols, rows := 4, 3
	if c.Width < c.Height {
		cols, rows = rows, cols
	}
	for j := range rows {
		for i := range cols {
			k := cell(c.bounds(), i, cols, j, rows)
			// Fields that begin on even pixels go on in step with their neighbours.
			k.Min.X, k.Min.Y = k.Min.X&^1, k.Min.Y&^1
			switch (i + j) % 3 {
			case 0:
				c.chequer(k, 0, top)
			case 1:
				c.stripes(k, 1, true, 0, top)
			default:
				c.stripes(k, 1, false, 0, top)
			}
		}
	}
	plate := middle(c.bounds(), c.Width/2, c.Height/3)
	c.rangeEnd(cell(plate, 0, 1, 0, 3), false)
	c.rangeEnd(cell(plate, 0, 1, 2, 3), true)
	between := cell(plate, 0, 1, 1, 3)
	surround := c.frac(1, 2)
	c.rect(between, surround)
	b := append(c.number(c.Width), " x "...)
	b = appendInt(b, c.Height)
	b = appendInt(append(b, ", "...), c.Bits)
	b = append(b, " bits"...)
	c.label(between, 2*c.labelSize(), b, c.ink(surround, 1, 2))
}

// rangeEnd draws blocks a few 64ths of the range away from its end. An output that is limited to the range of
// broadcast, 16 to 235 of 255, swallows the first of them.
func (c *canvas) rangeEnd(r image.Rectangle, bright bool) {
	const blocks = 8
	level := func(v uint16) uint16 {
		if bright {
			return uint16(c.max) - v
		}
		return v
	}
	c.rect(r, level(0))
	for k := range blocks {
		b := cell(r, k, blocks, 0, 1)
		v := level(c.frac(k+1, 64))
		c.rect(image.Rect(b.Min.X+b.Dx()/5, b.Min.Y+b.Dy()/6, b.Max.X-b.Dx()/5, b.Min.Y+b.Dy()*4/6), v)
		c.label(image.Rect(b.Min.X, b.Min.Y+b.Dy()*4/6, b.Max.X, b.Max.Y), c.labelSize()*3/4, c.number(int(v)),
			level(c.frac(1, 4)))
	}
}
