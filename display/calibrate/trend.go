package calibrate

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// trend is the curve that the smooth part of a fit is laid over.
type trend interface {
	place(xs []float64) placed
}

// placed is a trend at some places: its values in JND, and the directions in which it may still move there,
// each scaled to the standard deviation that it is given beforehand.
type placed struct {
	xs, values []float64
	moves      [][]float64
}

// slope is the plainest trend: a straight line, free to move up and down and to tilt.
type slope struct{ middle, rise float64 }

func newSlope(samples []sample) slope {
	first, last := samples[0].y, samples[len(samples)-1].y
	return slope{middle: (first + last) / 2, rise: math.Abs(last-first) + 1}
}

func (s slope) place(xs []float64) placed {
	p := placed{xs: xs, values: make([]float64, len(xs)), moves: make([][]float64, len(xs))}
	for i, x := range xs {
		p.values[i] = s.middle + s.rise*(x-0.5)
		p.moves[i] = []float64{s.rise, s.rise * (x - 0.5)}
	}
	return p
}

// law is a power law of luminance, black + (white - black) x^exponent. With a foot, luminance runs straight
// from black to the law, which then need not lead to black itself. With pieces, it is what a table in the
// panel makes of the law: as many equal pieces, straight in luminance.
type law struct {
	// Logarithms of black, white and exponent, of how far the law, carried on to level 0, lies above black,
	// and of the level where the foot ends.
	constants [5]float64
	spread    [5]float64 // standard deviation that each constant has beforehand
	foot      bool
	pieces    int
}

// lawSpread: black and white are read, the exponent is not.
var lawSpread = [5]float64{1, 0.5, 0.5, 0.5}

// withFoot is the law with a foot that ends somewhere between two levels.
func (c law) withFoot(from, to float64) law {
	c.foot = true
	c.constants[4] = math.Log((from + to) / 2)
	c.spread[4] = (to - from) / (from + to) / 2
	return c
}

// inPieces is the law through a table of so many equal pieces.
func (c law) inPieces(n int) law {
	c.pieces = n
	return c
}

func (c law) free() int {
	if c.foot {
		return 5
	}
	return 3
}

// worked is a law with its constants worked out.
type worked struct {
	black, white, exponent, start, foot, knee float64
	pieces                                    float64
}

func (c law) work() worked {
	w := worked{black: math.Exp(c.constants[0]), white: math.Exp(c.constants[1]), exponent: math.Exp(c.constants[2]), pieces: float64(c.pieces)}
	w.start = w.black
	if c.foot {
		w.start *= math.Exp(c.constants[3])
		w.foot = math.Exp(c.constants[4])
		w.knee = w.start + (w.white-w.start)*math.Pow(w.foot, w.exponent)
	}
	return w
}

// index is the index of the luminance at x.
func (w worked) index(x float64) float64 {
	switch {
	case w.pieces > 0:
		from := math.Floor(min(x*w.pieces, w.pieces-1))
		a, b := math.Pow(from/w.pieces, w.exponent), math.Pow((from+1)/w.pieces, w.exponent)
		return indexOf(w.black + (w.white-w.black)*(a+(b-a)*(x*w.pieces-from)))
	case x < w.foot:
		return indexOf(w.black + (w.knee-w.black)*x/w.foot)
	}
	return indexOf(w.start + (w.white-w.start)*math.Pow(x, w.exponent))
}

func (c law) place(xs []float64) placed {
	p := placed{xs: xs, values: make([]float64, len(xs)), moves: make([][]float64, len(xs))}
	here := c.work()
	for i, x := range xs {
		p.values[i] = here.index(x)
		p.moves[i] = make([]float64, c.free())
	}
	const h = 1e-4 // the law bends over changes of about 1
	for k := range c.free() {
		up, down := c, c
		up.constants[k] += h
		down.constants[k] -= h
		above, below := up.work(), down.work()
		for i, x := range xs {
			p.moves[i][k] = c.spread[k] * (above.index(x) - below.index(x)) / (2 * h)
		}
	}
	return p
}

// plainLaw is the power law without a foot that misses the samples least.
func plainLaw(samples []sample) law {
	ends := func(y float64) float64 { return math.Log(max(luminanceOf(y), 1e-4)) }
	c := law{constants: [5]float64{ends(samples[0].y), ends(samples[len(samples)-1].y)}, spread: lawSpread}
	best, found := math.Inf(1), c
	for g := -0.5; g < 1.7; g += 0.1 {
		c.constants[2] = g
		if m := c.misfit(samples); m < best {
			best, found = m, c
		}
	}
	return found.settle(samples)
}

// slack is what a law is let to miss a sample by, in JND squared, so that a few exact samples of a panel
// that follows no power law do not rule the rest.
const slack = 4

func (c law) misfit(samples []sample) float64 {
	here := c.work()
	sum := 0.0
	for _, p := range samples {
		d := p.y - here.index(p.x)
		sum += d * d / (p.variance + slack)
	}
	return sum
}

// settle moves the constants to where the law misses the samples least, by damped Gauss-Newton steps.
func (c law) settle(samples []sample) law {
	best := c.misfit(samples)
	for range 12 {
		next, ok := c.towards(samples)
		if !ok {
			break
		}
		m := next.misfit(samples)
		if !(m < best-1e-3) {
			break
		}
		best, c = m, next
	}
	return c
}

func (c law) towards(samples []sample) (law, bool) {
	n := c.free()
	a := blas64.Symmetric{N: n, Stride: n, Data: make([]float64, n*n), Uplo: blas.Upper}
	step := make([]float64, n)
	at := c.place(places(samples))
	for s, p := range samples {
		w := 1 / (p.variance + slack)
		d := p.y - at.values[s]
		for i, m := range at.moves[s] {
			step[i] += w * m * d
			for j := i; j < n; j++ {
				a.Data[i*n+j] += w * m * at.moves[s][j]
			}
		}
	}
	for i := range n {
		a.Data[i*n+i] = a.Data[i*n+i]*1.01 + 1e-3
	}
	root, ok := lapack64.Potrf(a)
	if !ok {
		return c, false
	}
	lapack64.Potrs(root, blas64.General{Rows: n, Cols: 1, Stride: 1, Data: step})
	for i, v := range step {
		c.constants[i] += c.spread[i] * v
	}
	return c, true
}

func places(samples []sample) []float64 {
	xs := make([]float64, len(samples))
	for i, p := range samples {
		xs[i] = p.x
	}
	return xs
}
