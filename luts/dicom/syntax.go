package dicom

import (
	"regexp"
)

// coding says how the pixel data of a transfer syntax are kept.
type coding int

const (
	native coding = iota
	runLength
	jpegBaseline
	jpegLossless
	refused
)

// syntax is how the elements of a data set are written (PS3.5 clause 10).
type syntax struct {
	explicit, big bool
}

// transfer is a transfer syntax (PS3.5 annex A, names by PS3.6 annex A).
type transfer struct {
	uid, name string
	syntax
	deflated bool
	coding   coding
}

const explicitLittleUID = "1.2.840.10008.1.2.1"

var explicitLittle = syntax{explicit: true}

var transfers = []transfer{
	{uid: "1.2.840.10008.1.2", name: "Implicit VR Little Endian"},
	{uid: explicitLittleUID, name: "Explicit VR Little Endian", syntax: explicitLittle},
	{uid: "1.2.840.10008.1.2.2", name: "Explicit VR Big Endian", syntax: syntax{explicit: true, big: true}},
	{uid: "1.2.840.10008.1.2.1.99", name: "Deflated Explicit VR Little Endian", syntax: explicitLittle, deflated: true},
	{uid: "1.2.840.10008.1.2.5", name: "RLE Lossless", syntax: explicitLittle, coding: runLength},
	{uid: "1.2.840.10008.1.2.4.50", name: "JPEG Baseline (Process 1)", syntax: explicitLittle, coding: jpegBaseline},
	{uid: "1.2.840.10008.1.2.4.57", name: "JPEG Lossless, Non-Hierarchical (Process 14)", syntax: explicitLittle, coding: jpegLossless},
	{uid: "1.2.840.10008.1.2.4.70", name: "JPEG Lossless, Non-Hierarchical, First-Order Prediction (Process 14 [Selection Value 1])", syntax: explicitLittle, coding: jpegLossless},
}

// refusedNames are the transfer syntaxes that are known and not read.
var refusedNames = map[string]string{
	"1.2.840.10008.1.2.1.98":  "Encapsulated Uncompressed Explicit VR Little Endian",
	"1.2.840.10008.1.2.4.51":  "JPEG Extended (Process 2 and 4)",
	"1.2.840.10008.1.2.4.52":  "JPEG Extended (Process 3 and 5)",
	"1.2.840.10008.1.2.4.53":  "JPEG Spectral Selection, Non-Hierarchical (Process 6 and 8)",
	"1.2.840.10008.1.2.4.54":  "JPEG Spectral Selection, Non-Hierarchical (Process 7 and 9)",
	"1.2.840.10008.1.2.4.55":  "JPEG Full Progression, Non-Hierarchical (Process 10 and 12)",
	"1.2.840.10008.1.2.4.56":  "JPEG Full Progression, Non-Hierarchical (Process 11 and 13)",
	"1.2.840.10008.1.2.4.58":  "JPEG Lossless, Non-Hierarchical (Process 15)",
	"1.2.840.10008.1.2.4.59":  "JPEG Extended, Hierarchical (Process 16 and 18)",
	"1.2.840.10008.1.2.4.60":  "JPEG Extended, Hierarchical (Process 17 and 19)",
	"1.2.840.10008.1.2.4.61":  "JPEG Spectral Selection, Hierarchical (Process 20 and 22)",
	"1.2.840.10008.1.2.4.62":  "JPEG Spectral Selection, Hierarchical (Process 21 and 23)",
	"1.2.840.10008.1.2.4.63":  "JPEG Full Progression, Hierarchical (Process 24 and 26)",
	"1.2.840.10008.1.2.4.64":  "JPEG Full Progression, Hierarchical (Process 25 and 27)",
	"1.2.840.10008.1.2.4.65":  "JPEG Lossless, Hierarchical (Process 28)",
	"1.2.840.10008.1.2.4.66":  "JPEG Lossless, Hierarchical (Process 29)",
	"1.2.840.10008.1.2.4.80":  "JPEG-LS Lossless Image Compression",
	"1.2.840.10008.1.2.4.81":  "JPEG-LS Lossy (Near-Lossless) Image Compression",
	"1.2.840.10008.1.2.4.90":  "JPEG 2000 Image Compression (Lossless Only)",
	"1.2.840.10008.1.2.4.91":  "JPEG 2000 Image Compression",
	"1.2.840.10008.1.2.4.92":  "JPEG 2000 Part 2 Multi-component Image Compression (Lossless Only)",
	"1.2.840.10008.1.2.4.93":  "JPEG 2000 Part 2 Multi-component Image Compression",
	"1.2.840.10008.1.2.4.94":  "JPIP Referenced",
	"1.2.840.10008.1.2.4.95":  "JPIP Referenced Deflate",
	"1.2.840.10008.1.2.4.100": "MPEG2 Main Profile / Main Level",
	"1.2.840.10008.1.2.4.101": "MPEG2 Main Profile / High Level",
	"1.2.840.10008.1.2.4.102": "MPEG-4 AVC/H.264 High Profile / Level 4.1",
	"1.2.840.10008.1.2.4.103": "MPEG-4 AVC/H.264 BD-compatible High Profile / Level 4.1",
	"1.2.840.10008.1.2.4.104": "MPEG-4 AVC/H.264 High Profile / Level 4.2 For 2D Video",
	"1.2.840.10008.1.2.4.105": "MPEG-4 AVC/H.264 High Profile / Level 4.2 For 3D Video",
	"1.2.840.10008.1.2.4.106": "MPEG-4 AVC/H.264 Stereo High Profile / Level 4.2",
	"1.2.840.10008.1.2.4.107": "HEVC/H.265 Main Profile / Level 5.1",
	"1.2.840.10008.1.2.4.108": "HEVC/H.265 Main 10 Profile / Level 5.1",
	"1.2.840.10008.1.2.4.110": "JPEG XL Lossless",
	"1.2.840.10008.1.2.4.111": "JPEG XL JPEG Recompression",
	"1.2.840.10008.1.2.4.112": "JPEG XL",
	"1.2.840.10008.1.2.4.201": "High-Throughput JPEG 2000 Image Compression (Lossless Only)",
	"1.2.840.10008.1.2.4.202": "High-Throughput JPEG 2000 with RPCL Options Image Compression (Lossless Only)",
	"1.2.840.10008.1.2.4.203": "High-Throughput JPEG 2000 Image Compression",
	"1.2.840.10008.1.2.4.204": "JPIP HTJ2K Referenced",
	"1.2.840.10008.1.2.4.205": "JPIP HTJ2K Referenced Deflate",
}

// uidShape is what PS3.5 clause 9 allows in a UID.
var uidShape = regexp.MustCompile(`^[0-9]+(\.[0-9]+)*$`)

func isUID(s string) bool { return len(s) <= 64 && uidShape.MatchString(s) }

// findTransfer gives the transfer syntax of a UID; of a refused or unknown one only name and coding.
func findTransfer(uid string) transfer {
	for _, t := range transfers {
		if t.uid == uid {
			return t
		}
	}
	name := refusedNames[uid]
	if name == "" && isUID(uid) {
		name = uid
	}
	return transfer{uid: uid, name: name, coding: refused}
}
