package dicom

import (
	"fmt"
	"io"
	"strconv"
	"time"
)

// Tags of a presentation state (PS3.3 C.10.4, C.11.10).
const (
	tagAreaTopLeft   tag = 0x00700052
	tagAreaBottom    tag = 0x00700053
	tagDisplayedArea tag = 0x0070005A
	tagContentLabel  tag = 0x00700080
	tagContentText   tag = 0x00700081
	tagStateDate     tag = 0x00700082
	tagStateTime     tag = 0x00700083
	tagContentAuthor tag = 0x00700084
	tagSizeMode      tag = 0x00700100
	tagStateSpacing  tag = 0x00700101
	tagStateAspect   tag = 0x00700102
)

// State is a way to show one image (all its frames alike). A stage that is missing is an identity, whatever
// the image says itself (PS3.4 N.2), so the modality stage of the image has to be repeated here.
type State struct {
	Image Reference

	Label       string // Content Label: at most 16 capital letters, digits, spaces, underscores
	Description string // at most 64 characters
	Software    string // version of the program, at most 64 characters; "" leaves it out

	Slope, Intercept float64 // Slope 0: no rescaling
	ModalityLUT      *LUT    // instead of slope and intercept
	Unit             string  // of the modality stage; "" is written as US, unspecified

	Window   *Window // not both of Window and VOILUT
	Function string  // of the window; "" is LINEAR
	VOILUT   *LUT    // of 8 or 16 bits: other depths are legal here, but not every program takes them

	Inverse         bool // Presentation LUT Shape INVERSE instead of IDENTITY
	PresentationLUT *LUT // instead of a shape; First is 0
}

// WritePresentationState writes a Grayscale Softcopy Presentation State (PS3.3 A.33.1) in the study of the
// image that it names. It carries no patient: the attributes that would name one are there and empty, so an
// archive has to match it by the image's UIDs. uids feeds NewUID twice; made is the time of creation, in
// the zone that shall show.
func WritePresentationState(w io.Writer, s State, uids io.Reader, made time.Time) error {
	if err := s.check(); err != nil {
		return err
	}
	ids, err := newUIDs(uids, 2)
	if err != nil {
		return err
	}
	v := values{}
	v.text(tagCharacterSet, "CS", "ISO_IR 192")
	v.text(tagSOPClass, "UI", presentationStateClass)
	v.text(tagSOPInstance, "UI", ids[0])
	v.text(tagStudyDate, "DA", "")
	v.text(tagStudyTime, "TM", "")
	v.text(tagAccession, "SH", "")
	v.text(tagModality, "CS", "PR")
	v.equipment(s.Description)
	v.sequence(tagReferencedSeries, func(v *values) {
		v.sequence(tagReferencedImages, func(v *values) {
			v.text(tagReferencedClass, "UI", s.Image.SOPClass)
			v.text(tagReferencedInstance, "UI", s.Image.SOPInstance)
		})
		v.text(tagSeriesInstance, "UI", s.Image.Series)
	})
	v.nobody()
	if s.Software != "" {
		v.text(tagSoftwareVersions, "LO", s.Software)
	}
	v.text(tagStudyInstance, "UI", s.Image.Study)
	v.text(tagSeriesInstance, "UI", ids[1])
	v.numbers()
	v.text(tagLaterality, "CS", "")
	s.modality(&v)
	s.voi(&v)
	v.sequence(tagDisplayedArea, s.area)
	v.text(tagContentLabel, "CS", s.Label)
	v.text(tagContentText, "LO", s.Description)
	v.text(tagStateDate, "DA", made.Format("20060102"))
	v.text(tagStateTime, "TM", made.Format("150405"))
	v.text(tagContentAuthor, "PN", "")
	switch {
	case s.PresentationLUT != nil:
		v.sequence(tagPresentationLUT, func(v *values) { v.lut(*s.PresentationLUT, "") })
	case s.Inverse:
		v.text(tagShape, "CS", "INVERSE")
	default:
		v.text(tagShape, "CS", "IDENTITY")
	}
	return v.write(w, presentationStateClass, ids[0], nil, 16)
}

func (s State) check() error {
	wrong := func(format string, args ...any) error {
		return fmt.Errorf("presentation state: %s: %w", fmt.Sprintf(format, args...), ErrWrite)
	}
	for _, uid := range []string{s.Image.SOPClass, s.Image.SOPInstance, s.Image.Study, s.Image.Series} {
		if !isUID(uid) {
			return wrong("the image is not named by four UIDs; expected those that Image.Reference gives; take them from the image")
		}
	}
	switch {
	case s.Image.Columns < 1 || s.Image.Rows < 1 || s.Image.Columns > 65535 || s.Image.Rows > 65535:
		return wrong("an image of %d rows of %d columns; expected 1 to 65535 of each; take the size from the image", s.Image.Rows, s.Image.Columns)
	case s.Label == "":
		return wrong("no label; expected 1 to 16 capital letters, digits, spaces or underscores; give one")
	case s.ModalityLUT != nil && s.Slope != 0:
		return wrong("a slope and a modality LUT; expected one of them; leave one out")
	case s.Window != nil && s.VOILUT != nil:
		return wrong("a window and a VOI LUT; expected one of them; leave one out")
	case s.PresentationLUT != nil && (s.Inverse || s.PresentationLUT.First != 0):
		return wrong("a presentation LUT with a shape or a first input other than 0; expected the LUT alone, from 0; give one of them")
	}
	if s.Window == nil {
		return nil
	}
	// PS3.3 C.11.2.1.2 and C.11.2.1.3.
	switch wide := s.Window.Width; s.Function {
	case "", "LINEAR":
		if !(wide >= 1) {
			return wrong("window width %g; expected at least 1 for LINEAR; give a wider one or LINEAR_EXACT", wide)
		}
	case "LINEAR_EXACT", "SIGMOID":
		if !(wide > 0) {
			return wrong("window width %g; expected above 0; give a wider one", wide)
		}
	default:
		return wrong("function %q; expected LINEAR, LINEAR_EXACT or SIGMOID; give one of them", s.Function)
	}
	return nil
}

func (s State) modality(v *values) {
	unit := s.Unit
	if unit == "" {
		unit = "US"
	}
	switch {
	case s.ModalityLUT != nil:
		v.sequence(tagModalityLUT, func(v *values) { v.lut(*s.ModalityLUT, unit) })
	case s.Slope != 0:
		v.decimals(tagIntercept, s.Intercept)
		v.decimals(tagSlope, s.Slope)
		v.text(tagRescaleType, "LO", unit)
	}
}

func (s State) voi(v *values) {
	switch {
	case s.VOILUT != nil:
		v.sequence(tagSoftcopyVOI, func(v *values) {
			v.sequence(tagVOILUT, func(v *values) { v.lut(*s.VOILUT, "") })
		})
	case s.Window != nil:
		v.sequence(tagSoftcopyVOI, func(v *values) {
			v.decimals(tagWindowCenter, s.Window.Center)
			v.decimals(tagWindowWidth, s.Window.Width)
			if s.Window.Explanation != "" {
				v.text(tagWindowText, "LO", s.Window.Explanation)
			}
			if s.Function != "" {
				v.text(tagVOIFunction, "CS", s.Function)
			}
		})
	}
}

// area shows the whole image (PS3.3 C.10.4).
func (s State) area(v *values) {
	v.int32s(tagAreaTopLeft, 1, 1)
	v.int32s(tagAreaBottom, int32(s.Image.Columns), int32(s.Image.Rows))
	v.text(tagSizeMode, "CS", "SCALE TO FIT")
	if s.Image.Spacing[0] > 0 && s.Image.Spacing[1] > 0 {
		v.decimals(tagStateSpacing, s.Image.Spacing[0], s.Image.Spacing[1])
		return
	}
	height, width := max(1, s.Image.Aspect[0]), max(1, s.Image.Aspect[1])
	v.joined(tagStateAspect, "IS", strconv.Itoa(height)+`\`+strconv.Itoa(width))
}
