package patterns

import (
	"image"
	"strings"
)

const maxReadingSteps = 6

// readingWords is what the reading sheet says. Every sentence has letters and figures that a blurred screen
// confuses.
var readingWords = split(`Small letters ought to stay open and even, here and in every corner of the sheet.
 Tell c from e, a from o, rn from m, cl from d, and i from l and 1. Count 3, 5, 6, 8 and 9: 3568 8653 9386 5698.
 A stroke should be as black, or as bright, at the edge as in the middle. Where two strokes run together, the
 signal is stretched, the cable is poor, or the size is not the one of the panel. Read on: vivid, willow, minimum,
 illicit, 0.08 mm, 1.18 mm, 11:17, 80 kg, 0O8B, 2Z5S, 1lI7. Nothing here needs guessing when all is well.`)

func split(text string) [][]byte {
	var words [][]byte
	for _, w := range strings.Fields(text) {
		words = append(words, []byte(w))
	}
	return words
}

// reading sets the text in blocks from edge to edge, a block for each contrast and in it a line or more of
// each size.
func reading(c *canvas, _ int) {
	top := uint16(c.max)
	steps := c.spec.Steps
	if steps == nil {
		c.steps[0] = Step{Low: 0, High: top}
		c.steps[1] = Step{Low: top, High: 0}
		c.steps[2] = Step{Low: c.frac(1, 10), High: c.frac(4, 10)}
		c.steps[3] = Step{Low: c.frac(5, 10), High: c.frac(6, 10)}
		steps = c.steps[:4]
	}
	cols, rows := grid(len(steps), c.Width, c.Height)
	for i := range steps {
		r := cell(c.bounds(), i%cols, cols, i/cols, rows)
		if i == len(steps)-1 {
			// The last block takes what would stay empty of its row.
			r.Max.X = c.Width
		}
		c.rect(r, steps[i].Low)
		c.block(r.Inset(c.short/150), steps[i].High, i*17)
	}
}

// block fills r with lines of rising size, beginning with the word at index word. What is left over goes
// between the lines, so that the last one stands on the lower edge.
func (c *canvas) block(r image.Rectangle, ink uint16, word int) {
	last := 0
	sum := c.face(textSizes[0]).height
	for last+1 < len(textSizes) && textSizes[last+1] <= c.short/25 {
		last++
		sum += c.face(textSizes[last]).height
	}
	each := max(r.Dy()/sum, 1)
	lines := each * (last + 1)
	spare := max(r.Dy()-each*sum, 0)
	y, line := r.Min.Y, 0
	for s := range last + 1 {
		t := c.face(textSizes[s])
		for range each {
			below := y + spare*line/max(lines-1, 1)
			word = c.line(t, r.Min.X, r.Max.X, below+t.ascent, word, ink)
			y += t.height
			line++
		}
	}
}

// line sets as many words as fit between two columns, spread so that the last one ends at the right edge,
// and says which word comes next.
func (c *canvas) line(t *typeface, left, right, y, word int, ink uint16) int {
	space := t.glyph(' ').advance
	n, used := 0, 0
	for {
		w := t.width(readingWords[(word+n)%len(readingWords)])
		if n > 0 && used+n*space+w > right-left {
			break
		}
		used += w
		n++
	}
	x := left
	for i := range n {
		s := readingWords[(word+i)%len(readingWords)]
		gap := 0
		if n > 1 {
			gap = (right - left - used) * i / (n - 1)
		}
		c.write(t, x+gap, y, s, ink)
		x += t.width(s)
	}
	return word + n
}
