package gsdf

import (
	"math"
	"sync"
)

// The inverse is cut into pieces of equal width within each power of two, so that the exponent
// and the leading mantissa bits of a luminance number its piece and no logarithm is needed. The
// inverse is least smooth in the first pieces, near index 1. A polynomial of degree 7 over a 32nd
// of a power of two follows it there to about 3e-11 JND, which is as much as the equation itself
// loses to rounding at the top; its eight coefficients fill one cache line.
const (
	pieceBits    = 5
	coefficients = 8

	mantissaBits = 52
	shift        = mantissaBits - pieceBits
	fractionMask = 1<<shift - 1
)

// inverse is the numeric inverse of the equation, tabulated.
type inverse struct {
	min, max float64 // ends of the range in cd/m2
	first    uint64  // number of the piece that holds min
	pieces   [][coefficients]float64
}

// inverted builds the inverse at its first use, so that a program that never asks for an index
// does not wait for it. It holds constants of the standard only, never state.
var inverted = sync.OnceValue(newInverse)

func newInverse() *inverse {
	inv := &inverse{min: luminance(float64(First)), max: luminance(float64(Last))}
	inv.first = math.Float64bits(inv.min) >> shift
	last := math.Float64bits(inv.max) >> shift
	inv.pieces = make([][coefficients]float64, last-inv.first+1)
	fit := newFit()
	x := math.Log(float64(First))
	for i := range inv.pieces {
		from := math.Float64frombits((inv.first + uint64(i)) << shift)
		to := math.Float64frombits((inv.first + uint64(i) + 1) << shift)
		var at [coefficients]float64
		for n, t := range fit.nodes {
			x = solve(math.Log10(from+(to-from)*(t+1)/2), x)
			at[n] = math.Exp(x)
		}
		inv.pieces[i] = fit.polynomial(at)
	}
	return inv
}

// index is the index of a luminance between min and max.
func (inv *inverse) index(l float64) float64 {
	bits := math.Float64bits(l)
	c := &inv.pieces[bits>>shift-inv.first]
	// The mantissa bits that do not number the piece give the place in it, from -1 to 1. The
	// conversion is exact.
	t := float64(int64(bits&fractionMask)-1<<(shift-1)) * (1.0 / (1 << (shift - 1)))
	t2 := t * t
	t4 := t2 * t2
	j := (c[0] + c[1]*t) + (c[2]+c[3]*t)*t2 + ((c[4]+c[5]*t)+(c[6]+c[7]*t)*t2)*t4
	// Rounding may carry a luminance next to an end of the range past the index of that end.
	return min(max(j, float64(First)), float64(Last))
}

// solve finds the x at which the equation gives log10L, by Newton's method from a start nearby.
// The equation rises with x and is nearly straight over the width of a piece.
func solve(log10L, start float64) float64 {
	x := start
	for range 20 {
		y, slope := equation(x)
		step := (y - log10L) / slope
		x -= step
		if math.Abs(step) < 1e-14 {
			break
		}
	}
	return x
}

// fit turns the values of a function at the Chebyshev nodes of -1 to 1 into the coefficients of
// the polynomial through them, in powers of the place.
type fit struct {
	nodes [coefficients]float64
	// weights[p][n] is the share of the value at node n in the coefficient of power p.
	weights [coefficients][coefficients]float64
}

func newFit() *fit {
	// chebyshev[k] holds the Chebyshev polynomial of degree k in powers of the place.
	var chebyshev [coefficients][coefficients]float64
	chebyshev[0][0] = 1
	chebyshev[1][1] = 1
	for k := 2; k < coefficients; k++ {
		for p := range coefficients {
			chebyshev[k][p] = -chebyshev[k-2][p]
			if p > 0 {
				chebyshev[k][p] += 2 * chebyshev[k-1][p-1]
			}
		}
	}
	f := &fit{}
	for n := range f.nodes {
		angle := math.Pi * (1 - (float64(n)+0.5)/coefficients)
		f.nodes[n] = math.Cos(angle)
		for k := range coefficients {
			share := 2.0 / coefficients * math.Cos(float64(k)*angle)
			if k == 0 {
				share /= 2
			}
			for p := range coefficients {
				f.weights[p][n] += share * chebyshev[k][p]
			}
		}
	}
	return f
}

// polynomial works on the differences from the first value: they are small, and so are the
// roundings that the weights magnify.
func (f *fit) polynomial(at [coefficients]float64) (c [coefficients]float64) {
	for p := range c {
		for n := range at {
			c[p] += f.weights[p][n] * (at[n] - at[0])
		}
	}
	c[0] += at[0]
	return c
}
