package patterns

import (
	"bytes"
	"errors"
	"image"
	"image/png"
	"io"
	"testing"

	"golang.org/x/image/tiff"
)

// sample reads a gray sample of a decoded picture as it stands in the file.
func sample(t *testing.T, m image.Image, x, y int) int {
	t.Helper()
	switch m := m.(type) {
	case *image.Gray:
		return int(m.GrayAt(x, y).Y)
	case *image.Gray16:
		return int(m.Gray16At(x, y).Y)
	}
	t.Fatalf("decoded as %T; want gray", m)
	return 0
}

// TestFilesComeBackExactly writes every level and reads it with the decoders of PNG and TIFF.
func TestFilesComeBackExactly(t *testing.T) {
	for _, bits := range []int{8, 9, 10, 12, 15, 16} {
		p := draw(t, "wedge", Spec{Width: 800, Height: 600, Bits: bits})
		var pngFile, tiffFile bytes.Buffer
		if err := p.WritePNG(&pngFile); err != nil {
			t.Fatal(err)
		}
		if err := p.WriteTIFF(&tiffFile); err != nil {
			t.Fatal(err)
		}
		fromPNG, err := png.Decode(&pngFile)
		if err != nil {
			t.Fatal(err)
		}
		fromTIFF, err := tiff.Decode(&tiffFile)
		if err != nil {
			t.Fatal(err)
		}
		if _, is8 := fromPNG.(*image.Gray); is8 != (bits == 8) {
			t.Errorf("%d bits: PNG is %T", bits, fromPNG)
		}
		for name, c := range map[string]struct {
			m     image.Image
			depth int
		}{"PNG": {fromPNG, pngDepth(bits)}, "TIFF": {fromTIFF, 16}} {
			if c.m.Bounds() != image.Rect(0, 0, 800, 600) {
				t.Fatalf("%s, %d bits: bounds %v", name, bits, c.m.Bounds())
			}
			top, full := int(p.Max()), 1<<c.depth-1
			for y := range p.Height {
				for x, v := range p.Row(y) {
					got := sample(t, c.m, x, y)
					scaled := (2*got*top + full) / (2 * full)
					if got>>(c.depth-bits) != int(v) || scaled != int(v) {
						t.Fatalf("%s, %d bits: level %d came back as %d by shifting, %d by scaling",
							name, bits, v, got>>(c.depth-bits), scaled)
					}
				}
			}
		}
	}
}

func pngDepth(bits int) int {
	if bits == 8 {
		return 8
	}
	return 16
}

func TestColourPNGComesBackExactly(t *testing.T) {
	for _, bits := range []int{8, 10, 16} {
		c, err := DrawRGB("gray-tracking", Spec{Width: 800, Height: 600, Bits: bits})
		if err != nil {
			t.Fatal(err)
		}
		var file bytes.Buffer
		if err := c.WritePNG(&file); err != nil {
			t.Fatal(err)
		}
		m, err := png.Decode(&file)
		if err != nil {
			t.Fatal(err)
		}
		for y := range 600 {
			for x := range 800 {
				r, g, b, a := m.At(x, y).RGBA()
				got := [3]uint16{uint16(r) >> (16 - bits), uint16(g) >> (16 - bits), uint16(b) >> (16 - bits)}
				want := [3]uint16{c.R.Level(x, y), c.G.Level(x, y), c.B.Level(x, y)}
				if got != want || a != 0xffff {
					t.Fatalf("%d bits: %v at %d, %d; want %v", bits, got, x, y, want)
				}
			}
		}
	}
}

// PNG specification, third edition, 11.3.2.7: sBIT holds one byte for gray, three for colour, and stands
// before the data.
func TestPNGTellsItsDepth(t *testing.T) {
	for _, c := range []struct {
		bits  int
		sheet string
		want  string
	}{
		{8, "wedge", ""},
		{10, "wedge", "\x00\x00\x00\x01sBIT\x0a"},
		{12, "wedge", "\x00\x00\x00\x01sBIT\x0c"},
		{16, "wedge", ""},
		{10, "colours", "\x00\x00\x00\x03sBIT\x0a\x0a\x0a"},
	} {
		rgb, err := DrawRGB(c.sheet, Spec{Width: 800, Height: 600, Bits: c.bits})
		if err != nil {
			t.Fatal(err)
		}
		var file bytes.Buffer
		if c.sheet == "wedge" {
			err = rgb.R.WritePNG(&file)
		} else {
			err = rgb.WritePNG(&file)
		}
		if err != nil {
			t.Fatal(err)
		}
		at := bytes.Index(file.Bytes()[:60], []byte("sBIT"))
		switch {
		case c.want == "" && at >= 0:
			t.Errorf("%s, %d bits: an sBIT that says nothing", c.sheet, c.bits)
		case c.want != "" && (at != headerLen+4 || !bytes.HasPrefix(file.Bytes()[headerLen:], []byte(c.want))):
			t.Errorf("%s, %d bits: %q behind the header; want %q", c.sheet, c.bits, file.Bytes()[headerLen:60], c.want)
		}
	}
}

// full is a disk with so many bytes left.
type full struct{ left int }

var errFull = errors.New("disk full")

func (f *full) Write(b []byte) (int, error) {
	n := min(len(b), f.left)
	f.left -= n
	if n < len(b) {
		return n, errFull
	}
	return n, nil
}

func TestWritersReportAFullDisk(t *testing.T) {
	c, err := DrawRGB("uniform", Spec{Width: 800, Height: 600, Bits: 10})
	if err != nil {
		t.Fatal(err)
	}
	for name, write := range map[string]func(io.Writer) error{
		"PNG": c.R.WritePNG, "colour PNG": c.WritePNG, "TIFF": c.R.WriteTIFF,
	} {
		var whole bytes.Buffer
		if err := write(&whole); err != nil {
			t.Fatal(err)
		}
		for _, left := range []int{0, 5, 20, 33, 40, 47, whole.Len() - 1} {
			if err := write(&full{left}); !errors.Is(err, errFull) {
				t.Errorf("%s, %d bytes left: %v; want it to say that the disk is full", name, left, err)
			}
		}
		if err := write(&full{whole.Len()}); err != nil {
			t.Errorf("%s: %v; there was room", name, err)
		}
	}
}

// A writer may be handed the header in pieces of any size.
func TestDepthChunkWhateverThePieces(t *testing.T) {
	p := draw(t, "uniform", Spec{Width: 800, Height: 600, Bits: 10})
	var whole, plain bytes.Buffer
	if err := p.WritePNG(&whole); err != nil {
		t.Fatal(err)
	}
	if err := png.Encode(&plain, p.Image()); err != nil {
		t.Fatal(err)
	}
	for _, piece := range []int{1, 7, 33, 34, 1000} {
		var got bytes.Buffer
		w := &significant{w: &got, depth: 10, channels: 1}
		for b := plain.Bytes(); len(b) > 0; {
			n := min(piece, len(b))
			if k, err := w.Write(b[:n]); k != n || err != nil {
				t.Fatalf("pieces of %d: wrote %d of %d, %v", piece, k, n, err)
			}
			b = b[n:]
		}
		if !bytes.Equal(got.Bytes(), whole.Bytes()) {
			t.Errorf("pieces of %d: the file differs", piece)
		}
	}
}
