package patterns

// sheets is the register of sheets. What Serves cites: DICOM PS3.14 and PS3.17 by clause; IEC 62563-1 clause
// 7.3 by the names of its visual tests in the code lists of DICOM PS3.16; the sections of AAPM On-line
// Report 03 from memory of its table of contents. None of the sheets is taken from any of them.
var sheets = []sheet{
	{Info{
		Name:    "luminance-field",
		Purpose: "luminance of one level, with a meter",
		Serves:  "DICOM PS3.14 annexes C and D.1 (square of a tenth of the pixels); AAPM On-line Report 03 section 4.3",
		Look: "Good: a square in the middle, even, on an even surround. " +
			"Bad: a square off the middle, not square, or with shades in it: do not measure yet.",
		Takes: TakesField | TakesSurround,
	}, luminanceField},
	{Info{
		Name:    "uniform",
		Purpose: "one level from edge to edge, for meter and eye",
		Serves:  "IEC 62563-1 7.3.5 (luminance uniformity); AAPM Report 270 (full-screen levels)",
		Look: "Good: one gray without clouds, stains or paler edges. " +
			"Bad: blotches, a bright rim, a dark corner, bands.",
		Takes: TakesField,
	}, uniform},
	{Info{
		Name:    "places",
		Purpose: "where to put the meter for uniformity",
		Serves:  "AAPM On-line Report 03 section 4.4 (5 places); IEC 62563-1 uniformity; schemes with 9, 13 or 25 places",
		Look: "Good: the inside of every ring looks as bright as that of the middle one. " +
			"Bad: a ring near an edge holds a darker, brighter or tinted gray.",
		Takes: TakesField | TakesPlaces,
	}, uniformityPlaces},
	{Info{
		Name:    "wedge",
		Purpose: "every level once, in order",
		Serves:  "IEC 62563-1 7.3.3 (grayscale resolution) and 7.3.4 (luminance response)",
		Look: "Good: an unbroken rise from black to white in each band, no edge stronger than its neighbours. " +
			"Bad: broad stripes of one gray, a sudden jump, a stretch that falls, a tint.",
		Takes: TakesSurround,
	}, wedge},
	{Info{
		Name:    "sawtooth",
		Purpose: "lost, doubled and swapped levels",
		Serves:  "IEC 62563-1 7.3.3 (grayscale resolution); AAPM On-line Report 03 section 4.3",
		Look: "Good: rows of teeth, each of four columns rising evenly, one like the other. " +
			"Bad: teeth with a broad or missing column (levels lost or doubled) or with a notch (levels swapped). " +
			"Steps of more than 8 bits lie below what the eye sees: there, look for changes from tooth to tooth.",
		Takes: TakesSurround,
	}, sawtooth},
	{Info{
		Name:    "dark-end",
		Purpose: "the last levels before black",
		Serves:  "IEC 62563-1 7.3.4 (luminance response) and 7.3.9 (clipping); AAPM On-line Report 03 section 4.3",
		Look: "Good: every step of the stairs can be told from the next and the lowest from the black around it. " +
			"Bad: the first steps sink into the black: too much room light, a lost table, or a limited range.",
	}, darkEnd},
	{Info{
		Name:    "bright-end",
		Purpose: "the last levels before white",
		Serves:  "IEC 62563-1 7.3.4 (luminance response) and 7.3.9 (clipping); AAPM On-line Report 03 section 4.3",
		Look: "Good: every step of the stairs can be told from the next and the lowest from the white around it. " +
			"Bad: steps melt into the white: the signal is clipped, or the range is limited.",
	}, brightEnd},
	{Info{
		Name:    "low-contrast",
		Purpose: "the smallest steps that can be seen, by level",
		Serves:  "DICOM PS3.14 clause 7 (equal steps look equal); IEC 62563-1 7.3.4 (luminance response)",
		Look: "Good: bars of the same number of JNDs are equally easy to see in dark, middle and bright tiles, " +
			"and one can say which are upright and which lie. " +
			"Bad: bars of one end are plain and those of the other lost.",
		Takes:    TakesSurround | TakesSteps | TakesSeed,
		MaxSteps: maxLowContrast,
	}, lowContrast},
	{Info{
		Name:    "disks",
		Purpose: "what can be seen by size and step",
		Serves:  "IEC 62563-1 7.3.2 (overall image quality); AAPM On-line Report 03 section 4.6 (noise)",
		Look: "Good: the border between disks found and disks missed runs slantwise, as it did at the last check. " +
			"Bad: small disks are lost at steps that were enough before, or their places are guessed wrong.",
		Takes:    TakesSurround | TakesSteps | TakesDiameters | TakesSeed,
		MaxSteps: maxDiskSteps,
	}, disks},
	{Info{
		Name:    "sharpness",
		Purpose: "fine lines in both directions, at full and at low contrast",
		Serves:  "AAPM On-line Report 03 section 4.5 (resolution); IEC 62563-1 7.3.2 (overall image quality)",
		Look: "Good: lines of one pixel stand apart as cleanly as those of four, upright and lying alike. " +
			"Bad: the fine lines run into gray, show slow waves, or one direction is paler than the other.",
		Takes:    TakesSurround | TakesSteps,
		MaxSteps: 1,
	}, sharpness},
	{Info{
		Name:    "geometry",
		Purpose: "shape, position and the outermost pixels",
		Serves:  "IEC 62563-1 7.3.9 (geometry); AAPM On-line Report 03 section 4.1 (distortion)",
		Look: "Good: an unbroken line along all four edges, rules that end where they should, square meshes, straight diagonals. " +
			"Bad: an edge line is missing (cut off), meshes longer than wide (wrong shape), lines of unequal strength (scaled).",
		Takes: TakesSurround,
	}, geometry},
	{Info{
		Name:    "native",
		Purpose: "scaling and limited range at a glance",
		Serves:  "IEC 62563-1 7.3.9 (phase and clock, clipping); AAPM On-line Report 03 section 4.5",
		Look: "Good: all fields show the same even gray, the size in the middle is that of the panel, and every block " +
			"near black and near white is seen. " +
			"Bad: waves, nets or colours in the fields (scaled, or not sent pixel for pixel); the blocks up to a sixteenth " +
			"of the range are gone (limited range).",
	}, native},
	{Info{
		Name:    "reading",
		Purpose: "text in several sizes and contrasts, corner to corner",
		Serves:  "IEC 62563-1 7.3.2 (overall image quality); AAPM On-line Report 03 section 4.5 (resolution)",
		Look: "Good: every line can be read in every block, in the corners as well as in the middle. " +
			"Bad: strokes run together, have shadows or coloured rims, or the faint block cannot be read.",
		Takes:    TakesSteps,
		MaxSteps: maxReadingSteps,
	}, reading},
	{Info{
		Name:    "motion",
		Purpose: "moving edges",
		Serves:  "moving pictures (ultrasound, fluoroscopy): common practice, no source",
		Look: "Good: one upright bar that glides, its edges equally sharp in all three lanes. " +
			"Bad: a tail or a ghost behind it, a bar broken sideways, jerks.",
		Takes:    TakesSteps | TakesFrame,
		MaxSteps: 1,
	}, motion},
	{Info{
		Name:    "colours",
		Purpose: "the colours that the channels make",
		Serves:  "IEC 62563-1 7.3.6 (chromaticity)",
		Look: "Good: eight fields in the colours written on them, each even, the lower part a darker kind of the same colour. " +
			"Bad: a colour under the wrong name (channels swapped), a gray where a colour should be (a channel missing), shades.",
		Colour: true,
	}, colours},
	{Info{
		Name:    "colour-field",
		Purpose: "one colour from edge to edge, for meter and eye",
		Serves:  "AAPM On-line Report 03 section 4.8 (chromaticity); IEC 62563-1 7.3.6 and 7.3.7 (pixel faults)",
		Look: "Good: one even colour, the same in the corners. " +
			"Bad: a change of hue towards an edge; single points of another colour (a channel of that pixel is stuck).",
		Colour: true,
		Takes:  TakesColour,
	}, colourField},
	{Info{
		Name:    "gray-tracking",
		Purpose: "a tint in the grays",
		Serves:  "AAPM On-line Report 03 section 4.8 (chromaticity); IEC 62563-1 7.3.6",
		Look: "Good: the large grays have no colour from the darkest to the brightest; of the strips below, one is plainly " +
			"redder and one bluer. " +
			"Bad: some of the large grays look like one of the strips, or the tint changes along the row.",
		Colour: true,
		Takes:  TakesSurround,
	}, grayTracking},
	{Info{
		Name:    "pixel-faults",
		Purpose: "single pixels that are stuck",
		Serves:  "IEC 62563-1 7.3.7 (pixel faults); ISO 9241-307 (counts by kind; from memory)",
		Look: "Good: nothing but the letters and figures along the edges. " +
			"Bad: points that stay bright on black or dark on white; say where by letter and figure.",
		Takes: TakesField,
	}, pixelFaults},
	{Info{
		Name:    "angle",
		Purpose: "contrast seen from the side",
		Serves:  "IEC 62563-1 7.3.10 (viewing angle)",
		Look: "Good: from every place where readers sit, each strip still shows its block, brighter than the strip, all over the screen. " +
			"Bad: blocks vanish or turn darker than their strip, or dark strips become paler, on one side.",
		Takes:    TakesSurround | TakesSteps,
		MaxSteps: 7,
	}, angle},
}
