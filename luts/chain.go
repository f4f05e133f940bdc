package luts

import (
	"fmt"
	"math"
)

// Chain is the way from stored values to output levels. The zero value of a stage is an identity, so that a
// Chain without stages spreads the stored range over the output.
type Chain struct {
	Stored       Stored
	Modality     Modality
	VOI          VOI
	Presentation Presentation
	Calibration  *Table // P-value to DDL; nil where the output is P-values
	OutBits      int    // depth of the output, 8 to 16; 0 with a calibration means that of its entries
}

// Mapping is a Chain that is ready for use. It may be used by several goroutines; the tables that the Chain was
// given must not be changed meanwhile.
type Mapping struct {
	stored      Stored
	outBits     int
	pmax        float64
	modality    func(float64) float64
	voi         func(float64) float64
	present     func(float64) float64
	calibration *Table
}

// Values are what becomes of one stored value, unrounded up to the P-value.
type Values struct {
	Modality float64 // in the unit of the modality stage
	PValue   float64 // 0 to Mapping.MaxPValue
	Output   uint16  // output level: DDL with a calibration, else the rounded P-value
}

// Compose makes the mapping of the chain. The error names the stage that cannot be used.
func (c Chain) Compose() (*Mapping, error) {
	if err := c.Stored.check(); err != nil {
		return nil, err
	}
	m := &Mapping{stored: c.Stored, outBits: c.OutBits}
	pbits := c.OutBits
	if t := c.Calibration; t != nil {
		if err := t.Check(); err != nil {
			return nil, fmt.Errorf("calibration: %w", err)
		}
		if t.Kind != Calibration {
			return nil, fmt.Errorf("calibration: a table of kind %q; expected %q; give the table that was made for the monitor", t.Kind, Calibration)
		}
		if c.OutBits == 0 {
			m.outBits = t.OutBits
		}
		if m.outBits != t.OutBits {
			return nil, fmt.Errorf("calibration: entries of %d bits for an output of %d; expected the same depth; leave the output depth to the table",
				t.OutBits, m.outBits)
		}
		held := *t
		m.calibration, pbits = &held, t.InBits
	} else if c.OutBits < 8 || c.OutBits > 16 {
		return nil, fmt.Errorf("output: %d bits; expected 8 to 16; choose the depth of the output", c.OutBits)
	}
	m.pmax = float64(top(pbits))

	out := span{float64(c.Stored.Min()), float64(c.Stored.Max())}
	m.modality = func(x float64) float64 { return x }
	var err error
	if c.Modality != nil {
		if m.modality, out, err = c.Modality.modality(out); err != nil {
			return nil, err
		}
	}
	if c.Presentation == nil {
		c.Presentation = Identity
	}
	var ymax float64
	if m.present, ymax, err = c.Presentation.presentation(m.pmax); err != nil {
		return nil, err
	}
	if c.VOI == nil {
		m.voi = spread(func(x float64) float64 { return x }, out, ymax)
	} else if m.voi, err = c.VOI.voi(out, ymax); err != nil {
		return nil, err
	}
	return m, nil
}

// MaxPValue is the P-value of the highest luminance; that of the lowest is 0.
func (m *Mapping) MaxPValue() float64 { return m.pmax }

// At follows one stored value through the stages; it must be a finite number. Fractions are followed as well,
// for curves between two stored values. What leaves the output range takes its nearest end.
func (m *Mapping) At(stored float64) Values {
	v := Values{Modality: m.modality(stored)}
	v.PValue = min(max(m.present(m.voi(v.Modality)), 0), m.pmax)
	level := uint16(math.Round(v.PValue))
	if m.calibration != nil {
		level = m.calibration.Entries[level]
	}
	v.Output = level
	return v
}

// Table is the one table that the stages come to, over the whole stored range.
func (m *Mapping) Table() Table {
	t := Table{Kind: Window, InBits: m.stored.Bits, OutBits: m.outBits, First: m.stored.Min(), Entries: make([]uint16, 1<<m.stored.Bits)}
	for i := range t.Entries {
		t.Entries[i] = m.At(float64(t.First + i)).Output
	}
	return t
}
