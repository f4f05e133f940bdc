package patterns

import (
	"errors"
	"flag"
	"fmt"
	"hash/crc32"
	"os"
	"runtime"
	"slices"
	"strings"
	"testing"
	"time"
)

var update = flag.Bool("update", false, "write the golden checksums anew")

// screens are sizes from the smallest to those of reading rooms, lying and upright, even and odd.
var screens = []struct{ width, height, bits int }{
	{800, 600, 8},
	{600, 800, 16},
	{1280, 1024, 10},
	{1366, 768, 8},
	{1023, 767, 12},
	{2400, 600, 8},
	{1200, 1920, 14},
}

func (s Spec) String() string { return fmt.Sprintf("%dx%d at %d bits", s.Width, s.Height, s.Bits) }

// channels draws any sheet and gives its planes: one, or three for a colour sheet.
func channels(t testing.TB, name string, s Spec) []*Plane {
	t.Helper()
	c, err := DrawRGB(name, s)
	if err != nil {
		t.Fatal(err)
	}
	if c.R == c.G {
		return []*Plane{c.R}
	}
	return []*Plane{c.R, c.G, c.B}
}

func draw(t testing.TB, name string, s Spec) *Plane {
	t.Helper()
	p, err := Draw(name, s)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// counts is how many pixels each level has.
func counts(p *Plane) map[uint16]int {
	n := make([]int, 1<<16)
	for _, v := range p.Pix {
		n[v]++
	}
	m := make(map[uint16]int)
	for v, k := range n {
		if k > 0 {
			m[uint16(v)] = k
		}
	}
	return m
}

func TestEverySheetPaintsEveryPixelWithinTheDepth(t *testing.T) {
	for _, in := range List() {
		for _, sc := range screens {
			s := Spec{Width: sc.width, Height: sc.height, Bits: sc.bits}
			// Drawn over two different levels, a pixel left out would differ.
			over, under := newPlane(&s), newPlane(&s)
			under.Fill(under.Max())
			for channel := range 3 {
				if channel > 0 && !in.Colour {
					break
				}
				sh, err := find(in.Name)
				if err != nil {
					t.Fatal(err)
				}
				if err := errors.Join(sh.on(over, &s, channel), sh.on(under, &s, channel)); err != nil {
					t.Fatal(err)
				}
				if !slices.Equal(over.Pix, under.Pix) {
					t.Errorf("%s, %v: some pixels are not painted", in.Name, s)
				}
				if v := slices.Max(over.Pix); v > over.Max() {
					t.Errorf("%s, %v: level %d is above %d", in.Name, s, v, over.Max())
				}
				over.Fill(0)
				under.Fill(under.Max())
			}
		}
	}
}

func checksum(p *Plane) uint32 {
	h := crc32.NewIEEE()
	row := make([]byte, 2*p.Width)
	for y := range p.Height {
		for x, v := range p.Row(y) {
			row[2*x], row[2*x+1] = byte(v>>8), byte(v)
		}
		h.Write(row)
	}
	return h.Sum32()
}

func TestEverySheetAtTheLargestSize(t *testing.T) {
	if testing.Short() {
		t.Skip("takes 70 MB and a few seconds")
	}
	for _, s := range []Spec{{Width: 8192, Height: 4320, Bits: 16}, {Width: 4320, Height: 8192, Bits: 8}} {
		p := newPlane(&s)
		for _, in := range List() {
			sh, err := find(in.Name)
			if err != nil {
				t.Fatal(err)
			}
			if err := sh.on(p, &s, 0); err != nil {
				t.Errorf("%s, %v: %v", in.Name, s, err)
			}
		}
	}
}

func TestEverySheetSaysWhatItIsFor(t *testing.T) {
	seen := map[string]bool{}
	for _, in := range List() {
		if seen[in.Name] {
			t.Errorf("%s is listed twice", in.Name)
		}
		seen[in.Name] = true
		for what, text := range map[string]string{"name": in.Name, "purpose": in.Purpose, "serves": in.Serves} {
			if text == "" {
				t.Errorf("%s: no %s", in.Name, what)
			}
		}
		good, bad := strings.Index(in.Look, "Good: "), strings.Index(in.Look, " Bad: ")
		if good != 0 || bad < 0 {
			t.Errorf("%s: look %q; expected what a good monitor shows, then a bad one", in.Name, in.Look)
		}
		if (in.Takes&TakesSteps != 0) != (in.MaxSteps > 0) {
			t.Errorf("%s: takes steps and %d of them at most", in.Name, in.MaxSteps)
		}
	}
}

// The golden checksums guard against changes nobody meant; what the sheets must hold is checked elsewhere.
func TestSheetsAreAsTheyWere(t *testing.T) {
	const golden = "../testdata/patterns/checksums.txt"
	var b strings.Builder
	b.WriteString("# CRC-32 of each sheet's levels, big-endian, row by row, red before green before blue.\n")
	b.WriteString("# Made by this package, seen as pictures when made: go test ./patterns -run AsTheyWere -update\n")
	for _, in := range List() {
		for _, s := range []Spec{{Width: 800, Height: 600, Bits: 8}, {Width: 768, Height: 1024, Bits: 10}} {
			fmt.Fprintf(&b, "%-16s %dx%d %d", in.Name, s.Width, s.Height, s.Bits)
			for _, p := range channels(t, in.Name, s) {
				fmt.Fprintf(&b, " %08x", checksum(p))
			}
			b.WriteByte('\n')
		}
	}
	if *update {
		if err := os.WriteFile(golden, []byte(b.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	got, wanted := strings.Split(b.String(), "\n"), strings.Split(string(want), "\n")
	for i := range max(len(got), len(wanted)) {
		if i >= len(got) || i >= len(wanted) || got[i] != wanted[i] {
			t.Fatalf("line %d differs; got\n%s\nwant\n%s", i+1, b.String(), want)
		}
	}
}

func TestDrawingAllocatesNothingBesideThePlane(t *testing.T) {
	// The canvas and the copy of the Spec: two small objects. The plane itself would be 960,000 bytes.
	const mostObjects, mostBytes = 2, 2048
	s := Spec{Width: 800, Height: 600, Bits: 8}
	p := newPlane(&s)
	for _, in := range List() {
		one := func() {
			if in.Colour {
				sh, _ := find(in.Name)
				spec := s
				if err := sh.on(p, &spec, 1); err != nil {
					t.Fatal(err)
				}
			} else if err := DrawOn(p, in.Name, s); err != nil {
				t.Fatal(err)
			}
		}
		const runs = 5
		if n := testing.AllocsPerRun(runs, one); n > mostObjects {
			t.Errorf("%s: %v objects allocated; expected at most %d", in.Name, n, mostObjects)
		}
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		one()
		runtime.ReadMemStats(&after)
		if n := after.TotalAlloc - before.TotalAlloc; n > mostBytes {
			t.Errorf("%s: %d bytes allocated; expected at most %d", in.Name, n, mostBytes)
		}
	}
	// Draw adds the plane: its head and its samples.
	if n := testing.AllocsPerRun(5, func() { draw(t, "reading", s) }); n > mostObjects+2 {
		t.Errorf("Draw: %v objects allocated; expected at most %d", n, mostObjects+2)
	}
}

func TestRefusals(t *testing.T) {
	size := Spec{Width: 1920, Height: 1080, Bits: 8}
	with := func(change func(*Spec)) Spec {
		s := size
		change(&s)
		return s
	}
	for _, c := range []struct {
		name, sheet string
		spec        Spec
		want        string
	}{
		{"unknown sheet", "none", size, `pattern "none": no such sheet`},
		{"no size", "uniform", Spec{Bits: 8}, "size 0x0; expected 800x600 to 8192x4320"},
		{"too low", "uniform", with(func(s *Spec) { s.Height = 599 }), "size 1920x599"},
		{"too short", "uniform", with(func(s *Spec) { s.Width, s.Height = 700, 700 }), "size 700x700"},
		{"too wide", "uniform", with(func(s *Spec) { s.Width = 8193 }), "size 8193x1080"},
		{"too high", "uniform", with(func(s *Spec) { s.Width, s.Height = 4321, 8192 }), "size 4321x8192"},
		{"too long for its width", "uniform", with(func(s *Spec) { s.Width, s.Height = 2401, 600 }), "size 2401x600"},
		{"negative", "uniform", with(func(s *Spec) { s.Height = -1080 }), "size 1920x-1080"},
		{"7 bits", "uniform", with(func(s *Spec) { s.Bits = 7 }), "7 bits; expected 8 to 16"},
		{"17 bits", "uniform", with(func(s *Spec) { s.Bits = 17 }), "17 bits"},
		{"level too high", "uniform", with(func(s *Spec) { s.Field = new(uint16(256)) }), "level 256; expected 0 to 255 at 8 bits"},
		{"surround too high", "wedge", with(func(s *Spec) { s.Surround = new(uint16(300)) }), "level 300"},
		{
			"step too high", "low-contrast", with(func(s *Spec) { s.Steps = []Step{{Low: 1, High: 2}, {Low: 255, High: 256}} }),
			"level 256",
		},
		{
			"no step in a step", "low-contrast", with(func(s *Spec) { s.Steps = []Step{{Low: 1, High: 2}, {Low: 9, High: 9}} }),
			"step 2 has level 9 twice",
		},
		{"empty steps", "low-contrast", with(func(s *Spec) { s.Steps = []Step{} }), "0 steps; expected 1 to 48"},
		{"too many steps", "sharpness", with(func(s *Spec) { s.Steps = make([]Step, 2) }), "2 steps; expected 1 to 1"},
		{"field for a wedge", "wedge", with(func(s *Spec) { s.Field = new(uint16) }), "given a field level; expected none"},
		{"surround", "uniform", with(func(s *Spec) { s.Surround = new(uint16) }), "given a surround level; expected none"},
		{"steps", "uniform", with(func(s *Spec) { s.Steps = []Step{} }), "given steps; expected none"},
		{"diameters", "uniform", with(func(s *Spec) { s.Diameters = []int{2} }), "given diameters; expected none"},
		{"places", "uniform", with(func(s *Spec) { s.Place = 1 }), "given places; expected none"},
		{"frame", "uniform", with(func(s *Spec) { s.Frame = 1 }), "given a frame number; expected none"},
		{"seed", "uniform", with(func(s *Spec) { s.Seed = 1 }), "given a seed; expected none"},
		{"colour", "uniform", with(func(s *Spec) { s.Colour = &[3]uint16{} }), "given a colour; expected none"},
		{"7 places", "places", with(func(s *Spec) { s.Places = 7 }), "7 places; expected 5, 9, 13 or 25"},
		{"place 10 of 9", "places", with(func(s *Spec) { s.Place = 10 }), "place 10; expected 1 to 9"},
		{"place -1", "places", with(func(s *Spec) { s.Place = -1 }), "place -1"},
		{"no diameters", "disks", with(func(s *Spec) { s.Diameters = []int{} }), "0 diameters; expected 1 to 10"},
		{"too many diameters", "disks", with(func(s *Spec) { s.Diameters = make([]int, 11) }), "11 diameters"},
		{"disk of nothing", "disks", with(func(s *Spec) { s.Diameters = []int{4, 0} }), "a disk of 0 pixels"},
		{"disk too large", "disks", with(func(s *Spec) { s.Diameters = []int{900} }), "a disk of 900 pixels"},
		{"colour sheet", "colours", size, "expected three channels"},
	} {
		t.Run(c.name, func(t *testing.T) {
			p, err := Draw(c.sheet, c.spec)
			if !errors.Is(err, ErrSpec) || p != nil || !strings.Contains(err.Error(), c.want) {
				t.Fatalf("got %v; want it to refuse with %q", err, c.want)
			}
			if strings.Contains(err.Error(), "\n") || strings.Count(err.Error(), ";") < 2 {
				t.Errorf("%q is not one line of what was found, what was expected and what to do", err)
			}
			if c.sheet == "colours" {
				return // DrawRGB draws it
			}
			if _, err := DrawRGB(c.sheet, c.spec); !errors.Is(err, ErrSpec) {
				t.Errorf("DrawRGB: got %v; want it to refuse", err)
			}
		})
	}
}

func TestDrawOnRefusesAPlaneOfAnotherShape(t *testing.T) {
	s := Spec{Width: 800, Height: 600, Bits: 8}
	for name, p := range map[string]*Plane{
		"other width": newPlane(&Spec{Width: 801, Height: 600, Bits: 8}),
		"other depth": newPlane(&Spec{Width: 800, Height: 600, Bits: 9}),
		"cut short":   {800, 600, 8, make([]uint16, 800*599)},
		"empty":       {},
	} {
		if err := DrawOn(p, "uniform", s); !errors.Is(err, ErrSpec) {
			t.Errorf("%s: got %v; want it to refuse", name, err)
		}
	}
	p := newPlane(&s)
	if err := DrawOn(p, "none", s); !errors.Is(err, ErrSpec) {
		t.Errorf("unknown sheet: got %v; want it to refuse", err)
	}
	if err := DrawOn(p, "colours", s); !errors.Is(err, ErrSpec) {
		t.Errorf("colour sheet: got %v; want it to refuse", err)
	}
}

// BenchmarkFill is the measure for BenchmarkDraw: one level into every pixel of a plane of 4096x3328.
func BenchmarkFill(b *testing.B) {
	p := newPlane(&benchSpec)
	b.SetBytes(int64(2 * len(p.Pix)))
	for v := uint16(0); b.Loop(); v++ {
		p.Fill(v & 0xff)
	}
}

var benchSpec = Spec{Width: 4096, Height: 3328, Bits: 8}

// BenchmarkDraw draws each sheet, one channel of it, onto a plane that is there. The figure x-fill is the time
// over that of filling the plane once, taken in the same run; the greatest of all is that of the slowest
// sheet.
func BenchmarkDraw(b *testing.B) {
	p := newPlane(&benchSpec)
	for _, in := range List() {
		b.Run(in.Name, func(b *testing.B) {
			sh, err := find(in.Name)
			if err != nil {
				b.Fatal(err)
			}
			b.ReportAllocs()
			if err := sh.on(p, &benchSpec, 0); err != nil { // glyphs are made once
				b.Fatal(err)
			}
			for b.Loop() {
				if err := sh.on(p, &benchSpec, 0); err != nil {
					b.Fatal(err)
				}
			}
			each := b.Elapsed() / time.Duration(max(1, b.N))
			b.StopTimer()
			const fills = 10
			start := time.Now()
			for v := range uint16(fills) {
				p.Fill(v)
			}
			b.ReportMetric(float64(each)/float64(time.Since(start)/fills), "x-fill")
		})
	}
}
