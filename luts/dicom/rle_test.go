package dicom

import (
	"bytes"
	"encoding/binary"
	"image"
	"image/jpeg"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
)

func containsAll(s string, parts ...string) bool {
	for _, p := range parts {
		if !strings.Contains(s, p) {
			return false
		}
	}
	return true
}

// rleFrame puts segments behind the header of PS3.5 G.5.
func rleFrame(segments ...[]byte) []byte {
	b := make([]byte, 64)
	binary.LittleEndian.PutUint32(b, uint32(len(segments)))
	for i, s := range segments {
		binary.LittleEndian.PutUint32(b[4+4*i:], uint32(len(b)))
		b = append(b, s...)
	}
	return b
}

// The decoder of PS3.5 G.3.2, step by step: literal runs, replicated runs, the byte that means nothing.
func TestRunLength(t *testing.T) {
	for _, q := range []struct {
		name string
		b    []byte
		want []uint16
	}{
		{"8 bits", rleFrame([]byte{0x80, 2, 10, 20, 30, 0xFE, 7, 0, 1}), []uint16{10, 20, 30, 7, 7, 7, 1}},
		{"16 bits, high byte first", rleFrame([]byte{0xFF, 1, 0, 0xFF}, []byte{2, 1, 2, 3}), []uint16{0x101, 0x102, 0xFF03}},
		{"a run past the end", rleFrame([]byte{0x81, 9}), []uint16{9, 9, 9}},
		{"a literal past the end", rleFrame([]byte{3, 9, 8, 7, 6}), []uint16{9, 8}},
	} {
		t.Run(q.name, func(t *testing.T) {
			size := 1
			if q.b[0] == 2 {
				size = 2
			}
			fill, err := openRunLength(q.b, len(q.want), size)
			if err != nil {
				t.Fatal(err)
			}
			got := make([]uint16, len(q.want))
			for i := range got {
				got[i] = 0xABCD // what was there does not matter
			}
			if err := fill(got); err != nil || !slices.Equal(got, q.want) {
				t.Errorf("%v %v; expected %v", err, got, q.want)
			}
		})
	}
}

func TestRunLengthRefusals(t *testing.T) {
	two := rleFrame([]byte{1, 1, 1}, []byte{1, 1, 1})
	backward := slices.Clone(two)
	binary.LittleEndian.PutUint32(backward[8:], 65)
	binary.LittleEndian.PutUint32(backward[4:], 66)
	for _, q := range []struct {
		name        string
		b           []byte
		cells, size int
		want        string
	}{
		{"no header", make([]byte, 63), 4, 1, "63 bytes"},
		{"segments", two, 4, 1, "2 RLE segments; expected 1"},
		{"backward", backward, 2, 2, "RLE segment 0 from 66 to 65"},
		{"more cells than bytes can hold", rleFrame(make([]byte, 100)), 1 << 27, 1, "an RLE segment of 100 bytes; expected at least 2097152"},
		{"literal ends", rleFrame([]byte{3, 1, 2}), 4, 1, "byte 65 of the frame: the RLE segment ends"},
		{"run ends", rleFrame([]byte{1, 1, 2, 0xFF}), 4, 1, "byte 68"},
		{"second segment ends", rleFrame([]byte{3, 1, 2, 3, 4}, []byte{0, 1}), 4, 2, "byte 71"},
	} {
		t.Run(q.name, func(t *testing.T) {
			fill, err := openRunLength(q.b, q.cells, q.size)
			if err == nil {
				err = fill(make([]uint16, q.cells))
			}
			if err == nil || !strings.Contains(err.Error(), q.want) {
				t.Errorf("error %v; expected %q in it", err, q.want)
			}
		})
	}
}

func baselineSample(t testing.TB, columns, rows int) ([]byte, []uint16) {
	t.Helper()
	gray := image.NewGray(image.Rect(0, 0, columns, rows))
	random := rand.New(rand.NewPCG(5, 6))
	for i := range gray.Pix {
		gray.Pix[i] = byte(random.IntN(256))
	}
	var b bytes.Buffer
	if err := jpeg.Encode(&b, gray, &jpeg.Options{Quality: 100}); err != nil {
		t.Fatal(err)
	}
	decoded, err := jpeg.Decode(bytes.NewReader(b.Bytes()))
	if err != nil {
		t.Fatal(err)
	}
	cells := make([]uint16, columns*rows)
	for y := range rows {
		for x := range columns {
			cells[y*columns+x] = uint16(decoded.(*image.Gray).GrayAt(x, y).Y)
		}
	}
	return b.Bytes(), cells
}

func TestBaseline(t *testing.T) {
	data, want := baselineSample(t, 21, 13)
	fill, err := openBaseline(data, 21, 13)
	if err != nil {
		t.Fatal(err)
	}
	got := make([]uint16, len(want))
	if err := fill(got); err != nil || !slices.Equal(got, want) {
		t.Errorf("%v; the planes differ", err)
	}
	progressive := bytes.Replace(data, []byte{0xFF, markerSOF0}, []byte{0xFF, 0xC2}, 1)
	sof := bytes.Index(data, []byte{0xFF, markerSOF0})
	large := slices.Clone(data)
	copy(large[sof+5:], []byte{0x40, 0, 0x20, 0})
	for _, q := range []struct {
		name          string
		b             []byte
		columns, rows int
		want          string
	}{
		{"progressive", progressive, 21, 13, "FF C2; expected baseline"},
		{"other size", data, 22, 13, "13 rows of 21 columns; expected 13 of 22"},
		{"more cells than bytes can hold", large, 0x2000, 0x4000, "expected at least"},
		{"cut off", data[:len(data)/2], 21, 13, "does not decode"},
		{"no frame", append(slices.Clone(data[:2]), 0xFF, markerSOS, 0, 2), 21, 13, "no JPEG frame header"},
	} {
		t.Run(q.name, func(t *testing.T) {
			fill, err := openBaseline(q.b, q.columns, q.rows)
			if err == nil {
				err = fill(make([]uint16, q.columns*q.rows))
			}
			if err == nil || !strings.Contains(err.Error(), q.want) {
				t.Errorf("error %v; expected %q in it", err, q.want)
			}
		})
	}
}
