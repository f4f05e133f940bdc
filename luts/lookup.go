package luts

import (
	"fmt"
	"math"
)

// Lookup is a table as an image or a presentation state carries it, for any of the stages: a Modality LUT
// (PS3.3 C.11.1.1), a VOI LUT (C.11.2.1.1) or a Presentation LUT (C.11.6.1.1).
//
// Entry i belongs to the input First + i; inputs outside take the nearest end, inputs between two integers
// the nearer one. As a Presentation LUT its First must be 0, and the VOI stage is spread over its entries.
type Lookup struct {
	First   int // first input mapped, -32768 to 65535
	Bits    int // bits per entry, 8 to 16
	Entries []uint16
}

// NewLookup makes a Lookup from the three values of a LUT Descriptor and the LUT Data. Of entries, 0 means
// 65536, and a negative count is one that was read as signed though it never is.
func NewLookup(entries, first, bits int, data []uint16) (Lookup, error) {
	n := entries
	switch {
	case n == 0:
		n = 1 << 16
	case n < 0 && n >= math.MinInt16:
		n += 1 << 16
	}
	if n < 1 || n > 1<<16 {
		return Lookup{}, fmt.Errorf("LUT Descriptor: %d entries; expected 0 to 65535, where 0 means 65536; correct the descriptor", entries)
	}
	if n != len(data) {
		return Lookup{}, fmt.Errorf("LUT Data: %d entries; expected %d as the LUT Descriptor says; correct the descriptor or the data", len(data), n)
	}
	l := Lookup{First: first, Bits: bits, Entries: data}
	if err := l.check(); err != nil {
		return Lookup{}, fmt.Errorf("LUT Descriptor: %w", err)
	}
	return l, nil
}

func (l Lookup) check() error {
	switch n := len(l.Entries); {
	case n < 1 || n > 1<<16:
		return fmt.Errorf("table of %d entries; expected 1 to 65536; give the table of the image", n)
	case l.First < math.MinInt16 || l.First > math.MaxUint16:
		return fmt.Errorf("first input mapped %d; expected -32768 to 65535; correct the descriptor", l.First)
	case l.Bits < 8 || l.Bits > 16:
		return fmt.Errorf("%d bits per entry; expected 8 to 16; correct the descriptor", l.Bits)
	}
	for i, e := range l.Entries {
		if int(e) > top(l.Bits) {
			return fmt.Errorf("entry %d of the table is %d; expected at most %d for %d bits; correct the descriptor or the data",
				i, e, top(l.Bits), l.Bits)
		}
	}
	return nil
}

// at is the entry of the input x.
func (l Lookup) at(x float64) float64 {
	i := math.Round(x) - float64(l.First)
	return float64(l.Entries[int(min(max(i, 0), float64(len(l.Entries)-1)))])
}

func (l Lookup) modality(span) (func(float64) float64, span, error) {
	if err := l.check(); err != nil {
		return nil, span{}, fmt.Errorf("modality: %w", err)
	}
	return l.at, span{0, float64(top(l.Bits))}, nil
}

func (l Lookup) voi(_ span, ymax float64) (func(float64) float64, error) {
	if err := l.check(); err != nil {
		return nil, fmt.Errorf("VOI: %w", err)
	}
	return spread(l.at, span{0, float64(top(l.Bits))}, ymax), nil
}

func (l Lookup) presentation(pmax float64) (func(float64) float64, float64, error) {
	if err := l.check(); err != nil {
		return nil, 0, fmt.Errorf("presentation: %w", err)
	}
	if l.First != 0 {
		return nil, 0, fmt.Errorf("presentation: first input mapped %d; expected 0; correct the descriptor", l.First)
	}
	return spread(l.at, span{0, float64(top(l.Bits))}, pmax), float64(len(l.Entries) - 1), nil
}

// spread carries the results of f from their range to 0 to ymax. The product comes first: for integers it is
// exact, so that the one division is correctly rounded.
func spread(f func(float64) float64, of span, ymax float64) func(float64) float64 {
	return func(x float64) float64 { return (f(x) - of.low) * ymax / (of.high - of.low) }
}
