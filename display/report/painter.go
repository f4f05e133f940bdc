// Package report turns a sealed record into what people read: charts, a PDF of one to two pages,
// CSV, and the words and signs for quantities, limits and verdicts that other outputs share. It
// computes no figure and gives no verdict.
//
// # Charts
//
// The chart model is our own. A chart here stands in three places: in the PDF as vectors with
// embedded text (cd/m², ≥, Δu'v'), in a window where it must stay sharp and neutral in colour, and
// in a picture. The plotting packages that could be taken mangle text outside one code page in their
// PDF output, open a document of their own instead of drawing on a page, and bring fonts under
// licences that the program does not take. Four kinds of chart need axes, lines, bands, bars and
// markers, which is little. So a Chart is plain data that tests compare as text, and a Painter with
// four methods is all that a new surface has to bring.
//
// State is shown by shape and word, never by colour: everything is drawn in neutral grays, because
// the pages are also looked at on gray-scale monitors and printed on laser printers.
package report

import "math"

// XY is a place on a surface, in points (1/72 inch) from its top left, y down.
type XY struct{ X, Y float64 }

// Box is a rectangle on a surface, in points; X and Y are its top left.
type Box struct{ X, Y, W, H float64 }

// Gray is an achromatic ink, 0 black to 1 white.
type Gray float64

// The inks of charts and pages.
const (
	black  Gray = 0
	dark   Gray = 0.35
	middle Gray = 0.55
	light  Gray = 0.82
	pale   Gray = 0.93
	white  Gray = 1
)

// Face is a typeface.
type Face int

// The typefaces.
const (
	Regular Face = iota
	Bold
	Mono
)

// Align says which part of a text stands at its place.
type Align int

// The alignments.
const (
	Left Align = iota
	Centre
	Right
)

// Type is how a text is set: Size in points.
type Type struct {
	Face  Face
	Size  float64
	Gray  Gray
	Align Align
}

// Stroke is how a line is drawn: Width in points, Dash the length of dashes and gaps, 0 for none.
type Stroke struct {
	Width float64
	Gray  Gray
	Dash  float64
}

// Painter is a surface for charts.
type Painter interface {
	// Polyline draws an open line through two or more places.
	Polyline(at []XY, s Stroke)
	// Polygon fills the area within three or more places.
	Polygon(at []XY, g Gray)
	// Text sets one line with its baseline at the place.
	Text(at XY, text string, t Type)
	// TextWidth is the width that Text would take, in points.
	TextWidth(text string, t Type) float64
}

// Shape is the outline of a marker.
type Shape string

// The shapes of markers.
const (
	Circle   Shape = "circle"
	Square   Shape = "square"
	Triangle Shape = "triangle"
	Diamond  Shape = "diamond"
	Cross    Shape = "cross"
	Dash     Shape = "dash"
)

// Marker is a shape, filled or open.
type Marker struct {
	Shape Shape
	Open  bool
}

// Draw draws the marker around a place, size points wide.
func (m Marker) Draw(p Painter, at XY, size float64, ink Gray) {
	r := size / 2
	line := Stroke{Width: max(0.5, size/8), Gray: ink}
	switch m.Shape {
	case Cross:
		r *= 0.8
		p.Polyline([]XY{{at.X - r, at.Y - r}, {at.X + r, at.Y + r}}, line)
		p.Polyline([]XY{{at.X - r, at.Y + r}, {at.X + r, at.Y - r}}, line)
		return
	case Dash:
		line.Width = max(0.8, size/5)
		p.Polyline([]XY{{at.X - r, at.Y}, {at.X + r, at.Y}}, line)
		return
	}
	edge := m.Shape.outline(at, r)
	if !m.Open {
		p.Polygon(edge, ink)
		return
	}
	p.Polygon(edge, white)
	p.Polyline(append(edge, edge[0], edge[1]), line) // over the first corner, so that it closes sharply
}

// outline gives the corners of a shape that stands in a circle of radius r, sized to look as large
// as the others.
func (s Shape) outline(at XY, r float64) []XY {
	corners := func(n int, start, r float64, dy float64) []XY {
		out := make([]XY, n)
		for i := range out {
			a := start + 2*math.Pi*float64(i)/float64(n)
			out[i] = XY{at.X + r*math.Cos(a), at.Y + dy + r*math.Sin(a)}
		}
		return out
	}
	switch s {
	case Square:
		return corners(4, math.Pi/4, r*1.2, 0)
	case Triangle:
		return corners(3, -math.Pi/2, r*1.25, r*0.25)
	case Diamond:
		return corners(4, 0, r*1.2, 0)
	default:
		return corners(28, 0, r, 0)
	}
}

func rectangle(b Box) []XY {
	return []XY{{b.X, b.Y}, {b.X + b.W, b.Y}, {b.X + b.W, b.Y + b.H}, {b.X, b.Y + b.H}}
}
