package dicom

import (
	"fmt"
	"io"
	"slices"
	"time"
)

// Tags that only the writer needs (PS3.6).
const (
	tagImageType          tag = 0x00080008
	tagStudyDate          tag = 0x00080020
	tagStudyTime          tag = 0x00080030
	tagAccession          tag = 0x00080050
	tagConversion         tag = 0x00080064
	tagManufacturer       tag = 0x00080070
	tagReferring          tag = 0x00080090
	tagSeriesDescription  tag = 0x0008103E
	tagModelName          tag = 0x00081090
	tagReferencedSeries   tag = 0x00081115
	tagReferencedImages   tag = 0x00081140
	tagReferencedClass    tag = 0x00081150
	tagReferencedInstance tag = 0x00081155
	tagPatientName        tag = 0x00100010
	tagPatientID          tag = 0x00100020
	tagPatientBirth       tag = 0x00100030
	tagPatientSex         tag = 0x00100040
	tagControlSubject     tag = 0x00100200
	tagSoftwareVersions   tag = 0x00181020
	tagStudyID            tag = 0x00200010
	tagSeriesNumber       tag = 0x00200011
	tagInstanceNumber     tag = 0x00200013
	tagOrientation        tag = 0x00200020
	tagLaterality         tag = 0x00200060
	tagComments           tag = 0x00204000
)

// Capture is a test pattern to be written as a Secondary Capture image (PS3.3 A.8.1).
type Capture struct {
	Columns, Rows int      // 1 to 65535 each
	BitsStored    int      // 8 to 16
	Cells         []uint16 // Columns * Rows values of 0 to 2^BitsStored - 1, row by row
	Title         string   // what the pattern is, at most 51 characters; made part of Series Description
	Software      string   // version of the program, at most 64 characters; "" leaves it out
}

// WriteCapture writes a grayscale image that is plainly a test object: no patient, Quality Control Subject
// YES, Conversion Type SYN. Its window spans the whole range and its output is P-values. uids feeds NewUID
// three times; made is the time of the content, in the zone that shall show.
func WriteCapture(w io.Writer, c Capture, uids io.Reader, made time.Time) error {
	if c.Columns < 1 || c.Columns > 65535 || c.Rows < 1 || c.Rows > 65535 || len(c.Cells) != c.Columns*c.Rows {
		return fmt.Errorf("%d pixel cells for %d rows of %d columns; expected 1 to 65535 of each, and a cell for every place: %w", len(c.Cells), c.Rows, c.Columns, ErrWrite)
	}
	if c.BitsStored < 8 || c.BitsStored > 16 {
		return fmt.Errorf("%d bits stored; expected 8 to 16; choose another depth: %w", c.BitsStored, ErrWrite)
	}
	for i, x := range c.Cells {
		if c.BitsStored < 16 && x>>c.BitsStored != 0 {
			return fmt.Errorf("pixel cell %d is %d; expected at most %d for %d bits: %w", i, x, 1<<c.BitsStored-1, c.BitsStored, ErrWrite)
		}
	}
	ids, err := newUIDs(uids, 3)
	if err != nil {
		return err
	}
	allocated, form := 16, "OW"
	if c.BitsStored == 8 {
		allocated, form = 8, "OB"
	}
	text := "Test pattern " + c.Title
	v := values{}
	v.text(tagCharacterSet, "CS", "ISO_IR 192")
	v.joined(tagImageType, "CS", `ORIGINAL\SECONDARY`)
	v.text(tagSOPClass, "UI", secondaryCaptureClass)
	v.text(tagSOPInstance, "UI", ids[0])
	v.study(made)
	v.text(tagModality, "CS", "OT")
	v.text(tagConversion, "CS", "SYN")
	v.equipment(text)
	v.nobody()
	v.text(tagControlSubject, "CS", "YES")
	if c.Software != "" {
		v.text(tagSoftwareVersions, "LO", c.Software)
	}
	v.text(tagStudyInstance, "UI", ids[1])
	v.text(tagSeriesInstance, "UI", ids[2])
	v.numbers()
	v.text(tagOrientation, "CS", "")
	v.text(tagLaterality, "CS", "")
	v.text(tagComments, "LT", text)
	v.uint16s(tagSamples, "US", 1)
	v.text(tagPhotometric, "CS", "MONOCHROME2")
	v.uint16s(tagRows, "US", uint16(c.Rows))
	v.uint16s(tagColumns, "US", uint16(c.Columns))
	v.uint16s(tagBitsAllocated, "US", uint16(allocated))
	v.uint16s(tagBitsStored, "US", uint16(c.BitsStored))
	v.uint16s(tagHighBit, "US", uint16(c.BitsStored-1))
	v.uint16s(tagRepresentation, "US", 0)
	v.text(tagBurnedIn, "CS", "NO")
	v.decimals(tagWindowCenter, float64(int(1)<<(c.BitsStored-1)))
	v.decimals(tagWindowWidth, float64(int(1)<<c.BitsStored))
	v.text(tagWindowText, "LO", "whole range")
	v.text(tagLossy, "CS", "00")
	v.text(tagShape, "CS", "IDENTITY")
	size := len(c.Cells) * allocated / 8
	v.head(tagPixels, form, size+size%2)
	return v.write(w, secondaryCaptureClass, ids[0], c.Cells, allocated)
}

// study writes the General Study attributes that stand before Modality.
func (v *values) study(made time.Time) {
	v.text(tagStudyDate, "DA", made.Format("20060102"))
	v.text(tagStudyTime, "TM", made.Format("150405"))
	v.text(tagAccession, "SH", "")
}

// equipment writes what stands between Modality and the patient.
func (v *values) equipment(description string) {
	v.text(tagManufacturer, "LO", "")
	v.text(tagReferring, "PN", "")
	v.text(tagSeriesDescription, "LO", description)
	v.text(tagModelName, "LO", "Evenstep")
}

// nobody writes a patient without a name or anything else.
func (v *values) nobody() {
	v.text(tagPatientName, "PN", "")
	v.text(tagPatientID, "LO", "")
	v.text(tagPatientBirth, "DA", "")
	v.text(tagPatientSex, "CS", "")
}

func (v *values) numbers() {
	v.text(tagStudyID, "SH", "")
	v.text(tagSeriesNumber, "IS", "1")
	v.text(tagInstanceNumber, "IS", "1")
}

// write writes the file: the elements so far, then the cells as the value of the last of them.
func (v *values) write(w io.Writer, class, instance string, cells []uint16, allocated int) error {
	m, err := meta(class, instance)
	if err == nil {
		err = v.err
	}
	if err != nil {
		return err
	}
	out := &firstError{w: w}
	out.Write(m)
	out.Write(v.b)
	buf := make([]byte, 0, writeChunk+1)
	for part := range slices.Chunk(cells, writeChunk/2) {
		buf = buf[:0]
		for _, x := range part {
			if buf = append(buf, byte(x)); allocated == 16 {
				buf = append(buf, byte(x>>8))
			}
		}
		if len(buf)%2 != 0 { // only the last can be odd
			buf = append(buf, 0)
		}
		out.Write(buf)
	}
	if out.err != nil {
		return fmt.Errorf("writing DICOM: %w; expected room for the file; check the disk", out.err)
	}
	return nil
}

// writeChunk is how many bytes of pixels are written at a time; even.
const writeChunk = 64 << 10

// firstError writes until something fails and keeps what failed.
type firstError struct {
	w   io.Writer
	err error
}

func (f *firstError) Write(b []byte) {
	if f.err == nil {
		_, f.err = f.w.Write(b)
	}
}
