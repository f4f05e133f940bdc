package dicom

import (
	"bytes"
	"compress/flate"
	"encoding/binary"
	"maps"
	"slices"
	"strings"
	"testing"
)

// part is an element to be built: text (string), words ([]uint16), bytes ([]byte) or items ([]parts).
type part struct {
	vr    string
	value any
}

type parts map[tag]part

// with gives a copy with other elements laid over; an empty vr takes one away.
func (p parts) with(over parts) parts {
	q := maps.Clone(p)
	for t, e := range over {
		if q[t] = e; e.vr == "" {
			delete(q, t)
		}
	}
	return q
}

// builder writes data sets byte by byte, independent of the package's writer, which knows one syntax only.
type builder struct {
	syntax
	open bool // sequences and items without stated lengths
}

func (b builder) bytes(p parts) []byte {
	var out []byte
	for _, t := range slices.Sorted(maps.Keys(p)) {
		out = append(out, b.element(t, p[t])...)
	}
	return out
}

func (b builder) short(v int) []byte {
	out := make([]byte, 2)
	b.order().PutUint16(out, uint16(v))
	return out
}

func (b builder) long(v int64) []byte {
	out := make([]byte, 4)
	b.order().PutUint32(out, uint32(v))
	return out
}

func (b builder) tag(t tag) []byte {
	return append(b.short(int(t.group())), b.short(int(t&0xFFFF))...)
}

func (b builder) delimited(t tag, length int64, body []byte, end tag) []byte {
	out := append(b.tag(t), b.long(length)...)
	out = append(out, body...)
	if length == undefined {
		out = append(append(out, b.tag(end)...), 0, 0, 0, 0)
	}
	return out
}

func (b builder) element(t tag, e part) []byte {
	var body []byte
	length := int64(-2)
	switch v := e.value.(type) {
	case string:
		body = []byte(v)
		if len(body)%2 != 0 {
			body = append(body, ' ')
		}
	case []uint16:
		for _, x := range v {
			body = append(body, b.short(int(x))...)
		}
	case []byte:
		body = v
	case []parts:
		for _, item := range v {
			inner := b.bytes(item)
			n := int64(len(inner))
			if b.open {
				n = undefined
			}
			body = append(body, b.delimited(tagItem, n, inner, tagItemEnd)...)
		}
		if b.open {
			length = undefined
		}
	case [][]byte: // fragments, the offset table first
		length = undefined
		for _, f := range v {
			body = append(body, b.delimited(tagItem, int64(len(f)), f, 0)...)
		}
	}
	if length == undefined {
		body = append(append(body, b.tag(tagSequenceEnd)...), 0, 0, 0, 0)
	} else {
		length = int64(len(body))
	}
	out := b.tag(t)
	switch {
	case !b.explicit:
		out = append(out, b.long(length)...)
	case longForm(e.vr):
		out = append(append(append(out, e.vr...), 0, 0), b.long(length)...)
	default:
		out = append(append(out, e.vr...), b.short(int(length))...)
	}
	return append(out, body...)
}

// file puts preamble and meta information of a transfer syntax before a data set.
func file(uid string, set []byte) []byte {
	t := findTransfer(uid)
	if t.deflated {
		var z bytes.Buffer
		w, _ := flate.NewWriter(&z, flate.BestCompression)
		w.Write(set)
		w.Close()
		set = z.Bytes()
	}
	if len(uid)%2 != 0 {
		uid += "\x00"
	}
	m := builder{syntax: explicitLittle}.bytes(parts{tagTransferSyntax: {"UI", uid}})
	return append(append(append(make([]byte, 128), "DICM"...), m...), set...)
}

// filed builds a whole file.
func filed(uid string, p parts) []byte {
	return file(uid, builder{syntax: findTransfer(uid).syntax}.bytes(p))
}

// words16 gives cells as bytes.
func words16(order binary.ByteOrder, cells []uint16) []byte {
	b := make([]byte, 2*len(cells))
	for i, c := range cells {
		order.PutUint16(b[2*i:], c)
	}
	return b
}

// plain is a small 12-bit image of 3 rows of 4 columns.
func plain() (parts, []uint16) {
	cells := []uint16{0, 1, 2, 3, 100, 200, 300, 400, 4092, 4093, 4094, 4095}
	return parts{
		tagSOPClass:       {"UI", secondaryCaptureClass + "\x00"},
		tagSOPInstance:    {"UI", "2.25.11"},
		tagStudyInstance:  {"UI", "2.25.12"},
		tagSeriesInstance: {"UI", "2.25.13"},
		tagModality:       {"CS", "OT"},
		tagSamples:        {"US", []uint16{1}},
		tagPhotometric:    {"CS", "MONOCHROME2"},
		tagRows:           {"US", []uint16{3}},
		tagColumns:        {"US", []uint16{4}},
		tagBitsAllocated:  {"US", []uint16{16}},
		tagBitsStored:     {"US", []uint16{12}},
		tagHighBit:        {"US", []uint16{11}},
		tagRepresentation: {"US", []uint16{0}},
		tagPixels:         {"OW", cells},
	}, cells
}

func readBytes(b []byte) (*Image, error) {
	return Read("sample.dcm", bytes.NewReader(b), int64(len(b)))
}

func mustRead(t *testing.T, b []byte) *Image {
	t.Helper()
	m, err := readBytes(b)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func mustFrame(t *testing.T, m *Image, i int) []uint16 {
	t.Helper()
	cells, err := m.Frame(i)
	if err != nil {
		t.Fatal(err)
	}
	return cells
}

// isOneLine checks the shape that every error has.
func isOneLine(t *testing.T, err error, wanted ...string) {
	t.Helper()
	if err == nil {
		t.Fatalf("no error; expected one with %q", wanted)
	}
	s := err.Error()
	if strings.ContainsAny(s, "\n\r\x00") || strings.Count(s, ";") < 2 || !strings.HasPrefix(s, "sample.dcm: ") {
		t.Errorf("error is not of the form place: found; expected; what to do: %q", s)
	}
	for _, w := range wanted {
		if !strings.Contains(s, w) {
			t.Errorf("error %q; expected %q in it", s, w)
		}
	}
}
