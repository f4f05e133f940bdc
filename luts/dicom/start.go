package dicom

import (
	"compress/flate"
	"errors"
	"io"
)

// Sniff says whether the first 132 bytes of a file are those of a DICOM file (PS3.10 7.1). Files without
// them exist, and Read takes them.
func Sniff(head []byte) bool {
	return len(head) >= 132 && string(head[128:132]) == "DICM"
}

const notDICOM = "no preamble and no data elements of an image; expected a DICOM file; choose another file"

// start finds where the data set begins and how it is written (PS3.10 clause 7).
func (p *parser) start() (int64, transfer, []string, error) {
	var none transfer
	var notices []string
	if p.size < 8 {
		return 0, none, nil, p.unsupported(0, 0, notDICOM)
	}
	head, err := p.bytes(0, int(min(p.size, 132)))
	if err != nil {
		return 0, none, nil, err
	}
	off := int64(132)
	if !Sniff(head) {
		off = 0
		little := (head[0] == 0x02 || head[0] == 0x08) && head[1] == 0
		if big := head[0] == 0 && head[1] == 0x08; !little && !big {
			return 0, none, nil, p.unsupported(0, 0, notDICOM)
		}
		notices = append(notices, "the file has no preamble")
	}
	meta := dataset{}
	for off+8 <= p.size {
		b, err := p.bytes(off, 2)
		if err != nil {
			return 0, none, nil, err
		}
		if b[0] != 0x02 || b[1] != 0 {
			break
		}
		e, err := p.header(off, p.size, explicitLittle)
		if err != nil {
			return 0, none, nil, err
		}
		meta[e.tag] = e
		if off, err = p.next(e); err != nil {
			return 0, none, nil, err
		}
	}
	uid, err := p.text(meta, tagTransferSyntax)
	if err != nil {
		return 0, none, nil, err
	}
	if uid == "" {
		t, err := p.guess(off)
		return off, t, append(notices, "the file does not name its transfer syntax; taken for "+t.name), err
	}
	t := findTransfer(uid)
	switch {
	case t.coding != refused && t.deflated:
		return off, t, notices, nil
	case t.coding != refused:
		found, err := p.explicitAt(off)
		if err == nil && found != t.explicit && !t.big {
			t.explicit = found
			notices = append(notices, "the data set is not written as its transfer syntax says; it is read as found")
		}
		return off, t, notices, err
	case t.name == "":
		return 0, none, nil, p.damaged(meta[tagTransferSyntax].header, tagTransferSyntax, "no UID; expected one")
	}
	return 0, none, nil, p.unsupported(meta[tagTransferSyntax].header, tagTransferSyntax,
		"transfer syntax %s; expected an uncompressed one, RLE, JPEG lossless (process 14) or JPEG baseline; convert the file to Explicit VR Little Endian with a general DICOM toolkit", t.name)
}

// guess tells the transfer syntax by the first element of the data set, which is of group 0008 in an image.
func (p *parser) guess(off int64) (transfer, error) {
	explicit, err := p.explicitAt(off)
	if err != nil {
		return transfer{}, err
	}
	b, err := p.bytes(off, 2)
	if err != nil {
		return transfer{}, err
	}
	big := b[0] == 0
	for _, t := range transfers {
		if t.explicit == explicit && t.big == big && (b[0] == 0x08 && b[1] == 0 || b[0] == 0 && b[1] == 0x08) {
			return t, nil // the first that fits is not compressed
		}
	}
	return transfer{}, p.unsupported(off, 0, notDICOM)
}

// explicitAt says whether the element at off states a value representation.
func (p *parser) explicitAt(off int64) (bool, error) {
	if p.size-off < 8 {
		return false, p.damaged(off, 0, "the file ends; expected a data set")
	}
	b, err := p.bytes(off+4, 2)
	return err == nil && isLetter(b[0]) && isLetter(b[1]), err
}

// inflate gives a parser of the inflated data set that begins at off.
func (p *parser) inflate(off int64) (*parser, error) {
	z, n, err := inflate(p.r, off, p.size)
	var corrupt flate.CorruptInputError
	switch {
	case err == nil:
		inside := place{p.file, "inflated byte"}
		return newParser(inside, z, n), nil
	case errors.Is(err, errTooLarge):
		return nil, p.unsupported(off, 0, "a deflated data set of more than %d bytes; expected at most that; convert the file to Explicit VR Little Endian with a general DICOM toolkit", inflateLimit(p.size))
	case errors.As(err, &corrupt), errors.Is(err, io.ErrUnexpectedEOF):
		return nil, p.damaged(off, 0, "a deflated data set that cannot be inflated; expected a whole one (RFC 1951)")
	}
	return nil, p.unreadable(off, p.size-off, err)
}
