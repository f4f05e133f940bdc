package main

import (
	"crypto/rand"
	"errors"
	"fmt"
	"strconv"
	"strings"

	"github.com/spf13/cobra"

	"evenstep/display/gsdf"
	"evenstep/display/response"
	"evenstep/display/sheet"
	"evenstep/patterns"
)

func (p program) patternCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "pattern",
		Short: "Test patterns: list and draw them",
		Args:  cobra.NoArgs,
		RunE:  func(c *cobra.Command, _ []string) error { return c.Help() },
	}
	var asJSON bool
	list := &cobra.Command{
		Use:   "list",
		Short: "List the patterns with what each is for and what to look for",
		Args:  cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			all := patterns.List()
			if asJSON {
				type entry struct {
					Name    string `json:"name"`
					Purpose string `json:"purpose"`
					Serves  string `json:"serves"`
					Look    string `json:"look"`
					Colour  bool   `json:"colour"`
				}
				var out []entry
				for _, i := range all {
					out = append(out, entry{i.Name, i.Purpose, i.Serves, i.Look, i.Colour})
				}
				return p.printJSON(out)
			}
			t := &page{}
			for _, i := range all {
				t.paragraph("", i.Name+": "+i.Purpose)
				t.paragraph("    ", i.Look)
				t.paragraph("    ", "serves "+i.Serves)
			}
			return p.printText(t)
		},
	}
	list.Flags().BoolVar(&asJSON, "json", false, "print JSON")
	c.AddCommand(list, p.drawCommand())
	return c
}

// drawFlags say what is drawn and where it goes.
type drawFlags struct {
	visitFlags
	size, out, colour, readings string
	bits, place, places, frame  int
	field, surround             int
	seed                        uint64
	jnd                         []float64
	replace                     bool
}

func (p program) drawCommand() *cobra.Command {
	var d drawFlags
	c := &cobra.Command{
		Use:   "draw NAME",
		Short: "Draw a pattern to a PNG, TIFF or DICOM file",
		Long: `Draw a pattern pixel for pixel to a file: PNG (8 or 16 bit), TIFF (16 bit) or DICOM Secondary
Capture, by the ending .png, .tif or .dcm. Give the native size of the monitor: a pattern that is
scaled on its way to the glass shows the scaling.

The low-contrast patterns take levels by JND where --readings gives the monitor's response: each
step is then the nearest that the chain can show and is labelled with its computed JND. Whether an
object is seen depends on more than JND.`,
		Args: oneFile("a pattern's name"),
		RunE: func(c *cobra.Command, args []string) error { return p.draw(args[0], &d) },
	}
	f := c.Flags()
	f.StringVar(&d.size, "size", "", "`WxH` in pixels, the monitor's native size")
	f.IntVar(&d.bits, "bits", 8, "`N` bits a pixel, 8 to 16")
	f.StringVarP(&d.out, "output", "o", "", "`FILE` ending in .png, .tif or .dcm")
	f.IntVar(&d.field, "field", 0, "`LEVEL` of what is measured or looked at")
	f.IntVar(&d.surround, "surround", 0, "`LEVEL` of what lies around it")
	f.IntVar(&d.places, "places", 0, "`N` places: 5, 9, 13 or 25")
	f.IntVar(&d.place, "place", 0, "only place `N`")
	f.IntVar(&d.frame, "frame", 0, "picture `N` of a moving pattern")
	f.Uint64Var(&d.seed, "seed", 0, "`S` picks the arrangement")
	f.StringVar(&d.colour, "colour", "", "`R,G,B` levels")
	f.StringVar(&d.readings, "readings", "", "readings `FILE` of the monitor, for steps in JND")
	f.Float64SliceVar(&d.jnd, "jnd", []float64{1, 2, 3, 4}, "`J,...` steps wanted, with --readings")
	f.BoolVar(&d.replace, "replace", false, "write over a file that is there")
	d.visitFlags.add(c)
	return c
}

func (p program) draw(name string, d *drawFlags) error {
	if d.out == "" {
		return errors.New("no file was named; expected -o FILE ending in .png, .tif or .dcm; name it")
	}
	s, err := d.spec()
	if err != nil {
		return err
	}
	if info, _ := sheet.Find(name); d.readings != "" {
		if info.Takes&patterns.TakesSteps == 0 {
			return fmt.Errorf("pattern %s takes no steps, so --readings has no use; expected it with low-contrast or disks; leave it away", name)
		}
		if s.Steps, err = p.jndSteps(d, s.Bits, info.MaxSteps); err != nil {
			return err
		}
	}
	b, err := sheet.Encode(d.out, name, s, "evenstep "+version(), p.now(), rand.Reader)
	if err != nil {
		return err
	}
	return writeFile(d.out, b, d.replace)
}

// spec reads the flags of the drawing.
func (d *drawFlags) spec() (patterns.Spec, error) {
	s := patterns.Spec{Bits: d.bits, Places: d.places, Place: d.place, Frame: d.frame, Seed: d.seed}
	w, h, ok := strings.Cut(strings.ToLower(d.size), "x")
	var errW, errH error
	s.Width, errW = strconv.Atoi(w)
	s.Height, errH = strconv.Atoi(h)
	if !ok || errW != nil || errH != nil {
		return s, fmt.Errorf("--size is %q; expected WxH, as 1536x2048; give the native size of the monitor", d.size)
	}
	level := func(flag string, v int) (*uint16, error) {
		if !d.set(flag) {
			return nil, nil
		}
		if v < 0 || v > 65535 {
			return nil, fmt.Errorf("--%s is %d; expected a level of %d bits; correct it", flag, v, d.bits)
		}
		l := uint16(v)
		return &l, nil
	}
	var err error
	if s.Field, err = level("field", d.field); err != nil {
		return s, err
	}
	if s.Surround, err = level("surround", d.surround); err != nil {
		return s, err
	}
	if d.colour != "" {
		var c [3]uint16
		parts := strings.Split(d.colour, ",")
		for i := range c {
			if len(parts) != 3 {
				break
			}
			v, err := strconv.ParseUint(strings.TrimSpace(parts[i]), 10, 16)
			if err != nil {
				parts = nil
				break
			}
			c[i] = uint16(v)
		}
		if len(parts) != 3 {
			return s, fmt.Errorf("--colour is %q; expected R,G,B levels, as 255,255,255; correct it", d.colour)
		}
		s.Colour = &c
	}
	return s, nil
}

// jndSteps finds levels by JND on the monitor whose readings were given: each wanted step at places spread
// over the range, the nearest that the chain can show.
func (p program) jndSteps(d *drawFlags, bits, most int) ([]patterns.Step, error) {
	file, err := p.openReadings(d.readings)
	if err != nil {
		return nil, err
	}
	if file.Metadata.Bits != bits {
		return nil, fmt.Errorf("%s: levels of %d bits but --bits is %d; expected the same; draw at the depth of the readings", file.Name, file.Metadata.Bits, bits)
	}
	in, err := d.input(file)
	if err != nil {
		return nil, err
	}
	r, err := response.Evaluate(in)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", file.Name, err)
	}
	if r.Undefined != "" {
		return nil, fmt.Errorf("%s: %s; expected luminances that the standard function knows; state the room light", file.Name, r.Undefined)
	}
	if len(d.jnd) == 0 || len(d.jnd) > most {
		return nil, fmt.Errorf("--jnd has %d steps; expected 1 to %d; give fewer", len(d.jnd), most)
	}
	bases := max(1, min(5, most/len(d.jnd)))
	var out []patterns.Step
	for i := range bases {
		base := (1<<bits - 1) * (2*i + 1) / (2 * bases)
		for _, wanted := range d.jnd {
			if !(wanted > 0 && wanted <= 100) {
				return nil, fmt.Errorf("--jnd has %v; expected more than 0 and at most 100 JND; correct it", wanted)
			}
			level, jnd, ok := r.LevelAbove(base, gsdf.JND(wanted))
			if !ok {
				continue
			}
			step := patterns.Step{Low: uint16(base), High: uint16(level), Label: fmt.Sprintf("%.1f JND", float64(jnd))}
			if n := len(out); n == 0 || out[n-1] != step { // two wanted steps may be the same shown one
				out = append(out, step)
			}
		}
	}
	return out, nil
}
