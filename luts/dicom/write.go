package dicom

import (
	"encoding/binary"
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"
)

// ErrWrite: what shall be written does not fit the standard.
var ErrWrite = errors.New("cannot be written as DICOM")

// values builds a data set in explicit little endian; elements come in ascending order of their tags. The
// first mistake stays in err.
type values struct {
	b    []byte
	last tag
	err  error
}

func (v *values) fail(t tag, format string, args ...any) {
	if v.err == nil {
		v.err = fmt.Errorf("%v: %s: %w", t, fmt.Sprintf(format, args...), ErrWrite)
	}
}

// head writes the header of an element (PS3.5 7.1.2).
func (v *values) head(t tag, vr string, length int) {
	switch {
	case t <= v.last:
		v.fail(t, "an element behind %v; expected ascending tags; this is a mistake of the program", v.last)
	case !longForm(vr) && length > 65534:
		v.fail(t, "a value %s of %d bytes; expected at most 65534; give a shorter one", vr, length)
	case length%2 != 0 || int64(length) >= math.MaxUint32:
		v.fail(t, "a value of %d bytes; expected an even number below 2^32; give a smaller image", length)
	}
	v.last = t
	v.b = binary.LittleEndian.AppendUint16(v.b, t.group())
	v.b = binary.LittleEndian.AppendUint16(v.b, uint16(t))
	v.b = append(v.b, vr...)
	if longForm(vr) {
		v.b = append(v.b, 0, 0)
		v.b = binary.LittleEndian.AppendUint32(v.b, uint32(length))
		return
	}
	v.b = binary.LittleEndian.AppendUint16(v.b, uint16(length))
}

// longest are the most characters of a single value (PS3.5 table 6.2-1).
var longest = map[string]int{"CS": 16, "DA": 8, "DS": 16, "IS": 12, "LO": 64, "LT": 10240, "PN": 64, "SH": 16, "TM": 14, "UI": 64}

// text writes one text value, empty for "".
func (v *values) text(t tag, vr, s string) {
	ok := utf8.ValidString(s) && utf8.RuneCountInString(s) <= longest[vr]
	for _, r := range s {
		ok = ok && r >= ' ' && r != 0x7F && (r != '\\' || vr == "LT")
		switch vr {
		case "CS":
			ok = ok && ('A' <= r && r <= 'Z' || '0' <= r && r <= '9' || r == ' ' || r == '_')
		case "UI":
			ok = ok && isUID(s)
		}
	}
	if !ok {
		v.fail(t, "text of %d characters that does not fit a %s; expected at most %d, without control characters; give another", utf8.RuneCountInString(s), vr, longest[vr])
	}
	v.joined(t, vr, s)
}

// joined writes text whose values are checked and joined.
func (v *values) joined(t tag, vr, s string) {
	if len(s)%2 != 0 {
		pad := " "
		if vr == "UI" {
			pad = "\x00"
		}
		s += pad
	}
	v.head(t, vr, len(s))
	v.b = append(v.b, s...)
}

// decimals writes DS values.
func (v *values) decimals(t tag, fs ...float64) {
	parts := make([]string, len(fs))
	for i, f := range fs {
		if math.IsNaN(f) || math.IsInf(f, 0) {
			v.fail(t, "%v; expected a finite number; give one", f)
		}
		parts[i] = formatDecimal(f)
	}
	v.joined(t, "DS", strings.Join(parts, `\`))
}

// formatDecimal gives the DS nearest to f: as many digits as 16 characters hold (PS3.5 6.2).
func formatDecimal(f float64) string {
	s := strconv.FormatFloat(f, 'G', -1, 64)
	for digits := 16; len(s) > 16 && digits > 0; digits-- {
		s = strconv.FormatFloat(f, 'G', digits, 64)
	}
	return s
}

func (v *values) uint16s(t tag, vr string, ns ...uint16) {
	v.head(t, vr, 2*len(ns))
	for _, n := range ns {
		v.b = binary.LittleEndian.AppendUint16(v.b, n)
	}
}

func (v *values) int32s(t tag, ns ...int32) {
	v.head(t, "SL", 4*len(ns))
	for _, n := range ns {
		v.b = binary.LittleEndian.AppendUint32(v.b, uint32(n))
	}
}

// sequence writes a sequence of one item.
func (v *values) sequence(t tag, fill func(*values)) {
	var inner values
	fill(&inner)
	if v.err == nil {
		v.err = inner.err
	}
	v.head(t, "SQ", 8+len(inner.b))
	v.b = binary.LittleEndian.AppendUint16(v.b, tagItem.group())
	v.b = binary.LittleEndian.AppendUint16(v.b, uint16(tagItem&0xFFFF))
	v.b = binary.LittleEndian.AppendUint32(v.b, uint32(len(inner.b)))
	v.b = append(v.b, inner.b...)
}

// lut writes descriptor, explanation, the type of a modality LUT, and data. The data are OW: as US a table
// of 32768 entries or more would not fit.
func (v *values) lut(l LUT, modalityType string) {
	if n := len(l.Entries); l.Bits == 8 && n%2 != 0 {
		// Packed entries fill words. Inputs behind the last take it anyway, so it may stand twice.
		l.Entries = append(slices.Clip(l.Entries), l.Entries[n-1])
	}
	n := len(l.Entries)
	switch {
	case n < 1 || n > 1<<16:
		v.fail(tagLUTData, "%d entries; expected 1 to 65536; give another table", n)
	case l.Bits < 8 || l.Bits > 16:
		v.fail(tagLUTDescriptor, "entries of %d bits; expected 8 to 16; give another table", l.Bits)
	case l.First < -1<<15 || l.First >= 1<<16:
		v.fail(tagLUTDescriptor, "first input %d; expected -32768 to 65535; give another table", l.First)
	}
	vr := "US"
	if l.First < 0 {
		vr = "SS"
	}
	v.uint16s(tagLUTDescriptor, vr, uint16(n), uint16(l.First), uint16(l.Bits))
	if l.Explanation != "" {
		v.text(tagLUTText, "LO", l.Explanation)
	}
	for i, x := range l.Entries {
		if l.Bits < 16 && x>>l.Bits != 0 {
			v.fail(tagLUTData, "entry %d is %d; expected at most %d; give another table", i, x, 1<<l.Bits-1)
			break
		}
	}
	if modalityType != "" {
		v.text(tagModalityLUTType, "LO", modalityType)
	}
	if l.Bits != 8 {
		v.uint16s(tagLUTData, "OW", l.Entries...)
		return
	}
	v.head(tagLUTData, "OW", n) // the first of a pair is in the low byte
	for _, x := range l.Entries {
		v.b = append(v.b, byte(x))
	}
}

// meta gives preamble and file meta information (PS3.10 7.1).
func meta(class, instance string) ([]byte, error) {
	var v values
	v.head(tagMetaVersion, "OB", 2)
	v.b = append(v.b, 0, 1)
	v.text(tagMediaSOPClass, "UI", class)
	v.text(tagMediaSOPInstance, "UI", instance)
	v.text(tagTransferSyntax, "UI", explicitLittleUID)
	v.text(tagImplementationClass, "UI", implementationClass)
	v.text(tagImplementationVersion, "SH", implementationVersion)
	var length values
	length.head(tagMetaLength, "UL", 4)
	length.b = binary.LittleEndian.AppendUint32(length.b, uint32(len(v.b)))
	b := append(make([]byte, 128, 132+len(length.b)+len(v.b)), "DICM"...)
	return append(append(b, length.b...), v.b...), v.err
}
