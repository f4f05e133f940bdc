package dicom

import "fmt"

// tag is a data element tag, group in the upper half.
type tag uint32

func (t tag) group() uint16 { return uint16(t >> 16) }

// String gives the tag as PS3.6 writes it, with its name where this package reads it.
func (t tag) String() string {
	s := fmt.Sprintf("(%04X,%04X)", uint16(t>>16), uint16(t))
	if name, ok := tagNames[t]; ok {
		s += " " + name
	}
	return s
}

// Tags by PS3.6. The ones that describe a person are not among them.
const (
	tagMetaLength            tag = 0x00020000
	tagMetaVersion           tag = 0x00020001
	tagMediaSOPClass         tag = 0x00020002
	tagMediaSOPInstance      tag = 0x00020003
	tagTransferSyntax        tag = 0x00020010
	tagImplementationClass   tag = 0x00020012
	tagImplementationVersion tag = 0x00020013

	tagCharacterSet    tag = 0x00080005
	tagSOPClass        tag = 0x00080016
	tagSOPInstance     tag = 0x00080018
	tagModality        tag = 0x00080060
	tagIntent          tag = 0x00080068
	tagImagerSpacing   tag = 0x00181164
	tagStudyInstance   tag = 0x0020000D
	tagSeriesInstance  tag = 0x0020000E
	tagSamples         tag = 0x00280002
	tagPhotometric     tag = 0x00280004
	tagFrames          tag = 0x00280008
	tagRows            tag = 0x00280010
	tagColumns         tag = 0x00280011
	tagPixelSpacing    tag = 0x00280030
	tagAspectRatio     tag = 0x00280034
	tagBitsAllocated   tag = 0x00280100
	tagBitsStored      tag = 0x00280101
	tagHighBit         tag = 0x00280102
	tagRepresentation  tag = 0x00280103
	tagPaddingValue    tag = 0x00280120
	tagPaddingLimit    tag = 0x00280121
	tagBurnedIn        tag = 0x00280301
	tagWindowCenter    tag = 0x00281050
	tagWindowWidth     tag = 0x00281051
	tagIntercept       tag = 0x00281052
	tagSlope           tag = 0x00281053
	tagRescaleType     tag = 0x00281054
	tagWindowText      tag = 0x00281055
	tagVOIFunction     tag = 0x00281056
	tagLossy           tag = 0x00282110
	tagModalityLUT     tag = 0x00283000
	tagLUTDescriptor   tag = 0x00283002
	tagLUTText         tag = 0x00283003
	tagModalityLUTType tag = 0x00283004
	tagLUTData         tag = 0x00283006
	tagVOILUT          tag = 0x00283010
	tagSoftcopyVOI     tag = 0x00283110
	tagFrameVOI        tag = 0x00289132
	tagTransformation  tag = 0x00289145
	tagPresentationLUT tag = 0x20500010
	tagShape           tag = 0x20500020
	tagShared          tag = 0x52009229
	tagPerFrame        tag = 0x52009230
	tagOverlayData     tag = 0x60003000 // groups 6000 to 60FE
	tagLongOffsets     tag = 0x7FE00001
	tagFloatPixels     tag = 0x7FE00008
	tagDoublePixels    tag = 0x7FE00009
	tagPixels          tag = 0x7FE00010

	tagItem         tag = 0xFFFEE000
	tagItemEnd      tag = 0xFFFEE00D
	tagSequenceEnd  tag = 0xFFFEE0DD
	groupDelimiters     = 0xFFFE
)

// tagNames are names by PS3.6 of the elements that an error may speak of.
var tagNames = map[tag]string{
	tagTransferSyntax: "Transfer Syntax UID",
	tagCharacterSet:   "Specific Character Set",
	tagSOPClass:       "SOP Class UID",
	tagSOPInstance:    "SOP Instance UID",
	tagModality:       "Modality",
	tagIntent:         "Presentation Intent Type",
	tagStudyInstance:  "Study Instance UID",
	tagSeriesInstance: "Series Instance UID",
	tagSamples:        "Samples per Pixel",
	tagPhotometric:    "Photometric Interpretation",
	tagFrames:         "Number of Frames",
	tagRows:           "Rows",
	tagColumns:        "Columns",
	tagPixelSpacing:   "Pixel Spacing",
	tagAspectRatio:    "Pixel Aspect Ratio",
	tagBitsAllocated:  "Bits Allocated",
	tagBitsStored:     "Bits Stored",
	tagHighBit:        "High Bit",
	tagRepresentation: "Pixel Representation",
	tagPaddingValue:   "Pixel Padding Value",
	tagPaddingLimit:   "Pixel Padding Range Limit",
	tagWindowCenter:   "Window Center",
	tagWindowWidth:    "Window Width",
	tagIntercept:      "Rescale Intercept",
	tagSlope:          "Rescale Slope",
	tagRescaleType:    "Rescale Type",
	tagWindowText:     "Window Center & Width Explanation",
	tagVOIFunction:    "VOI LUT Function",
	tagModalityLUT:    "Modality LUT Sequence",
	tagLUTDescriptor:  "LUT Descriptor",
	tagLUTText:        "LUT Explanation",
	tagLUTData:        "LUT Data",
	tagVOILUT:         "VOI LUT Sequence",
	tagFrameVOI:       "Frame VOI LUT Sequence",
	tagTransformation: "Pixel Value Transformation Sequence",
	tagShape:          "Presentation LUT Shape",
	tagShared:         "Shared Functional Groups Sequence",
	tagPerFrame:       "Per-Frame Functional Groups Sequence",
	tagLongOffsets:    "Extended Offset Table",
	tagFloatPixels:    "Float Pixel Data",
	tagDoublePixels:   "Double Float Pixel Data",
	tagPixels:         "Pixel Data",
	tagItem:           "Item",
}
