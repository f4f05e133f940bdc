// Package gsdf is the Grayscale Standard Display Function of DICOM PS3.14 section 7.1 and its
// inverse, and nothing else. The printed equation is the truth; the index of a luminance is its
// numeric inverse, not the polynomial that the standard prints beside it.
//
// The two printed functions are not exact inverses of each other. Fed with the luminance of index
// j, the printed polynomial returns j with an error between -0.092 (j = 1023) and +0.051 (j = 2).
// An index from this package can differ by that much from one worked out by the polynomial.
// Nor does Table B-1 hold the rounded values of the equation: it lies up to 2.2e-5 of the
// luminance above it. L(1) is 0.04998 cd/m2 and L(1023) is 3993.33 cd/m2, so the range that the
// standard names, 0.05 to 4000 cd/m2, is not quite covered.
package gsdf

import (
	"errors"
	"fmt"
	"math"

	"evenstep/display/photometry"
)

// JND is an index of just-noticeable differences on the standard function, real, 1 to 1023.
type JND float64

// First and Last are the ends of the range in which the standard function is defined.
const (
	First JND = 1
	Last  JND = 1023
)

// The reasons for which an argument is refused. Test for them with errors.Is.
var (
	// ErrBelow says that an index or a luminance lies below the range of the standard function.
	ErrBelow = errors.New("below the range of the standard display function")
	// ErrAbove says that an index or a luminance lies above the range of the standard function.
	ErrAbove = errors.New("above the range of the standard display function")
	// ErrNaN says that an index or a luminance is not a number.
	ErrNaN = errors.New("not a number")
)

// MinLuminance is the luminance of the first index, 0.04998 cd/m2.
func MinLuminance() photometry.CdM2 { return photometry.CdM2(luminance(float64(First))) }

// MaxLuminance is the luminance of the last index, 3993.33 cd/m2.
func MaxLuminance() photometry.CdM2 { return photometry.CdM2(luminance(float64(Last))) }

// Luminance is the luminance that the equation of PS3.14 section 7.1 gives to the index j, which
// need not be whole. An index outside First to Last is refused with ErrBelow or ErrAbove, and one
// that is not a number with ErrNaN.
func Luminance(j JND) (photometry.CdM2, error) {
	switch {
	case j >= First && j <= Last:
		return photometry.CdM2(luminance(float64(j))), nil
	case j < First:
		return 0, fmt.Errorf("gsdf: index %v is %w, give %v to %v", j, ErrBelow, First, Last)
	case j > Last:
		return 0, fmt.Errorf("gsdf: index %v is %w, give %v to %v", j, ErrAbove, First, Last)
	default:
		return 0, fmt.Errorf("gsdf: index is %w, give %v to %v", ErrNaN, First, Last)
	}
}

// Index is the index whose luminance by the equation of PS3.14 section 7.1 is l: the inverse of
// Luminance, exact to better than 1e-9 JND. A luminance outside MinLuminance to MaxLuminance is
// refused with ErrBelow or ErrAbove, never extrapolated, and one that is not a number with ErrNaN.
// It allocates nothing unless it refuses.
func Index(l photometry.CdM2) (JND, error) {
	inv := inverted()
	v := float64(l)
	if v > inv.min && v < inv.max {
		return JND(inv.index(v)), nil
	}
	return end(v, inv)
}

// end answers for the two ends of the range, exactly, and refuses all that lies beyond them.
func end(l float64, inv *inverse) (JND, error) {
	switch {
	case l == inv.min:
		return First, nil
	case l == inv.max:
		return Last, nil
	case l < inv.min:
		return 0, fmt.Errorf("gsdf: luminance %v cd/m2 is %w, give %.6f to %.1f cd/m2", l, ErrBelow, inv.min, inv.max)
	case l > inv.max:
		return 0, fmt.Errorf("gsdf: luminance %v cd/m2 is %w, give %.6f to %.1f cd/m2", l, ErrAbove, inv.min, inv.max)
	default:
		return 0, fmt.Errorf("gsdf: luminance is %w, give %.6f to %.1f cd/m2", ErrNaN, inv.min, inv.max)
	}
}

// luminance is the equation of PS3.14 section 7.1 in cd/m2, with no check of its range.
func luminance(j float64) float64 {
	q, _ := equation(math.Log(j))
	return math.Exp(q * math.Ln10)
}

// equation is the decimal logarithm of the luminance at x, the natural logarithm of the index,
// and its derivative by x. PS3.14 section 7.1; the letters are those of the standard.
func equation(x float64) (log10L, slope float64) {
	const (
		a = -1.3011877
		b = -2.5840191e-2
		c = 8.0242636e-2
		d = -1.0320229e-1
		e = 1.3646699e-1
		f = 2.8745620e-2
		g = -2.5468404e-2
		h = -3.1978977e-3
		k = 1.2992634e-4
		m = 1.3635334e-3
	)
	num := a + x*(c+x*(e+x*(g+x*m)))
	den := 1 + x*(b+x*(d+x*(f+x*(h+x*k))))
	dnum := c + x*(2*e+x*(3*g+x*4*m))
	dden := b + x*(2*d+x*(3*f+x*(4*h+x*5*k)))
	log10L = num / den
	return log10L, (dnum - log10L*dden) / den
}
