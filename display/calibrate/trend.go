package calibrate

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// trend is the curve that the smooth part of a fit is laid over: its value in JND, and the directions in
// which it may still move, each scaled to the standard deviation that it is given beforehand.
type trend interface {
	value(x float64) float64
	directions(x float64) []float64
}

// placed is a trend at some places.
type placed struct {
	xs, values []float64
	moves      [][]float64
}

func place(t trend, xs []float64) placed {
	p := placed{xs: xs, values: make([]float64, len(xs)), moves: make([][]float64, len(xs))}
	for i, x := range xs {
		p.values[i] = t.value(x)
		p.moves[i] = t.directions(x)
	}
	return p
}

// level is the plainest trend: one index all over, free to move up and down and to tilt.
type level struct{ middle, rise float64 }

func newLevel(samples []sample) level {
	first, last := samples[0].y, samples[len(samples)-1].y
	return level{middle: (first + last) / 2, rise: math.Abs(last-first) + 1}
}

func (l level) value(x float64) float64        { return l.middle + l.rise*(x-0.5) }
func (l level) directions(x float64) []float64 { return []float64{l.rise, l.rise * (x - 0.5)} }

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

func (c law) luminance(x float64) float64 {
	black, white, exponent := math.Exp(c.constants[0]), math.Exp(c.constants[1]), math.Exp(c.constants[2])
	switch {
	case c.pieces > 0:
		n := float64(c.pieces)
		from := math.Floor(min(x*n, n-1))
		a, b := math.Pow(from/n, exponent), math.Pow((from+1)/n, exponent)
		return black + (white-black)*(a+(b-a)*(x*n-from))
	case !c.foot:
		return black + (white-black)*math.Pow(x, exponent)
	}
	start := black * math.Exp(c.constants[3])
	foot := math.Exp(c.constants[4])
	if x >= foot {
		return start + (white-start)*math.Pow(x, exponent)
	}
	knee := start + (white-start)*math.Pow(foot, exponent)
	return black + (knee-black)*x/foot
}

func (c law) value(x float64) float64 { return indexOf(c.luminance(x)) }

func (c law) directions(x float64) []float64 {
	out := make([]float64, c.free())
	const h = 1e-4 // the law bends over changes of about 1
	for i := range out {
		up, down := c, c
		up.constants[i] += h
		down.constants[i] -= h
		out[i] = c.spread[i] * (up.value(x) - down.value(x)) / (2 * h)
	}
	return out
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
	sum := 0.0
	for _, p := range samples {
		d := p.y - c.value(p.x)
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
	a := mat.NewSymDense(n, nil)
	b := mat.NewVecDense(n, nil)
	for _, p := range samples {
		m := c.directions(p.x)
		w := 1 / (p.variance + slack)
		d := p.y - c.value(p.x)
		for i := range m {
			b.SetVec(i, b.AtVec(i)+w*m[i]*d)
			for j := i; j < n; j++ {
				a.SetSym(i, j, a.At(i, j)+w*m[i]*m[j])
			}
		}
	}
	for i := range n {
		a.SetSym(i, i, a.At(i, i)*1.01+1e-3)
	}
	var chol mat.Cholesky
	if !chol.Factorize(a) {
		return c, false
	}
	var step mat.VecDense
	if err := chol.SolveVecTo(&step, b); err != nil {
		return c, false
	}
	for i := range n {
		c.constants[i] += c.spread[i] * step.AtVec(i)
	}
	return c, true
}
