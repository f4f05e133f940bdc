package response

import (
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
	"evenstep/display/readings"
)

// table reads a file of testdata/response: rows of cells, without comments and heading.
func table(t *testing.T, name string) [][]string {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "..", "testdata", "response", name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	return rows[1:]
}

func number(t *testing.T, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// pppLevels and pppLuminances are the luminance response printed in DICOM PS3.17 Annex PPP.3.1. The
// twelfth level is printed 160; 165 is meant, since only that fits its neighbours.
var pppLuminances = []float64{0.64, 2.03, 4.17, 7.11, 11.12, 16.75, 24.07, 33.67, 46.24, 63.12, 83.94, 110.6, 144.9, 190.1, 246.3, 317.8, 406.4, 520.9}

const pppAmbient photometry.CdM2 = 0.408 // printed there as Reflected Ambient Light, MEASURED

// closeTo is for figures printed in per cent with two or three decimals.
func closeTo(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if math.IsNaN(got) || math.Abs(got-want) > tolerance {
		t.Errorf("%s is %.6g, want %.6g within %g", what, got, want, tolerance)
	}
}

// TestPublishedDisplay checks the example of DICOM PS3.17 Annex PPP. The luminances are printed
// there; the figures were computed from them by a second implementation of the same formulas.
func TestPublishedDisplay(t *testing.T) {
	for _, c := range []struct {
		name              string
		light             Light
		deviation, jnd    float64 // per cent
		ratio, jMin, jMax float64
	}{
		{"ambient left out", DarkRoom(), 19.956, 29.861, 813.906, 54.643, 712.049},
		{"ambient added", MeasuredAmbient(pppAmbient, nil), 8.14, 10.56, 497.43, 73.442, 712.166},
	} {
		t.Run(c.name, func(t *testing.T) {
			r := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), pppLuminances), Light: c.light, Noise: Noise{Repeatability: 0.005, Floor: 0.005}})
			d, step, ok := r.GreatestDeviation()
			if !ok {
				t.Fatal(r.Undefined)
			}
			closeTo(t, "greatest deviation in %", 100*d.Value, c.deviation, 0.006)
			if step.FromLevel != 0 || step.ToLevel != 15 {
				t.Errorf("greatest at %d to %d, want 0 to 15", step.FromLevel, step.ToLevel)
			}
			v, reason := r.GreatestJNDStep()
			if reason != "" {
				t.Fatal(reason)
			}
			closeTo(t, "JND-step variant in %", 100*v, c.jnd, 0.006)
			ratio, _ := r.Ratio()
			closeTo(t, "ratio", ratio.Value, c.ratio, 0.01)
			lo, hi, _ := r.JNDs()
			closeTo(t, "j min", float64(lo), c.jMin, 0.001)
			closeTo(t, "j max", float64(hi), c.jMax, 0.001)
			if d.Low > d.Value || d.High < d.Value || d.Low < 0 {
				t.Errorf("interval %v to %v does not hold %v", d.Low, d.High, d.Value)
			}
		})
	}
}

// TestPublishedDisplaySteps compares every step of both columns with the second implementation.
func TestPublishedDisplaySteps(t *testing.T) {
	for _, ambient := range []float64{0, 0.408} {
		light := MeasuredAmbient(photometry.CdM2(ambient), nil)
		r := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), pppLuminances), Light: light})
		seen := 0
		for _, row := range table(t, "ps317-annex-ppp-contrast.csv") {
			if number(t, row[0]) != ambient || row[4] == "" {
				continue
			}
			level, _ := strconv.Atoi(row[1])
			for _, s := range r.Steps {
				if s.ToLevel == level {
					closeTo(t, "deviation in % to level "+row[1], 100*s.Deviation, number(t, row[6]), 0.001)
					seen++
				}
			}
		}
		if seen != 17 {
			t.Errorf("ambient %v: %d steps compared, want 17", ambient, seen)
		}
	}
}

// TestMisprintedLevel takes the level 160 as printed: steps follow the levels, not their number.
func TestMisprintedLevel(t *testing.T) {
	levels := levels18()
	levels[11] = 160
	r := mustEvaluate(t, Input{Bits: 8, Readings: series(levels, pppLuminances), Light: MeasuredAmbient(pppAmbient, nil)})
	closeTo(t, "step 11 in %", 100*r.Steps[10].Deviation, 44.4, 0.5)
	closeTo(t, "step 12 in %", 100*r.Steps[11].Deviation, -26.5, 0.5)
	if _, ok := r.Eighteen(); ok {
		t.Error("level 160 was taken for 165")
	}
}

// TestAims checks the nine sets of 18 aims (second implementation of the printed equation).
func TestAims(t *testing.T) {
	type set struct{ lo, hi string }
	rows := map[set][][]string{}
	for _, row := range table(t, "gsdf-aims-18-levels.csv") {
		k := set{row[0], row[1]}
		rows[k] = append(rows[k], row)
	}
	if len(rows) != 9 {
		t.Fatalf("%d sets, want 9", len(rows))
	}
	for k, set := range rows {
		lum := aims(t, levels18(), number(t, k.lo), number(t, k.hi))
		r := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), lum), Light: DarkRoom()})
		for i, row := range set {
			want := number(t, row[5])
			closeTo(t, "aim "+k.lo+" to "+k.hi+" at level "+row[3], lum[i], want, 6e-6*max(want, 1)) // six significant digits
			j, _ := r.LevelJND(i)
			closeTo(t, "JND of level "+row[3], float64(j), number(t, row[4]), 6e-5)
			if i > 0 {
				closeTo(t, "contrast per JND to level "+row[3], r.Steps[i-1].ContrastPerJND, number(t, row[7]), 6e-7)
				closeTo(t, "deviation to level "+row[3], r.Steps[i-1].Deviation, 0, 1e-9) // inverse and forward agree to rounding
			}
		}
	}
}

// TestSampleCurve checks the 256-level sample curve of an open general DICOM toolkit at its 18
// levels, without and with the ambient 1.0 cd/m2 given there (deviations by a second implementation).
func TestSampleCurve(t *testing.T) {
	var levels []int
	var lum []float64
	for _, row := range table(t, "toolkit-sample-curve.csv") {
		l, _ := strconv.Atoi(row[0])
		levels, lum = append(levels, l), append(lum, number(t, row[1]))
	}
	for _, c := range []struct {
		ambient photometry.CdM2
		ratio   float64
		want    []float64
	}{
		{0, 622.5, []float64{-8.0, 31.5, 30.3, 20.8, 13.4, 6.6, 0.5, -4.8, -9.9, -14.6, -19.1, -23.1, -26.5, -30.0, -32.9, -35.9, -38.9}},
		{1, 98.58, []float64{-54.3, 5.7, 34.4, 37.0, 32.8, 25.8, 18.3, 11.4, 4.8, -1.4, -7.1, -12.1, -16.4, -20.6, -24.1, -27.7, -31.2}},
	} {
		all := mustEvaluate(t, Input{Bits: 8, Readings: series(levels, lum), Light: MeasuredAmbient(c.ambient, nil)})
		if len(all.Steps) != 255 {
			t.Fatalf("%d steps, want 255", len(all.Steps))
		}
		r, ok := all.Eighteen()
		if !ok {
			t.Fatal("the 18 levels were not found in 256")
		}
		ratio, _ := r.Ratio()
		closeTo(t, "ratio", ratio.Value, c.ratio, 0.06)
		for i, s := range r.Steps {
			closeTo(t, "step in %", 100*s.Deviation, c.want[i], 0.0501)
		}
	}
}

// TestPowerLaw checks the deviations of a gamma 2.2 monitor (second implementation).
func TestPowerLaw(t *testing.T) {
	for _, c := range []struct {
		lo, hi  float64
		ambient photometry.CdM2
		want    []float64
	}{
		{1, 350, 0, []float64{-26.4, 50.9, 49.0, 34.9, 22.0, 11.4, 2.6, -4.9, -11.2, -16.8, -21.8, -26.2, -30.2, -33.8, -37.2, -40.2, -43.1}},
		{0.35, 350, 0.25, []float64{-12.0, 53.3, 43.2, 28.1, 15.9, 6.0, -2.0, -8.8, -14.7, -19.9, -24.5, -28.7, -32.5, -36.0, -39.1, -42.1, -44.8}},
	} {
		var lum []float64
		for _, p := range levels18() {
			lum = append(lum, c.lo+(c.hi-c.lo)*math.Pow(float64(p)/255, 2.2))
		}
		r := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), lum), Light: MeasuredAmbient(c.ambient, nil)})
		for i, s := range r.Steps {
			closeTo(t, "step in %", 100*s.Deviation, c.want[i], 0.0501)
		}
	}
}

// TestAnnexCFigures checks FIT and LUM against the figures C-1 and D.3-4 of PS3.14. The points were
// digitised from the drawings; the statistics are printed in them. The printed mean of D.3-4
// (1.9261) is a misprint of 1.9561: slope and intercept printed beside it give 1.9561.
func TestAnnexCFigures(t *testing.T) {
	for _, c := range []struct {
		figure     string
		mean, lum  float64
		tolerance  float64 // of the digitised points
		lines      [][]float64
		rSquared   []float64
		coefDigits float64
	}{
		{"C-1", 2.65554, 0.35487, 1e-3, nil, nil, 0},
		{"D.3-4", 1.9561, 1.3450, 1e-3, [][]float64{
			{1.9253, 2.4175e-4},
			{1.8807, 1.294e-3, -4.1266e-6},
			{1.8103, 4.6435e-3, -3.7029e-5, 8.6019e-8},
		}, []float64{1.7714e-4, 4.0263e-4, 8.1537e-4}, 5e-3},
	} {
		t.Run(c.figure, func(t *testing.T) {
			var x, n []float64
			for _, row := range table(t, "annex-c-figures.csv") {
				if row[0] == c.figure {
					x, n = append(x, number(t, row[1])), append(n, number(t, row[2]))
				}
			}
			m, reason := fitAnnexC(x, n)
			if reason != "" {
				t.Fatal(reason)
			}
			closeTo(t, "mean", m.Mean, c.mean, c.tolerance)
			closeTo(t, "LUM", m.LUM, c.lum, c.tolerance)
			if m.FitOrder != 0 {
				t.Errorf("FIT order %d (p %.3g): the text calls the fit good, so order 0", m.FitOrder, m.FitP)
			}
			for k, line := range c.lines {
				order := k + 1
				coef := polyfit(x, n, order)
				for _, at := range []float64{0, 64, 128, 255} {
					want, got := 0.0, 0.0
					for i := order; i >= 0; i-- {
						want = want*at + line[i]
						got = got*scale(at, x[0], x[len(x)-1]) + coef[i]
					}
					closeTo(t, "fitted N", got, want, c.coefDigits)
				}
				total := residual(x, n, 0)
				closeTo(t, "R squared", 1-residual(x, n, order)/total, c.rSquared[k], 5e-6)
			}
		})
	}
}

// TestEighteenOfManyBits finds the 18 levels in longer series of every depth.
func TestEighteenOfManyBits(t *testing.T) {
	for bits := 8; bits <= 12; bits++ {
		top := 1<<bits - 1
		var levels []int
		for l := 0; l <= top; l++ {
			levels = append(levels, l)
		}
		lum := aims(t, levels, 0.8, 400)
		r := mustEvaluate(t, Input{Bits: bits, Readings: series(levels, lum), Light: DarkRoom(), Scale: readings.DDL})
		sub, ok := r.Eighteen()
		if !ok || len(sub.Points) != 18 {
			t.Fatalf("%d bits: 18 levels not found", bits)
		}
		d, _, _ := sub.GreatestDeviation()
		closeTo(t, "deviation of a perfect monitor", d.Value, 0, 1e-9)
	}
}

// TestUnequalLevels: a perfect monitor has no deviation whatever the levels.
func TestUnequalLevels(t *testing.T) {
	levels := []int{0, 1, 2, 5, 9, 17, 40, 41, 99, 160, 254, 255}
	r := mustEvaluate(t, Input{Bits: 8, Readings: series(levels, aims(t, levels, 0.6, 500)), Light: DarkRoom()})
	d, _, _ := r.GreatestDeviation()
	closeTo(t, "deviation", d.Value, 0, 1e-8)
	for i := range r.Points {
		e, ok := r.Expected(i)
		if !ok {
			t.Fatal("no expected luminance")
		}
		closeTo(t, "expected", float64(e), float64(r.Points[i].Luminance), 1e-9*float64(e))
	}
	m, reason := r.AnnexC()
	if reason != "" {
		t.Fatal(reason)
	}
	closeTo(t, "LUM", m.LUM, 0, 1e-6)
}

// TestOutsideTheFunction: what the GSDF does not know keeps its other figures.
func TestOutsideTheFunction(t *testing.T) {
	lum := append([]float64(nil), pppLuminances...)
	lum[0] = 0
	r := mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), lum), Light: DarkRoom()})
	if r.Undefined == "" || r.Steps != nil {
		t.Fatal("a black of 0 in a dark room was given steps")
	}
	if _, reason := r.Ratio(); reason == "" {
		t.Error("a ratio over 0 was given")
	}
	closeTo(t, "L'max", r.LuminanceMax().Value, 520.9, 0)
	lum[0] = 0.04
	r = mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), lum), Light: DarkRoom()})
	if r.Undefined == "" {
		t.Fatal("0.04 cd/m2 is below the function")
	}
	ratio, reason := r.Ratio()
	if reason != "" {
		t.Fatal(reason)
	}
	closeTo(t, "ratio", ratio.Value, 520.9/0.04, 1e-6)
	lum[0] = 0
	r = mustEvaluate(t, Input{Bits: 8, Readings: series(levels18(), lum), Light: MeasuredAmbient(0.2, nil)})
	if r.Undefined != "" {
		t.Errorf("0 with ambient 0.2 is inside the function: %s", r.Undefined)
	}
	if float64(r.Steps[0].JNDFrom) < float64(gsdf.First) {
		t.Error("index below the first")
	}
}
