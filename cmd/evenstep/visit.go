package main

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"github.com/spf13/cobra"

	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
)

// visitFlags are the flags that say what a readings file does not: the room light and the meter.
type visitFlags struct {
	ambient, illuminance, rd  float64
	darkRoom, ambientIncluded bool
	repeatability, noiseFloor string
	gain, gainK               string
	resolution, offset        float64
	scheme, class, site       string
	set                       func(name string) bool
}

func (v *visitFlags) add(c *cobra.Command) {
	f := c.Flags()
	f.Float64Var(&v.ambient, "ambient", 0, "ambient luminance that the screen reflects, display off, in `CDM2`")
	f.Float64Var(&v.illuminance, "illuminance", 0, "illuminance on the screen, in `LX`; ambient luminance is this times Rd")
	f.Float64Var(&v.rd, "rd", float64(response.RdDefault), "diffuse reflection coefficient `RD` in cd/m2 per lx; the default counts as assumed")
	f.BoolVar(&v.darkRoom, "dark-room", false, "there is no ambient light")
	f.BoolVar(&v.ambientIncluded, "ambient-included", false, "the readings hold the ambient light already")
	f.StringVar(&v.repeatability, "repeatability", "", "standard deviation of a reading as a `FRACTION` of it, as 0.005 or 0.5% (assumed where absent)")
	f.StringVar(&v.noiseFloor, "noise-floor", "", "standard deviation of a reading near zero, in `CDM2` (0.005 assumed where absent)")
	f.StringVar(&v.gain, "gain-uncertainty", "", "expanded uncertainty of the meter's calibration, a `FRACTION`, as 0.03 or 3%")
	f.StringVar(&v.gainK, "gain-k", "2", "coverage factor `K` of --gain-uncertainty, from the certificate")
	f.Float64Var(&v.resolution, "meter-resolution", 0, "one unit of the meter's least digit, in `CDM2`")
	f.Float64Var(&v.offset, "meter-offset", 0, "standard uncertainty of a zero error or stray light common to all readings, in `CDM2`")
	v.set = f.Changed
}

// openReadings reads a readings file; "-" is standard input.
func (p program) openReadings(path string) (*readings.File, error) {
	if path == "-" {
		return readings.Parse("standard input", p.in)
	}
	f, err := open(path, "readings")
	if err != nil {
		return nil, err
	}
	defer f.Close()
	return readings.Parse(path, f)
}

// contradiction is the error for a flag that says something else than the file.
func contradiction(file, key string, inFile any, flag string, given any) error {
	return fmt.Errorf("%s: states %s %v but --%s says %v; expected one answer; correct the file or leave the flag away", file, key, inFile, flag, given)
}

// agree compares a stated figure with a flag's.
func agree(a, b float64) bool {
	return a == b || math.Abs(a-b) <= 1e-9*math.Max(math.Abs(a), math.Abs(b))
}

// input joins the file and the flags. Where both speak they must say the same.
func (v *visitFlags) input(f *readings.File) (response.Input, error) {
	light, err := v.light(f)
	if err != nil {
		return response.Input{}, err
	}
	noise, err := v.noise(f)
	if err != nil {
		return response.Input{}, err
	}
	rs := append([]readings.Reading(nil), f.Readings...)
	for i := range rs {
		switch {
		case rs[i].Ambient == readings.Excluded && v.ambientIncluded:
			return response.Input{}, fmt.Errorf("%s:%d: ambient_included is no but --ambient-included was given; expected one answer; correct the file or leave the flag away", f.Name, rs[i].Line)
		case rs[i].Ambient == readings.Excluded && light.Ambient == nil:
			return response.Input{}, fmt.Errorf("%s:%d: the reading does not hold the ambient light; expected its size; give --ambient, --illuminance or --dark-room", f.Name, rs[i].Line)
		case rs[i].Ambient != readings.Unstated:
		case v.ambientIncluded:
			rs[i].Ambient = readings.Included
		case light.Ambient == nil:
			return response.Input{}, fmt.Errorf("%s:%d: ambient_included is empty; expected yes or no for every reading; fill it in, or give --ambient-included", f.Name, rs[i].Line)
		default:
			rs[i].Ambient = readings.Excluded
		}
	}
	return response.Input{Bits: f.Metadata.Bits, Scale: f.Scale, Readings: rs, Light: light, Noise: noise}, nil
}

// light finds the room light from flags and file.
func (v *visitFlags) light(f *readings.File) (response.Light, error) {
	m := f.Metadata
	given := 0
	for _, name := range []string{"ambient", "illuminance", "dark-room"} {
		if v.set(name) && (name != "dark-room" || v.darkRoom) {
			given++
		}
	}
	none := response.Light{}
	switch {
	case given > 1:
		return none, errors.New("two of --ambient, --illuminance and --dark-room were given; expected one; keep the one that was measured")
	case v.darkRoom && v.ambientIncluded:
		return none, errors.New("--dark-room and --ambient-included were given; expected one: in a dark room there is no ambient light to include; leave one away")
	case v.set("rd") && !v.set("illuminance") && m.Illuminance == nil:
		return none, errors.New("--rd was given without an illuminance; expected --illuminance or illuminance_lx in the file; add it")
	}
	for _, flag := range []struct {
		name  string
		value float64
		max   float64
		unit  string
	}{{"ambient", v.ambient, 1000, "cd/m2"}, {"illuminance", v.illuminance, 100000, "lx"}, {"rd", v.rd, 1, "cd/m2 per lx"}} {
		if v.set(flag.name) && !(flag.value >= 0 && flag.value <= flag.max) {
			return none, fmt.Errorf("--%s is %v; expected 0 to %v %s; check the figure and its unit", flag.name, flag.value, flag.max, flag.unit)
		}
	}
	ambient, lux, rd := m.Ambient, m.Illuminance, m.Rd
	if v.set("ambient") {
		if ambient != nil && !agree(float64(*ambient), v.ambient) {
			return none, contradiction(f.Name, "ambient_cd_m2", *ambient, "ambient", v.ambient)
		}
		value := photometry.CdM2(v.ambient)
		ambient = &value
	}
	if v.set("illuminance") {
		if lux != nil && !agree(float64(*lux), v.illuminance) {
			return none, contradiction(f.Name, "illuminance_lx", *lux, "illuminance", v.illuminance)
		}
		if ambient != nil {
			return none, contradiction(f.Name, "ambient_cd_m2", *ambient, "illuminance", v.illuminance)
		}
		value := photometry.Lux(v.illuminance)
		lux = &value
	}
	if v.set("rd") {
		if rd != nil && !agree(float64(*rd), v.rd) {
			return none, contradiction(f.Name, "rd", *rd, "rd", v.rd)
		}
		value := photometry.PerLux(v.rd)
		rd = &value
	}
	if v.darkRoom {
		switch {
		case ambient != nil && *ambient != 0:
			return none, contradiction(f.Name, "ambient_cd_m2", *ambient, "dark-room", "there is none")
		case lux != nil && *lux != 0:
			return none, contradiction(f.Name, "illuminance_lx", *lux, "dark-room", "there is none")
		}
		return response.DarkRoom(), nil
	}
	switch {
	case ambient != nil && lux != nil && rd != nil:
		if from := photometry.Reflected(*lux, *rd); math.Abs(float64(from-*ambient)) > 0.02*math.Max(float64(from), float64(*ambient)) {
			return none, fmt.Errorf("%s: ambient_cd_m2 is %v but illuminance_lx times rd is %.4g; expected the same within 2 %%; leave the wrong one away", f.Name, *ambient, float64(from))
		}
		return response.MeasuredAmbient(*ambient, lux), nil
	case ambient != nil:
		if rd != nil && lux == nil {
			l := response.MeasuredAmbient(*ambient, nil)
			l.Rd = rd
			return l, nil
		}
		return response.MeasuredAmbient(*ambient, lux), nil
	case lux != nil:
		return response.FromIlluminance(*lux, rd), nil
	}
	if v.ambientIncluded || hasFlag(f.Readings, readings.Included) {
		return response.AmbientInReadings(), nil
	}
	return none, fmt.Errorf("%s: %w; expected its size or that there is none; give --ambient, --illuminance or --dark-room, or --ambient-included where the readings hold it", f.Name, response.ErrAmbientUnknown)
}

func hasFlag(rs []readings.Reading, a readings.Ambient) bool {
	for _, r := range rs {
		if r.Ambient == a {
			return true
		}
	}
	return false
}

// noise finds the meter's figures from flags and file.
func (v *visitFlags) noise(f *readings.File) (response.Noise, error) {
	n := response.Noise{Repeatability: response.RepeatabilityDefault, Floor: response.FloorDefault, Assumed: true}
	haveR, haveFloor := false, false
	if m := f.Metadata.Repeatability; m != nil {
		n.Repeatability, haveR = *m, true
	}
	if m := f.Metadata.NoiseFloor; m != nil {
		n.Floor, haveFloor = *m, true
	}
	if v.set("repeatability") {
		r, err := fraction("repeatability", v.repeatability, 0.2)
		if err != nil {
			return n, err
		}
		if haveR && !agree(r, n.Repeatability) {
			return n, contradiction(f.Name, "repeatability", n.Repeatability, "repeatability", r)
		}
		n.Repeatability, haveR = r, true
	}
	if v.set("noise-floor") {
		a, err := strconv.ParseFloat(v.noiseFloor, 64)
		if err != nil || !(a >= 0 && a <= 10) {
			return n, fmt.Errorf("--noise-floor is %q; expected 0 to 10 cd/m2; give the spread of readings of a dark field", v.noiseFloor)
		}
		if haveFloor && !agree(a, float64(n.Floor)) {
			return n, contradiction(f.Name, "noise_floor", n.Floor, "noise-floor", a)
		}
		n.Floor, haveFloor = photometry.CdM2(a), true
	}
	n.Assumed = !haveR || !haveFloor
	if v.set("gain-k") && !v.set("gain-uncertainty") {
		return n, errors.New("--gain-k was given without --gain-uncertainty; expected both; add the uncertainty from the certificate")
	}
	if v.set("gain-uncertainty") {
		u, err := fraction("gain-uncertainty", v.gain, 0.5)
		if err != nil {
			return n, err
		}
		k, err := strconv.ParseFloat(v.gainK, 64)
		if err != nil || !(k >= 1 && k <= 5) {
			return n, fmt.Errorf("--gain-k is %q; expected 1 to 5, usually 2; read it from the certificate", v.gainK)
		}
		n.Gain = u / k
	}
	for _, flag := range []struct {
		name  string
		value float64
	}{{"meter-resolution", v.resolution}, {"meter-offset", v.offset}} {
		if !(flag.value >= 0 && flag.value <= 100) {
			return n, fmt.Errorf("--%s is %v; expected 0 to 100 cd/m2; check the figure and its unit", flag.name, flag.value)
		}
	}
	n.Resolution, n.Offset = photometry.CdM2(v.resolution), photometry.CdM2(v.offset)
	return n, nil
}

// fraction reads 0.005 or 0.5%.
func fraction(flag, s string, most float64) (float64, error) {
	text, percent := strings.CutSuffix(strings.TrimSpace(s), "%")
	v, err := strconv.ParseFloat(strings.TrimSpace(text), 64)
	if percent {
		v /= 100
	}
	if err != nil || !(v >= 0 && v <= most) {
		return 0, fmt.Errorf("--%s is %q; expected a fraction from 0 to %v or a percentage, as 0.005 or 0.5%%; read it from the meter's papers", flag, s, most)
	}
	return v, nil
}
