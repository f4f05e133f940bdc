package dicom

// quick is the length of the codes that are looked up in one step.
const quick = 9

// codes is a Huffman table of T.81 annex C and F.2.2.3, of the categories 0 to 16 of table H.2.
type codes struct {
	quick    [1 << quick]uint16 // length << 8 | category; 0 where the code is longer
	most     [18]int32          // greatest code of each length, -1 where there is none; the last stops
	offset   [17]int32          // from a code of each length to its place among the values
	values   []byte
	greatest int // length
}

// defineTables reads a DHT segment (B.2.4.2).
func (j *lossless) defineTables(at int, body []byte) error {
	for i := 0; i < len(body); {
		if len(body)-i < 17 {
			return bad(at+i, "a JPEG Huffman table of %d bytes; expected at least 17", len(body)-i)
		}
		if body[i] > 3 {
			return bad(at+i, "JPEG Huffman table %02X; expected 00 to 03", body[i])
		}
		counts := body[i+1 : i+17]
		n := 0
		for _, c := range counts {
			n += int(c)
		}
		if n > len(body)-i-17 {
			return bad(at+i, "%d JPEG Huffman codes; expected at most %d", n, len(body)-i-17)
		}
		c, ok := newCodes(counts, body[i+17:i+17+n])
		if !ok {
			return bad(at+i, "JPEG Huffman codes that do not fit their lengths or exceed category 16; expected a table as in T.81")
		}
		j.tables[body[i]] = c
		i += 17 + n
	}
	return nil
}

func newCodes(counts, values []byte) (*codes, bool) {
	c := &codes{values: values}
	code, k := int32(0), 0
	for length := 1; length <= 16; length++ {
		n := int32(counts[length-1])
		c.offset[length] = int32(k) - code
		for range n {
			if values[k] > 16 || code >= 1<<length {
				return nil, false
			}
			if length <= quick {
				first := code << (quick - length)
				for f := first; f < first+1<<(quick-length); f++ {
					c.quick[f] = uint16(length)<<8 | uint16(values[k])
				}
			}
			code++
			k++
		}
		c.most[length] = code - 1
		if n == 0 {
			c.most[length] = -1
		} else {
			c.greatest = length
		}
		code <<= 1
	}
	return c, true
}

// bitReader reads the entropy-coded data of a scan from the most significant bit on (F.2.2.5).
type bitReader struct {
	data []byte
	pos  int
	acc  uint64 // the low n bits are still to be read
	n    int
}

// fill brings at least 32 bits into the accumulator, unless a marker or the end stands before them.
func (b *bitReader) fill() {
	for b.n <= 56 && b.pos < len(b.data) {
		c := b.data[b.pos]
		if c == 0xFF {
			if b.pos+1 >= len(b.data) || b.data[b.pos+1] != 0 {
				return
			}
			b.pos++
		}
		b.pos++
		b.acc = b.acc<<8 | uint64(c)
		b.n += 8
	}
}

// peek gives the next k bits, 1 to 16, with zeros where the data have ended.
func (b *bitReader) peek(k int) uint32 {
	if b.n < k {
		return uint32(b.acc<<(k-b.n)) & (1<<k - 1)
	}
	return uint32(b.acc>>(b.n-k)) & (1<<k - 1)
}

// difference decodes one difference (H.1.2.2, F.2.2.1); false where the data end or hold no code.
func (b *bitReader) difference(c *codes) (uint16, bool) {
	if b.n < 32 {
		b.fill()
	}
	var length, category int
	if q := c.quick[b.peek(quick)]; q != 0 {
		length, category = int(q>>8), int(q&0xFF)
	} else {
		length = quick + 1
		for ; ; length++ {
			if length > c.greatest {
				return 0, false
			}
			if code := int32(b.peek(length)); code <= c.most[length] {
				category = int(c.values[code+c.offset[length]])
				break
			}
		}
	}
	if category == 0 || category == 16 { // no further bits
		b.n -= length
		return uint16(category << 11), b.n >= 0
	}
	b.n -= length
	if b.n < category {
		return 0, false
	}
	v := b.peek(category)
	b.n -= category
	if v < 1<<(category-1) {
		v += 1 - 1<<category
	}
	return uint16(v), true
}

// restart passes the padding and the restart marker that must come next.
func (b *bitReader) restart(marker byte) bool {
	if b.n >= 8 || b.pos+2 > len(b.data) {
		return false
	}
	for b.data[b.pos] == 0xFF && b.data[b.pos+1] == 0xFF && b.pos+2 < len(b.data) { // fill
		b.pos++
	}
	if b.pos+2 > len(b.data) || b.data[b.pos] != 0xFF || b.data[b.pos+1] != marker {
		return false
	}
	b.pos += 2
	b.acc, b.n = 0, 0
	return true
}
