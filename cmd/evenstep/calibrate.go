package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"time"

	"github.com/spf13/cobra"

	"evenstep/display/calibrate"
	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/luts"
)

// calibrateFlags are the flags of calibrate beyond those of the visit.
type calibrateFlags struct {
	visitFlags
	out, report              string
	inBits, outBits          int
	rampBits, linkBits       int
	aimMin, aimMax, aimRatio float64
	serial, monitor          string
	noSerial                 bool
	replace, json            bool
}

func (p program) calibrateCommand() *cobra.Command {
	var k calibrateFlags
	c := &cobra.Command{
		Use:   "calibrate READINGS.csv",
		Short: "Make a monitor's table from its readings, and say what the table will do",
		Long: `Make the monitor's characteristic curve from readings over driving levels, and from it the table that
gives P-values the Grayscale Standard Display Function (DICOM PS3.14) in the light of that room. The
curve is fitted through the noise of the readings; --repeatability 0 says that there is none, and
then it is the natural spline of PS3.14 D.1. -o names the table's file.

Only readings taken through no table make a curve. What the table will do is predicted, not proved:
load it, measure again and judge.

` + caution,
		Args: oneFile("a readings file"),
		RunE: func(_ *cobra.Command, args []string) error { return p.calibrate(args[0], &k) },
	}
	k.visitFlags.add(c)
	f := c.Flags()
	f.StringVarP(&k.out, "output", "o", "", "`TABLE` file: .json, .csv, or an ICC display profile with the video table, .icc (version 4) or .icm (version 2)")
	f.StringVar(&k.report, "report", "", "write the prediction to `FILE` as JSON")
	f.IntVar(&k.inBits, "in-bits", 8, "depth of the P-values, `N` from 8 to 12")
	f.IntVar(&k.outBits, "out-bits", 10, "depth of the driving levels, `N` from 8 to 16")
	f.IntVar(&k.rampBits, "ramp-bits", 0, "depth of the graphics card's ramp, `N`; 0: not stated")
	f.IntVar(&k.linkBits, "link-bits", 0, "depth of the signal to the panel, `N`; 0: not stated")
	f.Float64Var(&k.aimMin, "aim-min", 0, "lowest luminance to go for, ambient light in it, in `CDM2` (default: the panel's)")
	f.Float64Var(&k.aimMax, "aim-max", 0, "highest luminance to go for, ambient light in it, in `CDM2` (default: the panel's)")
	f.Float64Var(&k.aimRatio, "aim-ratio", 0, "luminance ratio to go for, `R`")
	f.StringVar(&k.serial, "serial", "", "`SERIAL` of the monitor")
	f.BoolVar(&k.noSerial, "no-serial", false, "the monitor has no serial number")
	f.StringVar(&k.monitor, "monitor", "", "`NAME` of the monitor at the site (default: its serial)")
	f.BoolVar(&k.replace, "replace", false, "write over files that are there")
	f.BoolVar(&k.json, "json", false, "print the prediction as JSON")
	return c
}

// calibrated is what the calibrate command says.
type calibrated struct {
	Range      calibrate.Range       `json:"range"`
	Warnings   []calibrate.Warning   `json:"warnings"`
	Prediction *calibrate.Prediction `json:"prediction"`
	Provenance luts.Provenance       `json:"provenance"`
}

func (p program) calibrate(path string, k *calibrateFlags) error {
	if k.out == "" {
		return errors.New("no table was named; expected -o FILE ending in .json, .csv, .icc or .icm; name it")
	}
	o := outputs{replace: k.replace}
	for _, check := range []struct{ flag, path string }{{"output", k.out}, {"report", k.report}} {
		o.csv = check.path
		if err := o.checkPaths("", path); err != nil {
			return err
		}
	}
	if k.report != "" && same(k.report, k.out) {
		return fmt.Errorf("--report and -o are both %s; expected two files; choose another name", k.out)
	}
	file, err := p.openReadings(path)
	if err != nil {
		return err
	}
	in, err := k.input(file)
	if err != nil {
		return err
	}
	curve, err := calibrate.NewCurve(calibrate.Input{
		Bits: in.Bits, Scale: in.Scale, Ramp: file.Metadata.Ramp, Readings: in.Readings, Light: in.Light, Noise: in.Noise,
	})
	if err != nil {
		return fmt.Errorf("%s: %w", file.Name, err)
	}
	aim, err := k.aim()
	if err != nil {
		return err
	}
	res, err := curve.Table(aim, k.inBits, k.outBits)
	if err != nil {
		return fmt.Errorf("%s: %w", file.Name, err)
	}
	prediction, err := curve.Predict(res.Table, calibrate.Path{RampBits: k.rampBits, LinkBits: k.linkBits})
	if err != nil {
		return fmt.Errorf("%s: %w", file.Name, err)
	}
	origin, err := k.origin(file, p.now())
	if err != nil {
		return err
	}
	b, err := calibrate.Encode(k.out, curve, res, origin)
	if err != nil {
		return err
	}
	kept, err := origin.Map(curve, res)
	if err != nil {
		return err
	}
	said := calibrated{Range: res.Range, Warnings: append(append([]calibrate.Warning{}, curve.Warnings...), res.Warnings...), Prediction: prediction, Provenance: kept}
	text, err := json.MarshalIndent(said, "", "  ")
	if err != nil {
		return system(fmt.Errorf("prediction: %w", err))
	}
	if err := writeFile(k.out, b, k.replace); err != nil {
		return err
	}
	if k.report != "" {
		if err := writeFile(k.report, append(text, '\n'), k.replace); err != nil {
			return err
		}
	}
	if k.json {
		return p.printJSON(said)
	}
	return p.printText(predictionText(k, res, said))
}

// origin is what the table remembers of how it came about.
func (k *calibrateFlags) origin(f *readings.File, now time.Time) (calibrate.Provenance, error) {
	serial := f.Metadata.Serial
	if k.serial != "" {
		if serial != "" && serial != k.serial {
			return calibrate.Provenance{}, contradiction(f.Name, "serial", serial, "serial", k.serial)
		}
		serial = k.serial
	}
	p := calibrate.Provenance{Monitor: k.monitor, Serial: serial, NoSerial: k.noSerial, Date: now, ReadingsSHA256: f.SHA256, Program: "evenstep " + version()}
	if p.Monitor == "" {
		p.Monitor = serial
	}
	for _, r := range f.Readings {
		if !r.Time.IsZero() {
			p.Date = r.Time // the readings are as old as their last one
		}
	}
	switch {
	case serial == "" && !k.noSerial:
		return p, fmt.Errorf("%s: states no serial; expected the monitor's, a table belongs to one monitor; give --serial, or --no-serial with --monitor", f.Name)
	case k.noSerial && serial != "":
		return p, fmt.Errorf("%s: the serial %q and --no-serial; expected one of them; leave one away", f.Name, serial)
	case k.noSerial && k.monitor == "":
		return p, errors.New("--no-serial was given without --monitor; expected both: something must tell the monitors apart; add its name")
	}
	return p, nil
}

// aim reads the flags of the aim.
func (k *calibrateFlags) aim() (calibrate.Aim, error) {
	var a calibrate.Aim
	for _, f := range []struct {
		name  string
		value float64
		most  float64
		into  **photometry.CdM2
	}{{"aim-min", k.aimMin, 1000, &a.Min}, {"aim-max", k.aimMax, 4000, &a.Max}} {
		if !k.set(f.name) {
			continue
		}
		if !(f.value > 0 && f.value <= f.most) {
			return a, fmt.Errorf("--%s is %v; expected more than 0 and at most %v cd/m2; check the figure", f.name, f.value, f.most)
		}
		l := photometry.CdM2(f.value)
		*f.into = &l
	}
	if k.set("aim-ratio") {
		if !(k.aimRatio > 1 && k.aimRatio <= 1e5) {
			return a, fmt.Errorf("--aim-ratio is %v; expected more than 1; check the figure", k.aimRatio)
		}
		a.Ratio = &k.aimRatio
	}
	return a, nil
}

// predictionText is the prediction for reading.
func predictionText(k *calibrateFlags, res calibrate.Result, s calibrated) *page {
	t := &page{}
	t.entry("table", fmt.Sprintf("%s, %d bits in, %d bits out", k.out, s.Prediction.InBits, s.Prediction.OutBits))
	for _, l := range calibrate.Words(res, s.Prediction) {
		t.entry(l.Label, l.Text)
	}
	for i, w := range s.Warnings {
		label := ""
		if i == 0 {
			label = "warnings"
		}
		t.entry(label, w.Text)
	}
	t.line("")
	t.paragraph("", "This is a prediction: load the table, measure again and judge.")
	return t
}
