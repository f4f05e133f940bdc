package patterns

// motion draws a bar from the top to the bottom edge that moves by the same number of pixels from frame to
// frame and comes in again on the left when it has left on the right. It crosses three lanes: bright on
// black, dark on white, and a small step.
func motion(c *canvas, _ int) {
	top := uint16(c.max)
	lanes := [3]Step{{Low: 0, High: top}, {Low: top, High: 0}, {Low: c.frac(7, 16), High: c.frac(9, 16)}}
	if c.spec.Steps != nil {
		lanes[2] = c.spec.Steps[0]
	}
	x, width := motionBar(c.Width, c.spec.Frame)
	for i := range lanes {
		lane := cell(c.bounds(), 0, 1, i, len(lanes))
		row := c.Row(lane.Min.Y)
		fillRun(row, lanes[i].Low)
		for _, from := range [2]int{x, x - c.Width} {
			if a, b := max(from, 0), min(from+width, c.Width); a < b {
				fillRun(row[a:b], lanes[i].High)
			}
		}
		c.repeat(lane, 1)
	}
}

// motionBar is the left edge of the bar and its width, in pixels.
func motionBar(width, frame int) (x, barWidth int) {
	perFrame := MotionStep(width)
	period := width // in pixels; the frame is reduced first, so that no product overflows
	x = (frame % period) * perFrame % period
	if x < 0 {
		x += period
	}
	return x, width / 16
}

// MotionStep is how far the bar of the sheet "motion" moves from one frame to the next, in pixels, on a
// screen of the given width: a 240th of it, four seconds from edge to edge at 60 frames per second.
func MotionStep(width int) int { return max(width/240, 1) }
