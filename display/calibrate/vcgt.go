package calibrate

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"math"
	"math/bits"

	"evenstep/luts"
)

// VideoTable is what the video table tag of a profile loads into a graphics card: for red, green and blue,
// outputs of 0 to 65535 over inputs in equal steps.
type VideoTable struct {
	Channels [3][]uint16
	Formula  bool // the profile holds constants of a power law, worked out here at 256 inputs
}

// Gray reports whether all three channels are alike.
func (v VideoTable) Gray() bool {
	for i, e := range v.Channels[0] {
		if v.Channels[1][i] != e || v.Channels[2][i] != e {
			return false
		}
	}
	return true
}

// Table is the video table as a calibration table. It refuses channels that differ, and a number of entries
// that is no bit depth of 8 to 12.
func (v VideoTable) Table(outBits int) (luts.Table, error) {
	n := len(v.Channels[0])
	in := bits.Len(uint(n)) - 1
	switch {
	case outBits < minOutBits || outBits > maxOutBits:
		return luts.Table{}, fmt.Errorf("table: %d bits out; expected %d to %d", outBits, minOutBits, maxOutBits)
	case !v.Gray():
		return luts.Table{}, fmt.Errorf("profile: video table: red, green and blue differ; expected one table for gray; take a profile that was made for gray")
	case n != 1<<in || in < minInBits || in > maxInBits:
		return luts.Table{}, fmt.Errorf("profile: video table: %d entries; expected 256 to 4096, a power of two; make the profile anew", n)
	}
	t := luts.Table{Kind: luts.Calibration, InBits: in, OutBits: outBits, Entries: make([]uint16, n)}
	top := 1<<outBits - 1
	for i, e := range v.Channels[0] {
		t.Entries[i] = uint16((int(e)*top + 65535/2) / 65535)
	}
	return t, nil
}

// videoTable is the tag for a table: three channels alike, two bytes an entry.
func videoTable(r Result) []byte {
	b := typed("vcgt")
	put(b, uint32(0), uint16(3), uint16(len(r.Table.Entries)), uint16(2))
	top := 1<<r.Table.OutBits - 1
	for range 3 {
		for _, e := range r.Table.Entries {
			put(b, uint16((int(e)*65535+top/2)/top))
		}
	}
	return b.Bytes()
}

// Bounds of what is read: no system takes more.
const (
	maxTags    = 200
	maxProfile = 64 << 20
)

// ReadVideoTable reads the video table tag of a whole ICC profile. It refuses a profile whose header, tag
// table or tag does not hold together, and one without the tag.
func ReadVideoTable(profile []byte) (VideoTable, error) {
	data, err := findTag(profile, "vcgt")
	if err != nil {
		return VideoTable{}, err
	}
	fail := func(found, expected string) (VideoTable, error) {
		return VideoTable{}, fmt.Errorf("profile: video table: %s; expected %s; make the profile anew", found, expected)
	}
	if len(data) < 12 || !bytes.Equal(data[:8], []byte("vcgt\x00\x00\x00\x00")) {
		return fail(fmt.Sprintf("%d bytes that do not begin as one", len(data)), "its type, zeros and a kind")
	}
	switch kind := binary.BigEndian.Uint32(data[8:]); kind {
	case 0:
		return readEntries(data, fail)
	case 1:
		return readFormula(data, fail)
	default:
		return fail(fmt.Sprintf("kind %d", kind), "0 (entries) or 1 (formula)")
	}
}

func readEntries(data []byte, fail func(found, expected string) (VideoTable, error)) (VideoTable, error) {
	const head = 18
	if len(data) < head {
		return fail(fmt.Sprintf("%d bytes", len(data)), "18 or more")
	}
	channels, n, width := int(binary.BigEndian.Uint16(data[12:])), int(binary.BigEndian.Uint16(data[14:])), int(binary.BigEndian.Uint16(data[16:]))
	if channels == 3 && n == 256 && width == 1 && len(data) == 1576 {
		width = 2 // old profiles that say one byte and hold two
	}
	switch {
	case channels != 1 && channels != 3:
		return fail(fmt.Sprintf("%d channels", channels), "3, or 1 for all")
	case n < 2:
		return fail(fmt.Sprintf("%d entries a channel", n), "2 or more")
	case width != 1 && width != 2:
		return fail(fmt.Sprintf("%d bytes an entry", width), "1 or 2")
	}
	want := head + channels*n*width
	// Three bytes may fill up to a multiple of four; the old profiles have 22 more.
	if len(data) < want || len(data) > want+3 && len(data) != 1576 {
		return fail(fmt.Sprintf("%d bytes for %d channels of %d entries of %d bytes", len(data), channels, n, width), fmt.Sprint(want))
	}
	var v VideoTable
	for k := range v.Channels {
		from := head
		if channels == 3 {
			from += k * n * width
		}
		v.Channels[k] = make([]uint16, n)
		for i := range n {
			if width == 1 {
				v.Channels[k][i] = uint16(data[from+i]) * 257
			} else {
				v.Channels[k][i] = binary.BigEndian.Uint16(data[from+2*i:])
			}
		}
	}
	return v, nil
}

func readFormula(data []byte, fail func(found, expected string) (VideoTable, error)) (VideoTable, error) {
	const whole = 48
	if len(data) != whole {
		return fail(fmt.Sprintf("a formula of %d bytes", len(data)), fmt.Sprint(whole))
	}
	v := VideoTable{Formula: true}
	at := func(i int) float64 { return float64(int32(binary.BigEndian.Uint32(data[12+4*i:]))) / 65536 }
	for k := range v.Channels {
		gamma, low, high := at(3*k), at(3*k+1), at(3*k+2)
		if gamma <= 0 || low < 0 || high > 1 || low > high {
			return fail(fmt.Sprintf("gamma %.4g from %.4g to %.4g", gamma, low, high), "a gamma above 0, and 0 to 1 in rising order")
		}
		v.Channels[k] = make([]uint16, 256)
		for i := range v.Channels[k] {
			y := low + (high-low)*math.Pow(float64(i)/255, gamma)
			v.Channels[k][i] = uint16(math.Round(65535 * y))
		}
	}
	return v, nil
}

// findTag is the data of a tag in a profile whose header and tag table hold together.
func findTag(profile []byte, name string) ([]byte, error) {
	const header, entry = 128, 12
	fail := func(found, expected string) ([]byte, error) {
		return nil, fmt.Errorf("profile: %s; expected %s; give a whole ICC profile", found, expected)
	}
	switch {
	case len(profile) < header+4:
		return fail(fmt.Sprintf("%d bytes", len(profile)), "a header of 128 and a tag table")
	case len(profile) > maxProfile:
		return fail(fmt.Sprintf("%d bytes", len(profile)), fmt.Sprintf("at most %d", maxProfile))
	case string(profile[36:40]) != "acsp":
		return fail("no ICC profile", "acsp at byte 36")
	case int64(binary.BigEndian.Uint32(profile)) != int64(len(profile)):
		return fail(fmt.Sprintf("a size of %d in %d bytes", binary.BigEndian.Uint32(profile), len(profile)), "the same")
	}
	n := int64(binary.BigEndian.Uint32(profile[header:]))
	first := header + 4 + entry*n
	if n > maxTags || first > int64(len(profile)) {
		return fail(fmt.Sprintf("%d tags in %d bytes", n, len(profile)), fmt.Sprintf("at most %d, inside the profile", maxTags))
	}
	var found []byte
	seen := map[string]bool{}
	for i := range n {
		e := profile[header+4+entry*i:]
		tag := string(e[:4])
		offset, size := int64(binary.BigEndian.Uint32(e[4:])), int64(binary.BigEndian.Uint32(e[8:]))
		switch {
		case seen[tag]:
			return fail(fmt.Sprintf("the tag %q twice", tag), "each once")
		case offset%4 != 0 || offset < first || offset+size > int64(len(profile)):
			return fail(fmt.Sprintf("the tag %q of %d bytes at %d", tag, size, offset), fmt.Sprintf("it between %d and %d, at a multiple of 4", first, len(profile)))
		}
		seen[tag] = true
		if tag == name {
			found = profile[offset : offset+size]
		}
	}
	if found == nil {
		return fail("no tag "+name, "one")
	}
	return found, nil
}
