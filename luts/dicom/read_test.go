package dicom

import (
	"encoding/binary"
	"errors"
	"fmt"
	"reflect"
	"slices"
	"strings"
	"sync"
	"testing"
)

// The ways to write one data set (PS3.5 clauses 7, 10 and annex A) must all read alike.
func TestReadSyntaxes(t *testing.T) {
	image, cells := plain()
	image = image.with(parts{tagVOILUT: {"SQ", []parts{{
		tagLUTDescriptor: {"US", []uint16{3, 0, 12}}, tagLUTText: {"LO", "soft"}, tagLUTData: {"US", []uint16{5, 6, 7}},
	}}}, 0x00091010: {"SQ", []parts{{}, {0x00091011: {"LO", "x"}}}}})
	for _, q := range []struct {
		name, uid string
		open      bool
	}{
		{"implicit", "1.2.840.10008.1.2", false},
		{"implicit, open sequences", "1.2.840.10008.1.2", true},
		{"explicit", explicitLittleUID, false},
		{"explicit, open sequences", explicitLittleUID, true},
		{"big endian", "1.2.840.10008.1.2.2", false},
		{"big endian, open sequences", "1.2.840.10008.1.2.2", true},
		{"deflated", "1.2.840.10008.1.2.1.99", false},
	} {
		t.Run(q.name, func(t *testing.T) {
			set := builder{findTransfer(q.uid).syntax, q.open}.bytes(image)
			for _, shape := range []struct {
				name    string
				b       []byte
				notices int
			}{
				{"whole", file(q.uid, set), 0},
				{"no preamble", file(q.uid, set)[132:], 1},
				{"bare", set, 2},
			} {
				if shape.name == "bare" && findTransfer(q.uid).deflated {
					continue
				}
				m := mustRead(t, shape.b)
				if len(m.Notices) != shape.notices {
					t.Errorf("%s: notices %q; expected %d", shape.name, m.Notices, shape.notices)
				}
				if m.Rows != 3 || m.Columns != 4 || m.Frames != 1 || m.BitsStored != 12 || m.Signed || m.Inverse || m.Modality != "OT" || m.Padding != nil {
					t.Errorf("%s: %+v", shape.name, m)
				}
				if got := mustFrame(t, m, 0); !slices.Equal(got, cells) {
					t.Errorf("%s: cells %v; expected %v", shape.name, got, cells)
				}
				s, err := m.Stages(0)
				if err != nil {
					t.Fatal(err)
				}
				want := Stages{Slope: 1, Function: "LINEAR", VOILUTs: []LUT{{0, 12, []uint16{5, 6, 7}, "soft"}}}
				if !reflect.DeepEqual(s, want) {
					t.Errorf("%s: stages %+v; expected %+v", shape.name, s, want)
				}
			}
		})
	}
}

func TestReadCells(t *testing.T) {
	base, _ := plain()
	word := func(v int) part { return part{"US", []uint16{uint16(v)}} }
	for _, q := range []struct {
		name     string
		over     parts
		cells    []uint16
		pads     []uint16 // padding value, range limit
		expected []int
		padding  *Range
	}{
		{
			"high bits hold something else", nil,
			[]uint16{0xF000, 0xF001, 0x8FFF, 0x0ABC},
			[]uint16{0xF001},
			[]int{0, 1, 0xFFF, 0xABC},
			&Range{1, 1},
		},
		{
			"signed with high bits not extended",
			parts{tagRepresentation: word(1)},
			[]uint16{0x0800, 0x0FFF, 0xF7FF, 0x0001},
			[]uint16{0xF830, 0x0800},
			[]int{-2048, -1, 2047, 1},
			&Range{-2048, -2000},
		},
		{
			"stored bits at the top",
			parts{tagHighBit: word(15)},
			[]uint16{0xFFFF, 0x0010, 0x001F, 0x8000},
			nil,
			[]int{4095, 1, 1, 2048},
			nil,
		},
		{
			"sixteen bits signed",
			parts{tagBitsStored: word(16), tagHighBit: word(15), tagRepresentation: word(1)},
			[]uint16{0x8000, 0xFFFF, 0x7FFF, 0},
			[]uint16{0x8300, 0x8000},
			[]int{-32768, -1, 32767, 0},
			&Range{-32768, -32000},
		},
		{
			"high bit not stated",
			parts{tagHighBit: {}, tagRepresentation: {}, tagSamples: {}},
			[]uint16{0xF001, 2, 3, 4},
			nil,
			[]int{1, 2, 3, 4},
			nil,
		},
	} {
		t.Run(q.name, func(t *testing.T) {
			image := base.with(q.over).with(parts{tagRows: word(2), tagColumns: word(2), tagPixels: {"OW", q.cells}})
			for i, pad := range q.pads {
				image[tagPaddingValue+tag(i)] = word(int(pad))
			}
			m := mustRead(t, filed(explicitLittleUID, image))
			var got []int
			for _, c := range mustFrame(t, m, 0) {
				if m.Signed {
					got = append(got, int(int16(c)))
				} else {
					got = append(got, int(c))
				}
			}
			if !slices.Equal(got, q.expected) || !reflect.DeepEqual(m.Padding, q.padding) {
				t.Errorf("%v, padding %v; expected %v, %v", got, m.Padding, q.expected, q.padding)
			}
		})
	}
}

// In big endian words the first of two cells of 8 bits is in the low byte, which comes second (PS3.5 8.1.1
// with OW; annex A.3 there); in bytes (OB) they come as they are.
func TestReadFramesOfBytes(t *testing.T) {
	base, _ := plain()
	base = base.with(parts{
		tagRows: {"US", []uint16{3}}, tagColumns: {"US", []uint16{1}}, tagFrames: {"IS", "2"},
		tagBitsAllocated: {"US", []uint16{8}}, tagBitsStored: {"US", []uint16{8}}, tagHighBit: {"US", []uint16{7}},
	})
	for _, q := range []struct {
		uid, vr string
		value   []byte
	}{
		{explicitLittleUID, "OB", []byte{1, 2, 3, 4, 5, 6}},
		{explicitLittleUID, "OW", []byte{1, 2, 3, 4, 5, 6}},
		{"1.2.840.10008.1.2.2", "OB", []byte{1, 2, 3, 4, 5, 6}},
		{"1.2.840.10008.1.2.2", "OW", []byte{2, 1, 4, 3, 6, 5}},
	} {
		m := mustRead(t, filed(q.uid, base.with(parts{tagPixels: {q.vr, q.value}})))
		for i, want := range [][]uint16{{1, 2, 3}, {4, 5, 6}} {
			if got := mustFrame(t, m, i); !slices.Equal(got, want) {
				t.Errorf("%s %s: frame %d %v; expected %v", q.uid, q.vr, i, got, want)
			}
		}
	}
}

// A frame longer than the chunk it is read in, from several goroutines at once.
func TestReadLargeFrames(t *testing.T) {
	const columns, rows, frames = 701, 301, 3
	base, _ := plain()
	cells := make([]uint16, columns*rows*frames)
	for i := range cells {
		cells[i] = uint16(i*7) & 0xFFF
	}
	for _, uid := range []string{explicitLittleUID, "1.2.840.10008.1.2.2", "1.2.840.10008.1.2.1.99"} {
		order := findTransfer(uid).order()
		m := mustRead(t, filed(uid, base.with(parts{
			tagRows: {"US", []uint16{rows}}, tagColumns: {"US", []uint16{columns}}, tagFrames: {"IS", fmt.Sprint(frames)},
			tagPixels: {"OW", words16(order, cells)},
		})))
		var wait sync.WaitGroup
		for _, i := range []int{2, 0, 1, 2} {
			wait.Go(func() {
				plane := make([]uint16, columns*rows)
				if err := m.FrameInto(plane, i); err != nil {
					t.Error(err)
				}
				if !slices.Equal(plane, cells[i*columns*rows:][:columns*rows]) {
					t.Errorf("%s: frame %d differs", uid, i)
				}
			})
		}
		wait.Wait()
		if err := m.FrameInto(make([]uint16, 7), 0); err == nil {
			t.Error("a plane of the wrong size was taken")
		}
		for _, i := range []int{-1, frames} {
			_, err := m.Frame(i)
			isOneLine(t, err, fmt.Sprintf("frame %d", i))
			_, err = m.Stages(i)
			isOneLine(t, err, fmt.Sprintf("frame %d", i))
		}
	}
}

// Fragments become frames by number, by offset table, by extended offset table or by start of image
// (PS3.5 A.4).
func TestReadFragments(t *testing.T) {
	base, _ := plain()
	base = base.with(parts{tagRows: {"US", []uint16{2}}, tagColumns: {"US", []uint16{2}}, tagFrames: {"IS", "2"}})
	a, b := []uint16{1, 2, 3, 4}, []uint16{4095, 0, 7, 9}
	ja := encodeLossless(a, 2, losslessOptions{precision: 12, predictor: 1})
	jb := encodeLossless(b, 2, losslessOptions{precision: 12, predictor: 1})
	cut := func(f []byte) [][]byte { return [][]byte{f[:20], f[20:]} }
	at := len(ja) + 16 // two items before the second frame
	short := make([]byte, 8)
	binary.LittleEndian.PutUint32(short[4:], uint32(at))
	long := make([]byte, 16)
	binary.LittleEndian.PutUint64(long[8:], uint64(at))
	for _, q := range []struct {
		name  string
		value [][]byte
		table []byte
	}{
		{"one each", [][]byte{{}, ja, jb}, nil},
		{"one each and empty ones", [][]byte{{}, {}, ja, {}, jb}, nil},
		{"offset table", append(append([][]byte{short}, cut(ja)...), cut(jb)...), nil},
		{"extended offset table", append(append([][]byte{{}}, cut(ja)...), cut(jb)...), long},
		{"start of image", append(append([][]byte{{}}, cut(ja)...), cut(jb)...), nil},
	} {
		t.Run(q.name, func(t *testing.T) {
			image := base.with(parts{tagPixels: {"OB", q.value}})
			if q.table != nil {
				image[tagLongOffsets] = part{"OV", q.table}
			}
			m := mustRead(t, filed("1.2.840.10008.1.2.4.70", image))
			for i, want := range [][]uint16{a, b} {
				if got := mustFrame(t, m, i); !slices.Equal(got, want) {
					t.Errorf("frame %d %v; expected %v", i, got, want)
				}
			}
		})
	}
	t.Run("one frame in many", func(t *testing.T) {
		m := mustRead(t, filed("1.2.840.10008.1.2.4.70", base.with(parts{
			tagFrames: {"IS", "1"}, tagPixels: {"OB", append([][]byte{{}}, cut(ja)...)},
		})))
		if got := mustFrame(t, m, 0); !slices.Equal(got, a) {
			t.Errorf("%v; expected %v", got, a)
		}
	})
	far := slices.Clone(short)
	far[4]++
	for _, q := range []struct {
		name  string
		uid   string
		value [][]byte
		want  string
	}{
		{"too few", "1.2.840.10008.1.2.4.70", [][]byte{{}, ja}, "1 fragment for 2 frames"},
		{"offset into nothing", "1.2.840.10008.1.2.4.70", append(append([][]byte{far}, cut(ja)...), cut(jb)...), "starts at no fragment"},
		{"short offset table", "1.2.840.10008.1.2.4.70", append(append([][]byte{short[:4]}, cut(ja)...), cut(jb)...), "an offset table of 4 bytes"},
		{"three pictures", "1.2.840.10008.1.2.4.70", [][]byte{{}, ja, jb, jb}, "3 JPEG pictures in the fragments for 2 frames"},
		{"RLE", "1.2.840.10008.1.2.5", [][]byte{{}, ja, jb, jb}, "3 fragments for 2 frames"},
	} {
		t.Run(q.name, func(t *testing.T) {
			_, err := readBytes(filed(q.uid, base.with(parts{tagPixels: {"OB", q.value}})))
			isOneLine(t, err, q.want)
			if !errors.Is(err, ErrDamaged) {
				t.Error("it is not ErrDamaged")
			}
		})
	}
}

func TestReadNotices(t *testing.T) {
	base, cells := plain()
	for _, q := range []struct {
		over parts
		want string
	}{
		{parts{0x60000010: {"US", []uint16{3}}, 0x60003000: {"OW", []uint16{0xFFF}}}, "overlays are left out"},
		{parts{0x601E0102: {"US", []uint16{12}}}, "overlays are left out"},
		{parts{tagBurnedIn: {"CS", "YES"}}, "Burned In Annotation"},
		{parts{tagFrames: {"IS", "0"}}, "Number of Frames is 0"},
		{parts{tagPixels: {"OW", make([]uint16, 24)}}, "24 bytes more"},
		{parts{tagPhotometric: {"CS", "MONOCHROME1"}, tagShape: {"CS", "IDENTITY"}}, "IDENTITY contradicts MONOCHROME1"},
		{parts{tagShape: {"CS", "INVERSE"}}, "INVERSE contradicts MONOCHROME2"},
	} {
		m := mustRead(t, filed(explicitLittleUID, base.with(q.over)))
		if len(m.Notices) != 1 || !strings.Contains(m.Notices[0], q.want) {
			t.Errorf("notices %q; expected %q", m.Notices, q.want)
		}
	}
	for _, uid := range []string{explicitLittleUID, "1.2.840.10008.1.2"} {
		written := syntax{explicit: uid != explicitLittleUID}
		m := mustRead(t, file(uid, builder{syntax: written}.bytes(base)))
		if len(m.Notices) != 1 || !strings.Contains(m.Notices[0], "not written as its transfer syntax says") || !slices.Equal(mustFrame(t, m, 0), cells) {
			t.Errorf("%s: notices %q", uid, m.Notices)
		}
	}
	m := mustRead(t, filed(explicitLittleUID, base.with(parts{
		tagPhotometric: {"CS", "MONOCHROME1"}, tagShape: {"CS", "INVERSE"}, tagIntent: {"CS", "FOR PROCESSING"}, tagLossy: {"CS", "01"},
	})))
	if len(m.Notices) != 0 || !m.Inverse || !m.ForProcessing || !m.Lossy {
		t.Errorf("%+v; expected an inverse, lossy image for processing and no notice", m)
	}
}

func TestReference(t *testing.T) {
	base, _ := plain()
	m := mustRead(t, filed(explicitLittleUID, base.with(parts{
		tagPixelSpacing: {"DS", `0.5\0.25`}, tagAspectRatio: {"IS", `2\1`},
	})))
	got, err := m.Reference()
	want := Reference{secondaryCaptureClass, "2.25.11", "2.25.12", "2.25.13", 4, 3, [2]float64{0.5, 0.25}, [2]int{2, 1}}
	if err != nil || got != want {
		t.Errorf("%+v, %v; expected %+v", got, err, want)
	}
	m = mustRead(t, filed(explicitLittleUID, base.with(parts{tagSOPInstance: {"UI", "none of"}})))
	_, err = m.Reference()
	isOneLine(t, err, "(0008,0018) SOP Instance UID")
}

// BenchmarkFrame reads a mammogram-sized frame of 4096 by 3328 cells; beside it a copy of the plane.
func BenchmarkFrame(b *testing.B) {
	const columns, rows = 3328, 4096
	file := captured(b, Capture{Columns: columns, Rows: rows, BitsStored: 12, Cells: ramp(columns, rows, 12), Title: "ramp"})
	m, err := readBytes(file)
	if err != nil {
		b.Fatal(err)
	}
	cells := make([]uint16, columns*rows)
	b.Run("read", func(b *testing.B) {
		b.SetBytes(2 * columns * rows)
		for b.Loop() {
			if err := m.FrameInto(cells, 0); err != nil {
				b.Fatal(err)
			}
		}
	})
	b.Run("copy", func(b *testing.B) {
		b.SetBytes(2 * columns * rows)
		other := make([]uint16, len(cells))
		for b.Loop() {
			copy(other, cells)
		}
	})
}
