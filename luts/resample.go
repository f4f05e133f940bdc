package luts

import "fmt"

// Resample is the table for an input of another depth, so that a calibration of 8 bits serves P-values of 10.
// The ends of the new input belong to the ends of the old one, and inputs are spread evenly between: input k of
// n bits lies at k * (2^InBits - 1) / (2^n - 1) of the old input. Where that is an integer, the entry is taken
// as it is; else the entries on both sides are interpolated linearly and rounded, halves away from zero. The
// arithmetic is exact: a table that never falls still does not. Tables of signed data are refused.
func (t Table) Resample(inBits int) (Table, error) {
	if err := t.Check(); err != nil {
		return Table{}, err
	}
	if t.First != 0 {
		return Table{}, fmt.Errorf("table: first input %d; expected 0, as stored values do not stretch; compose the window anew for the other depth", t.First)
	}
	if inBits < 1 || inBits > 16 {
		return Table{}, fmt.Errorf("table: resampling to %d bits; expected 1 to 16; choose the depth of the new input", inBits)
	}
	out := t
	out.InBits = inBits
	out.Entries = make([]uint16, 1<<inBits)
	old, steps := top(t.InBits), top(inBits)
	for k := range out.Entries {
		i, rest := k*old/steps, k*old%steps
		if rest == 0 {
			out.Entries[k] = t.Entries[i]
			continue
		}
		sum := int(t.Entries[i])*(steps-rest) + int(t.Entries[i+1])*rest
		out.Entries[k] = uint16((2*sum + steps) / (2 * steps))
	}
	return out, nil
}

// Through is the one table that t and then next come to: the entries of t are looked up in next, which must take
// inputs of just their depth. The kind, the input and its first value are those of t. To be exact a window and a
// calibration are better composed by [Chain], which rounds once less.
func (t Table) Through(next Table) (Table, error) {
	if err := t.Check(); err != nil {
		return Table{}, fmt.Errorf("first: %w", err)
	}
	if err := next.Check(); err != nil {
		return Table{}, fmt.Errorf("second: %w", err)
	}
	if next.Kind != Calibration {
		return Table{}, fmt.Errorf("second table: kind %q; expected %q, as nothing but that takes levels; change the order of the tables", next.Kind, Calibration)
	}
	if next.InBits != t.OutBits {
		return Table{}, fmt.Errorf("second table: input of %d bits after an output of %d; expected the same depth; resample the second table to %d bits",
			next.InBits, t.OutBits, t.OutBits)
	}
	out := t
	out.OutBits = next.OutBits
	out.Entries = make([]uint16, len(t.Entries))
	for i, e := range t.Entries {
		out.Entries[i] = next.Entries[e]
	}
	return out, nil
}
