package photometry

import (
	"errors"
	"math"
	"math/rand/v2"
	"testing"
)

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s = %.12g, want %.12g within %g", what, got, want, tolerance)
	}
}

// TestUnits holds values with the digits of their source; the tolerance is half a unit of the
// last digit.
func TestUnits(t *testing.T) {
	// 1 fL is 1/pi cd/ft2, 1 fc is 1 lm/ft2, 1 ft is 0.3048 m (NIST Special Publication 811, 2008,
	// Appendix B: 3.426259 cd/m2 and 10.76391 lx; figures from memory).
	near(t, "1 fL in cd/m2", float64(FootLambert(1).CdM2()), 3.426259, 5e-7)
	near(t, "1 fc in lx", float64(FootCandle(1).Lux()), 10.76391, 5e-6)
	// PS3.14 section 3: 1 footlambert is 3.426 cd/m2.
	near(t, "1 fL in cd/m2, PS3.14", float64(FootLambert(1).CdM2()), 3.426, 5e-4)
	// Worked by hand from the same factors.
	near(t, "50 fL in cd/m2", float64(FootLambert(50).CdM2()), 171.31, 5e-3)
	near(t, "171.31 cd/m2 in fL", float64(CdM2(171.31).FootLambert()), 50, 5e-3)
	near(t, "100 fL in cd/m2", float64(FootLambert(100).CdM2()), 342.6, 5e-2)
	near(t, "25 lx in fc", float64(Lux(25).FootCandle()), 2.32, 5e-3)
	// A white that reflects all light evenly has a luminance of E/pi: 1 fL for 1 fc, by definition
	// of the two units.
	near(t, "white under 1 fc in fL", float64(Reflected(FootCandle(1).Lux(), 1/math.Pi).FootLambert()), 1, 1e-15)
}

func TestReflected(t *testing.T) {
	// Worked by hand, Lamb = Rd E; the tolerance is rounding.
	rows := []struct {
		name string
		e    Lux
		rd   PerLux
		want float64
	}{
		{"reading room", 40, 0.005, 0.200},
		{"brighter room", 60, 0.005, 0.300},
		{"matt screen in low light", 25, 0.003, 0.075},
		{"bright screen, bright room", 100, 0.010, 1.000},
		{"dark", 0, 0.005, 0},
	}
	for _, row := range rows {
		t.Run(row.name, func(t *testing.T) {
			near(t, "Reflected", float64(Reflected(row.e, row.rd)), row.want, 1e-15)
		})
	}
}

func TestUnitsRoundTrip(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	for range 10_000 {
		v := math.Exp(20*random.Float64() - 10)
		// Two roundings, each at most half a unit of the last place.
		near(t, "cd/m2 by way of fL over itself", float64(CdM2(v).FootLambert().CdM2())/v, 1, 4e-16)
		near(t, "lx by way of fc over itself", float64(Lux(v).FootCandle().Lux())/v, 1, 4e-16)
	}
}

func TestChromaticity(t *testing.T) {
	rows := []struct {
		name string
		xy   XY
		uv   UV
	}{
		// CIE 15:2018 formulas on the xy of the CIE illuminants, worked by a second program.
		{"D65", D65(), UV{0.197830, 0.468320}},
		{"A", XY{0.44757, 0.40745}, UV{0.255964, 0.524294}},
		{"D50", XY{0.34567, 0.35850}, UV{0.209159, 0.488075}},
		{"D55", XY{0.33242, 0.34743}, UV{0.204430, 0.480737}},
		{"D75", XY{0.29902, 0.31485}, UV{0.193535, 0.458508}},
		{"E", XY{1.0 / 3, 1.0 / 3}, UV{4.0 / 19, 9.0 / 19}},
		// Unit tests of an open colour-science library, 2024 tree.
		{"library, red", XY{0.54369558, 0.32107944}, UV{0.37720213, 0.50120264}},
		{"library, green", XY{0.29777734, 0.48246445}, UV{0.14536327, 0.52992069}},
		{"library, blue", XY{0.18582824, 0.14633764}, UV{0.16953603, 0.30039234}},
	}
	for _, row := range rows {
		t.Run(row.name, func(t *testing.T) {
			// Half a unit of the sixth decimal, and a little for the rounding of xy itself.
			near(t, "u'", row.xy.UV().U, row.uv.U, 6e-7)
			near(t, "v'", row.xy.UV().V, row.uv.V, 6e-7)
			// Six decimals of u'v' fix xy no better than this.
			near(t, "x", row.uv.XY().X, row.xy.X, 3e-6)
			near(t, "y", row.uv.XY().Y, row.xy.Y, 3e-6)
		})
	}
}

func TestChromaticityRoundTrip(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	for range 10_000 {
		y := 0.01 + 0.98*random.Float64()
		c := XY{X: (1 - y) * random.Float64(), Y: y}
		if err := c.Valid(); err != nil {
			t.Fatal(err)
		}
		// A few roundings of numbers up to 15.
		back := c.UV().XY()
		near(t, "x by way of u'v'", back.X, c.X, 1e-13)
		near(t, "y by way of u'v'", back.Y, c.Y, 1e-13)
	}
}

func TestDistance(t *testing.T) {
	a, b := UV{0.1978, 0.4683}, UV{0.1900, 0.4740}
	// Worked by hand: the root of 0.0078^2 + 0.0057^2.
	near(t, "distance", a.Distance(b), 0.00966, 5e-6)
	near(t, "distance the other way less this way", b.Distance(a)-a.Distance(b), 0, 0)
	near(t, "distance to itself", a.Distance(a), 0, 0)
}

func TestValid(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	rows := []struct {
		name string
		xy   XY
		ok   bool
	}{
		{"D65", D65(), true},
		{"red end of the spectrum, CIE 15:2018", XY{0.7347, 0.2653}, true},
		{"on the line within rounding", XY{0.1, 0.9000000000000001}, true},
		{"x of 0", XY{0, 0.5}, true},
		{"x and y above 1", XY{0.6, 0.41}, false},
		// DICOM PS3.17 Annex PPP prints this pair for the first field of its example.
		{"PS3.17 example", XY{0.940694, 1.455249}, false},
		{"negative x", XY{-0.01, 0.3}, false},
		{"negative y", XY{0.3, -0.01}, false},
		{"y of 0", XY{0.3, 0}, false},
		{"both 0", XY{}, false},
		{"x not a number", XY{nan, 0.3}, false},
		{"y not a number", XY{0.3, nan}, false},
		{"infinite x", XY{inf, 0.3}, false},
		{"infinite y", XY{0.3, inf}, false},
		{"y of minus infinity", XY{0.3, -inf}, false},
	}
	for _, row := range rows {
		t.Run(row.name, func(t *testing.T) {
			err := row.xy.Valid()
			if row.ok && err != nil {
				t.Errorf("refused: %v", err)
			}
			if !row.ok && !errors.Is(err, ErrChromaticity) {
				t.Errorf("error %v, want %v", err, ErrChromaticity)
			}
			if _, cct := row.xy.CCT(); !row.ok && !errors.Is(cct, ErrChromaticity) {
				t.Errorf("CCT gives error %v, want %v", cct, ErrChromaticity)
			}
		})
	}
}

func TestCCT(t *testing.T) {
	rows := []struct {
		name      string
		xy        XY
		want      float64
		tolerance float64
	}{
		// Unit tests of an open colour-science library, cubic approximation.
		{"D65", D65(), 6505.08059131, 1e-8},
		{"A", XY{0.44757, 0.40745}, 2857.28961266, 1e-8},
		// The published cubic, worked by a second program to two decimals.
		{"D50", XY{0.34567, 0.35850}, 5002.10, 5e-3},
		{"D55", XY{0.33242, 0.34743}, 5502.62, 5e-3},
		{"D75", XY{0.29902, 0.31485}, 7501.81, 5e-3},
		{"E", XY{1.0 / 3, 1.0 / 3}, 5458.95, 5e-3},
		// CIE daylight of known temperature, from the same library's tests. The cubic is an
		// approximation: it misses the first by 6 K, and 8 K are allowed.
		{"daylight of 4000 K", XY{0.382343625, 0.383766261015578}, 4000, 8},
		{"daylight of 7000 K", XY{0.305357431486880, 0.321646345474552}, 7000, 8},
	}
	for _, row := range rows {
		t.Run(row.name, func(t *testing.T) {
			got, err := row.xy.CCT()
			if err != nil {
				t.Fatal(err)
			}
			near(t, "CCT", float64(got), row.want, row.tolerance)
		})
	}
}

func TestCCTRefused(t *testing.T) {
	rows := []struct {
		name string
		xy   XY
	}{
		{"daylight of 25000 K", XY{0.24985367, 0.254799464210944}},
		{"candle, 1500 K", XY{0.5857, 0.3931}},
		// Primaries of Rec. ITU-R BT.709 (from memory), far from any black body.
		{"red primary", XY{0.64, 0.33}},
		{"green primary", XY{0.30, 0.60}},
		{"blue primary", XY{0.15, 0.06}},
		{"where the lines of equal temperature meet", XY{0.3320, 0.1858}},
		{"beside that point", XY{0.3321, 0.1858}},
		{"purple below that point", XY{0.33, 0.10}},
	}
	for _, row := range rows {
		t.Run(row.name, func(t *testing.T) {
			if got, err := row.xy.CCT(); !errors.Is(err, ErrNoCCT) {
				t.Errorf("CCT = %v, error %v, want %v", got, err, ErrNoCCT)
			}
		})
	}
}

// TestPlanckian places the CIE illuminants beside the black body. A lies on it by definition
// (CIE 15:2018; the approximation is good to about 1e-4), D65 lies 0.0032 from it (from memory).
func TestPlanckian(t *testing.T) {
	near(t, "distance of A", XY{0.44757, 0.40745}.fromPlanckian(2856), 0, 2e-4)
	near(t, "distance of D65", D65().fromPlanckian(6504), 0.0032, 2e-4)
}
