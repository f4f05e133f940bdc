package calibrate

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/interp"

	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
)

// fewest is the number of levels under which no curve is made.
const fewest = 5

// nodes is the number of places at which a fitted curve is worked out; between them it is interpolated.
const nodes = 384

// ErrNoCurve wraps every refusal to make a curve of readings.
var ErrNoCurve = errors.New("no curve can be made of these readings")

// Curve is a monitor's characteristic curve: luminance, ambient light in it, over the driving level.
type Curve struct {
	Bits     int // bit depth of the readings
	Light    response.Light
	Noise    response.Noise
	Points   []response.Point // the readings by level
	Warnings []Warning
	Exact    bool // the readings were taken as they are, by the spline of PS3.14 D.1

	spline   interp.NaturalCubic   // of luminance, where Exact
	index    interp.FritschButland // in JND
	spread   interp.PiecewiseLinear
	mixture  mixture
	variance []float64 // of each point, in JND squared
}

// NewCurve makes the curve of a monitor from readings over its driving levels.
//
// Where the repeatability in in.Noise is 0 (which is never assumed, so somebody said it) the readings are
// taken as they are: a natural cubic spline of luminance over the level, as in PS3.14 D.1. Else the curve
// runs through the noise: a Gaussian process in JND over the level, each reading weighed by its noise,
// the shape of the process weighed by the likelihood of the readings, the result made monotone.
//
// It refuses, wrapping ErrNoCurve, readings over P-values, readings through a ramp, fewer than five
// levels, and readings that do not rise from end to end; and whatever response.Evaluate refuses.
func NewCurve(in Input) (*Curve, error) {
	if in.Scale == readings.PValue {
		return nil, fmt.Errorf("readings: the levels are P-values, which go through a table; %w; expected driving levels; take the readings with the table out of the way", ErrNoCurve)
	}
	if in.Ramp != "" && in.Ramp != Identity {
		return nil, fmt.Errorf("readings: they were taken through the ramp %.16q; %w; expected the ramp %q; reset the ramp and take them again", in.Ramp, ErrNoCurve, Identity)
	}
	r, err := response.Evaluate(response.Input{Bits: in.Bits, Scale: in.Scale, Readings: in.Readings, Light: in.Light, Noise: in.Noise})
	if err != nil {
		return nil, err
	}
	if len(r.Points) < fewest {
		return nil, fmt.Errorf("readings: %d levels; %w; expected at least %d, better 18 or more; read more levels", len(r.Points), ErrNoCurve, fewest)
	}
	c := &Curve{Bits: in.Bits, Light: in.Light, Noise: in.Noise, Points: r.Points, Exact: in.Noise.Repeatability == 0}
	first, last := r.Points[0], r.Points[len(r.Points)-1]
	c.variance = c.variances(in.Readings)
	noise := math.Sqrt(c.variance[0] + c.variance[len(c.variance)-1])
	if rise := indexOf(float64(last.Luminance)) - indexOf(float64(first.Luminance)); rise <= 3*noise || rise < 1 {
		return nil, fmt.Errorf("readings: level %d reads %.4g cd/m2 and level %d %.4g with the ambient light; %w; expected a rise from dark to bright; check the order of the levels, the cable and the ambient light",
			first.Level, first.Luminance, last.Level, last.Luminance, ErrNoCurve)
	}
	if c.Exact {
		err = c.through()
	} else {
		err = c.smooth()
	}
	if err != nil {
		return nil, err
	}
	c.Warnings = c.concerns(in)
	return c, nil
}

// variances of the points, in JND squared, by the meter's noise.
func (c *Curve) variances(rs []readings.Reading) []float64 {
	inside := map[int]bool{}
	for _, r := range rs {
		if r.Role != readings.Drift && r.Ambient == readings.Included {
			inside[r.Level] = true
		}
	}
	out := make([]float64, len(c.Points))
	for i, p := range c.Points {
		read := float64(p.Luminance)
		if !inside[p.Level] && p.Emitted != nil {
			read = float64(*p.Emitted)
		}
		out[i] = c.readingVariance(float64(p.Luminance), read) / float64(p.Readings)
	}
	return out
}

// readingVariance is the variance in JND squared of one reading of read cd/m2 that stands for the
// luminance full.
func (c *Curve) readingVariance(full, read float64) float64 {
	n := c.Noise
	s := indexSlope(full)
	rounded := float64(n.Resolution) * float64(n.Resolution) / 12
	// A hundredth of a JND keeps the matrix sound where a reading of 0 has no noise.
	return s*s*(sq(n.Repeatability*read)+sq(float64(n.Floor))+rounded) + 1e-4
}

func sq(v float64) float64 { return v * v }

func (c *Curve) drives() []float64 {
	xs := make([]float64, len(c.Points))
	for i, p := range c.Points {
		xs[i] = float64(p.Level) / float64(c.top())
	}
	return xs
}

func (c *Curve) top() int { return 1<<c.Bits - 1 }

// through lays the spline of PS3.14 D.1 through the points.
func (c *Curve) through() error {
	ys := make([]float64, len(c.Points))
	for i, p := range c.Points {
		ys[i] = float64(p.Luminance)
	}
	if err := c.spline.Fit(c.drives(), ys); err != nil {
		return fmt.Errorf("readings: no spline: %w", err)
	}
	return nil
}

// samples are the points as the fit sees them.
func (c *Curve) samples() []sample {
	out := make([]sample, len(c.Points))
	for i, x := range c.drives() {
		out[i] = sample{x: x, y: indexOf(float64(c.Points[i].Luminance)), variance: c.variance[i]}
	}
	return out
}

func (c *Curve) smooth() error {
	c.mixture = smoothThrough(c.samples())
	if len(c.mixture) == 0 {
		return fmt.Errorf("readings: %w: no smooth curve fits; expected luminances that rise; check the readings", ErrNoCurve)
	}
	at := make([]float64, nodes)
	for i := range at {
		at[i] = math.Pow(float64(i)/(nodes-1), 1.5) // closer together where a panel bends most
	}
	mean, variance := c.mixture.curve(at)
	weights := make([]float64, nodes)
	spread := make([]float64, nodes)
	for i, v := range variance {
		weights[i] = 1 / (v + 1e-6)
		spread[i] = math.Sqrt(v)
	}
	if err := c.index.Fit(at, monotone(mean, weights)); err != nil {
		return fmt.Errorf("readings: no curve: %w", err)
	}
	if err := c.spread.Fit(at, spread); err != nil {
		return fmt.Errorf("readings: no band: %w", err)
	}
	return nil
}

// At is the luminance at a driving level, ambient light in it. A level outside 0 to 1 takes the nearer end.
func (c *Curve) At(d Drive) photometry.CdM2 { return photometry.CdM2(c.luminance(float64(d))) }

func (c *Curve) luminance(x float64) float64 {
	x = min(max(x, 0), 1)
	if c.Exact {
		return c.spline.Predict(x)
	}
	return luminanceOf(c.index.Predict(x))
}

// Band is the luminance at a driving level with its 95 % interval from reading noise and from what the
// readings leave open between them. Where the readings were taken as they are it has no width.
func (c *Curve) Band(d Drive) Band {
	x := min(max(float64(d), 0), 1)
	l := c.luminance(x)
	if c.Exact {
		return Band{photometry.CdM2(l), photometry.CdM2(l), photometry.CdM2(l)}
	}
	j, u := c.index.Predict(x), 1.96*c.spread.Predict(x)
	return Band{photometry.CdM2(l), photometry.CdM2(max(0, luminanceOf(j-u))), photometry.CdM2(luminanceOf(j + u))}
}

// levels are the luminances of all driving levels of a bit depth.
func (c *Curve) levels(bits int) []float64 {
	top := 1<<bits - 1
	out := make([]float64, top+1)
	for i := range out {
		out[i] = c.luminance(float64(i) / float64(top))
	}
	return out
}
