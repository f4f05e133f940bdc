package dicom

import (
	"encoding/binary"
	"io"
)

// maxDepth is the deepest nesting of items that is followed; real images stay below ten.
const maxDepth = 32

// undefined is a length that is not stated: a delimiter ends the value (PS3.5 7.5).
const undefined = -1

// element is the header of a data element; its value stays in the file.
type element struct {
	tag    tag
	vr     string // "" where the file states none
	syntax syntax // of what is inside
	header int64  // where the element begins
	off    int64  // where its value begins
	length int64  // of the value in bytes, or undefined
	end    int64  // where what holds the element ends
	depth  int    // how many items hold it
}

// item is one item of a sequence. Without a stated length it is open: a delimiter ends it before end.
type item struct {
	off, end int64
	open     bool
	depth    int
	syntax   syntax
}

// dataset holds the elements that were asked for.
type dataset map[tag]element

type parser struct {
	place
	source
}

func newParser(p place, r io.ReaderAt, size int64) *parser {
	return &parser{p, source{r: r, size: size}}
}

func (s syntax) order() binary.ByteOrder {
	if s.big {
		return binary.BigEndian
	}
	return binary.LittleEndian
}

// bytes reads within the file; who calls has checked the range.
func (p *parser) bytes(off int64, n int) ([]byte, error) {
	if off < 0 || n < 0 || off+int64(n) > p.size {
		return nil, p.damaged(off, 0, "the file ends at %d; expected %d more bytes", p.size, n)
	}
	b, err := p.source.bytes(off, n)
	if err != nil {
		return nil, p.unreadable(off, int64(n), err)
	}
	return b, nil
}

// header reads the header of the element at off (PS3.5 7.1.2, 7.1.3), which must end by end with its value.
func (p *parser) header(off, end int64, s syntax) (element, error) {
	e := element{syntax: s, header: off, end: end}
	if end-off < 8 {
		return e, p.damaged(off, 0, "%d bytes are left for an element; expected at least 8", end-off)
	}
	b, err := p.bytes(off, 8)
	if err != nil {
		return e, err
	}
	order := s.order()
	e.tag = tag(order.Uint16(b))<<16 | tag(order.Uint16(b[2:]))
	e.off = off + 8
	var length uint32
	switch {
	case !s.explicit || e.tag.group() == groupDelimiters:
		length = order.Uint32(b[4:])
	case !isLetter(b[4]) || !isLetter(b[5]):
		return e, p.damaged(off, e.tag, "no value representation but bytes %02X %02X; expected two capital letters", b[4], b[5])
	default:
		e.vr = string(b[4:6])
		if !longForm(e.vr) {
			length = uint32(order.Uint16(b[6:]))
			break
		}
		if end-off < 12 {
			return e, p.damaged(off, e.tag, "%d bytes are left for an element of form %s; expected at least 12", end-off, e.vr)
		}
		if b, err = p.bytes(off+8, 4); err != nil {
			return e, err
		}
		length = order.Uint32(b)
		e.off += 4
	}
	if e.length = int64(length); length == 0xFFFFFFFF {
		e.length = undefined
		// An unknown value of undefined length is a sequence in implicit little endian (PS3.5 6.2.2).
		if e.vr == "UN" {
			e.syntax = syntax{}
		}
	}
	if e.length > end-e.off {
		return e, p.damaged(off, e.tag, "a value of %d bytes; expected at most the %d that are left", e.length, end-e.off)
	}
	return e, nil
}

func isLetter(b byte) bool { return 'A' <= b && b <= 'Z' }

// shortForm are the value representations with a length of 16 bits (PS3.5 table 7.1-2); those that are
// not known here have 32 bits, as all later ones shall.
var shortForm = map[string]bool{
	"AE": true, "AS": true, "AT": true, "CS": true, "DA": true, "DS": true, "DT": true, "FL": true,
	"FD": true, "IS": true, "LO": true, "LT": true, "PN": true, "SH": true, "SL": true, "SS": true,
	"ST": true, "TM": true, "UI": true, "UL": true, "US": true,
}

func longForm(vr string) bool { return !shortForm[vr] }

// walk visits the elements of an item (or of the data set, an item of depth 0) until it ends or visit
// says stop, and gives the position behind it.
func (p *parser) walk(it item, visit func(element) (stop bool, err error)) (int64, error) {
	if it.depth > maxDepth {
		return 0, p.damaged(it.off, tagItem, "items nested deeper than %d; expected fewer levels", maxDepth)
	}
	off := it.off
	for off < it.end {
		e, err := p.header(off, it.end, it.syntax)
		if err != nil {
			return 0, err
		}
		e.depth = it.depth
		if e.tag == tagItemEnd && it.open {
			if e.length != 0 {
				return 0, p.damaged(off, e.tag, "an end of an item with a value; expected none")
			}
			return e.off, nil
		}
		if e.tag.group() == groupDelimiters {
			return 0, p.damaged(off, e.tag, "a delimiter among data elements; expected an element")
		}
		if visit != nil {
			if stop, err := visit(e); stop || err != nil {
				return e.off, err
			}
		}
		if off, err = p.next(e); err != nil {
			return 0, err
		}
	}
	if it.open {
		return 0, p.damaged(off, tagItem, "an item without an end; expected its delimiter")
	}
	return off, nil
}

// next gives the position behind an element.
func (p *parser) next(e element) (int64, error) {
	if e.length != undefined {
		return e.off + e.length, nil
	}
	switch e.vr {
	case "OB", "OW":
		return p.fragments(e, nil)
	case "SQ", "UN", "":
		return p.items(e, nil)
	}
	return 0, p.damaged(e.header, e.tag, "a value %s of undefined length; expected a stated one", e.vr)
}

// items visits the items of a sequence and gives the position behind it.
func (p *parser) items(e element, visit func(item) error) (int64, error) {
	off, end := e.off, e.end
	if e.length != undefined {
		end = e.off + e.length
	}
	for off < end {
		h, err := p.header(off, end, e.syntax)
		if err != nil {
			return 0, err
		}
		switch {
		case h.tag == tagSequenceEnd && e.length == undefined:
			return h.off, nil
		case h.tag != tagItem:
			return 0, p.damaged(off, h.tag, "an element between items; expected an item or the end of the sequence")
		}
		it := item{h.off, end, h.length == undefined, e.depth + 1, e.syntax}
		if !it.open {
			it.end = h.off + h.length
		}
		if visit != nil {
			if err := visit(it); err != nil {
				return 0, err
			}
		}
		if off = it.end; it.open {
			if off, err = p.walk(it, nil); err != nil {
				return 0, err
			}
		}
	}
	if e.length == undefined {
		return 0, p.damaged(off, e.tag, "a sequence without an end; expected its delimiter")
	}
	return off, nil
}

// fragments visits the fragments of encapsulated data (PS3.5 A.4), the offset table first, and gives the
// position behind them.
func (p *parser) fragments(e element, visit func(off, length int64) error) (int64, error) {
	for off := e.off; ; {
		h, err := p.header(off, e.end, e.syntax)
		if err != nil {
			return 0, err
		}
		switch {
		case h.tag == tagSequenceEnd:
			return h.off, nil
		case h.tag != tagItem || h.length == undefined:
			return 0, p.damaged(off, h.tag, "no fragment of stated length; expected one or the end of the sequence")
		}
		if visit != nil {
			if err := visit(h.off, h.length); err != nil {
				return 0, err
			}
		}
		off = h.off + h.length
	}
}

// collect gives the elements of an item that keep says yes to; of one that stands twice the last.
func (p *parser) collect(it item, keep func(tag) bool) (dataset, error) {
	d := dataset{}
	_, err := p.walk(it, func(e element) (bool, error) {
		if keep(e.tag) {
			d[e.tag] = e
		}
		return false, nil
	})
	return d, err
}

// sequence visits the items of an element that must be a sequence.
func (p *parser) sequence(e element, visit func(item) error) error {
	if e.vr != "SQ" && e.vr != "UN" && e.vr != "" {
		return p.damaged(e.header, e.tag, "a value of form %s; expected a sequence", e.vr)
	}
	if e.vr == "UN" { // always implicit little endian inside (PS3.5 6.2.2)
		e.syntax = syntax{}
	}
	_, err := p.items(e, visit)
	return err
}

// first collects from the first item of a sequence; it is empty where the sequence is.
func (p *parser) first(e element, keep func(tag) bool) (dataset, error) {
	var d dataset
	err := p.sequence(e, func(it item) (err error) {
		if d == nil {
			d, err = p.collect(it, keep)
		}
		return err
	})
	return d, err
}
