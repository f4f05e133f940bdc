package luts

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

// byHand carries one stored value through the stages as the formulas are printed, one after the other in double
// precision, without anything of Compose.
func byHand(c Chain, stored int) uint16 {
	x := float64(stored)
	least, greatest := 0.0, math.Pow(2, float64(c.Stored.Bits))-1
	if c.Stored.Signed {
		least, greatest = -math.Pow(2, float64(c.Stored.Bits-1)), math.Pow(2, float64(c.Stored.Bits-1))-1
	}
	entry := func(l Lookup, x float64) float64 {
		i := int(math.Floor(math.Abs(x)+0.5)) * map[bool]int{true: 1, false: -1}[x >= 0]
		switch {
		case i < l.First:
			return float64(l.Entries[0])
		case i >= l.First+len(l.Entries):
			return float64(l.Entries[len(l.Entries)-1])
		}
		return float64(l.Entries[i-l.First])
	}
	full := func(bits int) float64 { return math.Pow(2, float64(bits)) - 1 }

	switch s := c.Modality.(type) {
	case Rescale:
		product := s.Slope * x
		x = product + s.Intercept
		a, b := s.Slope*least, s.Slope*greatest
		least, greatest = math.Min(a+s.Intercept, b+s.Intercept), math.Max(a+s.Intercept, b+s.Intercept)
	case Lookup:
		x = entry(s, x)
		least, greatest = 0, full(s.Bits)
	}

	pmax := full(c.OutBits)
	if c.Calibration != nil {
		pmax = full(c.Calibration.InBits)
	}
	ymin, ymax := 0.0, pmax
	if l, ok := c.Presentation.(Lookup); ok {
		ymax = float64(len(l.Entries)) - 1
	}
	var y float64
	switch s := c.VOI.(type) {
	case nil:
		y = (x - least) * ymax / (greatest - least)
	case Lookup:
		y = entry(s, x) * ymax / full(s.Bits)
	case Windowing:
		cc, w := s.Center, s.Width
		switch s.Function {
		case LinearExact:
			if x <= cc-w/2 {
				y = ymin
			} else if x > cc+w/2 {
				y = ymax
			} else {
				y = ((x-cc)/w+0.5)*(ymax-ymin) + ymin
			}
		case Sigmoid:
			y = (ymax-ymin)/(1+math.Exp(-4*(x-cc)/w)) + ymin
		default:
			if x <= cc-0.5-(w-1)/2 {
				y = ymin
			} else if x > cc-0.5+(w-1)/2 {
				y = ymax
			} else {
				y = ((x-(cc-0.5))/(w-1)+0.5)*(ymax-ymin) + ymin
			}
		}
	}
	p := y
	switch s := c.Presentation.(type) {
	case Lookup:
		p = entry(s, y) * pmax / full(s.Bits)
	case Shape:
		if s == Inverse {
			p = pmax - y
		}
	}
	level := uint16(math.Floor(p + 0.5))
	if c.Calibration != nil {
		level = c.Calibration.Entries[level]
	}
	return level
}

func pick[T any](r *rand.Rand, of ...T) T { return of[r.IntN(len(of))] }

func randomLookup(r *rand.Rand, first int) Lookup {
	l := Lookup{First: first, Bits: 8 + r.IntN(9), Entries: make([]uint16, pick(r, 1, 2, 255, 256, 1000, 4096, 65536))}
	for i := range l.Entries {
		l.Entries[i] = uint16(r.IntN(1 << l.Bits))
	}
	return l
}

func randomTable(r *rand.Rand, in, out int) Table {
	t := Table{Kind: Calibration, InBits: in, OutBits: out, Entries: make([]uint16, 1<<in)}
	for i := range t.Entries {
		t.Entries[i] = uint16(r.IntN(1 << out))
	}
	return t
}

func randomChain(r *rand.Rand) Chain {
	c := Chain{Stored: Stored{8 + r.IntN(9), r.IntN(2) == 0}, OutBits: 8 + r.IntN(9)}
	unit := 1.0
	switch r.IntN(4) {
	case 0:
		unit = pick(r, 1, 0.5, 2.57, -1, -0.003, 1e-6)
		c.Modality = Rescale{unit, pick(r, 0, -1024, 0.25, 1e4)}
	case 1:
		c.Modality = randomLookup(r, pick(r, 0, c.Stored.Min(), c.Stored.Min()+3, 100))
	}
	switch r.IntN(6) {
	case 0:
	case 1:
		c.VOI = randomLookup(r, pick(r, 0, -1024, 100))
	default:
		width := math.Abs(unit) * math.Pow(2, r.Float64()*18-1)
		if r.IntN(2) == 0 {
			width = math.Ceil(width) // integers meet the borders of the window
		}
		center := math.Floor((r.Float64() - 0.25) * math.Pow(2, float64(c.Stored.Bits)))
		c.VOI = Windowing{pick(r, "", Linear, LinearExact, Sigmoid), center, width}
		if w := c.VOI.(Windowing); (w.Function == "" || w.Function == Linear) && width < 1 {
			c.VOI = Windowing{w.Function, center, 1}
		}
	}
	switch r.IntN(4) {
	case 0:
		c.Presentation = Identity
	case 1:
		c.Presentation = Inverse
	case 2:
		c.Presentation = randomLookup(r, 0)
	}
	if r.IntN(3) == 0 {
		t := randomTable(r, 8+r.IntN(5), c.OutBits)
		c.Calibration = &t
	}
	return c
}

func TestComposedTableEqualsStagesOneByOne(t *testing.T) {
	n := 400
	if testing.Short() {
		n = 100
	}
	r := rand.New(rand.NewPCG(6, 1))
	for i := range n {
		c := randomChain(r)
		got := compose(t, c).Table()
		if err := got.Check(); err != nil {
			t.Fatalf("chain %d: %v", i, err)
		}
		if got.Kind != Window || got.InBits != c.Stored.Bits || got.OutBits != c.OutBits || got.First != c.Stored.Min() {
			t.Fatalf("chain %d: %s of %d to %d bits from %d for %+v", i, got.Kind, got.InBits, got.OutBits, got.First, c.Stored)
		}
		for v := c.Stored.Min(); v <= c.Stored.Max(); v++ {
			if want := byHand(c, v); got.At(v) != want {
				t.Fatalf("chain %d: stored value %d gives %d, want %d\nmodality %T, VOI %+v, presentation %T", i, v, got.At(v), want, c.Modality, c.VOI, c.Presentation)
			}
		}
	}
}

func TestStoredValues(t *testing.T) {
	for _, c := range []struct {
		stored    Stored
		sample    uint16
		value     int
		low, high int
	}{
		{Stored{12, false}, 0xF801, 0x801, 0, 4095},
		{Stored{12, true}, 0x0801, -2047, -2048, 2047},
		{Stored{12, true}, 0xF7FF, 2047, -2048, 2047},
		{Stored{16, true}, 0x8000, -32768, -32768, 32767},
		{Stored{16, false}, 0xFFFF, 65535, 0, 65535},
		{Stored{8, true}, 0x1280, -128, -128, 127},
		{Stored{1, false}, 0xFFFE, 0, 0, 1},
		{Stored{1, true}, 1, -1, -1, 0},
	} {
		if v := c.stored.Value(c.sample); v != c.value {
			t.Errorf("%+v of %#x: %d, want %d", c.stored, c.sample, v, c.value)
		}
		if c.stored.Min() != c.low || c.stored.Max() != c.high {
			t.Errorf("%+v: %d to %d, want %d to %d", c.stored, c.stored.Min(), c.stored.Max(), c.low, c.high)
		}
	}
}

func TestChainWithoutStagesSpreadsTheStoredRange(t *testing.T) {
	m := compose(t, Chain{Stored: Stored{12, true}, OutBits: 8})
	for stored, want := range map[float64]uint16{-2048: 0, 2047: 255, 0: 128, -1: 127, -2049: 0, 5000: 255} {
		if got := m.At(stored).Output; got != want {
			t.Errorf("%g gives %d, want %d", stored, got, want)
		}
	}
	if m.MaxPValue() != 255 {
		t.Errorf("greatest P-value %g", m.MaxPValue())
	}
}

func TestCalibrationGivesDepths(t *testing.T) {
	table := randomTable(rand.New(rand.NewPCG(1, 1)), 10, 12)
	m := compose(t, Chain{Stored: Stored{Bits: 10}, Calibration: &table})
	if m.MaxPValue() != 1023 || m.Table().OutBits != 12 {
		t.Errorf("P-values to %g, output of %d bits", m.MaxPValue(), m.Table().OutBits)
	}
	for i, e := range m.Table().Entries {
		if e != table.Entries[i] {
			t.Fatalf("%d gives %d, want %d", i, e, table.Entries[i])
		}
	}
}

func TestChainErrors(t *testing.T) {
	good := Stored{Bits: 12}
	window := func(f Function, c, w float64) Chain { return Chain{Stored: good, VOI: Windowing{f, c, w}, OutBits: 8} }
	modality := func(m Modality) Chain { return Chain{Stored: good, Modality: m, OutBits: 8} }
	ten := Table{Calibration, 1, 10, 0, []uint16{0, 1023}}
	stored := Table{Window, 1, 10, 0, []uint16{0, 1023}}
	for _, c := range []struct {
		chain Chain
		want  string
	}{
		{Chain{OutBits: 8}, "stored values: 0 bits; expected 1 to 16"},
		{Chain{Stored: Stored{Bits: 17}, OutBits: 8}, "stored values: 17 bits"},
		{Chain{Stored: good}, "output: 0 bits; expected 8 to 16"},
		{Chain{Stored: good, OutBits: 7}, "output: 7 bits"},
		{Chain{Stored: good, OutBits: 17}, "output: 17 bits"},
		{window("", 40, 0.99), "VOI: window width 0.99; expected at least 1 with LINEAR; widen the window or take LINEAR_EXACT"},
		{window(Linear, 40, 0), "VOI: window width 0; expected at least 1"},
		{window(LinearExact, 40, 0), "VOI: window width 0; expected above 0 with LINEAR_EXACT"},
		{window(Sigmoid, 40, -3), "VOI: window width -3; expected above 0 with SIGMOID"},
		{window(Sigmoid, 40, math.Inf(1)), "VOI: window width +Inf; expected a finite number"},
		{window(Linear, 40, math.NaN()), "VOI: window width NaN; expected a finite number"},
		{window(Linear, math.NaN(), 1), "VOI: window center NaN; expected a finite number"},
		{window("CUBIC\n", 40, 400), `VOI: function "CUBIC\n"; expected LINEAR, LINEAR_EXACT or SIGMOID`},
		{modality(Rescale{0, 5}), "modality: rescale slope 0; expected a number other than 0"},
		{modality(Rescale{math.NaN(), 5}), "modality: rescale slope NaN"},
		{modality(Rescale{1, math.Inf(-1)}), "modality: rescale intercept -Inf; expected a finite number"},
		{modality(Rescale{1e305, 0}), "modality: slope 1e+305 and intercept 0 give values from 0 to +Inf"},
		{modality(Rescale{1, 1e30}), "modality: slope 1 and intercept 1e+30 give values from 1e+30 to 1e+30"},
		{modality(Lookup{}), "modality: table of 0 entries; expected 1 to 65536"},
		{modality(Lookup{Bits: 8, Entries: make([]uint16, 1<<16+1)}), "modality: table of 65537 entries"},
		{modality(Lookup{First: -32769, Bits: 8, Entries: []uint16{0}}), "modality: first input mapped -32769; expected -32768 to 65535"},
		{modality(Lookup{First: 65536, Bits: 8, Entries: []uint16{0}}), "modality: first input mapped 65536"},
		{modality(Lookup{Bits: 7, Entries: []uint16{0}}), "modality: 7 bits per entry; expected 8 to 16"},
		{Chain{Stored: good, VOI: Lookup{Bits: 17, Entries: []uint16{0}}, OutBits: 8}, "VOI: 17 bits per entry"},
		{Chain{Stored: good, VOI: Lookup{Bits: 8, Entries: []uint16{0, 256}}, OutBits: 8}, "VOI: entry 1 of the table is 256; expected at most 255 for 8 bits"},
		{Chain{Stored: good, Presentation: Lookup{Bits: 6, Entries: []uint16{0}}, OutBits: 8}, "presentation: 6 bits per entry"},
		{Chain{Stored: good, Presentation: Lookup{First: 1, Bits: 8, Entries: []uint16{0}}, OutBits: 8}, "presentation: first input mapped 1; expected 0"},
		{Chain{Stored: good, Presentation: Shape("LIN OD"), OutBits: 8}, `presentation: shape "LIN OD"; expected IDENTITY or INVERSE`},
		{Chain{Stored: good, Calibration: &Table{}}, `calibration: table: kind ""; expected "calibration" or "window"`},
		{Chain{Stored: good, Calibration: &stored}, `calibration: a table of kind "window"; expected "calibration"`},
		{Chain{Stored: good, Calibration: &ten, OutBits: 8}, "calibration: entries of 10 bits for an output of 8; expected the same depth"},
	} {
		_, err := c.chain.Compose()
		checkError(t, err, c.want)
	}
}

func TestDescriptorErrors(t *testing.T) {
	for _, c := range []struct {
		entries, first, bits int
		data                 []uint16
		want                 string
	}{
		{65537, 0, 8, nil, "LUT Descriptor: 65537 entries; expected 0 to 65535"},
		{-32769, 0, 8, nil, "LUT Descriptor: -32769 entries"},
		{0, 0, 8, []uint16{1, 2}, "LUT Data: 2 entries; expected 65536 as the LUT Descriptor says"},
		{3, 0, 8, []uint16{1, 2}, "LUT Data: 2 entries; expected 3"},
		{2, 0, 4, []uint16{1, 2}, "LUT Descriptor: 4 bits per entry; expected 8 to 16"},
		{2, 70000, 8, []uint16{1, 2}, "LUT Descriptor: first input mapped 70000"},
		{2, 0, 8, []uint16{1, 300}, "LUT Descriptor: entry 1 of the table is 300"},
	} {
		_, err := NewLookup(c.entries, c.first, c.bits, c.data)
		checkError(t, err, c.want)
	}
}

func TestParseFunction(t *testing.T) {
	for name, want := range map[string]Function{
		"": Linear, "LINEAR": Linear, "linear": Linear, "linear-exact": LinearExact, "LINEAR_EXACT": LinearExact, "Sigmoid": Sigmoid,
	} {
		if got, err := ParseFunction(name); err != nil || got != want {
			t.Errorf("%q: %q, %v", name, got, err)
		}
	}
	_, err := ParseFunction("gamma")
	checkError(t, err, `VOI: function "gamma"; expected linear, linear-exact or sigmoid`)
}

// checkError wants one line with all its parts that begins with want.
func checkError(t *testing.T, err error, want string) {
	t.Helper()
	if err == nil {
		t.Errorf("no error, want %q", want)
		return
	}
	text := err.Error()
	if !strings.HasPrefix(text, want) {
		t.Errorf("error %q, want %q", text, want)
	}
	checkOneLine(t, err)
}

func checkOneLine(t *testing.T, err error) {
	t.Helper()
	text := err.Error()
	if strings.ContainsAny(text, "\r\n\x00\x1b") || strings.Count(text, "; ") < 2 || !strings.Contains(text, "; expected ") {
		t.Errorf("error %q is not one line of place, found, expected, do", text)
	}
}
