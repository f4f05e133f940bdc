package calibrate

import (
	"bytes"
	"fmt"
	"path/filepath"
	"strings"

	"evenstep/luts"
)

// Encode is a table in the form that the ending of a file's name asks for: .json or .csv (package luts), or
// an ICC display profile with the video table tag, .icc (version 4) or .icm (version 2).
func Encode(file string, c *Curve, r Result, p Provenance) ([]byte, error) {
	kept, err := p.Map(c, r)
	if err != nil {
		return nil, err
	}
	var b bytes.Buffer
	switch kind := strings.ToLower(filepath.Ext(file)); kind {
	case ".json":
		err = luts.WriteJSON(&b, r.Table, kept)
	case ".csv":
		err = luts.WriteCSV(&b, r.Table, kept)
	case ".icc", ".icm":
		edition := ICCv4
		if kind == ".icm" {
			edition = ICCv2
		}
		return Profile(c, r, p, edition)
	default:
		return nil, fmt.Errorf("%s: ends in %q; expected .json, .csv, .icc (version 4) or .icm (version 2); choose one", file, kind)
	}
	if err != nil {
		return nil, fmt.Errorf("%s: %w", file, err)
	}
	return b.Bytes(), nil
}
