// Package sheet puts test patterns into files: PNG, TIFF and DICOM. It draws nothing itself and writes
// no file: callers get the bytes.
package sheet

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"strings"
	"time"

	"evenstep/luts/dicom"
	"evenstep/patterns"
)

// ErrEnding is returned for a file name that does not say what kind of file it is.
var ErrEnding = errors.New("ending is not known")

// Encode draws a pattern for a file of the given name: .png (8 or 16 bit), .tif (16 bit) or .dcm
// (Secondary Capture, plainly a test object). program is the name and version that a DICOM file carries,
// made the time of its content, uids the randomness of its identifiers.
func Encode(file, name string, s patterns.Spec, program string, made time.Time, uids io.Reader) ([]byte, error) {
	kind := strings.ToLower(filepath.Ext(file))
	switch kind {
	case ".png", ".tif", ".tiff", ".dcm":
	default:
		return nil, fmt.Errorf("%s: %q %w; expected .png, .tif or .dcm; choose one", file, kind, ErrEnding)
	}
	info, ok := Find(name)
	if !ok {
		return nil, fmt.Errorf("pattern %q is not known; expected one of %s; run \"evenstep pattern list\"", name, names())
	}
	var b bytes.Buffer
	if info.Colour {
		if kind != ".png" {
			return nil, fmt.Errorf("pattern %s is in colour, %s %w for that; expected .png; choose it", name, kind, ErrEnding)
		}
		rgb, err := patterns.DrawRGB(name, s)
		if err != nil {
			return nil, err
		}
		err = rgb.WritePNG(&b)
		return b.Bytes(), err
	}
	plane, err := patterns.Draw(name, s)
	if err != nil {
		return nil, err
	}
	switch kind {
	case ".png":
		err = plane.WritePNG(&b)
	case ".dcm":
		cells := make([]uint16, 0, s.Width*s.Height)
		for y := range s.Height {
			cells = append(cells, plane.Row(y)...)
		}
		c := dicom.Capture{Columns: s.Width, Rows: s.Height, BitsStored: s.Bits, Cells: cells, Title: name, Software: program}
		err = dicom.WriteCapture(&b, c, uids, made)
	default:
		err = plane.WriteTIFF(&b)
	}
	return b.Bytes(), err
}

// Find returns what there is to say about a pattern.
func Find(name string) (patterns.Info, bool) {
	for _, i := range patterns.List() {
		if i.Name == name {
			return i, true
		}
	}
	return patterns.Info{}, false
}

func names() string {
	var all []string
	for _, i := range patterns.List() {
		all = append(all, i.Name)
	}
	return strings.Join(all, ", ")
}
