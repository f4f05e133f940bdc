package patterns

import (
	"fmt"
	"image"
	"math/rand/v2"
)

// pick chooses one of n for item i: the same for the same seed, on every machine.
func pick(seed uint64, i, n int) int {
	var g rand.PCG
	g.Seed(seed, uint64(i))
	return int(g.Uint64() % uint64(n))
}

const maxLowContrast = 48

var barWays = [...]string{"upright", "lying"}

// ownSteps makes a step of each size, in levels of 8 bits, at each place of the range, in sixteenths: size by
// size, or place by place.
func (c *canvas) ownSteps(sixteenths, sizes []int, bySize bool) []Step {
	n := len(sixteenths) * len(sizes)
	for i := range n {
		at, size := i/len(sizes), i%len(sizes)
		if bySize {
			at, size = i%len(sixteenths), i/len(sixteenths)
		}
		low := c.frac(sixteenths[at], 16)
		c.steps[i] = Step{Low: low, High: low + c.frac(sizes[size], 255)}
	}
	return c.steps[:n]
}

// lowContrast draws a tile for each step, with a bar in it that is upright or lying: who sees it can say
// which.
func lowContrast(c *canvas, _ int) {
	surround := c.surround(c.frac(2, 10))
	c.Fill(surround)
	ink := c.ink(surround, 1, 3)
	steps := c.spec.Steps
	if steps == nil {
		// Lying, a row is one size over the range; upright, a column is.
		steps = c.ownSteps([]int{1, 5, 10, 14}, []int{1, 2, 4}, c.Width > c.Height)
	}
	cols, rows := grid(len(steps), c.Width, c.Height)
	for i := range steps {
		k := cell(c.bounds(), i%cols, cols, i/cols, rows)
		gap := min(k.Dx(), k.Dy()) / 12
		text := c.face(min(c.labelSize(), k.Dy()/8)).height
		tile := image.Rect(k.Min.X+gap, k.Min.Y+gap, k.Max.X-gap, k.Max.Y-gap-text)
		c.rect(tile, steps[i].Low)
		side := min(tile.Dx(), tile.Dy())
		w, h := side/6, side*2/3
		if barWays[pick(c.spec.Seed, i, len(barWays))] == "lying" {
			w, h = h, w
		}
		c.rect(middle(tile, w, h), steps[i].High)
		c.label(image.Rect(tile.Min.X, tile.Max.Y, tile.Max.X, k.Max.Y-gap/2), min(c.labelSize(), k.Dy()/8),
			c.stepLabel(&steps[i]), ink)
	}
}

// grid is how many columns and rows hold n tiles so that they come out nearly square.
func grid(n, width, height int) (cols, rows int) {
	best := 0
	for k := 1; k <= n; k++ {
		j := (n + k - 1) / k
		if side := min(width/k, height/j); side > best {
			best, cols, rows = side, k, j
		}
	}
	return cols, rows
}

const (
	maxDiameters  = 10
	ownDiameters  = 5
	ownDiskSteps  = 6
	maxDiskSteps  = 12
	diskPositions = 3
)

// The disk lies in a third of its cell, counted along the longer side.
var (
	placesAcross = [diskPositions]string{"left", "middle", "right"}
	placesDown   = [diskPositions]string{"top", "middle", "bottom"}
)

// diskArea is the part of the sheet that holds the cells of the disks; labels go left of it and above.
func diskArea(s *Spec) (r image.Rectangle, cols, rows int) {
	short := min(s.Width, s.Height)
	cols, rows = len(s.Steps), len(s.Diameters)
	if s.Steps == nil {
		cols = ownDiskSteps
	}
	if s.Diameters == nil {
		rows = ownDiameters
	}
	edge := short / 60
	return image.Rect(short/9, short/14, s.Width-edge, s.Height-edge), cols, rows
}

// diskThird is the part of the cell in column i and row j where a disk in the given position lies.
func diskThird(s *Spec, i, j, position int) image.Rectangle {
	r, cols, rows := diskArea(s)
	k := cell(r, i, cols, j, rows).Inset(2 * diskGap(s))
	if disksAcross(s) {
		return cell(k, position, diskPositions, 0, 1)
	}
	return cell(k, 0, 1, position, diskPositions)
}

// disksAcross tells whether the cells are wider than high.
func disksAcross(s *Spec) bool {
	r, cols, rows := diskArea(s)
	return r.Dx()*rows >= r.Dy()*cols
}

// diskGap is the gap around a cell in pixels.
func diskGap(s *Spec) int { return max(min(s.Width, s.Height)/200, 2) }

// maxDiameter is the greatest disk, in pixels, that a third of a cell holds.
func maxDiameter(s *Spec) int {
	third := diskThird(s, 0, 0, 0)
	return min(third.Dx(), third.Dy()) * 8 / 10
}

// disks draws one disk in each cell, at one end or in the middle: a column for each step, a row for each
// diameter.
func disks(c *canvas, _ int) {
	surround := c.surround(c.frac(1, 2))
	c.Fill(surround)
	ink := c.ink(surround, 1, 3)
	steps := c.spec.Steps
	if steps == nil {
		steps = c.ownSteps([]int{8}, []int{1, 2, 3, 4, 6, 8}, true)
	}
	diameters := c.spec.Diameters
	if diameters == nil {
		most := maxDiameter(c.spec)
		for i := range ownDiameters {
			c.sizes[i] = max(most>>i, 1)
		}
		diameters = c.sizes[:ownDiameters]
	}
	r, cols, rows := diskArea(c.spec)
	size := c.labelSize()
	gap := diskGap(c.spec)
	for i := range steps {
		k := cell(r, i, cols, 0, rows)
		c.label(image.Rect(k.Min.X+gap, 0, k.Max.X-gap, r.Min.Y), size, c.stepLabel(&steps[i]), ink)
		for j, d := range diameters {
			k := cell(r, i, cols, j, rows)
			c.rect(k.Inset(gap), steps[i].Low)
			c.frame(k.Inset(gap-1), 1, c.ink(surround, 1, 10))
			at := middle(diskThird(c.spec, i, j, pick(c.spec.Seed, j*cols+i, diskPositions)), d, d).Min
			c.disk(at.X, at.Y, d, steps[i].High)
		}
	}
	for j, d := range diameters {
		k := cell(r, 0, cols, j, rows)
		c.label(image.Rect(0, k.Min.Y, r.Min.X, k.Max.Y), size, append(c.number(d), " px"...), ink)
	}
}

// Answers is what a seeded sheet holds, in reading order: for each bar of "low-contrast" "upright" or
// "lying", for each cell of "disks" "left", "middle" or "right", or where the cells are
// higher than wide "top", "middle" or "bottom". Other sheets have no answers: an error that
// wraps ErrSpec, as for a Spec that Draw would refuse.
func Answers(name string, s Spec) ([]string, error) {
	sh, err := find(name)
	if err != nil {
		return nil, err
	}
	if err := s.check(&sh.Info); err != nil {
		return nil, err
	}
	var n int
	var from []string
	switch name {
	case "low-contrast":
		n, from = len(s.Steps), barWays[:]
		if s.Steps == nil {
			n = ownLowContrast
		}
	case "disks":
		_, cols, rows := diskArea(&s)
		n, from = cols*rows, placesDown[:]
		if disksAcross(&s) {
			from = placesAcross[:]
		}
	default:
		return nil, fmt.Errorf("pattern %s: nothing in it depends on a seed; expected low-contrast or disks; "+
			"ask for one of these (%w)", name, ErrSpec)
	}
	answers := make([]string, n)
	for i := range answers {
		answers[i] = from[pick(s.Seed, i, len(from))]
	}
	return answers, nil
}

const ownLowContrast = 12

// angle draws the same group of strips all over the sheet: each strip one level with a block a small step
// away from it.
func angle(c *canvas, _ int) {
	surround := c.surround(c.frac(2, 10))
	c.Fill(surround)
	steps := c.spec.Steps
	if steps == nil {
		steps = c.ownSteps([]int{1, 4, 8, 11, 14}, []int{10}, true)
	}
	const groups = 3
	for g := range groups * groups {
		k := cell(c.bounds(), g%groups, groups, g/groups, groups)
		k = middle(k, k.Dx()*8/10, k.Dy()*7/10)
		for i := range steps {
			strip := cell(k, i, len(steps), 0, 1)
			c.rect(strip, steps[i].Low)
			c.rect(middle(strip, strip.Dx()/2, strip.Dy()/2), steps[i].High)
		}
	}
}
