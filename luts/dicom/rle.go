package dicom

import "encoding/binary"

// openRunLength checks an RLE frame (PS3.5 annex G) against the cells it must hold: a segment for each
// byte of a cell, the high byte first, and at least 2 bytes for 128 cells in each.
func openRunLength(data []byte, cells, bytes int) (func([]uint16) error, error) {
	if len(data) < 64 {
		return nil, bad(0, "%d bytes; expected the RLE header of 64", len(data))
	}
	if n := binary.LittleEndian.Uint32(data); n != uint32(bytes) {
		return nil, bad(0, "%d RLE segments; expected %d", n, bytes)
	}
	var segments [2][]byte
	for i := range bytes {
		from := uint64(binary.LittleEndian.Uint32(data[4+4*i:]))
		to := uint64(len(data))
		if i+1 < bytes {
			to = uint64(binary.LittleEndian.Uint32(data[8+4*i:]))
		}
		if from < 64 || from > to || to > uint64(len(data)) {
			return nil, bad(4+4*i, "RLE segment %d from %d to %d; expected it within %d to %d", i, from, to, 64, len(data))
		}
		if least := 2 * ((cells + 127) / 128); int(to-from) < least {
			return nil, bad(int(from), "an RLE segment of %d bytes; expected at least %d for %d pixel cells", to-from, least, cells)
		}
		segments[i] = data[from:to]
	}
	return func(plane []uint16) error {
		for i := range bytes {
			start := len(data) - len(segments[i])
			if i+1 < bytes {
				start = int(binary.LittleEndian.Uint32(data[4+4*i:]))
			}
			if at, ok := unpack(plane, segments[i], i == 0); !ok {
				return bad(start+at, "the RLE segment ends; expected more pixel cells")
			}
		}
		return nil
	}, nil
}

// unpack decodes a segment into the low bytes of the plane, after moving what is there up by a byte.
// It says where it stopped, and false where the segment did not fill the plane.
func unpack(plane []uint16, s []byte, first bool) (int, bool) {
	if first {
		clear(plane)
	}
	i := 0
	for len(plane) > 0 {
		if i >= len(s) {
			return i, false
		}
		c := int(s[i])
		i++
		switch {
		case c < 128: // c + 1 bytes as they are
			n := min(c+1, len(plane))
			if i+n > len(s) {
				return i, false
			}
			for k, b := range s[i : i+n] {
				plane[k] = plane[k]<<8 | uint16(b)
			}
			plane = plane[n:]
			i += c + 1
		case c > 128: // one byte, 257 - c times
			if i >= len(s) {
				return i, false
			}
			n, b := min(257-c, len(plane)), uint16(s[i])
			for k := range plane[:n] {
				plane[k] = plane[k]<<8 | b
			}
			plane = plane[n:]
			i++
		}
	}
	return i, true
}
