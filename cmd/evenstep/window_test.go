package main

import (
	"bytes"
	"context"
	"encoding/binary"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"evenstep/luts"
)

func command(t *testing.T, want int, args ...string) string {
	t.Helper()
	var out, errs bytes.Buffer
	p := program{in: strings.NewReader(""), out: &out, err: &errs, now: clock, getenv: os.Getenv, self: os.Executable}
	if code := p.run(context.Background(), args); code != want {
		t.Fatalf("%v: exit code %d, want %d; %s", args, code, want, errs.String())
	}
	return errs.String()
}

// TestRenderIsTheFormula draws a 12-bit wedge as DICOM and maps it by several windows: every pixel is what
// the LINEAR formula of DICOM PS3.3 C.11.2.1.2.1 gives, rounded half away from zero.
func TestRenderIsTheFormula(t *testing.T) {
	dir := t.TempDir()
	src, out := filepath.Join(dir, "w.dcm"), filepath.Join(dir, "o.pgm")
	command(t, 0, "pattern", "draw", "wedge", "--size", "800x600", "--bits", "12", "-o", src)
	plain := filepath.Join(dir, "p.pgm")
	command(t, 0, "render", src, "-o", plain, "--center", "2048", "--width", "4096", "--out-bits", "12")
	stored := pgm(t, plain, 800*600, 12) // the window over the whole range at the stored depth is the stored value
	for _, w := range []struct {
		center, width float64
		bits          int
	}{{2048, 4096, 8}, {1000, 500, 8}, {3000.5, 33, 8}, {2000, 1, 8}, {100, 3000, 10}} {
		command(t, 0, "render", src, "-o", out, "--replace", "--center", fmt.Sprint(w.center), "--width", fmt.Sprint(w.width), "--out-bits", fmt.Sprint(w.bits))
		top := float64(int(1)<<w.bits - 1)
		for i, got := range pgm(t, out, 800*600, w.bits) {
			x := float64(stored[i])
			y := 0.0
			switch {
			case x <= w.center-.5-(w.width-1)/2:
			case x > w.center-.5+(w.width-1)/2:
				y = top
			default:
				y = ((x-(w.center-.5))/(w.width-1) + .5) * top
			}
			if want := uint16(math.Round(y)); got != want {
				t.Fatalf("window %v/%v, stored %v: %d, want %d", w.center, w.width, x, got, want)
			}
		}
	}
}

func pgm(t *testing.T, path string, pixels, bits int) []uint16 {
	t.Helper()
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	var w, h, top, n int
	if _, err := fmt.Sscanf(string(b[:20]), "P5\n%d %d\n%d\n", &w, &h, &top); err != nil || w*h != pixels || top != 1<<bits-1 {
		t.Fatalf("%v: %d x %d, %d", err, w, h, top)
	}
	n = len(fmt.Sprintf("P5\n%d %d\n%d\n", w, h, top))
	out := make([]uint16, pixels)
	for i := range out {
		if bits <= 8 {
			out[i] = uint16(b[n+i])
		} else {
			out[i] = binary.BigEndian.Uint16(b[n+2*i:])
		}
	}
	return out
}

// TestWindowTable: the table of a window, in each form, holds what the mapping gives.
func TestWindowTable(t *testing.T) {
	dir := t.TempDir()
	flags := []string{"--stored-bits", "12", "--signed", "--slope", "2", "--intercept", "-10", "--center", "40", "--width", "400", "--function", "sigmoid", "--out-bits", "10"}
	chain := luts.Chain{
		Stored: luts.Stored{Bits: 12, Signed: true}, Modality: luts.Rescale{Slope: 2, Intercept: -10},
		VOI: luts.Windowing{Function: luts.Sigmoid, Center: 40, Width: 400}, OutBits: 10,
	}
	mapping, err := chain.Compose()
	if err != nil {
		t.Fatal(err)
	}
	want := mapping.Table()
	for _, kind := range []string{".json", ".csv"} {
		path := filepath.Join(dir, "t"+kind)
		command(t, 0, append([]string{"window", "-o", path}, flags...)...)
		got, err := openTable(path)
		if err != nil {
			t.Fatal(err)
		}
		for i, e := range got.Entries {
			if e != want.Entries[i] || got.First != want.First {
				t.Fatalf("%s, entry %d: %d, want %d", kind, i, e, want.Entries[i])
			}
		}
	}
	raw := filepath.Join(dir, "t.raw")
	command(t, 0, append([]string{"window", "-o", raw}, flags...)...)
	if b, err := os.ReadFile(raw); err != nil || len(b) != 2*4096 || binary.LittleEndian.Uint16(b[2*2048:]) != want.Entries[2048] {
		t.Errorf("%v, %d bytes", err, len(b))
	}

	// Through the monitor's table: the output is that table's.
	cal := filepath.Join(dir, "cal.json")
	command(t, 0, "calibrate", filepath.Join("..", "..", "testdata", "readings", "demo-failing.csv"), "-o", cal)
	command(t, 0, "window", "-o", filepath.Join(dir, "c.json"), "--stored-bits", "12", "--through", cal)
	got, err := openTable(filepath.Join(dir, "c.json"))
	if err != nil || got.OutBits != 10 || got.Entries[4095] != 1023 {
		t.Errorf("%v, %d bits, last entry %d", err, got.OutBits, got.Entries[len(got.Entries)-1])
	}

	// A presentation state names its image.
	img := filepath.Join(dir, "i.dcm")
	command(t, 0, "pattern", "draw", "wedge", "--size", "800x600", "--bits", "12", "-o", img)
	command(t, 0, "window", "-o", filepath.Join(dir, "s.dcm"), "--for", img, "--center", "2000", "--width", "300")

	for _, args := range [][]string{
		{"window"},
		{"window", "-o", "x.txt"},
		{"window", "-o", "x.dcm"},
		{"window", "-o", "x.dcm", "--for", img},
		{"window", "-o", "x.dcm", "--for", img, "--center", "1", "--width", "2", "--through", cal},
		{"window", "-o", "x.dcm", "--for", img, "--center", "1", "--width", "2", "--slope", "3"},
		{"window", "-o", "x.json", "--for", img},
		{"window", "-o", "x.json", "--center", "3"},
		{"window", "-o", "x.json", "--center", "3", "--width", "0"},
		{"window", "-o", "x.json", "--center", "3", "--width", "NaN"},
		{"window", "-o", "x.json", "--function", "cubic", "--center", "3", "--width", "5"},
		{"window", "-o", "x.json", "--function", "sigmoid"},
		{"window", "-o", "x.json", "--stored-bits", "17"},
		{"window", "-o", "x.json", "--out-bits", "17"},
		{"window", "-o", "x.json", "--slope", "0"},
		{"window", "-o", "x.json", "--through", img},
		{"window", "-o", "x.json", "--through", "nothing.json"},
		{"render", img},
		{"render", img, "-o", "x.jpg"},
		{"render", "nothing.dcm", "-o", "x.png"},
		{"render", "window_test.go", "-o", "x.png"},
		{"render", img, "-o", "x.png", "--frame", "2"},
		{"render", img, "-o", img, "--replace"},
	} {
		if errs := command(t, 2, args...); strings.Count(errs, "\n") != 1 {
			t.Errorf("%v: %q; want one line", args, errs)
		}
	}
	for _, name := range []string{"x.json", "x.dcm", "x.png"} {
		if _, err := os.Stat(name); err == nil {
			t.Errorf("%s was written", name)
			os.Remove(name)
		}
	}
}

// TestRenderPictures: gray PNG and TIFF go through as they are, and colour is refused.
func TestRenderPictures(t *testing.T) {
	dir := t.TempDir()
	png, tif, colour := filepath.Join(dir, "a.png"), filepath.Join(dir, "a.tif"), filepath.Join(dir, "c.png")
	command(t, 0, "pattern", "draw", "wedge", "--size", "800x600", "-o", png)
	command(t, 0, "pattern", "draw", "wedge", "--size", "800x600", "--bits", "16", "-o", tif)
	command(t, 0, "pattern", "draw", "colours", "--size", "800x600", "-o", colour)
	a, b := filepath.Join(dir, "a.pgm"), filepath.Join(dir, "b.pgm")
	command(t, 0, "render", png, "-o", a)
	command(t, 0, "render", tif, "-o", b, "--out-bits", "16")
	command(t, 0, "render", tif, "-o", filepath.Join(dir, "b.tif"), "--out-bits", "10")
	if got := pgm(t, a, 800*600, 8); got[300*800+400] == 0 {
		t.Error("the middle of a wedge is black")
	}
	pgm(t, b, 800*600, 16)
	command(t, 2, "render", colour, "-o", filepath.Join(dir, "d.png"))
	command(t, 2, "render", png, "-o", filepath.Join(dir, "d.png"), "--frame", "2")
}
