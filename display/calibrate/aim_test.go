package calibrate

import (
	"errors"
	"math"
	"strings"
	"testing"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
	"evenstep/display/response"
)

func cd(v float64) *photometry.CdM2 { p := photometry.CdM2(v); return &p }
func number(v float64) *float64     { return &v }

// still is quiet, read without noise and with fine steps: 0.7 to 400.2 cd/m2 with the ambient light.
func still(t testing.TB) *Curve {
	t.Helper()
	return mustCurve(t, quiet.input(quiet.read(source(1), even(86), response.Noise{}), response.Noise{}))
}

func TestAims(t *testing.T) {
	c := still(t)
	jnds := func(a, b float64) float64 { return index(b) - index(a) }
	for _, test := range []struct {
		name     string
		aim      Aim
		min, max float64
	}{
		{"as measured", Aim{}, 0.7, 400.2},
		{"maximum", Aim{Max: cd(350)}, 0.7, 350},
		{"minimum", Aim{Min: cd(1)}, 1, 400.2},
		{"both", Aim{Min: cd(1), Max: cd(350)}, 1, 350},
		{"ratio keeps white", Aim{Ratio: number(250)}, 400.2 / 250, 400.2},
		{"ratio and maximum", Aim{Ratio: number(350), Max: cd(350)}, 1, 350},
		{"ratio and minimum", Aim{Ratio: number(250), Min: cd(1)}, 1, 250},
	} {
		t.Run(test.name, func(t *testing.T) {
			res := mustTable(t, c, test.aim, 8, 12)
			r := res.Range
			close := func(what string, got, want float64) {
				if math.Abs(got-want) > 1e-4*math.Max(1, want) {
					t.Errorf("%s %v; expected %v", what, got, want)
				}
			}
			close("minimum", float64(r.Min), test.min)
			close("maximum", float64(r.Max), test.max)
			close("ratio", r.Ratio, test.max/test.min)
			close("JNDs", float64(r.JNDs), jnds(test.min, test.max))
			close("JNDs lost", float64(r.JNDsLost), jnds(0.7, 400.2)-jnds(test.min, test.max))
			close("white lost", float64(r.WhiteLost), 400.2-test.max)
			close("black gained", float64(r.BlackGain), test.min-0.7)
			rising(t, res.Table.Entries)
			// The ends of the table reach the aim to half a level of 12 bits.
			e := res.Table.Entries
			for i, want := range map[int]float64{0: test.min, 255: test.max} {
				x := float64(e[i]) / 4095
				step := quiet.full(min(1, x+1./4095)) - quiet.full(max(0, x-1./4095))
				if got := quiet.full(x); math.Abs(got-want) > step/2+1e-3 {
					t.Errorf("P-value %d reaches %v cd/m2; expected %v", i, got, want)
				}
			}
		})
	}
}

func TestAimsRefused(t *testing.T) {
	c := still(t)
	unlit := panel{emits: func(x float64) float64 { return 0.01 + 300*x*x }}
	dark := mustCurve(t, unlit.input(unlit.read(source(1), even(52), response.Noise{}), response.Noise{}))
	blazing := panel{emits: func(x float64) float64 { return 1 + 4500*x*x }}
	bright := mustCurve(t, blazing.input(blazing.read(source(1), even(52), response.Noise{}), response.Noise{}))
	for _, test := range []struct {
		name  string
		curve *Curve
		aim   Aim
		want  string
		is    error
	}{
		{"darker than the panel", c, Aim{Min: cd(0.5)}, "panel's own", ErrAim},
		{"brighter than the panel", c, Aim{Max: cd(500)}, "panel's own", ErrAim},
		{"more ratio than the panel has", c, Aim{Ratio: number(700)}, "panel's own", ErrAim},
		{"all three", c, Aim{Min: cd(1), Max: cd(350), Ratio: number(350)}, "at once", ErrAim},
		{"no luminance", c, Aim{Min: cd(0)}, "more than 0", ErrAim},
		{"not a number", c, Aim{Max: cd(math.NaN())}, "more than 0", ErrAim},
		{"no ratio", c, Aim{Ratio: number(1)}, "more than 1", ErrAim},
		{"upside down", c, Aim{Min: cd(200), Max: cd(100)}, "less than one JND", ErrAim},
		{"black below the function", dark, Aim{}, "ambient", gsdf.ErrBelow},
		{"white above the function", bright, Aim{}, "lower maximum", gsdf.ErrAbove},
	} {
		t.Run(test.name, func(t *testing.T) {
			_, err := test.curve.Table(test.aim, 8, 10)
			if err == nil || !strings.Contains(err.Error(), test.want) || !errors.Is(err, test.is) || !errors.Is(err, ErrAim) {
				t.Errorf("%v; expected %q, wrapping %v", err, test.want, test.is)
			}
		})
	}
	// What the panel cannot do as measured it can do for an aim inside the function.
	if _, err := dark.Table(Aim{Min: cd(0.1)}, 8, 10); err != nil {
		t.Error(err)
	}
	for _, bits := range [][2]int{{7, 10}, {13, 10}, {8, 7}, {8, 17}} {
		if _, err := c.Table(Aim{}, bits[0], bits[1]); err == nil {
			t.Errorf("%d bits in, %d out: no error", bits[0], bits[1])
		}
	}
}

// An aim beyond the panel by less than its curve is known to is brought to the panel, and that is said.
func TestAimMoved(t *testing.T) {
	c := mustCurve(t, quiet.input(quiet.read(source(1), dark(20), studyNoise), studyNoise))
	black, white := c.Band(0), c.Band(1)
	a := Aim{Min: cd(float64(black.Low+black.Luminance) / 2), Max: cd(float64(white.High+white.Luminance) / 2)}
	res := mustTable(t, c, a, 8, 10)
	if len(res.Warnings) < 2 || res.Warnings[0].Concern != AimMoved || res.Warnings[1].Concern != AimMoved {
		t.Errorf("%v; expected two warnings that the aim was moved", res.Warnings)
	}
	if res.Range.Min != black.Luminance || res.Range.Max != white.Luminance {
		t.Errorf("%v to %v; expected the panel's %v to %v", res.Range.Min, res.Range.Max, black.Luminance, white.Luminance)
	}
}
