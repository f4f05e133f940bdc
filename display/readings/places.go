package readings

import (
	"fmt"
	"io"
	"strings"

	"evenstep/display/photometry"
)

// Position is a place on the screen where uniformity is measured.
type Position string

// The positions, left to right and top to bottom. Five-point methods use the centre and the corners.
const (
	TopLeft     Position = "top left"
	Top         Position = "top"
	TopRight    Position = "top right"
	Left        Position = "left"
	Centre      Position = "centre"
	Right       Position = "right"
	BottomLeft  Position = "bottom left"
	Bottom      Position = "bottom"
	BottomRight Position = "bottom right"
)

var (
	positions = []string{
		string(TopLeft), string(Top), string(TopRight), string(Left), string(Centre), string(Right),
		string(BottomLeft), string(Bottom), string(BottomRight),
	}
	fivePoints = []Position{Centre, TopLeft, TopRight, BottomLeft, BottomRight}
)

// LevelUnstated is the level of a field of which the file does not say the level.
const LevelUnstated = -1

// Place is one luminance, and where measured one colour, at one position of a uniform field.
type Place struct {
	Position  Position
	Level     int // of the field, 0 to 65535 (the file says no bit depth), or LevelUnstated
	Luminance photometry.CdM2
	Colour    *photometry.UV // nil where not measured
	Line      int
}

// PlacesFile is one parsed file of places.
type PlacesFile struct {
	Name   string
	SHA256 string // of the bytes as read, lower-case hexadecimal
	Unit   string // "cd/m2" or "fL"
	Places []Place
}

const (
	placeColumn = "place"
	uColumn     = "u_prime"
	vColumn     = "v_prime"
)

var placeHeadings = []heading{
	{"place", placeColumn},
	{"level", levelColumn},
	{"ddl", levelColumn},
	{"luminance_cd_m2", luminanceColumn},
	{"luminance", luminanceColumn},
	{"luminance_fl", luminanceColumn},
	{uColumn, uColumn},
	{vColumn, vColumn},
}

// maxUV is beyond the spectrum locus in the CIE 1976 diagram, which ends at 0.63 in u' and 0.60 in v'.
const maxUV = 0.7

// ParsePlaces reads a file of places, which is written like a file of readings (see Parse) but has
// no metadata. Its columns are place, one of the positions, with hyphen, underscore or space between
// its words; one of luminance_cd_m2, luminance or luminance_fl; and, where wanted, level or ddl, and
// u_prime with v_prime, 0 to 0.7, in rows whose colour was measured. Each level, and the rows without
// one, must hold the centre and the four corners, and each place once.
//
// Every error is a *FormatError; errors.Is finds the error of r in it.
func ParsePlaces(name string, r io.Reader) (*PlacesFile, error) {
	s, err := readSheet(name, r, placeHeadings, placeColumn, luminanceColumn)
	if err != nil {
		return nil, err
	}
	n := &numbers{sheet: s}
	f := &PlacesFile{Name: name, SHA256: s.sha256, Unit: s.unit()}
	for _, r := range s.rows {
		p, err := n.place(r)
		if err != nil {
			return nil, err
		}
		f.Places = append(f.Places, p)
	}
	if err := s.checkPlaces(f.Places); err != nil {
		return nil, err
	}
	return f, nil
}

func (n *numbers) place(r row) (Place, error) {
	p := Place{Level: LevelUnstated, Line: r.line}
	var err error
	if p.Position, err = n.position(r); err != nil {
		return p, err
	}
	if cell := n.cell(r, levelColumn); cell != "" {
		if p.Level, err = n.level(r.line, n.heading[levelColumn], cell, 1<<maxBits-1); err != nil {
			return p, err
		}
	}
	if p.Luminance, err = n.luminance(r); err != nil {
		return p, err
	}
	u, v := n.cell(r, uColumn), n.cell(r, vColumn)
	switch {
	case u == "" && v == "":
		return p, nil
	case u == "" || v == "":
		return p, n.fail(r.line, fmt.Sprintf("u_prime %s and v_prime %s", quote(u), quote(v)), "both or neither", "complete the colour or leave both cells empty")
	}
	var c photometry.UV
	if c.U, err = n.within(r.line, uColumn, u, 0, maxUV, ""); err != nil {
		return p, err
	}
	if c.V, err = n.within(r.line, vColumn, v, 0, maxUV, ""); err != nil {
		return p, err
	}
	p.Colour = &c
	return p, nil
}

func (n *numbers) position(r row) (Position, error) {
	cell := n.cell(r, placeColumn)
	words := strings.FieldsFunc(strings.ToLower(cell), func(r rune) bool { return r == ' ' || r == '-' || r == '_' })
	name := strings.Join(words, " ")
	if name == "center" {
		name = string(Centre)
	}
	for _, p := range positions {
		if name == p {
			return Position(p), nil
		}
	}
	do := "correct the place"
	if near := nearest(cell, positions); near != "" {
		do = "did you mean " + quote(near) + "? Correct the place"
	}
	return "", n.fail(r.line, "place "+quote(cell), strings.Join(positions, ", "), do)
}

// checkPlaces refuses fields of which no uniformity can be worked out.
func (s *sheet) checkPlaces(places []Place) error {
	type spot struct {
		level    int
		position Position
	}
	line := map[spot]int{}
	var levels []int
	last := map[int]int{} // level to the line of its last place
	for _, p := range places {
		k := spot{p.Level, p.Position}
		if before, twice := line[k]; twice {
			return s.fail(p.Line, fmt.Sprintf("%q a second time after line %d", p.Position, before), "each place once for a level", "delete one of the rows or state their levels")
		}
		line[k] = p.Line
		if _, known := last[p.Level]; !known {
			levels = append(levels, p.Level)
		}
		last[p.Level] = p.Line
	}
	for _, level := range levels {
		for _, want := range fivePoints {
			if _, ok := line[spot{level, want}]; ok {
				continue
			}
			found := fmt.Sprintf("no %q", want)
			if level != LevelUnstated {
				found += fmt.Sprintf(" at level %d", level)
			}
			return s.fail(last[level], found, "the centre and the four corners of each field", "measure it")
		}
	}
	return nil
}
