package dicom

import (
	"fmt"
	"io"
)

const (
	maxCells   = 1 << 27 // pixel cells of a frame; the largest radiographs have 2^25
	maxWindows = 256     // windows, and VOI LUTs, that are kept; real images have a handful
)

// Image is a grayscale image, one frame or several. Its pixels stay in the file.
type Image struct {
	Columns, Rows, Frames int // at least 1; Columns * Rows at most 2^27

	BitsStored int  // depth of a stored value, 1 to 16
	Signed     bool // stored values are two's complement

	// Inverse says that the smallest value is shown white: Photometric Interpretation MONOCHROME1,
	// which belongs with the Presentation LUT Shape INVERSE (PS3.3 C.7.6.3.1.2, C.11.6).
	Inverse bool

	Padding  *Range // stored values that are no picture (PS3.3 C.7.5.1.1.2), nil where none are named
	Modality string // such as CT, MR, DX; "" where unknown

	ForProcessing bool // Presentation Intent Type FOR PROCESSING: not meant to be looked at
	Lossy         bool // the pixels went through a lossy compression at some time

	TransferSyntax string   // name by PS3.6
	Notices        []string // what was left out or read around, a clause each; also in the first frame's stages

	place
	r        io.ReaderAt
	size     int64
	elements dataset
	charset  string
	perFrame []int64 // where the value of each frame's item of functional groups begins
	pixels   pixels
}

// Range is a range of stored values, both ends within.
type Range struct {
	Low, High int
}

// Reference names an image in a presentation state. Nothing else should be done with it: the identifiers
// lead to a patient.
type Reference struct {
	SOPClass, SOPInstance, Study, Series string // UIDs

	Columns, Rows int
	Spacing       [2]float64 // of rows and of columns in mm; 0 where unknown
	Aspect        [2]int     // height and width of a pixel cell; 1, 1 where not stated
}

// kept are the elements of the data set whose places are remembered.
var kept = map[tag]bool{
	tagCharacterSet: true, tagSOPClass: true, tagSOPInstance: true, tagModality: true, tagIntent: true,
	tagStudyInstance: true, tagSeriesInstance: true, tagSamples: true, tagPhotometric: true, tagFrames: true,
	tagRows: true, tagColumns: true, tagPixelSpacing: true, tagAspectRatio: true, tagBitsAllocated: true,
	tagBitsStored: true, tagHighBit: true, tagRepresentation: true, tagPaddingValue: true, tagPaddingLimit: true,
	tagBurnedIn: true, tagWindowCenter: true, tagWindowWidth: true, tagIntercept: true, tagSlope: true,
	tagRescaleType: true, tagWindowText: true, tagVOIFunction: true, tagLossy: true, tagModalityLUT: true,
	tagVOILUT: true, tagShape: true, tagShared: true, tagPerFrame: true,
	tagLongOffsets: true, tagFloatPixels: true, tagDoublePixels: true, tagPixels: true,
}

// Read reads what describes the image in the size bytes of r; name stands in errors. The errors are one
// line each and wrap ErrDamaged, ErrUnsupported or what r returned.
func Read(name string, r io.ReaderAt, size int64) (*Image, error) {
	p := newParser(newPlace(name), r, size)
	start, t, notices, err := p.start()
	if err != nil {
		return nil, err
	}
	if t.deflated {
		if p, err = p.inflate(start); err != nil {
			return nil, err
		}
		start = 0
	}
	m := &Image{TransferSyntax: t.name, Notices: notices, place: p.place, r: p.r, size: p.size, elements: dataset{}}
	overlays := false
	_, err = p.walk(item{off: start, end: p.size, syntax: t.syntax}, func(e element) (bool, error) {
		if kept[e.tag] {
			m.elements[e.tag] = e
		}
		if e.tag.group()&0xFF01 == tagOverlayData.group() {
			overlays = true
		}
		return e.tag == tagPixels, nil // nothing behind the pixels describes them
	})
	if err != nil {
		return nil, err
	}
	if overlays {
		m.notice("overlays are left out")
	}
	for _, step := range []func(*parser) error{m.readKind, m.readShape, m.readCells, m.readMeaning, m.readPerFrame} {
		if err := step(p); err != nil {
			return nil, err
		}
	}
	if err := m.findPixels(p, t.coding); err != nil {
		return nil, err
	}
	s, err := m.stages(p, 0)
	if err != nil {
		return nil, err
	}
	m.Notices = append(m.Notices, s.Notices...)
	return m, nil
}

func (m *Image) notice(format string, args ...any) {
	m.Notices = append(m.Notices, fmt.Sprintf(format, args...))
}

// readKind refuses what is no grayscale image.
func (m *Image) readKind(p *parser) error {
	for _, t := range []tag{tagFloatPixels, tagDoublePixels} {
		if e, ok := m.elements[t]; ok {
			return p.unsupported(e.header, t, "pixels in floating point; expected integers of 8 or 16 bits; convert the file with a general DICOM toolkit")
		}
	}
	if _, ok := m.elements[tagPixels]; !ok {
		return p.unsupported(p.size, tagPixels, "none in this file; expected an image (it may be a directory, a report or a plan); choose another file")
	}
	samples, err := p.number(m.elements, tagSamples, 1)
	if err != nil {
		return err
	}
	photometric, err := p.word(m.elements, tagPhotometric)
	if err != nil {
		return err
	}
	e := m.elements[tagPhotometric]
	switch {
	case photometric == "":
		return p.damaged(max(e.header, 0), tagPhotometric, "no term; expected MONOCHROME1 or MONOCHROME2")
	case photometric != "MONOCHROME1" && photometric != "MONOCHROME2":
		return p.unsupported(e.header, tagPhotometric, "a colour image; expected MONOCHROME1 or MONOCHROME2; grayscale stages do not apply to colour: choose a grayscale image")
	case samples != 1:
		return p.unsupported(m.elements[tagSamples].header, tagSamples, "%d; expected 1, as a grayscale image has; choose another file", samples)
	}
	m.Inverse = photometric == "MONOCHROME1"
	shape, err := p.word(m.elements, tagShape)
	if err != nil {
		return err
	}
	if shape == "INVERSE" && !m.Inverse || shape == "IDENTITY" && m.Inverse {
		m.notice("Presentation LUT Shape %s contradicts %s; the latter counts", shape, photometric)
	}
	return nil
}

// readShape reads the size of the image.
func (m *Image) readShape(p *parser) (err error) {
	if m.Rows, err = p.number(m.elements, tagRows, -1); err != nil {
		return err
	}
	if m.Columns, err = p.number(m.elements, tagColumns, -1); err != nil {
		return err
	}
	e := m.elements[tagRows]
	if m.Rows < 1 || m.Columns < 1 {
		return p.damaged(e.header, tagRows, "%d rows of %d columns; expected at least one of each", m.Rows, m.Columns)
	}
	if m.Rows*m.Columns > maxCells {
		return p.unsupported(e.header, tagRows, "%d rows of %d columns; expected at most %d pixel cells; cut the image into parts with a general DICOM toolkit", m.Rows, m.Columns, maxCells)
	}
	frames, err := p.decimal(m.elements, tagFrames, 1)
	if err != nil {
		return err
	}
	if m.Frames = int(min(max(frames, -1), 1<<31)); m.Frames < 0 || m.Frames == 1<<31 {
		return p.damaged(m.elements[tagFrames].header, tagFrames, "out of range; expected 1 to 2147483647")
	}
	if m.Frames == 0 {
		m.Frames = 1
		m.notice("Number of Frames is 0; taken for 1")
	}
	return nil
}

// readCells reads how a value lies in its pixel cell (PS3.5 8.1).
func (m *Image) readCells(p *parser) error {
	var v [4]int
	for i, q := range []struct {
		tag    tag
		absent int
	}{{tagBitsAllocated, -1}, {tagBitsStored, -1}, {tagHighBit, 0xFFFF}, {tagRepresentation, 0}} {
		var err error
		if v[i], err = p.number(m.elements, q.tag, q.absent); err != nil {
			return err
		}
	}
	allocated, stored, high, representation := v[0], v[1], v[2], v[3]
	if high == 0xFFFF {
		high = stored - 1
	}
	switch {
	case allocated != 8 && allocated != 16:
		return p.unsupported(m.elements[tagBitsAllocated].header, tagBitsAllocated, "%d; expected 8 or 16; convert the file with a general DICOM toolkit", allocated)
	case stored < 1 || stored > allocated:
		return p.damaged(m.elements[tagBitsStored].header, tagBitsStored, "%d; expected 1 to %d", stored, allocated)
	case high < stored-1 || high >= allocated:
		return p.damaged(m.elements[tagHighBit].header, tagHighBit, "%d; expected %d to %d", high, stored-1, allocated-1)
	case representation > 1:
		return p.damaged(m.elements[tagRepresentation].header, tagRepresentation, "%d; expected 0 or 1", representation)
	}
	m.BitsStored, m.Signed = stored, representation == 1
	m.pixels = pixels{bytes: allocated / 8, shift: high + 1 - stored}
	padding, err := p.uint16s(m.elements, tagPaddingValue)
	if err != nil || len(padding) == 0 {
		return err
	}
	limit, err := p.uint16s(m.elements, tagPaddingLimit)
	if err != nil {
		return err
	}
	a := m.value(padding[0])
	m.Padding = &Range{a, a}
	if len(limit) > 0 {
		b := m.value(limit[0])
		m.Padding = &Range{min(a, b), max(a, b)}
	}
	return nil
}

// value gives the number that the stored bits of a cell mean.
func (m *Image) value(cell uint16) int {
	unused := 16 - m.BitsStored
	if m.Signed {
		return int(int16(cell<<unused) >> unused)
	}
	return int(cell << unused >> unused)
}

// readMeaning reads what a viewer should know.
func (m *Image) readMeaning(p *parser) error {
	var words [4]string
	for i, t := range []tag{tagModality, tagIntent, tagBurnedIn, tagLossy} {
		var err error
		if words[i], err = p.word(m.elements, t); err != nil {
			return err
		}
	}
	m.Modality = words[0]
	m.ForProcessing = words[1] == "FOR PROCESSING"
	if words[2] == "YES" {
		m.notice("the picture itself carries text (Burned In Annotation): it may name a patient")
	}
	m.Lossy = words[3] == "01"
	charset, err := p.text(m.elements, tagCharacterSet)
	m.charset = charset
	return err
}

// Reference reads the identifiers of the image from the file.
func (m *Image) Reference() (Reference, error) {
	p := newParser(m.place, m.r, m.size)
	ref := Reference{Columns: m.Columns, Rows: m.Rows, Aspect: [2]int{1, 1}}
	for _, q := range []struct {
		tag tag
		to  *string
	}{
		{tagSOPClass, &ref.SOPClass},
		{tagSOPInstance, &ref.SOPInstance},
		{tagStudyInstance, &ref.Study},
		{tagSeriesInstance, &ref.Series},
	} {
		var err error
		if *q.to, err = p.uid(m.elements, q.tag); err != nil {
			return Reference{}, err
		}
	}
	spacing, err := p.decimals(m.elements, tagPixelSpacing)
	if err != nil {
		return Reference{}, err
	}
	if len(spacing) == 2 && spacing[0] > 0 && spacing[1] > 0 {
		ref.Spacing = [2]float64(spacing)
	}
	aspect, err := p.decimals(m.elements, tagAspectRatio)
	if err != nil {
		return Reference{}, err
	}
	if len(aspect) == 2 && aspect[0] >= 1 && aspect[1] >= 1 && aspect[0] < 1e6 && aspect[1] < 1e6 {
		ref.Aspect = [2]int{int(aspect[0]), int(aspect[1])}
	}
	return ref, nil
}
