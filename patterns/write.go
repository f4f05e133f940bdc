package patterns

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"hash/crc32"
	"image"
	"image/png"
	"io"

	"golang.org/x/image/tiff"
)

// Files hold 8 or 16 bits a sample. A level of another depth b is written so that black and white stay black
// and white: its bits are repeated from the top, v<<(16-b) | v>>(2b-16), as the PNG specification (third
// edition, 12.4 "Sample depth scaling") advises. The level comes back exactly as sample >> (16-b), and also
// by scaling to the range of b bits and rounding.

// Image is the plane as a picture: image.Gray at 8 bits, else image.Gray16 scaled as in the files.
func (p *Plane) Image() image.Image {
	r := image.Rect(0, 0, p.Width, p.Height)
	if p.Bits == 8 {
		m := image.NewGray(r)
		for i, v := range p.Pix {
			m.Pix[i] = uint8(v)
		}
		return m
	}
	m := image.NewGray16(r)
	for i, v := range p.Pix {
		binary.BigEndian.PutUint16(m.Pix[2*i:], widen(v, p.Bits))
	}
	return m
}

// Image is the colour picture: image.NRGBA at 8 bits, else image.NRGBA64 scaled as in the files.
func (c *RGB) Image() image.Image {
	r := image.Rect(0, 0, c.R.Width, c.R.Height)
	if c.R.Bits == 8 {
		m := image.NewNRGBA(r)
		for i := range c.R.Pix {
			o := m.Pix[4*i : 4*i+4]
			o[0], o[1], o[2], o[3] = uint8(c.R.Pix[i]), uint8(c.G.Pix[i]), uint8(c.B.Pix[i]), 0xff
		}
		return m
	}
	m := image.NewNRGBA64(r)
	for i := range c.R.Pix {
		o := m.Pix[8*i : 8*i+8]
		binary.BigEndian.PutUint16(o, widen(c.R.Pix[i], c.R.Bits))
		binary.BigEndian.PutUint16(o[2:], widen(c.G.Pix[i], c.R.Bits))
		binary.BigEndian.PutUint16(o[4:], widen(c.B.Pix[i], c.R.Bits))
		binary.BigEndian.PutUint16(o[6:], 0xffff)
	}
	return m
}

// widen brings a level of the given depth, 8 to 16 bits, to 16 bits.
func widen(v uint16, depth int) uint16 { return v<<(16-depth) | v>>(2*depth-16) }

// WritePNG writes a gray PNG of 8 bits for planes of 8 bits, else of 16 with the true depth in the chunk
// sBIT.
func (p *Plane) WritePNG(w io.Writer) error { return writePNG(w, p.Image(), p.Bits, 1) }

// WritePNG writes a colour PNG of 8 bits a channel for planes of 8 bits, else of 16 with the true depth in
// the chunk sBIT.
func (c *RGB) WritePNG(w io.Writer) error { return writePNG(w, c.Image(), c.R.Bits, 3) }

// WriteTIFF writes a gray TIFF of 16 bits, compressed without loss. An 8-bit level v becomes 257 v.
func (p *Plane) WriteTIFF(w io.Writer) error {
	m := image.NewGray16(image.Rect(0, 0, p.Width, p.Height))
	for i, v := range p.Pix {
		binary.BigEndian.PutUint16(m.Pix[2*i:], widen(v, p.Bits))
	}
	if err := tiff.Encode(w, m, &tiff.Options{Compression: tiff.Deflate, Predictor: true}); err != nil {
		return fmt.Errorf("TIFF: %w; expected to write %dx%d samples; look at the disk", err, p.Width, p.Height)
	}
	return nil
}

func writePNG(w io.Writer, m image.Image, depth, channels int) error {
	if depth != 8 && depth != 16 {
		w = &significant{w: w, depth: byte(depth), channels: channels}
	}
	if err := png.Encode(w, m); err != nil {
		return fmt.Errorf("PNG: %w; expected to write %v pixels; look at the disk", err, m.Bounds().Size())
	}
	return nil
}

// significant passes a PNG on and slips the chunk sBIT in behind the header: the standard library cannot
// write it.
type significant struct {
	w        io.Writer
	depth    byte
	channels int
	passed   int
}

// headerLen is the signature (8 bytes) and the chunk IHDR (4 length, 4 name, 13 data, 4 sum).
const headerLen = 8 + 4 + 4 + 13 + 4

func (s *significant) Write(b []byte) (int, error) {
	if s.passed >= headerLen {
		return s.w.Write(b)
	}
	head := min(len(b), headerLen-s.passed)
	n, err := s.w.Write(b[:head])
	s.passed += n
	if err != nil || s.passed < headerLen {
		return n, err
	}
	data := append([]byte("sBIT"), bytes.Repeat([]byte{s.depth}, s.channels)...)
	chunk := binary.BigEndian.AppendUint32(nil, uint32(s.channels))
	chunk = append(chunk, data...)
	chunk = binary.BigEndian.AppendUint32(chunk, crc32.ChecksumIEEE(data))
	if _, err := s.w.Write(chunk); err != nil {
		return n, err
	}
	if head == len(b) {
		return n, nil
	}
	rest, err := s.w.Write(b[head:])
	return n + rest, err
}
