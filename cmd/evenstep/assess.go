package main

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"evenstep/display/criteria"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/record"
	"evenstep/display/report"
	"evenstep/display/response"
)

// assessFlags are the flags of assess beyond those of the visit.
type assessFlags struct {
	visitFlags
	outputs

	places, white, neighbourWhite           string
	neighbourMax                            float64
	neighbourSerial                         string
	kind, person, reviewer, notes           string
	serial, name, meter, calibrated, record string
	json                                    bool
}

func (p program) assessCommand() *cobra.Command {
	var a assessFlags
	c := &cobra.Command{
		Use:   "assess READINGS.csv",
		Short: "Judge a monitor from its luminance readings",
		Long: `Judge a monitor from its luminance readings: contrast per JND against the Grayscale Standard
Display Function (DICOM PS3.14), each figure with its uncertainty, against the limits of a
published scheme. Without --scheme (here or in the file) the figures are given and nothing is
judged. READINGS.csv may be "-" for standard input.

Exit code 0: meets, or no scheme was asked for. 1: a limit is not met, or none could be judged.
2: wrong use or input. 3: the computer failed.

` + caution,
		Args: oneFile("a readings file"),
		RunE: func(c *cobra.Command, args []string) error { return p.assess(c, args[0], &a) },
	}
	a.visitFlags.add(c)
	f := c.Flags()
	f.StringVar(&a.scheme, "scheme", "", "judge by this `SCHEME`; \"evenstep criteria list\" names them")
	f.StringVar(&a.class, "class", "", "use of the monitor, a `CLASS` of the scheme")
	f.StringVar(&a.site, "site", "", "site `FILE` that confirms limits or sets the site's own")
	f.StringVar(&a.places, "places", "", "`FILE` of luminances (and colours) at places of a uniform field")
	f.Float64Var(&a.neighbourMax, "neighbour-max", 0, "luminance of the neighbour's highest level, measured as this series was, in `CDM2`")
	f.StringVar(&a.neighbourSerial, "neighbour-serial", "", "`SERIAL` of the neighbour")
	f.StringVar(&a.white, "white", "", "colour of this screen's white, `U,V` in CIE 1976 u',v' (default: mean over the places)")
	f.StringVar(&a.neighbourWhite, "neighbour-white", "", "colour of the neighbour's white, `U,V` in CIE 1976 u',v'")
	f.StringVar(&a.kind, "kind", "check", "`KIND` of visit: "+strings.Join(record.Kinds(), ", "))
	f.StringVar(&a.person, "person", "", "`ID` of the person who measured")
	f.StringVar(&a.reviewer, "reviewer", "", "`ID` of the person who reviews")
	f.StringVar(&a.serial, "serial", "", "`SERIAL` of the monitor")
	f.StringVar(&a.name, "monitor", "", "`NAME` of the monitor at the site")
	f.StringVar(&a.meter, "meter", "", "`ID` of the luminance meter")
	f.StringVar(&a.calibrated, "meter-calibrated", "", "`DAY` of the meter's calibration, as 2026-11-30")
	f.StringVar(&a.notes, "notes", "", "`TEXT` for the record")
	f.BoolVar(&a.json, "json", false, "print JSON")
	f.StringVar(&a.record, "record", "", "write the sealed record to `FILE`")
	a.outputs.add(c)
	return c
}

const caution = `The verdict supports a qualified person and depends on the scheme's edition and on how well each
limit is known. Local rules and licensed practice decide. Do not read clinically on a monitor that
fails.`

// oneFile is the argument check of a command that takes one file.
func oneFile(what string) cobra.PositionalArgs {
	return func(c *cobra.Command, args []string) error {
		if len(args) != 1 {
			return fmt.Errorf("%d files were given; expected one: %s; run \"%s --help\"", len(args), what, c.CommandPath())
		}
		return nil
	}
}

func (p program) assess(c *cobra.Command, path string, a *assessFlags) error {
	if err := a.checkPaths(a.record, path, a.places, a.site); err != nil {
		return err
	}
	file, err := p.openReadings(path)
	if err != nil {
		return err
	}
	used, err := a.limits(file)
	if err != nil {
		return err
	}
	in, err := a.input(file)
	if err != nil {
		return err
	}
	r, err := response.Evaluate(in)
	if err != nil {
		return fmt.Errorf("%s: %w", file.Name, err)
	}
	visit := criteria.Visit{Response: r}
	var places *readings.PlacesFile
	if a.places != "" {
		if places, err = openPlaces(a.places); err != nil {
			return err
		}
		visit.Places = places.Places
	}
	if visit.Neighbour, err = a.neighbour(); err != nil {
		return err
	}
	result := criteria.Assess(visit, used)
	if c.Flags().Changed("paper") && a.pdf == "" {
		return errors.New("--paper was given without --pdf; expected both; name the PDF")
	}
	doc, err := a.document(file, in, places, visit.Neighbour, used, result, p.now())
	if err != nil {
		return err
	}
	doc.Program = "evenstep " + version()
	sealed, text, err := record.Seal(*doc)
	if err != nil {
		return err
	}
	if a.record != "" {
		if err := writeFile(a.record, text, a.replace); err != nil {
			return err
		}
	}
	if err := a.outputs.write(sealed); err != nil {
		return err
	}
	if a.json {
		enc := json.NewEncoder(p.out)
		enc.SetIndent("", "  ")
		enc.SetEscapeHTML(false)
		if err := enc.Encode(result); err != nil {
			return system(fmt.Errorf("standard output: %w", err))
		}
	} else if err := a.print(p.out, file, sealed); err != nil {
		return system(fmt.Errorf("standard output: %w", err))
	}
	if used != nil && !result.Verdict.Holds() {
		return errFails
	}
	return nil
}

// limits finds the scheme and class from flags and file.
func (a *assessFlags) limits(f *readings.File) (*criteria.Used, error) {
	pick := func(flag, given, key, stated string) (string, error) {
		if a.set(flag) && stated != "" && given != stated {
			return "", contradiction(f.Name, key, stated, flag, given)
		}
		if a.set(flag) {
			return given, nil
		}
		return stated, nil
	}
	scheme, err := pick("scheme", a.scheme, "scheme", f.Metadata.Scheme)
	if err != nil {
		return nil, err
	}
	class, err := pick("class", a.class, "class", f.Metadata.Class)
	if err != nil {
		return nil, err
	}
	var site *criteria.SiteFile
	if a.site != "" {
		if site, err = openSite(a.site); err != nil {
			return nil, err
		}
	}
	switch {
	case scheme == "" && class != "":
		return nil, fmt.Errorf("class %q was given without a scheme; expected both; add --scheme, \"evenstep criteria list\" names them", class)
	case scheme == "" && site != nil:
		return nil, errors.New("--site was given without a scheme; expected both; add --scheme")
	case scheme == "":
		return nil, nil
	}
	s, err := criteria.Find(scheme)
	if err != nil {
		return nil, err
	}
	return s.Use(class, site)
}

func openPlaces(path string) (*readings.PlacesFile, error) {
	f, err := open(path, "places")
	if err != nil {
		return nil, err
	}
	defer f.Close()
	return readings.ParsePlaces(path, f)
}

// neighbour reads what is said of the other screen; nil where nothing is.
func (a *assessFlags) neighbour() (*criteria.Neighbour, error) {
	n := &criteria.Neighbour{}
	if a.set("neighbour-max") {
		if !(a.neighbourMax > 0 && a.neighbourMax <= 100000) {
			return nil, fmt.Errorf("--neighbour-max is %v; expected more than 0 and at most 100000 cd/m2; check the figure", a.neighbourMax)
		}
		l := photometry.CdM2(a.neighbourMax)
		n.LuminanceMax = &l
	}
	var err error
	if n.White, err = colour("neighbour-white", a.neighbourWhite); err != nil {
		return nil, err
	}
	if n.OwnWhite, err = colour("white", a.white); err != nil {
		return nil, err
	}
	switch {
	case n.OwnWhite != nil && n.White == nil:
		return nil, errors.New("--white was given without --neighbour-white; expected both, the colours are compared; add the neighbour's")
	case n.LuminanceMax == nil && n.White == nil:
		if a.neighbourSerial != "" {
			return nil, errors.New("--neighbour-serial was given without a reading; expected --neighbour-max or --neighbour-white; add what was measured")
		}
		return nil, nil
	}
	return n, nil
}

// colour reads "0.198,0.468"; nil where s is empty.
func colour(flag, s string) (*photometry.UV, error) {
	if s == "" {
		return nil, nil
	}
	us, vs, ok := strings.Cut(s, ",")
	u, errU := strconv.ParseFloat(strings.TrimSpace(us), 64)
	v, errV := strconv.ParseFloat(strings.TrimSpace(vs), 64)
	if !ok || errU != nil || errV != nil || !(u > 0 && u < .7 && v > 0 && v < .7) {
		return nil, fmt.Errorf("--%s is %q; expected u',v' of CIE 1976, as 0.198,0.468; convert the colour", flag, s)
	}
	return &photometry.UV{U: u, V: v}, nil
}

// document gathers the visit into a record that is not yet sealed.
func (a *assessFlags) document(f *readings.File, in response.Input, places *readings.PlacesFile, n *criteria.Neighbour, used *criteria.Used, result criteria.Assessment, now time.Time) (*record.Record, error) {
	pick := func(flag, given, key, stated string) (string, error) {
		if given != "" && stated != "" && given != stated {
			return "", contradiction(f.Name, key, stated, flag, given)
		}
		if given != "" {
			return given, nil
		}
		return stated, nil
	}
	serial, err := pick("serial", a.serial, "serial", f.Metadata.Serial)
	if err != nil {
		return nil, err
	}
	meter, err := pick("meter", a.meter, "meter", f.Metadata.Meter)
	if err != nil {
		return nil, err
	}
	if a.calibrated != "" {
		day, err := time.Parse(time.DateOnly, a.calibrated)
		if err != nil {
			return nil, fmt.Errorf("--meter-calibrated is %q; expected a day as 2026-11-30; correct it", a.calibrated)
		}
		if day.After(now) {
			return nil, fmt.Errorf("--meter-calibrated is %s, which is to come; expected a day that is past; correct it", a.calibrated)
		}
	}
	doc := &record.Record{
		Visit:   record.Visit{Kind: a.kind, Time: now.UTC().Format(time.RFC3339), Notes: a.notes},
		Monitor: record.Monitor{Serial: serial, Name: a.name, Ramp: f.Metadata.Ramp},
		Meter:   record.Meter{ID: meter, CalibratedOn: a.calibrated},
		File:    &record.SourceFile{Name: filepath.Base(f.Name), SHA256: f.SHA256, Unit: f.Unit},
		Persons: []record.Person{},
		Scheme:  used, Assessment: result,
	}
	for _, who := range []record.Person{{ID: a.person, Part: "measured"}, {ID: a.reviewer, Part: "reviewed"}} {
		if who.ID != "" {
			doc.Persons = append(doc.Persons, who)
		}
	}
	if places != nil {
		doc.PlacesFile = &record.SourceFile{Name: filepath.Base(places.Name), SHA256: places.SHA256, Unit: places.Unit}
	}
	if n != nil {
		doc.Neighbour = &record.Neighbour{Serial: a.neighbourSerial}
	}
	var measured []readings.Place
	if places != nil {
		measured = places.Places
	}
	doc.Take(in, measured, n)
	return doc, nil
}

// outputs are the papers that a command writes from a record.
type outputs struct {
	pdf, csv, paper string
	replace         bool
}

func (o *outputs) add(c *cobra.Command) {
	f := c.Flags()
	f.StringVar(&o.pdf, "pdf", "", "write the report to `FILE`")
	f.StringVar(&o.csv, "csv", "", "write steps and findings to `FILE`")
	f.StringVar(&o.paper, "paper", "a4", "paper of the PDF, `SIZE`: a4 or letter")
	f.BoolVar(&o.replace, "replace", false, "write over files that are there")
}

// checkPaths sees to it, before anything is written, that no output falls on another, on an input, or
// on a file that is there and may not be replaced.
func (o *outputs) checkPaths(record string, inputs ...string) error {
	type named struct{ flag, path string }
	var seen []named
	for _, out := range []named{{"record", record}, {"pdf", o.pdf}, {"csv", o.csv}} {
		if out.path == "" {
			continue
		}
		for _, in := range inputs {
			if in != "" && same(in, out.path) {
				return fmt.Errorf("--%s is %s, which is read; expected another file; choose another name", out.flag, out.path)
			}
		}
		for _, other := range seen {
			if same(other.path, out.path) {
				return fmt.Errorf("--%s and --%s are both %s; expected two files; choose another name", other.flag, out.flag, out.path)
			}
		}
		if _, err := os.Stat(out.path); err == nil && !o.replace {
			return alreadyThere(out.path)
		}
		seen = append(seen, out)
	}
	return nil
}

// same says whether two paths name one file, which need not be there yet.
func same(a, b string) bool {
	if filepath.Clean(a) == filepath.Clean(b) {
		return true
	}
	x, errX := os.Stat(a)
	y, errY := os.Stat(b)
	return errX == nil && errY == nil && os.SameFile(x, y)
}

func (o *outputs) write(r *record.Record) error {
	paper := report.A4
	switch strings.ToLower(o.paper) {
	case "a4":
	case "letter":
		paper = report.Letter
	default:
		return fmt.Errorf("--paper is %q; expected a4 or letter; choose one", o.paper)
	}
	for _, out := range []struct {
		path string
		draw func(io.Writer) error
	}{
		{o.pdf, func(w io.Writer) error { return report.PDF(w, r, report.Options{Paper: paper}) }},
		{o.csv, func(w io.Writer) error { return report.CSV(w, r) }},
	} {
		if out.path == "" {
			continue
		}
		var b bytes.Buffer
		if err := out.draw(&b); err != nil {
			return system(fmt.Errorf("%s: %w", out.path, err))
		}
		if err := writeFile(out.path, b.Bytes(), o.replace); err != nil {
			return err
		}
	}
	return nil
}
