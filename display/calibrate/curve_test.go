package calibrate

import (
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"evenstep/display/photometry"
	"evenstep/display/readings"
	"evenstep/display/response"
)

// quiet is a panel of a plain power law, 0.5 to 400 cd/m2, in a room that adds 0.2.
var quiet = panel{emits: func(x float64) float64 { return 0.5 + 399.5*math.Pow(x, 2.2) }, ambient: 0.2}

func mustCurve(t testing.TB, in Input) *Curve {
	t.Helper()
	c, err := NewCurve(in)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func mustTable(t testing.TB, c *Curve, a Aim, in, out int) Result {
	t.Helper()
	r, err := c.Table(a, in, out)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func source(seed uint64) *rand.Rand { return rand.New(rand.NewPCG(seed, 47)) }

func about(c *Curve, what Concern) []Warning {
	var out []Warning
	for _, w := range c.Warnings {
		if w.Concern == what {
			out = append(out, w)
		}
	}
	return out
}

// Readings that make no curve are refused, in one line that says why.
func TestRefusals(t *testing.T) {
	good := quiet.input(quiet.read(source(1), dark(20), studyNoise), studyNoise)
	for _, c := range []struct {
		name  string
		spoil func(in *Input)
		want  string
		is    error
	}{
		{"P-values", func(in *Input) { in.Scale = readings.PValue }, "P-values", ErrNoCurve},
		{"a ramp", func(in *Input) { in.Ramp = "0badc0de" }, "0badc0de", ErrNoCurve},
		{"four levels", func(in *Input) { in.Readings = quiet.read(source(1), []int{0, 60, 160, 255}, studyNoise) }, "4 levels", ErrNoCurve},
		{"no upper end", func(in *Input) { in.Readings = in.Readings[:len(in.Readings)-1] }, "level 255", nil},
		{"falling", func(in *Input) {
			for i := range in.Readings {
				in.Readings[i].Level = 255 - in.Readings[i].Level
			}
		}, "rise from dark to bright", ErrNoCurve},
		{"one gray", func(in *Input) {
			for i := range in.Readings {
				in.Readings[i].Luminance = 100
			}
		}, "rise from dark to bright", ErrNoCurve},
		{"ambient unknown", func(in *Input) { in.Readings[3].Ambient = readings.Unstated }, "level", response.ErrAmbientUnknown},
		{"not a number", func(in *Input) { in.Readings[3].Luminance = photometry.CdM2(math.NaN()) }, "NaN", nil},
	} {
		t.Run(c.name, func(t *testing.T) {
			in := good
			in.Readings = slices.Clone(good.Readings)
			c.spoil(&in)
			_, err := NewCurve(in)
			if err == nil {
				t.Fatal("no error")
			}
			if !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
				t.Errorf("%q; expected one line with %q", err, c.want)
			}
			if c.is != nil && !errors.Is(err, c.is) {
				t.Errorf("%v; expected it to wrap %v", err, c.is)
			}
		})
	}
}

// Awkward panels give a usable table, and warnings that name the levels.
func TestAwkwardPanels(t *testing.T) {
	for _, c := range []struct {
		name     string
		emits    func(x float64) float64
		levels   []int
		noise    response.Noise
		concern  Concern
		from, to int // the warning's levels lie within a few of these
		reach    int
	}{
		{"flat at the bottom", func(x float64) float64 { return 0.5 + 400*math.Pow(max(0, x-0.1)/0.9, 2.2) }, dark(24), studyNoise, Flat, 0, 29, 8},
		{"flat at the bottom, as they are", func(x float64) float64 { return 0.5 + 400*math.Pow(max(0, x-0.1)/0.9, 2.2) }, even(52), response.Noise{}, Flat, 0, 29, 6},
		{"saturated", func(x float64) float64 { return 0.5 + 400*math.Pow(min(1, x/0.85), 2.2) }, even(32), studyNoise, Flat, 217, 255, 10},
		{"reversed", func(x float64) float64 {
			if x > 0.5 && x < 0.6 {
				x = 0.45
			}
			return 0.5 + 400*math.Pow(x, 2.2)
		}, even(52), studyNoise, Reversed, 125, 155, 5},
		{"reversed, as they are", func(x float64) float64 {
			if x > 0.5 && x < 0.6 {
				x = 0.45
			}
			return 0.5 + 400*math.Pow(x, 2.2)
		}, even(52), response.Noise{}, Reversed, 125, 155, 5},
		{"bright end turns back", func(x float64) float64 { return 0.5 + 400*math.Pow(x, 2.2)*(1-0.3*max(0, x-0.9)/0.1) }, even(52), response.Noise{}, Reversed, 230, 255, 5},
		{"half of it unread", quiet.emits, []int{0, 1, 2, 4, 7, 10, 14, 20, 255}, studyNoise, Sparse, 20, 255, 0},
		{"short", quiet.emits, even(6), studyNoise, Short, 0, 0, 0},
	} {
		t.Run(c.name, func(t *testing.T) {
			p := panel{c.emits, 0.2}
			curve := mustCurve(t, p.input(p.read(source(5), c.levels, c.noise), c.noise))
			named := about(curve, c.concern)
			if len(named) == 0 {
				t.Fatalf("no warning of %q in %v", c.concern, curve.Warnings)
			}
			near := func(a, b int) bool { return a-b <= c.reach && b-a <= c.reach }
			if !slices.ContainsFunc(named, func(w Warning) bool { return near(w.FromLevel, c.from) && near(w.ToLevel, c.to) }) {
				t.Errorf("%v; expected levels %d to %d within %d", named, c.from, c.to, c.reach)
			}
			rising(t, mustTable(t, curve, Aim{}, 8, 10).Table.Entries)
		})
	}
}

func rising(t testing.TB, entries []uint16) {
	t.Helper()
	for i := 1; i < len(entries); i++ {
		if entries[i] < entries[i-1] {
			t.Fatalf("the table falls at %d, from %d to %d", i, entries[i-1], entries[i])
		}
	}
}

// A plain panel that was read well raises no warning in more than a few of many series.
func TestNoFalseWarnings(t *testing.T) {
	const series, allowed = 60, 3
	raised := 0
	for i := range series {
		c := mustCurve(t, quiet.input(quiet.read(source(uint64(100+i)), dark(24), studyNoise), studyNoise))
		if len(c.Warnings) > 0 {
			raised++
			t.Log(c.Warnings)
		}
	}
	if raised > allowed {
		t.Errorf("%d of %d series raised a warning; expected %d at most", raised, series, allowed)
	}
}

// A mistyped reading, and a meter that is worse than was said, are named.
func TestScatter(t *testing.T) {
	rs := quiet.read(source(7), dark(32), studyNoise)
	rs[20].Luminance *= 1.12
	c := mustCurve(t, quiet.input(rs, studyNoise))
	if w := about(c, Scatter); len(w) != 1 || w[0].FromLevel != rs[20].Level {
		t.Errorf("%v; expected one warning about level %d", w, rs[20].Level)
	}
	worse := response.Noise{Repeatability: 0.03}
	c = mustCurve(t, quiet.input(quiet.read(source(8), dark(40), worse), studyNoise))
	if len(about(c, Scatter)) == 0 {
		t.Errorf("readings of 3 %% noise said to have 0.5 %%: %v; expected a warning of scatter", c.Warnings)
	}
}

func TestRampUnstated(t *testing.T) {
	in := quiet.input(quiet.read(source(1), dark(20), studyNoise), studyNoise)
	in.Ramp = ""
	if c := mustCurve(t, in); len(about(c, RampOpen)) != 1 {
		t.Errorf("%v; expected a warning that no ramp is stated", c.Warnings)
	}
}

// The 95 % band holds the panel's luminance, taken over many series and levels, on families of both halves.
// Kinks between two readings are what it may miss.
func TestBandCoverage(t *testing.T) {
	const series = 12
	inside, all := 0, 0
	for _, f := range append(slices.Clone(tuned), heldOut...) {
		for i := range series {
			rng := source(uint64(i))
			p := f.draw(rng)
			c := mustCurve(t, p.input(p.read(rng, dark(20), studyNoise), studyNoise))
			for l := 0; l <= 255; l += 5 {
				x := float64(l) / 255
				b := c.Band(Drive(x))
				if b.Low > b.Luminance || b.High < b.Luminance {
					t.Fatalf("%s, level %d: %v is no band", f.name, l, b)
				}
				all++
				if v := photometry.CdM2(p.full(x)); v >= b.Low && v <= b.High {
					inside++
				}
			}
		}
	}
	share := float64(inside) / float64(all)
	t.Logf("%.1f %% of %d luminances inside", 100*share, all)
	if share < 0.9 {
		t.Errorf("%.1f %% of the luminances inside the band; expected 95 %%, less a little for kinks", 100*share)
	}
}

// Repeats, ambient light inside the readings and a known meter give the same curve as they should.
func TestReadingsAlike(t *testing.T) {
	in := quiet.input(quiet.read(source(3), dark(20), studyNoise), studyNoise)
	a := mustCurve(t, in)
	inside := in
	inside.Readings = slices.Clone(in.Readings)
	for i := range inside.Readings {
		inside.Readings[i].Luminance += photometry.CdM2(quiet.ambient)
		inside.Readings[i].Ambient = readings.Included
	}
	b := mustCurve(t, inside)
	for x := 0.0; x <= 1; x += 0.05 {
		if r := float64(b.At(Drive(x))/a.At(Drive(x))) - 1; math.Abs(r) > 0.01 {
			t.Errorf("at %.2f the curves differ by %.2f %%; expected less than 1 %%: only the weights of the dark readings differ", x, 100*r)
		}
	}
	twice := in
	twice.Readings = slices.Clone(in.Readings)
	for _, r := range in.Readings {
		r.Role = readings.Repeat
		twice.Readings = append(twice.Readings, r)
	}
	c := mustCurve(t, twice)
	at := Drive(0.5)
	if once, more := a.Band(at), c.Band(at); more.High-more.Low >= once.High-once.Low {
		t.Errorf("band %v after repeats, %v before; expected it narrower", more, once)
	}
	if c.Points[0].Readings != 2 {
		t.Errorf("%d readings at level 0; expected 2", c.Points[0].Readings)
	}
}

// Whatever rises at all gives a table that never falls, whose ends are those of the panel.
func TestTableNeverFalls(t *testing.T) {
	for i := range 40 {
		rng := source(uint64(1000 + i))
		n := 6 + rng.IntN(30)
		noise := response.Noise{Repeatability: []float64{0, 0.005, 0.03}[i%3]}
		p := quiet
		rough := uniform(rng, 0, 0.3)
		p.emits = func(x float64) float64 { return quiet.emits(x) * (1 + rough*math.Sin(40*x)*x) }
		c := mustCurve(t, p.input(p.read(rng, even(n), noise), noise))
		in, out := 8+rng.IntN(5), 8+rng.IntN(9)
		res := mustTable(t, c, Aim{}, in, out)
		if err := res.Table.Check(); err != nil {
			t.Fatal(err)
		}
		rising(t, res.Table.Entries)
		if len(res.Table.Entries) != 1<<in || res.Table.OutBits != out {
			t.Errorf("%d entries of %d bits; expected %d of %d", len(res.Table.Entries), res.Table.OutBits, 1<<in, out)
		}
	}
}

// The curve of 10-bit levels is that of the same panel read at 8 bits.
func TestLevelsOfTenBits(t *testing.T) {
	noise := response.Noise{Repeatability: 0.001}
	eight := quiet.read(source(4), dark(20), noise)
	ten := slices.Clone(eight)
	for i := range ten {
		ten[i].Level = int(math.Round(float64(ten[i].Level) * 1023 / 255))
		ten[i].Luminance = photometry.CdM2(quiet.emits(float64(ten[i].Level) / 1023))
	}
	in := quiet.input(ten, noise)
	in.Bits = 10
	a, b := mustCurve(t, quiet.input(eight, noise)), mustCurve(t, in)
	for x := 0.0; x <= 1; x += 0.1 {
		if r := float64(b.At(Drive(x))/a.At(Drive(x))) - 1; math.Abs(r) > 0.005 {
			t.Errorf("at %.1f they differ by %.2f %%; expected less than 0.5 %%", x, 100*r)
		}
	}
}

// Many levels: a curve of 256 readings is nearer to the panel than one of 20.
func TestManyLevels(t *testing.T) {
	all := make([]int, 256)
	for i := range all {
		all[i] = i
	}
	worst := func(c *Curve) float64 {
		w := 0.0
		for x := 0.0; x <= 1; x += 1. / 64 {
			w = max(w, math.Abs(indexOf(float64(c.At(Drive(x))))-indexOf(quiet.full(x))))
		}
		return w
	}
	c := mustCurve(t, quiet.input(quiet.read(source(9), all, studyNoise), studyNoise))
	if w := worst(c); w > 0.6 {
		t.Errorf("%.2f JND off; expected 0.6 at most, of readings that are 0.7 JND off each", w)
	}
}

// Readings of any kind end in a table that never falls, or in a refusal of one line.
func TestGarbage(t *testing.T) {
	tables := 0
	for i := range 150 {
		rng := source(uint64(3000 + i))
		bits := 3 + rng.IntN(12)
		top := 1<<bits - 1
		noise := response.Noise{
			Repeatability: []float64{0, 1e-6, 0.005, 0.2}[rng.IntN(4)],
			Floor:         photometry.CdM2([]float64{0, 0.005, 1}[rng.IntN(3)]),
			Resolution:    photometry.CdM2([]float64{0, 0.1}[rng.IntN(2)]),
		}
		seen := map[int]bool{0: true, top: true}
		for range rng.IntN(25) {
			seen[rng.IntN(top+1)] = true
		}
		in := Input{Bits: bits, Noise: noise, Light: response.DarkRoom()}
		for l := range seen {
			v := math.Pow(float64(l)/float64(top), uniform(rng, 0, 3)) * math.Pow(10, uniform(rng, -3, 4))
			in.Readings = append(in.Readings, readings.Reading{Level: l, Luminance: photometry.CdM2(v), Role: readings.Series, Ambient: readings.Excluded})
		}
		slices.SortFunc(in.Readings, func(a, b readings.Reading) int { return a.Level - b.Level })
		c, err := NewCurve(in)
		var res Result
		if err == nil {
			res, err = c.Table(Aim{Min: cd(0.2), Max: cd(50)}, 8, 8+rng.IntN(9))
		}
		if err != nil {
			if strings.Contains(err.Error(), "\n") {
				t.Errorf("%q is more than one line", err)
			}
			continue
		}
		tables++
		rising(t, res.Table.Entries)
		for _, w := range c.Warnings {
			if w.Text == "" || strings.Contains(w.Text, "\n") || w.ToLevel > top {
				t.Errorf("%+v", w)
			}
		}
		if p, err := c.Predict(res.Table, Path{}); err == nil && !(p.GreatestInterval[0] <= p.Greatest && p.Greatest <= p.GreatestInterval[1]) {
			t.Errorf("%v outside %v", p.Greatest, p.GreatestInterval)
		}
	}
	if tables < 10 {
		t.Errorf("%d tables; expected enough of them for the test to mean something", tables)
	}
}
