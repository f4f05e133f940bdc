package patterns

import "image"

// hues are the fields of the sheet of colours: a bit for each channel, and the name.
var hues = [...]struct {
	on   [3]bool
	name string
}{
	{[3]bool{true, false, false}, "red"},
	{[3]bool{false, true, false}, "green"},
	{[3]bool{false, false, true}, "blue"},
	{[3]bool{true, true, true}, "white"},
	{[3]bool{false, true, true}, "cyan"},
	{[3]bool{true, false, true}, "magenta"},
	{[3]bool{true, true, false}, "yellow"},
	{[3]bool{false, false, false}, "black"},
}

// colours draws the eight mixtures of the channels fully on and off, each with a part at half of its levels.
func colours(c *canvas, channel int) {
	cols, rows := 4, 2
	if c.Width < c.Height {
		cols, rows = rows, cols
	}
	for i := range hues {
		k := cell(c.bounds(), i%cols, cols, i/cols, rows)
		v, half := uint16(0), uint16(0)
		if hues[i].on[channel] {
			v, half = uint16(c.max), c.frac(1, 2)
		}
		c.rect(k, v)
		lower := image.Rect(k.Min.X, k.Max.Y-k.Dy()/3, k.Max.X, k.Max.Y)
		c.rect(lower, half)
		ink := uint16(0)
		if !hues[i].on[1] {
			ink = uint16(c.max) // without green a field is dark
		}
		c.label(image.Rect(k.Min.X, lower.Min.Y-2*c.labelSize(), k.Max.X, lower.Min.Y), c.labelSize(),
			append(c.words[:0], hues[i].name...), ink)
	}
}

// colourField draws one colour from edge to edge.
func colourField(c *canvas, channel int) {
	levels := [3]uint16{uint16(c.max), 0, 0}
	if c.spec.Colour != nil {
		levels = *c.spec.Colour
	}
	c.Fill(levels[channel])
}

// The sheet of gray tracking has this many grays, and beside them the same with one channel this much
// stronger, in hundredths of the range.
const (
	trackingGrays = 9
	trackingTint  = 4
)

// grayTracking draws grays of equal channels, and narrow strips of them with a little more red or blue to
// compare with: what a tint looks like.
func grayTracking(c *canvas, channel int) {
	surround := c.surround(c.frac(1, 20))
	c.Fill(surround)
	plain, red, blue := trackingRows(c.Width, c.Height)
	for i := range trackingGrays {
		v := c.frac(i+1, trackingGrays+1)
		c.rect(cell(plain, i, trackingGrays, 0, 1), v)
		for _, strip := range [...]struct {
			r       image.Rectangle
			channel int
		}{{red, 0}, {blue, 2}} {
			tinted := v
			if strip.channel == channel {
				tinted += c.frac(trackingTint, 100)
			}
			c.rect(cell(strip.r, i, trackingGrays, 0, 1), tinted)
		}
		k := cell(plain, i, trackingGrays, 0, 1)
		c.label(image.Rect(k.Min.X, plain.Max.Y, k.Max.X, red.Min.Y), c.labelSize(), c.number(int(v)),
			c.ink(surround, 1, 4))
	}
}

// trackingRows is where the plain grays lie, and the strips with more red and with more blue.
func trackingRows(width, height int) (plain, red, blue image.Rectangle) {
	row := func(from, to int) image.Rectangle {
		return image.Rect(width/30, height*from/100, width-width/30, height*to/100)
	}
	return row(5, 65), row(70, 81), row(84, 95)
}
