package sheet

import (
	"bytes"
	"errors"
	"image"
	"image/color"
	"image/png"
	"math/rand/v2"
	"strings"
	"testing"
	"time"

	"golang.org/x/image/tiff"

	"evenstep/luts/dicom"
	"evenstep/patterns"
)

var made = time.Date(2026, 11, 30, 12, 0, 0, 0, time.UTC)

type seeded struct{ *rand.Rand }

func (s seeded) Read(b []byte) (int, error) {
	for i := range b {
		b[i] = byte(s.Uint32())
	}
	return len(b), nil
}

func encode(t *testing.T, file, name string, s patterns.Spec) []byte {
	t.Helper()
	b, err := Encode(file, name, s, "evenstep test", made, seeded{rand.New(rand.NewPCG(1, 2))})
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// TestValueForValue reads the files back with decoders of the standard library, of the image library and of
// this project, and compares every pixel with the plane.
func TestValueForValue(t *testing.T) {
	for _, bits := range []int{8, 10, 12, 16} {
		s := patterns.Spec{Width: 800, Height: 600, Bits: bits}
		plane, err := patterns.Draw("wedge", s)
		if err != nil {
			t.Fatal(err)
		}
		compare := func(kind string, at func(x, y int) uint16) {
			t.Helper()
			for y := 0; y < s.Height; y += 7 {
				for x := range s.Width {
					if got, want := at(x, y), plane.Level(x, y); got != want {
						t.Fatalf("%s, %d bits: %d at %d,%d, want %d", kind, bits, got, x, y, want)
					}
				}
			}
		}
		gray := func(img image.Image) func(x, y int) uint16 {
			return func(x, y int) uint16 {
				return color.Gray16Model.Convert(img.At(x, y)).(color.Gray16).Y >> (16 - bits)
			}
		}
		p, err := png.Decode(bytes.NewReader(encode(t, "a.png", "wedge", s)))
		if err != nil {
			t.Fatal(err)
		}
		compare("PNG", gray(p))
		f, err := tiff.Decode(bytes.NewReader(encode(t, "a.tif", "wedge", s)))
		if err != nil {
			t.Fatal(err)
		}
		compare("TIFF", gray(f))
		b := encode(t, "a.dcm", "wedge", s)
		d, err := dicom.Read("a.dcm", bytes.NewReader(b), int64(len(b)))
		if err != nil {
			t.Fatal(err)
		}
		frame, err := d.Frame(0)
		if err != nil {
			t.Fatal(err)
		}
		compare("DICOM", func(x, y int) uint16 { return frame[y*s.Width+x] })
	}
}

func TestRefused(t *testing.T) {
	s := patterns.Spec{Width: 800, Height: 600, Bits: 8}
	for _, c := range []struct {
		file, name string
		want       error
	}{{"a", "wedge", ErrEnding}, {"a.gif", "wedge", ErrEnding}, {"a.dcm", "colours", ErrEnding}, {"a.png", "nothing", nil}, {"a.png", "wedge", patterns.ErrSpec}} {
		spec := s
		if c.want == patterns.ErrSpec {
			spec.Width = 3
		}
		_, err := Encode(c.file, c.name, spec, "", made, seeded{rand.New(rand.NewPCG(1, 2))})
		if err == nil || c.want != nil && !errors.Is(err, c.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s, %s: %v; want %v", c.file, c.name, err, c.want)
		}
	}
	if b := encode(t, "c.png", "colours", s); len(b) == 0 {
		t.Error("nothing was drawn")
	}
}
