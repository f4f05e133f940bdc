package luts

import (
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// published reads a file of testdata/luts as rows by column name; its first comment names the source.
func published(t *testing.T, name string) []map[string]string {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "testdata", "luts", name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	lines, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(lines) < 2 {
		t.Fatalf("%s has no rows", name)
	}
	var rows []map[string]string
	for _, line := range lines[1:] {
		row := map[string]string{}
		for i, cell := range line {
			row[lines[0][i]] = cell
		}
		rows = append(rows, row)
	}
	return rows
}

func number(t *testing.T, text string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// compose is Compose where it must succeed.
func compose(t *testing.T, c Chain) *Mapping {
	t.Helper()
	m, err := c.Compose()
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// The four examples printed in PS3.3 C.11.2.1.2.1, in steps of a quarter over more than the window.
func TestPrintedWindows(t *testing.T) {
	for _, row := range published(t, "window-printed.csv") {
		center, width := number(t, row["center"]), number(t, row["width"])
		low, high := number(t, row["low"]), number(t, row["high"])
		m := compose(t, Chain{Stored: Stored{16, true}, VOI: Windowing{Linear, center, width}, OutBits: 8})
		for x := low - 10; x <= high+10; x += 0.25 {
			var want float64
			switch {
			case x <= low:
			case x > high:
				want = 255
			case row["middle"] == "":
				t.Fatalf("window %g/%g: %g is below %g and above %g", center, width, x, high, low)
			default:
				want = ((x-number(t, row["middle"]))/number(t, row["span"]) + 0.5) * 255
			}
			if got := m.At(x).PValue; got != want {
				t.Fatalf("window %g/%g of %g: %v, want %v", center, width, x, got, want)
			}
		}
	}
}

// The values of testdata/luts/window-values.csv, to half of their last digit.
func TestWindowValues(t *testing.T) {
	for _, row := range published(t, "window-values.csv") {
		bits := map[string]int{"255": 8, "1023": 10}[row["ymax"]]
		for column, f := range map[string]Function{"linear": Linear, "linear_exact": LinearExact, "sigmoid": Sigmoid} {
			w := Windowing{f, number(t, row["center"]), number(t, row["width"])}
			// Values with fewer than five decimals end there and are exact, up to a few roundings of doubles below 1024.
			tolerance := 1e-12
			if _, decimals, _ := strings.Cut(row[column], "."); len(decimals) >= 5 {
				tolerance += 0.5 * math.Pow(10, -float64(len(decimals)))
			}
			got := compose(t, Chain{Stored: Stored{16, true}, VOI: w, OutBits: bits}).At(number(t, row["x"])).PValue
			if want := number(t, row[column]); math.Abs(got-want) > tolerance {
				t.Errorf("%+v to %s of %s: %.9f, want %s", w, row["ymax"], row["x"], got, row[column])
			}
		}
	}
}

// PS3.3 C.11.2.1.2.1, notes: what some windows come to, for integers.
func TestNotesOnLinear(t *testing.T) {
	for bits := 8; bits <= 16; bits++ {
		// Center 2^(n-1), width 2^n is the identity for n-bit unsigned data.
		c := Chain{Stored: Stored{Bits: bits}, VOI: Windowing{Linear, float64(int(1) << (bits - 1)), float64(int(1) << bits)}, OutBits: bits}
		for i, e := range compose(t, c).Table().Entries {
			if int(e) != i {
				t.Fatalf("%d bits: %d becomes %d", bits, i, e)
			}
		}
	}
	for _, ends := range [][2]int{{0, 255}, {-50, 49}, {17, 18}, {-1024, 3071}, {5, 5}} {
		// Center (x1+x2+1)/2, width x2-x1+1 selects exactly x1 to x2.
		w := WindowOver(float64(ends[0]), float64(ends[1]))
		if w.Center != float64(ends[0]+ends[1]+1)/2 || w.Width != float64(ends[1]-ends[0]+1) {
			t.Errorf("window over %v: %+v", ends, w)
		}
		m := compose(t, Chain{Stored: Stored{16, true}, VOI: w, OutBits: 8})
		for x := ends[0] - 2; x <= ends[1]+2; x++ {
			p := m.At(float64(x)).PValue
			switch {
			case x <= ends[0]: // also where both ends are one: width 1 is a threshold above it
				if p != 0 {
					t.Errorf("window over %v: %d becomes %g, want 0", ends, x, p)
				}
			case x >= ends[1]:
				if p != 255 {
					t.Errorf("window over %v: %d becomes %g, want 255", ends, x, p)
				}
			case p <= 0 || p >= 255:
				t.Errorf("window over %v: %d becomes %g, want between the ends", ends, x, p)
			}
		}
	}
	for _, width := range []float64{1, 2} {
		// Width 1 is a threshold at the center; for integers width 2 gives the same.
		m := compose(t, Chain{Stored: Stored{Bits: 12}, VOI: Windowing{"", 2048, width}, OutBits: 10})
		for x, e := range m.Table().Entries {
			if want := map[bool]uint16{false: 0, true: 1023}[x >= 2048]; e != want {
				t.Fatalf("width %g: %d becomes %d, want %d", width, x, e, want)
			}
		}
	}
}

// PS3.3 C.11.2.1.3.2: SIGMOID never reaches its ends, and its slope at the center is that of LINEAR_EXACT.
func TestSigmoidShape(t *testing.T) {
	stored := Stored{16, true}
	sigmoid := compose(t, Chain{Stored: stored, VOI: Windowing{Sigmoid, 40, 400}, OutBits: 8})
	exact := compose(t, Chain{Stored: stored, VOI: Windowing{LinearExact, 40, 400}, OutBits: 8})
	// Beyond 9 widths double precision cannot tell the value from 255.
	for _, x := range []float64{40 - 3600, -160, 240, 40 + 3400} {
		if p := sigmoid.At(x).PValue; p <= 0 || p >= 255 {
			t.Errorf("SIGMOID of %g: %g", x, p)
		}
	}
	slope := func(m *Mapping) float64 { return (m.At(40.001).PValue - m.At(39.999).PValue) / 0.002 }
	// The third derivative leaves 1e-11 of the slope over this step, rounding of 127.5 leaves 1e-11.
	if got, want := slope(sigmoid), slope(exact); math.Abs(got-want) > 1e-10 {
		t.Errorf("slope of SIGMOID %v, of LINEAR_EXACT %v", got, want)
	}
}

// PS3.3 C.11.6.1, printed examples of implicit scaling.
func TestImplicitScaling(t *testing.T) {
	ramp := func(bits, entries int) Lookup {
		l := Lookup{Bits: bits}
		for i := range entries {
			l.Entries = append(l.Entries, uint16(i))
		}
		return l
	}
	// Window 0/100 before a Presentation LUT of 256 entries: -50 to +49 is spread over 0 to 255, then looked up.
	falling := Lookup{Bits: 8}
	for i := range 256 {
		falling.Entries = append(falling.Entries, uint16(255-i))
	}
	m := compose(t, Chain{Stored: Stored{8, true}, VOI: Windowing{Linear, 0, 100}, Presentation: falling, OutBits: 8})
	for x := -50; x <= 49; x++ {
		spread := math.Round((float64(x) + 50) * 255 / 99)
		if got := m.At(float64(x)).PValue; got != 255-spread {
			t.Errorf("%d: P-value %g, want %g", x, got, 255-spread)
		}
	}
	// A VOI LUT of 16 bits with a shape: 0 to 65535 is the full range of P-values.
	for _, shape := range []Shape{Identity, Inverse} {
		m := compose(t, Chain{Stored: Stored{Bits: 16}, VOI: ramp(16, 1<<16), Presentation: shape, OutBits: 8})
		for _, x := range []float64{0, 1, 257, 32768, 65278, 65535} {
			want := x / 257
			if shape == Inverse {
				want = 255 - want
			}
			// One rounding of a value below 256.
			if got := m.At(x).PValue; math.Abs(got-want) > 1e-13 {
				t.Errorf("%s: %g gives %g, want %g", shape, x, got, want)
			}
		}
	}
	// A VOI LUT of 16 bits before a Presentation LUT of 4096 entries is scaled to 0 to 4095.
	m = compose(t, Chain{Stored: Stored{Bits: 16}, VOI: ramp(16, 1<<16), Presentation: ramp(12, 4096), OutBits: 12})
	for x := range 1 << 16 {
		if got, want := int(m.At(float64(x)).Output), (2*x*4095+65535)/(2*65535); got != want {
			t.Fatalf("%d gives %d, want %d", x, got, want)
		}
	}
}

// PS3.3 C.11.1.1.1, C.11.2.1.1, C.11.6.1.1: the three values of a LUT Descriptor.
func TestDescriptor(t *testing.T) {
	full := make([]uint16, 1<<16)
	for i := range full {
		full[i] = uint16(i)
	}
	// 0 means 65536; entry counts are unsigned whatever they were read as.
	for entries, n := range map[int]int{0: 65536, 256: 256, 40000: 40000, 40000 - 65536: 40000} {
		l, err := NewLookup(entries, 0, 16, full[:n])
		if err != nil || len(l.Entries) != n {
			t.Errorf("%d entries: %d, %v", entries, len(l.Entries), err)
		}
	}
	// Inputs below the first mapped take the first entry, inputs beyond the last the last.
	l, err := NewLookup(3, -1, 8, []uint16{10, 20, 40})
	if err != nil {
		t.Fatal(err)
	}
	modality := compose(t, Chain{Stored: Stored{8, true}, Modality: l, OutBits: 8})
	voi := compose(t, Chain{Stored: Stored{8, true}, VOI: l, OutBits: 8})
	for x, want := range map[float64]float64{-128: 10, -2: 10, -1: 10, 0: 20, 1: 40, 2: 40, 127: 40, 0.5: 40, 0.49: 20, -0.5: 10} {
		if got := modality.At(x).Modality; got != want {
			t.Errorf("modality: %g gives %g, want %g", x, got, want)
		}
		if got := voi.At(x).PValue; got != want {
			t.Errorf("VOI: %g gives %g, want %g", x, got, want)
		}
	}
}

// PS3.3 C.7.6.3.1.2: MONOCHROME1 is shown white at its smallest sample after the VOI stage. With LINEAR this is
// not an inversion of the stored values before it.
func TestInverseComesAfterTheWindow(t *testing.T) {
	stored, w := Stored{Bits: 8}, Windowing{Linear, 100, 51}
	plain := compose(t, Chain{Stored: stored, VOI: w, OutBits: 8})
	inverse := compose(t, Chain{Stored: stored, VOI: w, Presentation: Inverse, OutBits: 8})
	before := compose(t, Chain{Stored: stored, Modality: Rescale{-1, 255}, VOI: Windowing{Linear, 155, 51}, OutBits: 8})
	differ := false
	for x := range 256 {
		v := float64(x)
		if got, want := inverse.At(v).PValue, 255-plain.At(v).PValue; got != want {
			t.Fatalf("%d: %g, want %g", x, got, want)
		}
		differ = differ || inverse.At(v).Output != before.At(v).Output
	}
	if !differ {
		t.Error("inversion before the window is the same as after it")
	}
}

func TestHalvesGoAwayFromZero(t *testing.T) {
	// LINEAR_EXACT of its center is half of the range: 127.5 at 8 bits, for both shapes.
	for _, shape := range []Shape{Identity, Inverse} {
		m := compose(t, Chain{Stored: Stored{Bits: 8}, VOI: Windowing{LinearExact, 100, 64}, Presentation: shape, OutBits: 8})
		if v := m.At(100); v.PValue != 127.5 || v.Output != 128 {
			t.Errorf("%s: %+v, want 127.5 and 128", shape, v)
		}
	}
}

func ExampleChain() {
	m, err := Chain{
		Stored:   Stored{Bits: 12},
		Modality: Rescale{Slope: 1, Intercept: -1024},
		VOI:      Windowing{Center: 40, Width: 400},
		OutBits:  8,
	}.Compose()
	if err != nil {
		fmt.Println(err)
		return
	}
	v := m.At(1064)
	fmt.Printf("%g HU, P-value %.3f, level %d\n", v.Modality, v.PValue, v.Output)
	// Output: 40 HU, P-value 127.820, level 128
}
