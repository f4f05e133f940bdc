package patterns

import (
	"errors"
	"fmt"
	"math/bits"
	"slices"
)

// ErrSpec marks every refusal of a Spec: the sheet asked for cannot be drawn as asked.
var ErrSpec = errors.New("not drawable")

// The sizes that the sheets are laid out for, in pixels: the longer side, the shorter side, and how many
// times longer the one may be.
const (
	minLong, maxLong   = 800, 8192
	minShort, maxShort = 600, 4320
	maxAspect          = 4
)

// Step is a small difference of level and what to call it.
type Step struct {
	Low, High uint16 // levels: what lies around, and what stands out; High may be the darker one
	Label     string // written beside it, such as "2.1 JND"; empty: the two levels
}

// Spec says how a sheet is to be drawn. Width, Height and Bits are always needed. The rest is refused by a
// sheet that has no use for it: see Info.Takes.
type Spec struct {
	Width, Height int // pixels; 800x600 to 8192x4320 either way up, no side over 4 times the other
	Bits          int // depth, 8 to 16

	Field     *uint16    // level of the part that is measured or looked at; nil: the sheet's own
	Surround  *uint16    // level of what lies around it; nil: the sheet's own
	Steps     []Step     // the small differences to show, at most Info.MaxSteps; nil: the sheet's own
	Diameters []int      // of the disks, in pixels; nil: the sheet's own
	Places    int        // 5, 9, 13 or 25; 0 means 9
	Place     int        // the one place to mark, 1 to Places; 0: all of them
	Frame     int        // number of the picture in a moving sheet
	Seed      uint64     // picks the arrangement where it must not be known by heart
	Colour    *[3]uint16 // levels of red, green and blue; nil: the sheet's own
}

// Takes tells which fields of a Spec a sheet has a use for, beyond size and depth.
type Takes uint

// The fields of Spec, as bits of Takes.
const (
	TakesField Takes = 1 << iota
	TakesSurround
	TakesSteps
	TakesDiameters
	TakesPlaces
	TakesFrame
	TakesSeed
	TakesColour
)

var takesNames = [...]string{
	"a field level", "a surround level", "steps", "diameters", "places", "a frame number", "a seed", "a colour",
}

// given is what the Spec sets beyond size and depth.
func (s *Spec) given() Takes {
	var t Takes
	for i, set := range [...]bool{
		s.Field != nil, s.Surround != nil, s.Steps != nil, s.Diameters != nil, s.Places != 0 || s.Place != 0,
		s.Frame != 0, s.Seed != 0, s.Colour != nil,
	} {
		if set {
			t |= 1 << i
		}
	}
	return t
}

// check refuses what the sheet cannot draw, with one line that says what would do.
func (s *Spec) check(in *Info) error {
	refuse := func(format string, args ...any) error {
		return fmt.Errorf("pattern %s: %s (%w)", in.Name, fmt.Sprintf(format, args...), ErrSpec)
	}
	long, short := max(s.Width, s.Height), min(s.Width, s.Height)
	if long < minLong || long > maxLong || short < minShort || short > maxShort || long > maxAspect*short {
		return refuse("size %dx%d; expected %dx%d to %dx%d, upright or lying, at most %d times as long as wide; "+
			"give the native size of the monitor",
			s.Width, s.Height, minLong, minShort, maxLong, maxShort, maxAspect)
	}
	if s.Bits < 8 || s.Bits > 16 {
		return refuse("%d bits; expected 8 to 16; give the depth of the output", s.Bits)
	}
	if extra := s.given() &^ in.Takes; extra != 0 {
		return refuse("given %s; expected none on this sheet; leave that out", takesNames[bits.TrailingZeros(uint(extra))])
	}
	top := uint16(1<<s.Bits - 1)
	if v := s.highest(); v > top {
		return refuse("level %d; expected 0 to %d at %d bits; give levels of that depth", v, top, s.Bits)
	}
	if s.Steps != nil && (len(s.Steps) == 0 || len(s.Steps) > in.MaxSteps) {
		return refuse("%d steps; expected 1 to %d; give fewer, or none for the sheet's own", len(s.Steps), in.MaxSteps)
	}
	for i := range s.Steps {
		if st := &s.Steps[i]; st.Low == st.High {
			return refuse("step %d has level %d twice; expected two levels; leave the step out", i+1, st.Low)
		}
	}
	if s.Places != 0 && !slices.Contains(placeCounts[:], s.Places) {
		return refuse("%d places; expected 5, 9, 13 or 25; give one of these", s.Places)
	}
	if n := s.places(); s.Place < 0 || s.Place > n {
		return refuse("place %d; expected 1 to %d, or 0 for all; give one of these", s.Place, n)
	}
	if s.Diameters != nil {
		if len(s.Diameters) == 0 || len(s.Diameters) > maxDiameters {
			return refuse("%d diameters; expected 1 to %d; give fewer, or none for the sheet's own",
				len(s.Diameters), maxDiameters)
		}
		most := maxDiameter(s)
		for _, d := range s.Diameters {
			if d < 1 || d > most {
				return refuse("a disk of %d pixels; expected 1 to %d at this size and number of steps; "+
					"give a smaller one or fewer steps", d, most)
			}
		}
	}
	return nil
}

// highest is the highest level that the Spec names.
func (s *Spec) highest() uint16 {
	var v uint16
	for _, l := range [...]*uint16{s.Field, s.Surround} {
		if l != nil {
			v = max(v, *l)
		}
	}
	for i := range s.Steps {
		v = max(v, s.Steps[i].Low, s.Steps[i].High)
	}
	if s.Colour != nil {
		v = max(v, s.Colour[0], s.Colour[1], s.Colour[2])
	}
	return v
}

func (s *Spec) places() int {
	if s.Places == 0 {
		return 9
	}
	return s.Places
}
