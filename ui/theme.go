// Package ui is the window: sections, pages, forms, keys. It shows what the domain packages say and
// hands on what the user does; it holds no formula, no SQL and no file format.
package ui

import (
	"image/color"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/theme"

	"evenstep/display/criteria"
)

// dim is a theme without colour, so dark that the window does not light up a reading room and does not
// tint what stands beside it.
type dim struct{}

var _ fyne.Theme = dim{}

// The grays of the window, as sRGB values.
const (
	ground  = 0x1b
	raised  = 0x26
	edge    = 0x3d
	muted   = 0x8c
	text    = 0xd0
	focused = 0xb4
)

func gray(v uint8) color.Color { return color.NRGBA{v, v, v, 0xff} }

func (dim) Color(name fyne.ThemeColorName, _ fyne.ThemeVariant) color.Color {
	switch name {
	case theme.ColorNameBackground, theme.ColorNameOverlayBackground, theme.ColorNameMenuBackground, theme.ColorNameHeaderBackground:
		return gray(ground)
	case theme.ColorNameForeground:
		return gray(text)
	case theme.ColorNameInputBackground, theme.ColorNameButton:
		return gray(raised)
	case theme.ColorNameInputBorder, theme.ColorNameSeparator, theme.ColorNameScrollBar, theme.ColorNameDisabledButton:
		return gray(edge)
	case theme.ColorNameDisabled, theme.ColorNamePlaceHolder:
		return gray(muted)
	case theme.ColorNamePrimary, theme.ColorNameHyperlink:
		return gray(focused)
	case theme.ColorNameForegroundOnPrimary:
		return gray(ground)
	case theme.ColorNameFocus:
		return color.NRGBA{0xff, 0xff, 0xff, 0x50} // an edge around what has the keys
	case theme.ColorNameSelection:
		return color.NRGBA{0xff, 0xff, 0xff, 0x2c}
	case theme.ColorNameHover:
		return color.NRGBA{0xff, 0xff, 0xff, 0x12}
	case theme.ColorNamePressed:
		return color.NRGBA{0xff, 0xff, 0xff, 0x30}
	case theme.ColorNameShadow:
		return color.NRGBA{0, 0, 0, 0x80}
	case theme.ColorNameError:
		return stateColour(criteria.Fails)
	case theme.ColorNameWarning:
		return stateColour(criteria.MeetsUncertainly)
	case theme.ColorNameSuccess:
		return stateColour(criteria.Meets)
	}
	return theme.DefaultTheme().Color(name, theme.VariantDark)
}

// stateColour is the only colour in the window. It always stands beside a word and a sign.
func stateColour(v criteria.Verdict) color.Color {
	switch v {
	case criteria.Meets:
		return color.NRGBA{0x86, 0xb0, 0x8e, 0xff}
	case criteria.MeetsUncertainly, criteria.FailsUncertainly:
		return color.NRGBA{0xc4, 0xae, 0x7a, 0xff}
	case criteria.Fails:
		return color.NRGBA{0xcf, 0x88, 0x6a, 0xff}
	}
	return gray(muted)
}

func (dim) Font(s fyne.TextStyle) fyne.Resource     { return theme.DefaultTheme().Font(s) }
func (dim) Icon(n fyne.ThemeIconName) fyne.Resource { return theme.DefaultTheme().Icon(n) }

func (dim) Size(name fyne.ThemeSizeName) float32 {
	switch name {
	case theme.SizeNameText:
		return 14
	case theme.SizeNameSubHeadingText:
		return 17
	case theme.SizeNameInputBorder:
		return 2
	case theme.SizeNameInnerPadding:
		return 6
	case theme.SizeNameScrollBarSmall:
		return 6
	}
	return theme.DefaultTheme().Size(name)
}
