package dicom

import (
	"errors"
	"fmt"
	"strings"
	"unicode"
)

// The two ways in which a file can be at fault. An error of reading the file itself is neither.
var (
	// ErrDamaged: the file breaks the standard in a way that cannot be read around.
	ErrDamaged = errors.New("damaged DICOM file")
	// ErrUnsupported: the file may be sound, but holds what this package does not read.
	ErrUnsupported = errors.New("unsupported DICOM file")
)

// fault is an error whose text stands alone; its kind is found with errors.Is.
type fault struct {
	text string
	kind error
}

func (f *fault) Error() string { return f.text }

func (f *fault) Unwrap() error { return f.kind }

// place names a position in a file for errors. It never carries a value.
type place struct {
	file string
	unit string // "byte", or "inflated byte" within a deflated data set
}

func newPlace(file string) place {
	clean := strings.Map(func(r rune) rune {
		if unicode.IsControl(r) {
			return '?'
		}
		return r
	}, file)
	return place{clean, "byte"}
}

func (p place) at(off int64, t tag) string {
	if t == 0 {
		return fmt.Sprintf("%s: %s %d", p.file, p.unit, off)
	}
	return fmt.Sprintf("%s: %s %d, %v", p.file, p.unit, off, t)
}

// damaged makes an error; the text says what was found; what was expected.
func (p place) damaged(off int64, t tag, format string, args ...any) error {
	return &fault{p.at(off, t) + ": " + fmt.Sprintf(format, args...) + "; fetch or export the file anew", ErrDamaged}
}

// unsupported makes an error; the text says what was found; what was expected; what to do.
func (p place) unsupported(off int64, t tag, format string, args ...any) error {
	return &fault{p.at(off, t) + ": " + fmt.Sprintf(format, args...), ErrUnsupported}
}

func (p place) unreadable(off, n int64, err error) error {
	return fmt.Errorf("%s: %w; expected to read %d bytes; check the disk or the connection", p.at(off, 0), err, n)
}
