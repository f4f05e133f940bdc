package dicom

import (
	"fmt"
	"io"
	"math/big"
)

const (
	// implementationClass is this program's Implementation Class UID (PS3.7 D.3.3.2), made once by PS3.5 B.2.
	implementationClass   = "2.25.158085035815418607086186501737033160077"
	implementationVersion = "EVENSTEP"

	secondaryCaptureClass  = "1.2.840.10008.5.1.4.1.1.7"
	presentationStateClass = "1.2.840.10008.5.1.4.1.1.11.1"
)

// NewUID makes a UID of the root 2.25 from a UUID (PS3.5 B.2) of 16 bytes of r: random ones, or those of a
// hash where the same input shall give the same UID.
func NewUID(r io.Reader) (string, error) {
	var b [16]byte
	if _, err := io.ReadFull(r, b[:]); err != nil {
		return "", fmt.Errorf("making a UID: %w; expected 16 random bytes; check the source of randomness", err)
	}
	b[6] = b[6]&0x0F | 0x40 // version 4, variant 10 (RFC 9562 5.4)
	b[8] = b[8]&0x3F | 0x80
	return uidOf(b), nil
}

// uidOf writes a UUID as a decimal number without leading zeros.
func uidOf(uuid [16]byte) string { return "2.25." + new(big.Int).SetBytes(uuid[:]).String() }

// newUIDs makes n UIDs.
func newUIDs(r io.Reader, n int) ([]string, error) {
	uids := make([]string, n)
	for i := range uids {
		var err error
		if uids[i], err = NewUID(r); err != nil {
			return nil, err
		}
	}
	return uids, nil
}
