package calibrate

import (
	"bytes"
	"crypto/md5"
	"encoding/binary"
	"encoding/json"
	"fmt"
	"math"
	"time"
	"unicode/utf16"

	"evenstep/display/photometry"
)

// ICCVersion is the edition of the profile format (ICC.1) to write.
type ICCVersion int

// The editions: 2.4 is read by old systems, 4.4 by newer ones.
const (
	ICCv2 ICCVersion = 2
	ICCv4 ICCVersion = 4
)

// s15 is a number of the profile's fixed-point kind, in 1/65536.
type s15 int32

var (
	// d50 is the illuminant of the profile connection space (ICC.1 7.2.16).
	d50 = [3]s15{0xF6D6, 0x10000, 0xD32D}
	// The primaries of IEC 61966-2-1 brought to D50 by the Bradford method; they sum to D50. Colour was not
	// measured, and these stand in for it.
	primaries = [3][3]s15{
		{0x6FA0, 0x38F5, 0x0390},
		{0x6297, 0xB787, 0x18D9},
		{0x249F, 0x0F84, 0xB6C4},
	}
	// The Bradford matrix from the white of IEC 61966-2-1 to D50, row by row.
	adaptation = [9]s15{0x10C42, 0x05DE, -0x0CDB, 0x0793, 0xFD90, -0x045F, -0x025E, 0x03DC, 0xC06E}
)

// Profile is the table as an ICC display profile: the table itself in the video table tag (vcgt), which a
// system loads into the graphics card, and the tone curve of the display behind it. The same input gives
// the same bytes.
//
// Only luminance was measured: the colours are those of IEC 61966-2-1, and gray stays as tinted as the
// panel is. The tone curve is what the display emits, without ambient light where that is known.
func Profile(c *Curve, r Result, p Provenance, version ICCVersion) ([]byte, error) {
	if version != ICCv2 && version != ICCv4 {
		return nil, fmt.Errorf("profile: version %d; expected %d or %d", version, ICCv2, ICCv4)
	}
	if err := r.Table.Check(); err != nil {
		return nil, fmt.Errorf("profile: %w", err)
	}
	provenance, err := p.Map(c, r)
	if err != nil {
		return nil, err
	}
	origin, err := json.Marshal(provenance) // sorts the names
	if err != nil {
		return nil, fmt.Errorf("profile: %w", err)
	}
	white := c.emitted(Path{}.drives(r.Table)[len(r.Table.Entries)-1])
	if !(white > 0) {
		return nil, fmt.Errorf("profile: white emits %v cd/m2; expected more than 0; check the ambient light", white)
	}
	text := textTag
	describe := oldDescription
	if version == ICCv4 {
		text, describe = localised, localised
	}
	serial := "serial " + p.Serial
	if p.NoSerial {
		serial = "no serial number"
	}
	day := p.Date.UTC().Format(time.DateOnly)
	tags := []tag{
		{"desc", describe(p.Monitor + ", even gray steps by PS3.14, " + day)},
		{"cprt", text("No rights are reserved in this profile.")},
		{"wtpt", triple(d50)},
		{"rXYZ", triple(primaries[0])},
		{"gXYZ", triple(primaries[1])},
		{"bXYZ", triple(primaries[2])},
		{"rTRC", toneCurve(c, r, white)},
		{"gTRC", nil},
		{"bTRC", nil},
		{"lumi", triple([3]s15{0, s15(math.Round(min(float64(white), 32767) * 65536)), 0})},
		{"dmdd", describe(p.Monitor + ", " + serial)},
		{"calt", moment(p.Date)},
		{"targ", textTag(ascii(string(origin)))},
		{"vcgt", videoTable(r)},
	}
	if version == ICCv4 {
		tags = append(tags, tag{"chad", matrix(adaptation)})
	}
	return assemble(version, p.Date, tags), nil
}

// emitted is what the panel emits at a driving level, or what it shows where the ambient light in the
// readings is not known.
func (c *Curve) emitted(x float64) photometry.CdM2 {
	l := c.luminance(x)
	if c.Light.Ambient != nil {
		l = max(0, l-float64(*c.Light.Ambient))
	}
	return photometry.CdM2(l)
}

type tag struct {
	name string
	data []byte // nil: that of the tag before
}

// assemble lays out a profile: header, tag table, data at multiples of four.
func assemble(version ICCVersion, date time.Time, tags []tag) []byte {
	const header, entry = 128, 12
	b := make([]byte, header+4+entry*len(tags))
	offset, size := 0, 0
	var table bytes.Buffer
	put(&table, uint32(len(tags)))
	for _, t := range tags {
		if t.data != nil {
			offset, size = len(b), len(t.data)
			b = append(b, t.data...)
			for len(b)%4 != 0 {
				b = append(b, 0)
			}
		}
		table.WriteString(t.name)
		put(&table, uint32(offset), uint32(size))
	}
	copy(b[header:], table.Bytes())
	binary.BigEndian.PutUint32(b[0:], uint32(len(b)))
	b[8], b[9] = byte(version), 0x40
	copy(b[12:], "mntrRGB XYZ ")
	var d bytes.Buffer
	put(&d, dateNumbers(date))
	copy(b[24:], d.Bytes())
	copy(b[36:], "acsp")
	for i, v := range d50 {
		binary.BigEndian.PutUint32(b[68+4*i:], uint32(v))
	}
	if version == ICCv4 {
		// The identity is the MD5 of the profile with flags, rendering intent and identity zero, as they are here.
		sum := md5.Sum(b)
		copy(b[84:], sum[:])
	}
	return b
}

// put appends numbers in the profile's byte order. Writing to a buffer cannot fail, nor can these kinds.
func put(b *bytes.Buffer, values ...any) {
	for _, v := range values {
		_ = binary.Write(b, binary.BigEndian, v)
	}
}

// typed starts the data of a tag: its type and four reserved bytes.
func typed(name string) *bytes.Buffer {
	var b bytes.Buffer
	b.WriteString(name)
	put(&b, uint32(0))
	return &b
}

func dateNumbers(t time.Time) [6]uint16 {
	t = t.UTC()
	return [6]uint16{uint16(t.Year()), uint16(t.Month()), uint16(t.Day()), uint16(t.Hour()), uint16(t.Minute()), uint16(t.Second())}
}

func moment(t time.Time) []byte {
	b := typed("dtim")
	put(b, dateNumbers(t))
	return b.Bytes()
}

func triple(v [3]s15) []byte {
	b := typed("XYZ ")
	put(b, v)
	return b.Bytes()
}

func matrix(v [9]s15) []byte {
	b := typed("sf32")
	put(b, v)
	return b.Bytes()
}

// textTag is 7-bit text.
func textTag(s string) []byte {
	b := typed("text")
	b.WriteString(ascii(s))
	b.WriteByte(0)
	return b.Bytes()
}

// oldDescription is the description of version 2: 7-bit text, the same in UTF-16, and no Macintosh text.
func oldDescription(s string) []byte {
	b := typed("desc")
	plain := ascii(s)
	put(b, uint32(len(plain)+1))
	b.WriteString(plain)
	b.WriteByte(0)
	wide := append(utf16.Encode([]rune(s)), 0)
	put(b, uint32(0), uint32(len(wide)), wide)
	put(b, uint16(0), uint8(0), [67]byte{})
	return b.Bytes()
}

// localised is text of version 4, in English.
func localised(s string) []byte {
	b := typed("mluc")
	wide := utf16.Encode([]rune(s))
	put(b, uint32(1), uint32(12))
	b.WriteString("enUS")
	put(b, uint32(2*len(wide)), uint32(28), wide)
	return b.Bytes()
}

// ascii is s with a question mark for all that is not printable 7-bit text.
func ascii(s string) string {
	out := []byte{}
	for _, r := range s {
		if r < ' ' || r > '~' {
			r = '?'
		}
		out = append(out, byte(r))
	}
	return string(out)
}

// toneCurve is what the display emits over P-values, white being 1.
func toneCurve(c *Curve, r Result, white photometry.CdM2) []byte {
	b := typed("curv")
	drives := Path{}.drives(r.Table)
	put(b, uint32(len(drives)))
	for _, x := range drives {
		put(b, uint16(math.Round(65535*min(1, float64(c.emitted(x)/white)))))
	}
	return b.Bytes()
}
