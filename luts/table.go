// Package luts turns stored image values into output levels: the stages of a grayscale image as
// DICOM PS3.3 C.11 has them (modality, VOI, presentation), then a calibration table, composed into one
// table and applied fast. It also reads and writes tables as files. It knows no monitor and no meter, and
// opens no file.
//
// # Numbers
//
// A [Chain] is evaluated in double precision, each formula in the order of operations in which the standard
// prints it. Nothing is rounded between the stages except where a value looks up an entry of a table, and the
// end result. Rounding is always to the nearest integer, halves away from zero; the standard prescribes none.
// So INVERSE is taken before rounding: a VOI output of 127.5 becomes level 128 with both shapes at 8 bits.
//
// Where one stage feeds another, its full output range is spread linearly over the full input range of the
// next, or over that of the output (PS3.3 C.11.6.1); only a modality stage hands on its values as they are.
package luts

import "fmt"

// Kind says what a table is for.
type Kind string

// The kinds of table.
const (
	Calibration Kind = "calibration" // P-value to DDL
	Window      Kind = "window"      // stored value to output
)

// Table is a lookup table. Entry i belongs to the input First + i; inputs outside take the nearest end.
type Table struct {
	Kind    Kind
	InBits  int // depth of the input, 1 to 16
	OutBits int // depth of the entries, 1 to 16
	First   int // input of entry 0: 0, or the least value of signed data
	Entries []uint16
}

// Check says what keeps t from being a table: an unknown kind, a depth outside 1 to 16, a first input that is
// neither 0 nor the least value of signed data, entries that do not cover every input, an entry above the
// output depth. Calibration tables take no signed data.
func (t Table) Check() error {
	if f := t.flaw(); f != nil {
		return fmt.Errorf("table: %w", f)
	}
	return nil
}

func (t Table) flaw() *flaw {
	switch {
	case t.Kind != Calibration && t.Kind != Window:
		return newFlaw("say what the table is for", "kind %s", quote(string(t.Kind))).wants("%q or %q", Calibration, Window)
	case t.InBits < 1 || t.InBits > 16:
		return newFlaw("name the depth of the values that are looked up", "an input of %d bits", t.InBits).wants("1 to 16")
	case t.OutBits < 1 || t.OutBits > 16:
		return newFlaw("name the depth of the entries", "an output of %d bits", t.OutBits).wants("1 to 16")
	case t.First != 0 && t.Kind == Calibration:
		return newFlaw("make the table anew", "%d as the first input", t.First).wants("0, as P-values have no sign")
	case t.First != 0 && t.First != -1<<(t.InBits-1):
		return newFlaw("make the table anew", "%d as the first input", t.First).wants("0, or %d for signed data of %d bits", -1<<(t.InBits-1), t.InBits)
	case len(t.Entries) != 1<<t.InBits:
		return newFlaw("make the table anew", "%d entries", len(t.Entries)).wants("%d, one for every input of %d bits", 1<<t.InBits, t.InBits)
	}
	for i, e := range t.Entries {
		if int(e) > top(t.OutBits) {
			return newFlaw("correct the entry or the output depth", "%d for the input %d", e, t.First+i).wants("at most %d in %d bits", top(t.OutBits), t.OutBits)
		}
	}
	return nil
}

// At is the entry of the input x, of the nearest end where x is outside. A table without entries gives 0.
func (t Table) At(x int) uint16 {
	if len(t.Entries) == 0 {
		return 0
	}
	return t.Entries[min(max(x, t.First), t.First+len(t.Entries)-1)-t.First]
}

// top is the greatest unsigned value of a depth.
func top(bits int) int { return 1<<bits - 1 }

// Run is a stretch of neighbouring inputs that share one entry.
type Run struct {
	From, To int // inputs, both within
	Level    uint16
}

// Merged lists the stretches of at least two neighbouring inputs that cannot be told apart after the table, in
// the order of the inputs. Inputs below and above a window are such stretches as well.
func (t Table) Merged() []Run {
	var runs []Run
	for from := 0; from < len(t.Entries); {
		to := from
		for to+1 < len(t.Entries) && t.Entries[to+1] == t.Entries[from] {
			to++
		}
		if to > from {
			runs = append(runs, Run{t.First + from, t.First + to, t.Entries[from]})
		}
		from = to + 1
	}
	return runs
}

// Levels is the number of different entries.
func (t Table) Levels() int {
	seen := make([]bool, 1<<16)
	n := 0
	for _, e := range t.Entries {
		if !seen[e] {
			seen[e] = true
			n++
		}
	}
	return n
}

// Falls lists the inputs whose entry is below that of the input before. A table that never falls has none.
func (t Table) Falls() []int {
	return t.turns(func(before, entry uint16) bool { return entry < before })
}

// Rises lists the inputs whose entry is above that of the input before. A table that never rises, such as that
// of an inverted window, has none.
func (t Table) Rises() []int {
	return t.turns(func(before, entry uint16) bool { return entry > before })
}

func (t Table) turns(wanted func(before, entry uint16) bool) []int {
	var inputs []int
	for i := 1; i < len(t.Entries); i++ {
		if wanted(t.Entries[i-1], t.Entries[i]) {
			inputs = append(inputs, t.First+i)
		}
	}
	return inputs
}
