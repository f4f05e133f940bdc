package dicom

// lossless is a JPEG picture of process 14 (ITU-T T.81 annex H): one component, one scan, Huffman codes.
type lossless struct {
	frameHeader
	tables    [4]*codes
	table     byte
	predictor byte // selection value, 1 to 7
	transform int  // point transform: bits that were cut off below
	interval  int  // pixel cells between restarts, 0 for none
	scan      []byte
	scanAt    int
}

// openLossless reads the headers and checks the scan against the cells it must hold: each takes a bit at
// least.
func openLossless(data []byte, columns, rows int) (func([]uint16) error, error) {
	var j lossless
	at, err := segments(data, j.segment)
	if err == nil {
		err = j.check(columns, rows)
	}
	if err != nil {
		return nil, err
	}
	switch {
	case j.precision < 2 || j.precision > 16:
		return nil, bad(0, "JPEG samples of %d bits; expected 2 to 16", j.precision)
	case j.transform >= j.precision:
		return nil, bad(at, "a JPEG point transform of %d bits; expected fewer than %d", j.transform, j.precision)
	case j.tables[j.table] == nil:
		return nil, bad(at, "JPEG Huffman table %d is not defined; expected it before the scan", j.table)
	case j.interval%columns != 0:
		return nil, bad(at, "JPEG restarts every %d pixel cells; expected whole rows of %d", j.interval, columns)
	}
	j.scan, j.scanAt = data[at:], at
	if len(j.scan) < (columns*rows+7)/8 {
		return nil, bad(at, "a JPEG scan of %d bytes; expected at least %d for %d pixel cells", len(j.scan), (columns*rows+7)/8, columns*rows)
	}
	return j.decode, nil
}

func (j *lossless) segment(marker byte, at int, body []byte) error {
	switch {
	case marker == markerSOF3:
		return j.read(at, body)
	case isFrameHeader(marker):
		return bad(at, "JPEG frame header FF %02X; expected lossless with Huffman codes, FF C3", marker)
	case marker == markerDHT:
		return j.defineTables(at, body)
	case marker == markerDRI:
		if len(body) != 2 {
			return bad(at, "a JPEG restart interval of %d bytes; expected 2", len(body))
		}
		j.interval = int(body[0])<<8 | int(body[1])
	case marker == markerSOS: // B.2.3
		switch {
		case !j.found:
			return bad(at, "a JPEG scan before the frame header; expected it behind")
		case len(body) != 6 || body[0] != 1 || body[1] != j.component:
			return bad(at, "a JPEG scan of other components; expected the frame's only one")
		case body[2]>>4 > 3:
			return bad(at, "JPEG Huffman table %d; expected 0 to 3", body[2]>>4)
		case body[3] < 1 || body[3] > 7:
			return bad(at, "JPEG selection value %d; expected 1 to 7", body[3])
		}
		j.table, j.predictor, j.transform = body[2]>>4, body[3], int(body[5]&15)
	}
	return nil
}

// decode fills the plane (H.1.2, H.2).
func (j *lossless) decode(plane []uint16) error {
	b := bitReader{data: j.scan}
	table := j.tables[j.table]
	n := j.columns
	perRestart := j.interval / n // in rows
	start := uint16(1) << (j.precision - j.transform - 1)
	marker := byte(markerRST0)
	fresh := true // the next row is the first of the scan or of a restart interval
	for y := range j.rows {
		if perRestart > 0 && y > 0 && y%perRestart == 0 {
			if !b.restart(marker) {
				return bad(j.scanAt+b.pos, "no JPEG restart marker FF %02X before row %d; expected one", marker, y)
			}
			marker = markerRST0 | (marker+1)&7
			fresh = true
		}
		row := plane[y*n : y*n+n]
		var above []uint16
		if !fresh {
			above = plane[y*n-n : y*n]
			start = above[0]
		} else if y > 0 {
			start = uint16(1) << (j.precision - j.transform - 1)
		}
		if !j.decodeRow(&b, table, row, above, start) {
			return bad(j.scanAt+b.pos, "row %d does not decode; expected Huffman codes of pixel cells", y)
		}
		fresh = false
	}
	if j.transform > 0 {
		for i := range plane {
			plane[i] <<= j.transform
		}
	}
	return nil
}

// decodeRow decodes one row; start is the prediction of its first cell, above the row before it or nil
// where only the left neighbour counts (H.1.2.1). Arithmetic is modulo 2^16.
func (j *lossless) decodeRow(b *bitReader, table *codes, row, above []uint16, start uint16) bool {
	d, ok := b.difference(table)
	if !ok {
		return false
	}
	left := start + d
	row[0] = left
	if above == nil || j.predictor == 1 {
		for x := 1; x < len(row); x++ {
			if d, ok = b.difference(table); !ok {
				return false
			}
			left += d
			row[x] = left
		}
		return true
	}
	above = above[:len(row)]
	for x := 1; x < len(row); x++ {
		if d, ok = b.difference(table); !ok {
			return false
		}
		// Table H.1, with Ra to the left, Rb above, Rc above to the left.
		ra, rb, rc := int32(left), int32(above[x]), int32(above[x-1])
		var p int32
		switch j.predictor {
		case 2:
			p = rb
		case 3:
			p = rc
		case 4:
			p = ra + rb - rc
		case 5:
			p = ra + (rb-rc)>>1
		case 6:
			p = rb + (ra-rc)>>1
		case 7:
			p = (ra + rb) >> 1
		}
		left = uint16(p) + d
		row[x] = left
	}
	return true
}
