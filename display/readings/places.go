package readings

import "evenstep/display/photometry"

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

// Place is one luminance, and where measured one colour, at one position of a uniform field.
type Place struct {
	Position  Position
	Level     int // of the field
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
