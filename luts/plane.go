package luts

import (
	"fmt"
	"image"
)

// Sample is what one pixel of a plane is held in.
type Sample interface{ uint8 | uint16 }

// Plane is a gray picture in memory, or a part of one. The pixel in column x of row y is Pix[y*Stride+x].
type Plane[T Sample] struct {
	Pix           []T
	Width, Height int // at least 0
	Stride        int // samples from one row to the next, at least Width
}

// NewPlane is an empty plane of its own, without gaps between rows.
func NewPlane[T Sample](width, height int) Plane[T] {
	return Plane[T]{make([]T, width*height), width, height, width}
}

// Sub is the part of p within r, of which (0, 0) is the first pixel of p. Both share their pixels.
func (p Plane[T]) Sub(r image.Rectangle) (Plane[T], error) {
	if err := p.check(); err != nil {
		return Plane[T]{}, err
	}
	if r.Empty() {
		return Plane[T]{Stride: p.Stride}, nil
	}
	if !r.In(image.Rect(0, 0, p.Width, p.Height)) {
		return Plane[T]{}, fmt.Errorf("region: %v; expected it to lie within %d x %d pixels; cut the region first", r, p.Width, p.Height)
	}
	from := r.Min.Y*p.Stride + r.Min.X
	to := (r.Max.Y-1)*p.Stride + r.Max.X
	return Plane[T]{p.Pix[from:to:to], r.Dx(), r.Dy(), p.Stride}, nil
}

// maxSide is enough for any image, as Rows and Columns are US (PS3.3 C.7.6.3), and keeps sums over a row within
// 32 bits, sums over a plane within 64. In samples.
const maxSide = 1 << 16

func (p Plane[T]) check() error {
	if p.Width < 0 || p.Height < 0 || p.Width > maxSide || p.Height > maxSide {
		return fmt.Errorf("plane: %d x %d pixels; expected sides from 0 to %d; correct the size", p.Width, p.Height, maxSide)
	}
	if p.Stride < p.Width {
		return fmt.Errorf("plane: stride %d; expected at least the width of %d; correct the stride", p.Stride, p.Width)
	}
	if p.empty() {
		return nil
	}
	// By division, as the product of a wild stride could overflow.
	if p.Height > 1 && p.Stride > len(p.Pix)/(p.Height-1) || (p.Height-1)*p.Stride+p.Width > len(p.Pix) {
		return fmt.Errorf("plane: %d samples for %d rows of %d with stride %d; expected more; correct the size or the samples",
			len(p.Pix), p.Height, p.Width, p.Stride)
	}
	return nil
}

func (p Plane[T]) empty() bool { return p.Width == 0 || p.Height == 0 }

func (p Plane[T]) row(y int) []T {
	from := y * p.Stride
	return p.Pix[from : from+p.Width : from+p.Width]
}
