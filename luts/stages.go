package luts

import (
	"fmt"
	"math"
	"strings"
)

// Stored describes the stored values of an image: the low Bits bits of each sample, two's complement where
// Signed. Whatever the bits above hold is not looked at.
type Stored struct {
	Bits   int // Bits Stored, 1 to 16
	Signed bool
}

// Min is the least stored value.
func (s Stored) Min() int {
	if s.Signed {
		return -1 << (s.Bits - 1)
	}
	return 0
}

// Max is the greatest stored value.
func (s Stored) Max() int { return s.Min() + top(s.Bits) }

// Value is the stored value that a sample holds.
func (s Stored) Value(sample uint16) int {
	v := int(sample) & top(s.Bits)
	if v > s.Max() {
		v -= 1 << s.Bits
	}
	return v
}

func (s Stored) check() error {
	if s.Bits < 1 || s.Bits > 16 {
		return fmt.Errorf("stored values: %d bits; expected 1 to 16; take Bits Stored of the image", s.Bits)
	}
	return nil
}

// span is the range of values that a stage gives out.
type span struct{ low, high float64 }

// Modality is the first stage, from stored values to values with a meaning such as HU (PS3.3 C.11.1): a
// [Rescale] or a [Lookup]. A nil Modality is an identity.
type Modality interface {
	// modality gives the stage's function and the range of its results over the stored values.
	modality(stored span) (func(float64) float64, span, error)
}

// Rescale is the modality stage Slope * stored value + Intercept. Both must be finite, Slope not 0.
type Rescale struct{ Slope, Intercept float64 }

func (r Rescale) modality(stored span) (func(float64) float64, span, error) {
	// The conversion keeps processors that can from joining both operations into one with a single rounding.
	f := func(x float64) float64 { return float64(r.Slope*x) + r.Intercept }
	ends := span{min(f(stored.low), f(stored.high)), max(f(stored.low), f(stored.high))}
	switch {
	case !finite(r.Slope) || r.Slope == 0:
		return nil, span{}, fmt.Errorf("modality: rescale slope %g; expected a number other than 0; correct the slope", r.Slope)
	case !finite(r.Intercept):
		return nil, span{}, fmt.Errorf("modality: rescale intercept %g; expected a finite number; correct the intercept", r.Intercept)
	case !(ends.low < ends.high) || !finite((ends.high-ends.low)*math.MaxUint16):
		return nil, span{}, fmt.Errorf("modality: slope %g and intercept %g give values from %g to %g; expected a range that double precision can hold; correct them",
			r.Slope, r.Intercept, ends.low, ends.high)
	}
	return f, ends, nil
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }

// VOI is the second stage, which picks the values of interest (PS3.3 C.11.2): a [Windowing] or a [Lookup]. A
// nil VOI is an identity: the whole range of the modality stage.
type VOI interface {
	// voi gives the stage's function with results from 0 to ymax.
	voi(in span, ymax float64) (func(float64) float64, error)
}

// Function is a VOI LUT Function, by its defined term in PS3.3 C.11.2.1.3.
type Function string

// The VOI LUT Functions. The empty Function is LINEAR.
const (
	Linear      Function = "LINEAR"
	LinearExact Function = "LINEAR_EXACT"
	Sigmoid     Function = "SIGMOID"
)

// ParseFunction reads the name of a function in large or small letters, with "-" or "_". No name means LINEAR.
func ParseFunction(name string) (Function, error) {
	switch f := Function(strings.ToUpper(strings.ReplaceAll(name, "-", "_"))); f {
	case "":
		return Linear, nil
	case Linear, LinearExact, Sigmoid:
		return f, nil
	}
	return "", fmt.Errorf("VOI: function %s; expected linear, linear-exact or sigmoid; name one of them", quote(name))
}

// Windowing is a window: Center and Width in the unit of the modality stage's values, both finite. Width is at
// least 1 with LINEAR, else above 0; neither has an upper limit.
type Windowing struct {
	Function      Function
	Center, Width float64
}

// WindowOver is the LINEAR window that spreads exactly the values from low to high (note in C.11.2.1.2.1),
// where low is at most high. Where both are one value, that becomes the minimum and all above the maximum.
func WindowOver(low, high float64) Windowing {
	return Windowing{Linear, (low + high + 1) / 2, high - low + 1}
}

func (w Windowing) check() error {
	f := w.Function
	if f == "" {
		f = Linear
	}
	switch {
	case f != Linear && f != LinearExact && f != Sigmoid:
		return fmt.Errorf("VOI: function %s; expected LINEAR, LINEAR_EXACT or SIGMOID; name one of them", quote(string(f)))
	case !finite(w.Center):
		return fmt.Errorf("VOI: window center %g; expected a finite number; correct the center", w.Center)
	case !finite(w.Width):
		return fmt.Errorf("VOI: window width %g; expected a finite number; correct the width", w.Width)
	case f == Linear && w.Width < 1:
		return fmt.Errorf("VOI: window width %g; expected at least 1 with LINEAR; widen the window or take LINEAR_EXACT", w.Width)
	case w.Width <= 0:
		return fmt.Errorf("VOI: window width %g; expected above 0 with %s; widen the window", w.Width, f)
	}
	return nil
}

// voi has the formulas of C.11.2.1.2.1, C.11.2.1.3.1 and C.11.2.1.3.2 as they are printed, with ymin 0.
func (w Windowing) voi(_ span, ymax float64) (func(float64) float64, error) {
	if err := w.check(); err != nil {
		return nil, err
	}
	c, width := w.Center, w.Width
	switch w.Function {
	case LinearExact:
		return func(x float64) float64 {
			switch {
			case x <= c-width/2:
				return 0
			case x > c+width/2:
				return ymax
			}
			return ((x-c)/width + 0.5) * ymax
		}, nil
	case Sigmoid:
		return func(x float64) float64 { return ymax / (1 + math.Exp(-4*(x-c)/width)) }, nil
	}
	return func(x float64) float64 {
		switch {
		case x <= c-0.5-(width-1)/2:
			return 0
		case x > c-0.5+(width-1)/2:
			return ymax
		}
		return ((x-(c-0.5))/(width-1) + 0.5) * ymax
	}, nil
}

// Presentation is the third stage, which gives P-values (PS3.3 C.11.6): a [Shape] or a [Lookup]. A nil
// Presentation is IDENTITY.
type Presentation interface {
	// presentation gives the stage's function with results from 0 to pmax, and the upper end of its input.
	presentation(pmax float64) (func(float64) float64, float64, error)
}

// Shape is a Presentation LUT Shape. INVERSE gives the lowest value the highest luminance: it is what
// MONOCHROME1 asks for, once, after the window.
type Shape string

// The shapes of the softcopy presentation stage.
const (
	Identity Shape = "IDENTITY"
	Inverse  Shape = "INVERSE"
)

func (s Shape) presentation(pmax float64) (func(float64) float64, float64, error) {
	switch s {
	case Identity:
		return func(x float64) float64 { return x }, pmax, nil
	case Inverse:
		return func(x float64) float64 { return pmax - x }, pmax, nil
	}
	return nil, 0, fmt.Errorf("presentation: shape %s; expected IDENTITY or INVERSE; name one of them", quote(string(s)))
}
