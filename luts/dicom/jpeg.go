package dicom

import (
	"bytes"
	"image"
	"image/jpeg"
)

// Markers of ITU-T T.81 table B.1.
const (
	markerSOF0 = 0xC0 // baseline
	markerSOF3 = 0xC3 // lossless, Huffman
	markerDHT  = 0xC4
	markerSOI  = 0xD8
	markerEOI  = 0xD9
	markerSOS  = 0xDA
	markerDRI  = 0xDD
	markerRST0 = 0xD0
)

// segments calls visit for each marker segment up to the first scan, with the position of its body, and
// gives the position behind the scan header.
func segments(data []byte, visit func(marker byte, at int, body []byte) error) (int, error) {
	if len(data) < 2 || data[0] != 0xFF || data[1] != markerSOI {
		return 0, bad(0, "no JPEG start of image; expected bytes FF D8")
	}
	for i := 2; ; {
		if i+2 > len(data) || data[i] != 0xFF {
			return 0, bad(i, "no JPEG marker; expected byte FF")
		}
		marker := data[i+1]
		if marker == 0xFF { // fill
			i++
			continue
		}
		if marker == markerEOI || marker == markerSOI || marker&0xF8 == markerRST0 || marker < 2 {
			return 0, bad(i, "JPEG marker FF %02X before the scan; expected tables and headers", marker)
		}
		if i+4 > len(data) {
			return 0, bad(i, "the JPEG data end within a marker; expected its length")
		}
		n := int(data[i+2])<<8 | int(data[i+3])
		if n < 2 || i+2+n > len(data) {
			return 0, bad(i, "a JPEG segment of %d bytes; expected 2 to %d", n, len(data)-i-2)
		}
		if err := visit(marker, i+4, data[i+4:i+2+n]); err != nil {
			return 0, err
		}
		i += 2 + n
		if marker == markerSOS {
			return i, nil
		}
	}
}

func isFrameHeader(marker byte) bool {
	return marker&0xF0 == 0xC0 && marker != markerDHT && marker != 0xC8 && marker != 0xCC
}

// frameHeader is T.81 B.2.2 of a single component.
type frameHeader struct {
	found         bool
	precision     int
	columns, rows int
	component     byte
}

func (h *frameHeader) read(at int, body []byte) error {
	switch {
	case h.found:
		return bad(at, "a second JPEG frame header; expected one")
	case len(body) < 6 || len(body) != 6+3*int(body[5]):
		return bad(at, "a JPEG frame header of %d bytes; expected 9", len(body))
	case body[5] != 1:
		return bad(at, "%d JPEG components; expected 1, as a grayscale image has", body[5])
	}
	h.found = true
	h.precision = int(body[0])
	h.rows, h.columns = int(body[1])<<8|int(body[2]), int(body[3])<<8|int(body[4])
	h.component = body[6]
	return nil
}

func (h *frameHeader) check(columns, rows int) error {
	switch {
	case !h.found:
		return bad(0, "no JPEG frame header; expected one")
	case h.columns != columns || h.rows != rows:
		return bad(0, "a JPEG picture of %d rows of %d columns; expected %d of %d", h.rows, h.columns, rows, columns)
	}
	return nil
}

// openBaseline checks a JPEG baseline frame of 8 bits against the cells it must hold: each block of 64 takes
// 2 bits at least.
func openBaseline(data []byte, columns, rows int) (func([]uint16) error, error) {
	var h frameHeader
	_, err := segments(data, func(marker byte, at int, body []byte) error {
		switch {
		case marker == markerSOF0:
			return h.read(at, body)
		case isFrameHeader(marker):
			return bad(at, "JPEG frame header FF %02X; expected baseline, FF C0", marker)
		}
		return nil
	})
	if err == nil {
		err = h.check(columns, rows)
	}
	if err != nil {
		return nil, err
	}
	blocks := ((columns + 7) / 8) * ((rows + 7) / 8)
	if blocks > 4*len(data) {
		return nil, bad(0, "%d bytes; expected at least %d for %d pixel cells", len(data), (blocks+3)/4, columns*rows)
	}
	return func(plane []uint16) error {
		img, err := jpeg.Decode(bytes.NewReader(data))
		if err != nil {
			return bad(0, "JPEG baseline that does not decode (%v); expected a whole picture", err)
		}
		gray, ok := img.(*image.Gray)
		if !ok || gray.Rect.Dx() != columns || gray.Rect.Dy() != rows {
			return bad(0, "a JPEG picture of another kind; expected grayscale of %d rows of %d columns", rows, columns)
		}
		for y := range rows {
			for x, v := range gray.Pix[y*gray.Stride:][:columns] {
				plane[y*columns+x] = uint16(v)
			}
		}
		return nil
	}, nil
}
