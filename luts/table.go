// Package luts turns stored image values into output levels: the stages of a grayscale image as
// DICOM PS3.3 C.11 has them (modality, VOI, presentation), then a calibration table, composed into one
// table and applied fast. It knows no monitor and no meter.
package luts

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
