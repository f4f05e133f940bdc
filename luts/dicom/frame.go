package dicom

import (
	"encoding/binary"
	"fmt"
	"sort"
)

// pixels says where the pixel cells are and how they are kept.
type pixels struct {
	bytes  int // of a cell, 1 or 2
	shift  int // of the stored value within its cell
	coding coding

	off     int64 // native: where the first frame begins
	big     bool  // native, 2 bytes: high byte first
	swapped bool  // native, 1 byte: the bytes of each pair are exchanged

	fragments []fragment // encapsulated
	starts    []int32    // first fragment of each frame, nil where each has its own
}

type fragment struct {
	off    int64
	length uint32
}

// Frame gives the stored values of frame i, counted from 0, row by row: Columns * Rows of them. Bits that
// are not stored bits are cleared; signed values are two's complement in 16 bits.
func (m *Image) Frame(i int) ([]uint16, error) {
	fill, err := m.frame(i)
	if err != nil {
		return nil, err
	}
	cells := make([]uint16, m.Columns*m.Rows)
	return cells, fill(cells)
}

// FrameInto is Frame into cells that the caller has: Columns * Rows of them.
func (m *Image) FrameInto(cells []uint16, i int) error {
	if len(cells) != m.Columns*m.Rows {
		return fmt.Errorf("%s: room for %d pixel cells; expected %d; give a plane of the image's size", m.file, len(cells), m.Columns*m.Rows)
	}
	fill, err := m.frame(i)
	if err != nil {
		return err
	}
	return fill(cells)
}

// frame checks that frame i can hold the image's cells before anyone allocates them, and gives what
// decodes it.
func (m *Image) frame(i int) (func([]uint16) error, error) {
	if err := m.checkFrame(i); err != nil {
		return nil, err
	}
	if m.pixels.coding == native {
		return func(cells []uint16) error { return m.nativeFrame(cells, i) }, nil
	}
	data, err := m.encoded(i)
	if err != nil {
		return nil, err
	}
	var decode func([]uint16) error
	switch m.pixels.coding {
	case runLength:
		decode, err = openRunLength(data, m.Columns*m.Rows, m.pixels.bytes)
	case jpegBaseline:
		decode, err = openBaseline(data, m.Columns, m.Rows)
	case jpegLossless:
		decode, err = openLossless(data, m.Columns, m.Rows)
	}
	if err != nil {
		return nil, m.frameFault(i, err)
	}
	return func(cells []uint16) error {
		if err := decode(cells); err != nil {
			return m.frameFault(i, err)
		}
		m.clean(cells)
		return nil
	}, nil
}

// codeError is what a decoder finds wrong in a frame, at a byte of it.
type codeError struct {
	at   int
	text string
}

func (e *codeError) Error() string { return fmt.Sprintf("byte %d of the frame: %s", e.at, e.text) }

func bad(at int, format string, args ...any) error {
	return &codeError{at, fmt.Sprintf(format, args...)}
}

func (m *Image) frameFault(i int, err error) error {
	off := m.pixels.fragments[m.firstFragment(i)].off
	return m.damaged(off, tagPixels, "frame %d, %v", i, err)
}

// clean brings the stored value of each cell to the low bits and extends its sign.
func (m *Image) clean(cells []uint16) {
	up := 16 - m.BitsStored - m.pixels.shift
	down := 16 - m.BitsStored
	switch {
	case down == 0:
	case m.Signed:
		for i, c := range cells {
			cells[i] = uint16(int16(c<<up) >> down)
		}
	default:
		for i, c := range cells {
			cells[i] = c << up >> down
		}
	}
}

// nativeChunk is how much of an uncompressed frame is read at a time.
const nativeChunk = 128 << 10

func (m *Image) nativeFrame(cells []uint16, i int) error {
	size := int64(len(cells)) * int64(m.pixels.bytes)
	off := m.pixels.off + int64(i)*size
	buf := make([]byte, min(nativeChunk, size+2))
	for len(cells) > 0 {
		n := min(len(cells), nativeChunk/2/m.pixels.bytes)
		b := buf[:n*m.pixels.bytes]
		if m.pixels.swapped {
			// Pairs count from the first frame, whose place may be odd in the file.
			lead := int((off - m.pixels.off) & 1)
			b = buf[:(lead+n+1)&^1]
			if err := m.read(b, off-int64(lead)); err != nil {
				return err
			}
			for k := 0; k < len(b); k += 2 {
				b[k], b[k+1] = b[k+1], b[k]
			}
			b = b[lead : lead+n]
		} else if err := m.read(b, off); err != nil {
			return err
		}
		part := cells[:n]
		switch {
		case m.pixels.bytes == 1:
			for k := range part {
				part[k] = uint16(b[k])
			}
		case m.pixels.big:
			for k := range part {
				part[k] = binary.BigEndian.Uint16(b[2*k:])
			}
		default:
			littleWords(part, b)
		}
		m.clean(part)
		cells = cells[n:]
		off += int64(n * m.pixels.bytes)
	}
	return nil
}

// littleWords takes four words at a time: large frames are read in two thirds of the time.
func littleWords(words []uint16, b []byte) {
	b = b[:2*len(words)]
	for len(words) >= 4 && len(b) >= 8 {
		v := binary.LittleEndian.Uint64(b)
		words[0], words[1], words[2], words[3] = uint16(v), uint16(v>>16), uint16(v>>32), uint16(v>>48)
		words, b = words[4:], b[8:]
	}
	for k := range words {
		words[k] = binary.LittleEndian.Uint16(b[2*k:])
	}
}

func (m *Image) read(b []byte, off int64) error {
	if err := readFull(m.r, b, off); err != nil {
		return m.unreadable(off, int64(len(b)), err)
	}
	return nil
}

func (m *Image) firstFragment(i int) int {
	if m.pixels.starts == nil {
		return i
	}
	return int(m.pixels.starts[i])
}

// encoded reads the compressed frame i.
func (m *Image) encoded(i int) ([]byte, error) {
	first, behind := m.firstFragment(i), len(m.pixels.fragments)
	if i+1 < m.Frames {
		behind = m.firstFragment(i + 1)
	}
	parts := m.pixels.fragments[first:behind]
	n := int64(0)
	for _, f := range parts {
		n += int64(f.length)
	}
	data := make([]byte, n)
	at := data
	for _, f := range parts {
		if err := m.read(at[:f.length], f.off); err != nil {
			return nil, err
		}
		at = at[f.length:]
	}
	return data, nil
}

// findPixels checks that the pixel data can hold the frames.
func (m *Image) findPixels(p *parser, c coding) error {
	e := m.elements[tagPixels]
	m.pixels.coding = c
	if c != native {
		if e.length != undefined {
			return p.damaged(e.header, tagPixels, "a value of stated length; expected fragments, as in every compressed image")
		}
		return m.findFragments(p, e)
	}
	if e.length == undefined {
		return p.damaged(e.header, tagPixels, "fragments; expected a value of stated length, as the transfer syntax %s has", m.TransferSyntax)
	}
	need := int64(m.Rows) * int64(m.Columns) * int64(m.pixels.bytes) * int64(m.Frames)
	if e.length < need {
		return p.damaged(e.header, tagPixels, "%d bytes; expected %d for %s", e.length, need, plural(m.Frames, "frame", "frames"))
	}
	if e.length > need+need%2 {
		m.notice("the pixel data hold %d bytes more than the frames need", e.length-need)
	}
	m.pixels.off = e.off
	m.pixels.big = e.syntax.big
	m.pixels.swapped = e.syntax.big && e.vr == "OW" && m.pixels.bytes == 1
	if m.pixels.swapped && e.length%2 != 0 {
		return p.damaged(e.header, tagPixels, "%d bytes; expected whole words", e.length)
	}
	return nil
}

// findFragments tells which fragments make up which frame (PS3.5 A.4).
func (m *Image) findFragments(p *parser, e element) error {
	var table fragment
	seen := false
	_, err := p.fragments(e, func(off, length int64) error {
		switch {
		case !seen:
			table, seen = fragment{off, uint32(length)}, true
		case length > 0: // an empty one holds nothing of a frame
			m.pixels.fragments = append(m.pixels.fragments, fragment{off, uint32(length)})
		}
		return nil
	})
	if err != nil {
		return err
	}
	n := len(m.pixels.fragments)
	switch {
	case n < m.Frames:
		return p.damaged(e.header, tagPixels, "%s for %s; expected at least one for each", plural(n, "fragment", "fragments"), plural(m.Frames, "frame", "frames"))
	case n == m.Frames:
		return nil
	case m.Frames == 1:
		m.pixels.starts = []int32{0}
		return nil
	case table.length > 0:
		return m.startsByTable(p, e, table.off, int64(table.length), 4)
	}
	if long, ok := m.elements[tagLongOffsets]; ok && long.length > 0 {
		return m.startsByTable(p, e, long.off, long.length, 8)
	}
	return m.startsByMarker(p, e)
}

// startsByTable reads where frames start from an offset table of 4 or 8 bytes for each.
func (m *Image) startsByTable(p *parser, e element, off, length int64, width int) error {
	if length != int64(m.Frames)*int64(width) {
		return p.damaged(off, tagPixels, "an offset table of %d bytes; expected %d for %s", length, int64(m.Frames)*int64(width), plural(m.Frames, "frame", "frames"))
	}
	all := m.pixels.fragments
	base := all[0].off // offsets count from the item that holds the first fragment
	m.pixels.starts = make([]int32, m.Frames)
	for i := range m.pixels.starts {
		b, err := p.bytes(off+int64(i*width), width)
		if err != nil {
			return err
		}
		want := uint64(binary.LittleEndian.Uint32(b))
		if width == 8 {
			want = binary.LittleEndian.Uint64(b)
		}
		k := sort.Search(len(all), func(k int) bool { return uint64(all[k].off-base) >= want })
		if k == len(all) || uint64(all[k].off-base) != want || i == 0 && k != 0 || i > 0 && int32(k) <= m.pixels.starts[i-1] {
			return p.damaged(off+int64(i*width), tagPixels, "frame %d starts at no fragment of its own by the offset table; expected one", i)
		}
		m.pixels.starts[i] = int32(k)
	}
	return nil
}

// startsByMarker finds the fragments that begin with a JPEG start of image (T.81 B.1.1.3).
func (m *Image) startsByMarker(p *parser, e element) error {
	if m.pixels.coding == runLength {
		return p.damaged(e.header, tagPixels, "%d fragments for %d frames; expected one for each", len(m.pixels.fragments), m.Frames)
	}
	found := 0
	m.pixels.starts = make([]int32, m.Frames)
	for k, f := range m.pixels.fragments {
		b, err := p.bytes(f.off, int(min(f.length, 2)))
		if err != nil {
			return err
		}
		if len(b) == 2 && b[0] == 0xFF && b[1] == markerSOI {
			if found < m.Frames {
				m.pixels.starts[found] = int32(k)
			}
			found++
		}
	}
	if found != m.Frames || m.pixels.starts[0] != 0 {
		return p.damaged(e.header, tagPixels, "%s in the fragments for %s; expected one for each, the first at the start", plural(found, "JPEG picture", "JPEG pictures"), plural(m.Frames, "frame", "frames"))
	}
	return nil
}
