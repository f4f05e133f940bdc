package response

import (
	"fmt"
	"math"

	"evenstep/display/photometry"
)

// illuminanceSpread is the relative standard uncertainty taken for an illuminance meter of which
// nothing is stated: within 5 % with equal chance (the accuracy usually asked of such meters; from memory).
var illuminanceSpread = 0.05 / math.Sqrt(3)

// DarkRoom is a room that was stated to be dark: no ambient light.
func DarkRoom() Light {
	var none photometry.CdM2
	return Light{Source: AmbientDarkRoom, Ambient: &none}
}

// MeasuredAmbient is a room light of which the reflected luminance was measured. The illuminance may
// be nil; where it is known, Rd follows from both.
func MeasuredAmbient(ambient photometry.CdM2, illuminance *photometry.Lux) Light {
	l := Light{Source: AmbientMeasured, Ambient: &ambient, Illuminance: illuminance}
	if illuminance != nil && *illuminance > 0 && ambient > 0 {
		rd := photometry.PerLux(float64(ambient) / float64(*illuminance))
		l.Rd = &rd
	}
	return l
}

// FromIlluminance is a room light of which the illuminance on the screen was measured. Where rd is
// nil the default is taken and marked as assumed.
func FromIlluminance(e photometry.Lux, rd *photometry.PerLux) Light {
	l := Light{Source: AmbientFromRd, Illuminance: &e, Rd: rd}
	if rd == nil {
		assumed := RdDefault
		l.Source, l.Rd, l.RdAssumed = AmbientAssumedRd, &assumed, true
	}
	ambient := photometry.Reflected(e, *l.Rd)
	l.Ambient = &ambient
	return l
}

// AmbientInReadings is a room light of unknown size that every reading holds.
func AmbientInReadings() Light { return Light{Source: AmbientInside} }

// extremes returns the room light at the ends of what an assumed Rd may be. It is empty where
// nothing is assumed.
func (l Light) extremes() []Light {
	if !l.RdAssumed || l.Illuminance == nil {
		return nil
	}
	var ends []Light
	for _, rd := range []photometry.PerLux{RdLow, RdHigh} {
		end := l
		ambient := photometry.Reflected(*l.Illuminance, rd)
		end.Ambient, end.RdAssumed = &ambient, false
		ends = append(ends, end)
	}
	return ends
}

// withIlluminance is the same room with another illuminance on the screen.
func (l Light) withIlluminance(e photometry.Lux, rd photometry.PerLux) Light {
	ambient := photometry.Reflected(e, rd)
	return Light{Source: l.Source, Ambient: &ambient, Illuminance: &e, Rd: &rd}
}

// spread is the standard uncertainty of Lamb itself, in cd/m2, without what an assumed Rd adds.
func (l Light) spread(n Noise) float64 {
	if l.Ambient == nil {
		return 0
	}
	switch l.Source {
	case AmbientMeasured:
		return math.Sqrt(n.variance(float64(*l.Ambient)))
	case AmbientFromRd, AmbientAssumedRd:
		return illuminanceSpread * float64(*l.Ambient)
	}
	return 0
}

// variance is the variance of one reading of luminance l: s^2 = (r l)^2 + a^2.
func (n Noise) variance(l float64) float64 {
	r, a := n.Repeatability*l, float64(n.Floor)
	return r*r + a*a
}

func (n Noise) check() error {
	for _, f := range []struct {
		name  string
		value float64
		max   float64
	}{
		{"repeatability", n.Repeatability, 0.2},
		{"noise floor", float64(n.Floor), 100},
		{"gain uncertainty", n.Gain, 0.5},
		{"resolution", float64(n.Resolution), 100},
		{"offset", float64(n.Offset), 100},
	} {
		if math.IsNaN(f.value) || f.value < 0 || f.value > f.max {
			return fmt.Errorf("meter: %s is %v; expected 0 to %v (fractions, or cd/m2); give the figure from the meter's certificate", f.name, f.value, f.max)
		}
	}
	return nil
}
