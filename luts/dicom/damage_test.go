package dicom

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math/rand/v2"
	"runtime"
	"strings"
	"testing"
)

func TestReadRefusals(t *testing.T) {
	base, cells := plain()
	word := func(v int) part { return part{"US", []uint16{uint16(v)}} }
	frames := part{"OB", [][]byte{{}, encodeLossless(cells, 4, losslessOptions{precision: 12, predictor: 1})}}
	explicit := func(over parts) []byte { return filed(explicitLittleUID, base.with(over)) }
	for _, q := range []struct {
		name string
		b    []byte
		kind error
		want string
	}{
		{"empty", nil, ErrUnsupported, "byte 0: no preamble"},
		{"other file", []byte("P5 4 3 4095\n            "), ErrUnsupported, "no preamble"},
		{"other file with an eight", []byte{8, 8, 8, 8, 8, 8, 8, 8, 8, 8}, ErrUnsupported, "no preamble"},
		{"implicit big endian", []byte{0, 8, 0, 0, 0, 0, 0, 4, 0, 0, 0, 0}, ErrUnsupported, "no preamble"},
		{"preamble alone", file(explicitLittleUID, nil)[:132], ErrDamaged, "byte 132: the file ends"},
		{"no image", explicit(parts{tagPixels: {}}), ErrUnsupported, "(7FE0,0010) Pixel Data: none in this file"},
		{"floating point", explicit(parts{tagFloatPixels: {"OF", []byte{0, 0, 0, 0}}, tagPixels: {}}), ErrUnsupported, "floating point"},
		{"colour", explicit(parts{tagPhotometric: {"CS", "RGB"}, tagSamples: word(3)}), ErrUnsupported, "a colour image; expected MONOCHROME1 or MONOCHROME2"},
		{"palette", explicit(parts{tagPhotometric: {"CS", "PALETTE COLOR"}}), ErrUnsupported, "a colour image"},
		{"samples", explicit(parts{tagSamples: word(3)}), ErrUnsupported, "(0028,0002) Samples per Pixel: 3"},
		{"no photometric interpretation", explicit(parts{tagPhotometric: {}}), ErrDamaged, "(0028,0004) Photometric Interpretation: no term"},
		{"no rows", explicit(parts{tagRows: {}}), ErrDamaged, "(0028,0010) Rows: no value"},
		{"zero rows", explicit(parts{tagRows: word(0)}), ErrDamaged, "0 rows of 4 columns"},
		{"too many cells", explicit(parts{tagRows: word(65535), tagColumns: word(65535)}), ErrUnsupported, "65535 rows of 65535 columns"},
		{"frames", explicit(parts{tagFrames: {"IS", "1A"}}), ErrDamaged, "(0028,0008) Number of Frames: no number"},
		{"negative frames", explicit(parts{tagFrames: {"IS", "-1"}}), ErrDamaged, "out of range"},
		{"too many frames", explicit(parts{tagFrames: {"IS", "999999999999"}}), ErrDamaged, "out of range"},
		{"more frames than pixels", explicit(parts{tagFrames: {"IS", "2147483647"}}), ErrDamaged, "24 bytes; expected 51539607528 for 2147483647 frames"},
		{"32 bits", explicit(parts{tagBitsAllocated: word(32)}), ErrUnsupported, "(0028,0100) Bits Allocated: 32; expected 8 or 16"},
		{"bits stored", explicit(parts{tagBitsStored: word(17)}), ErrDamaged, "17; expected 1 to 16"},
		{"high bit", explicit(parts{tagHighBit: word(10)}), ErrDamaged, "10; expected 11 to 15"},
		{"representation", explicit(parts{tagRepresentation: word(2)}), ErrDamaged, "2; expected 0 or 1"},
		{"odd number", explicit(parts{tagRows: {"US", []byte{1, 2, 3}}}), ErrDamaged, "3 bytes; expected whole 16-bit"},
		{"slope", explicit(parts{tagSlope: {"DS", "one"}}), ErrDamaged, "(0028,1053) Rescale Slope: no number"},
		{"slope 0", explicit(parts{tagSlope: {"DS", "0.0"}}), ErrDamaged, "0; expected a number other than 0"},
		{"LUT", explicit(parts{tagVOILUT: {"SQ", []parts{{tagLUTData: {"US", []uint16{1}}}}}}), ErrDamaged, "without three descriptor values"},
		{"LUT data", explicit(parts{tagVOILUT: {"SQ", []parts{{tagLUTDescriptor: {"US", []uint16{0, 0, 16}}, tagLUTData: {"OW", []uint16{1}}}}}}), ErrDamaged, "expected 131072 bytes for 65536 entries"},
		{"LUT bits", explicit(parts{tagModalityLUT: {"SQ", []parts{{tagLUTDescriptor: {"US", []uint16{1, 0, 17}}, tagLUTData: {"US", []uint16{1}}}}}}), ErrDamaged, "entries of 17 bits"},
		{"no sequence", explicit(parts{tagVOILUT: {"US", []uint16{1}}}), ErrDamaged, "a value of form US; expected a sequence"},
		{"items for frames", explicit(parts{tagPerFrame: {"SQ", []parts{{}, {}}}}), ErrDamaged, "more items than frames; expected 1 item"},
		{"items for more frames", explicit(parts{tagFrames: {"IS", "2"}, tagPerFrame: {"SQ", []parts{{}}}}), ErrDamaged, "fewer items than frames"},
		{"native in fragments", explicit(parts{tagPixels: frames}), ErrDamaged, "expected a value of stated length, as the transfer syntax Explicit VR Little Endian has"},
		{"compressed without fragments", filed("1.2.840.10008.1.2.4.70", base), ErrDamaged, "expected fragments"},
		{"no fragments", filed("1.2.840.10008.1.2.4.70", base.with(parts{tagPixels: {"OB", [][]byte{}}})), ErrDamaged, "0 fragments for 1 frame;"},
		{"transfer syntax unknown", file("1.2.3.4", nil), ErrUnsupported, "transfer syntax 1.2.3.4; expected"},
		{"transfer syntax no UID", file("none", nil), ErrDamaged, "(0002,0010) Transfer Syntax UID: no UID"},
		{"value form", file(explicitLittleUID, []byte{8, 0, 1, 0, 'U', 'L', 0, 0, 8, 0, 5, 0, 'u', 's', 2, 0, 0, 0}), ErrDamaged, "(0008,0005) Specific Character Set: no value representation but bytes 75 73"},
		{"long form cut off", file(explicitLittleUID, []byte{8, 0, 6, 0, 'O', 'B', 0, 0, 0, 0}), ErrDamaged, "10 bytes are left for an element of form OB"},
		{"undefined length of text", file(explicitLittleUID, []byte{8, 0, 6, 0, 'U', 'T', 0, 0, 0xFF, 0xFF, 0xFF, 0xFF}), ErrDamaged, "a value UT of undefined length"},
		{"delimiter among elements", file(explicitLittleUID, []byte{0xFE, 0xFF, 0x0D, 0xE0, 0, 0, 0, 0}), ErrDamaged, "(FFFE,E00D): a delimiter among data elements"},
		{"element among items", file("1.2.840.10008.1.2", append([]byte{8, 0, 6, 0, 0xFF, 0xFF, 0xFF, 0xFF}, make([]byte, 8)...)), ErrDamaged, ": an element between items"},
		{"sequence without end", file("1.2.840.10008.1.2", []byte{8, 0, 6, 0, 0xFF, 0xFF, 0xFF, 0xFF}), ErrDamaged, "a sequence without an end"},
		{"item without end", file("1.2.840.10008.1.2", []byte{8, 0, 6, 0, 0xFF, 0xFF, 0xFF, 0xFF, 0xFE, 0xFF, 0, 0xE0, 0xFF, 0xFF, 0xFF, 0xFF}), ErrDamaged, "an item without an end"},
		{"long text", filed("1.2.840.10008.1.2", base.with(parts{tagPhotometric: {"CS", strings.Repeat("X", 65536)}})), ErrDamaged, "a value of 65536 bytes; expected at most 65534"},
		{"sequence for a number", file("1.2.840.10008.1.2", builder{open: true}.bytes(base.with(parts{tagRows: {"SQ", []parts{{}}}}))), ErrDamaged, "(0028,0010) Rows: a sequence; expected a value"},
		{"item for a fragment", filed("1.2.840.10008.1.2.5", base.with(parts{tagPixels: {"SQ", []parts{}}})), ErrDamaged, "expected fragments"},
		{"fragment of open length", file("1.2.840.10008.1.2.5", builder{explicitLittle, true}.bytes(base.with(parts{tagPixels: {"OB", []parts{{}}}}))), ErrDamaged, "no fragment of stated length"},
		{"deflated no more", file("1.2.840.10008.1.2.1.99", nil)[:164], ErrDamaged, "cannot be inflated"},
	} {
		t.Run(q.name, func(t *testing.T) {
			_, err := readBytes(q.b)
			isOneLine(t, err, q.want)
			if !errors.Is(err, q.kind) {
				t.Errorf("%v; expected the kind %v", err, q.kind)
			}
		})
	}
}

// A file name cannot break the line of an error.
func TestReadFileName(t *testing.T) {
	_, err := Read("a\nb\x00.dcm", bytes.NewReader(nil), 0)
	if err == nil || !strings.HasPrefix(err.Error(), "a?b?.dcm: byte 0: ") {
		t.Errorf("%v; expected the name without control characters", err)
	}
}

// Every refused transfer syntax is refused by its name, with what to do.
func TestRefusedTransferSyntaxes(t *testing.T) {
	for uid, name := range refusedNames {
		_, err := readBytes(file(uid, nil))
		isOneLine(t, err, name, "convert the file to Explicit VR Little Endian with a general DICOM toolkit")
		if !errors.Is(err, ErrUnsupported) {
			t.Errorf("%s: %v is not ErrUnsupported", name, err)
		}
	}
}

// A file of 9 MB of nested items once ended a process with an overflow of its stack.
func TestReadDeepNesting(t *testing.T) {
	var deep []byte
	for range 1 << 19 {
		deep = append(deep, 8, 0, 0x10, 0x11, 0xFF, 0xFF, 0xFF, 0xFF, 0xFE, 0xFF, 0, 0xE0, 0xFF, 0xFF, 0xFF, 0xFF)
	}
	_, err := readBytes(file("1.2.840.10008.1.2", deep))
	isOneLine(t, err, "items nested deeper than 32")

	base, _ := plain()
	nest := func(levels int) []byte {
		inner := parts{}
		for range levels {
			inner = parts{0x00081110: {"SQ", []parts{inner}}}
		}
		return file(explicitLittleUID, builder{explicitLittle, true}.bytes(base.with(inner)))
	}
	mustRead(t, nest(maxDepth))
	_, err = readBytes(nest(maxDepth + 1))
	isOneLine(t, err, "items nested deeper than 32")
}

// allocated is how many bytes f allocates.
func allocated(f func()) uint64 {
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	f()
	runtime.ReadMemStats(&after)
	return after.TotalAlloc - before.TotalAlloc
}

// An 8 KiB file with a length of 4 GB once made a reader allocate 4 GB. The limits are those of the package
// comment; the slack is for buffers and what the test itself makes.
func TestReadMemory(t *testing.T) {
	base, _ := plain()
	huge := func(over parts) parts {
		return base.with(parts{tagRows: {"US", []uint16{8192}}, tagColumns: {"US", []uint16{8192}}}).with(over)
	}
	eight := parts{tagBitsAllocated: {"US", []uint16{8}}, tagBitsStored: {"US", []uint16{8}}, tagHighBit: {"US", []uint16{7}}}
	bytes8K := make([]byte, 8192)
	manyFragments := make([][]byte, 100_000)
	for i := range manyFragments {
		manyFragments[i] = []byte{0xFF, markerSOI}
	}
	baseline, _ := baselineSample(t, 8, 8)
	sof := bytes.Index(baseline, []byte{0xFF, markerSOF0})
	copy(baseline[sof+5:], []byte{0x20, 0, 0x20, 0})
	windows := strings.Repeat(`1\`, 32000) + "1 "
	for _, q := range []struct {
		name string
		b    []byte
	}{
		{"length of an element", append(file("1.2.840.10008.1.2", nil), 8, 0, 6, 0, 0xFE, 0xFF, 0xFF, 0xFF)},
		{"cells of RLE", filed("1.2.840.10008.1.2.5", huge(parts{tagPixels: {"OB", [][]byte{{}, rleFrame(bytes8K, bytes8K)}}}))},
		{"cells of RLE, 8 bits", filed("1.2.840.10008.1.2.5", huge(eight).with(parts{tagPixels: {"OB", [][]byte{{}, rleFrame(bytes8K)}}}))},
		{"cells of JPEG lossless", filed("1.2.840.10008.1.2.4.70", huge(parts{tagPixels: {"OB", [][]byte{{}, encodeLossless(make([]uint16, 8192), 8192, losslessOptions{precision: 12, predictor: 1})}}}))},
		{"cells of JPEG baseline", filed("1.2.840.10008.1.2.4.50", huge(eight).with(parts{tagPixels: {"OB", [][]byte{{}, baseline}}}))},
		{"fragments", filed("1.2.840.10008.1.2.4.70", base.with(parts{tagFrames: {"IS", "99999"}, tagPixels: {"OB", manyFragments}}))},
		{"windows", filed(explicitLittleUID, base.with(parts{tagWindowCenter: {"DS", windows}, tagWindowWidth: {"DS", windows}, tagWindowText: {"LO", windows}}))},
		{"LUTs", filed(explicitLittleUID, base.with(parts{tagVOILUT: {"SQ", slicesRepeat(parts{
			tagLUTDescriptor: {"US", []uint16{1, 0, 16}}, tagLUTData: {"OW", []uint16{1}},
		}, 20_000)}}))},
		{"items of frames", filed(explicitLittleUID, base.with(parts{
			tagRows: {"US", []uint16{1}}, tagColumns: {"US", []uint16{1}}, tagFrames: {"IS", "20000"},
			tagPixels: {"OW", make([]uint16, 20_000)}, tagPerFrame: {"SQ", slicesRepeat(parts{}, 20_000)},
		}))},
	} {
		t.Run(q.name, func(t *testing.T) {
			const slack = 512 << 10
			limit := uint64(12*len(q.b) + slack)
			var m *Image
			var err error
			if got := allocated(func() { m, err = readBytes(q.b) }); got > limit {
				t.Errorf("Read allocates %d bytes for a file of %d; expected at most %d", got, len(q.b), limit)
			}
			if err != nil {
				return
			}
			limit = uint64(800*len(q.b) + slack)
			if m.pixels.coding != jpegBaseline {
				limit = uint64(132*len(q.b) + slack)
			}
			if got := allocated(func() { _, err = m.Frame(0) }); got > limit {
				t.Errorf("Frame allocates %d bytes for a file of %d; expected at most %d; %v", got, len(q.b), limit, err)
			}
		})
	}
}

func slicesRepeat(p parts, n int) []parts {
	all := make([]parts, n)
	for i := range all {
		all[i] = p
	}
	return all
}

// A data set may inflate to 64 MiB or 32 times its file; what is larger is refused without being held.
func TestReadInflateLimit(t *testing.T) {
	base, _ := plain()
	flat := func(n int) []byte {
		return filed("1.2.840.10008.1.2.1.99", base.with(parts{tagFrames: {"IS", fmt.Sprint(n / 24)}, tagPixels: {"OW", make([]byte, n)}}))
	}
	b := flat(63 << 20)
	if got := allocated(func() { mustFrame(t, mustRead(t, b), 5) }); got > 1<<20 {
		t.Errorf("%d bytes allocated; expected at most a MiB", got)
	}
	_, err := readBytes(flat(65 << 20))
	isOneLine(t, err, "a deflated data set of more than 67108864 bytes")
	if !errors.Is(err, ErrUnsupported) {
		t.Error(err)
	}
}

// rich holds what identifies a patient, every kind of stage, and sequences.
func rich() parts {
	base, _ := plain()
	lut := parts{tagLUTDescriptor: {"SS", []uint16{4, 0xFFFE, 16}}, tagLUTText: {"LO", "table"}, tagLUTData: {"OW", []uint16{1, 2, 3, 4}}}
	return base.with(parts{
		tagCharacterSet:   {"CS", "ISO_IR 100"},
		tagStudyDate:      {"DA", "SECRET"},
		tagAccession:      {"SH", "SECRET"},
		tagReferring:      {"PN", "SECRET^SECRET"},
		tagPatientName:    {"PN", "SECRET^SECRET"},
		tagPatientID:      {"LO", "SECRET"},
		tagPatientBirth:   {"DA", "SECRET"},
		tagComments:       {"LT", "SECRET SECRET"},
		0x00081032:        {"SQ", []parts{{0x00080104: {"LO", "SECRET"}}}},
		0x00091001:        {"UT", "SECRET SECRET"},
		tagWindowCenter:   {"DS", `40\50.5`},
		tagWindowWidth:    {"DS", `400\350`},
		tagWindowText:     {"LO", `one\two`},
		tagIntercept:      {"DS", "-1024"},
		tagSlope:          {"DS", "1"},
		tagRescaleType:    {"LO", "HU"},
		tagVOILUT:         {"SQ", []parts{lut, lut}},
		tagPerFrame:       {"SQ", []parts{{tagFrameVOI: {"SQ", []parts{{tagWindowCenter: {"DS", "1"}, tagWindowWidth: {"DS", "2"}}}}}}},
		tagPaddingValue:   {"US", []uint16{0}},
		tagRepresentation: {"US", []uint16{0}},
	})
}

// Nothing that identifies a patient stays in an image or reaches an error, whatever is broken. Files are
// cut at each byte, and each byte is changed.
func TestReadKeepsNoIdentity(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	for _, uid := range []string{explicitLittleUID, "1.2.840.10008.1.2", "1.2.840.10008.1.2.2", "1.2.840.10008.1.2.1.99"} {
		whole := file(uid, builder{findTransfer(uid).syntax, uid != explicitLittleUID}.bytes(rich()))
		try := func(what string, b []byte) (read bool) {
			m, err := readBytes(b)
			shown := fmt.Sprint(err)
			if err == nil {
				read = true
				s, err := m.Stages(0)
				kept, _ := json.Marshal(m)
				stages, _ := json.Marshal(s)
				_, frameErr := m.Frame(0)
				shown = fmt.Sprint(string(kept), string(stages), err, frameErr) + fmt.Sprintf("%+v", *m)
			} else {
				isOneLine(t, err)
			}
			// Texts of windows and tables are the only free ones that are kept.
			if strings.Contains(shown, "SECRET") || strings.Contains(shown, "2.25.1") {
				t.Fatalf("%s: %s", what, shown)
			}
			return read
		}
		if !try("whole", whole) {
			t.Fatalf("%s: the whole file is not read", uid)
		}
		for n := range whole {
			try(fmt.Sprintf("%s cut at %d", uid, n), whole[:n])
			b := bytes.Clone(whole)
			b[n] ^= byte(1 + random.IntN(255))
			try(fmt.Sprintf("%s changed at %d", uid, n), b)
		}
	}
	for _, over := range []parts{
		{tagPhotometric: {"CS", "SECRET"}},
		{tagModality: {"CS", "SECRET^A"}},
		{tagFrames: {"IS", "SECRET"}},
		{tagSlope: {"DS", "SECRET"}},
		{tagVOIFunction: {"CS", "SECRET"}},
		{tagWindowCenter: {"DS", "SECRET"}},
		{tagShape: {"CS", "SECRET"}},
	} {
		m, err := readBytes(filed(explicitLittleUID, rich().with(over)))
		if strings.Contains(fmt.Sprintf("%+v %v", m, err), "SECRET") {
			t.Errorf("%v: %+v %v", over, m, err)
		}
	}
}

// failing fails at the n-th read.
type failing struct {
	r io.ReaderAt
	n int
}

var errDisk = errors.New("input/output error")

func (f *failing) ReadAt(b []byte, off int64) (int, error) {
	if f.n--; f.n < 0 {
		return 0, errDisk
	}
	return f.r.ReadAt(b, off)
}

// What the file system says is passed on, and is no fault of the file's content.
func TestReadFailingDisk(t *testing.T) {
	for _, uid := range []string{explicitLittleUID, "1.2.840.10008.1.2.1.99"} {
		b := filed(uid, rich().with(parts{0x00081030: {"UT", strings.Repeat("text", 40_000)}}))
		for n := range 30 {
			f := &failing{bytes.NewReader(b), n}
			m, err := Read("sample.dcm", f, int64(len(b)))
			if err == nil {
				f.n = 0
				_, err = m.Frame(0)
			}
			if !errors.Is(err, errDisk) || errors.Is(err, ErrDamaged) {
				t.Fatalf("%s, read %d: %v", uid, n, err)
			}
			isOneLine(t, err, "check the disk")
		}
	}
	b := filed(explicitLittleUID, rich())
	_, err := Read("sample.dcm", bytes.NewReader(b[:200]), int64(len(b)))
	isOneLine(t, err, "unexpected EOF")
}
