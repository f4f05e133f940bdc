package dicom

import (
	"errors"
	"math"
	"testing"
)

// FuzzRead: no file makes Read, Stages or Frame panic or allocate more than the package comment says; every
// error is one line of a known kind; what is read is within its stated ranges.
func FuzzRead(f *testing.F) {
	base, cells := plain()
	baseline, _ := baselineSample(f, 4, 3)
	eight := parts{tagBitsAllocated: {"US", []uint16{8}}, tagBitsStored: {"US", []uint16{8}}, tagHighBit: {"US", []uint16{7}}}
	seeds := [][]byte{
		filed("1.2.840.10008.1.2.4.70", base.with(parts{tagPixels: {"OB", [][]byte{{}, encodeLossless(cells, 4, losslessOptions{precision: 12, predictor: 1})}}})),
		filed("1.2.840.10008.1.2.4.57", base.with(parts{tagPixels: {"OB", [][]byte{{}, encodeLossless(cells, 4, losslessOptions{precision: 16, predictor: 7, restartRows: 1})}}})),
		filed("1.2.840.10008.1.2.5", base.with(parts{tagPixels: {"OB", [][]byte{{}, rleFrame([]byte{0xF5, 3}, []byte{5, 1, 2, 3, 4, 5, 6, 0xFB, 9, 0})}}})),
		filed("1.2.840.10008.1.2.4.50", base.with(eight).with(parts{tagPixels: {"OB", [][]byte{{}, baseline}}})),
	}
	for _, uid := range []string{explicitLittleUID, "1.2.840.10008.1.2", "1.2.840.10008.1.2.2", "1.2.840.10008.1.2.1.99"} {
		for _, open := range []bool{false, true} {
			set := builder{findTransfer(uid).syntax, open}.bytes(rich())
			seeds = append(seeds, file(uid, set), set)
		}
	}
	read := 0
	for _, b := range seeds {
		f.Add(b)
		if _, err := readBytes(b); err == nil {
			read++
		}
	}
	// The deflated data set without its file is none.
	if read < len(seeds)-2 {
		f.Fatalf("%d of %d seeds are read", read, len(seeds))
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		const slack = 4 << 20 // the fuzzer allocates beside
		var m *Image
		var err error
		if n := allocated(func() { m, err = readBytes(b) }); n > uint64(12*len(b)+slack) {
			t.Fatalf("Read allocates %d bytes for %d", n, len(b))
		}
		if err != nil {
			isOneLine(t, err)
			if !errors.Is(err, ErrDamaged) && !errors.Is(err, ErrUnsupported) {
				t.Fatalf("%v is of no known kind", err)
			}
			return
		}
		if m.Rows < 1 || m.Columns < 1 || m.Frames < 1 || m.Rows*m.Columns > maxCells || m.BitsStored < 1 || m.BitsStored > 16 {
			t.Fatalf("out of range: %+v", m)
		}
		for _, i := range []int{0, m.Frames - 1} {
			s, err := m.Stages(i)
			if err != nil {
				isOneLine(t, err)
			} else if s.Slope == 0 || math.IsNaN(s.Slope+s.Intercept) || s.Function == "" {
				t.Fatalf("stages %+v", s)
			}
			var cells []uint16
			allowed := uint64(800 * len(b))
			if m.pixels.coding == native { // of an inflated data set, perhaps
				allowed = 2 * uint64(m.size)
			}
			if n := allocated(func() { cells, err = m.Frame(i) }); n > allowed+slack {
				t.Fatalf("Frame allocates %d bytes for %d", n, len(b))
			}
			if err != nil {
				isOneLine(t, err)
				continue
			}
			for _, c := range cells {
				if v := int16(c); m.Signed && int(v) != m.value(c) || !m.Signed && int(c) != m.value(c) {
					t.Fatalf("cell %04X has bits above the stored %d", c, m.BitsStored)
				}
			}
		}
	})
}
