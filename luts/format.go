package luts

import (
	"bytes"
	"cmp"
	"encoding/binary"
	"fmt"
	"io"
	"strconv"
	"unicode/utf8"
)

// maxFile holds the largest table, 65536 rows of "-32768,65535" with CRLF, and as much again for the rest.
// In bytes.
const maxFile = 2 << 20

// FormatError says what in a file could not be read as a table.
type FormatError struct {
	File     string // as given to the reader
	Line     int    // counted from 1; 0 where no single line is at fault
	Found    string
	Expected string // without the word "expected"
	Do       string // what the user should do about it

	cause error
}

// Error is one line, "FILE:LINE: found; expected …; do", without control characters whatever the file or its
// name hold.
func (e *FormatError) Error() string {
	place := cmp.Or(e.File, "table")
	if e.Line > 0 {
		place += ":" + strconv.Itoa(e.Line)
	}
	return printable(fmt.Sprintf("%s: %s; expected %s; %s", place, e.Found, e.Expected, e.Do))
}

// Unwrap is the error of the reader where the file could not be read to its end, else nil.
func (e *FormatError) Unwrap() error { return e.cause }

// at puts the place in front of a flaw.
func (f *flaw) at(file string, line int) *FormatError {
	return &FormatError{File: file, Line: line, Found: f.found, Expected: f.expected, Do: f.do}
}

// readText reads a whole file of at most maxFile bytes and takes a byte-order mark off.
func readText(file string, r io.Reader) ([]byte, error) {
	text, err := io.ReadAll(io.LimitReader(r, maxFile+1))
	if err != nil {
		e := newFlaw("try again or fetch the file anew", "reading stopped: %v", err).wants("a file that can be read to its end").at(file, 0)
		e.cause = err
		return nil, e
	}
	if len(text) > maxFile {
		return nil, newFlaw("choose the file of a table", "more than %d bytes", maxFile).wants("a table").at(file, 0)
	}
	if at := invalidAt(text); at < len(text) {
		return nil, newFlaw("choose the file of a table or save it as UTF-8", "bytes that are no UTF-8").wants("text").at(file, lineAt(text, at))
	}
	return bytes.TrimPrefix(text, []byte("\ufeff")), nil
}

// invalidAt is where the first byte lies that is no UTF-8.
func invalidAt(text []byte) int {
	for i := 0; i < len(text); {
		r, size := utf8.DecodeRune(text[i:])
		if r == utf8.RuneError && size == 1 {
			return i
		}
		i += size
	}
	return len(text)
}

// lineAt is the line, counted from 1, in which the byte at offset lies.
func lineAt(text []byte, offset int) int {
	return 1 + bytes.Count(text[:min(offset, len(text))], []byte("\n"))
}

// WriteRaw writes the bare entries in the order of the inputs, with the least input first: one byte each for
// bits = 8, two bytes each, the low one first (little endian), for bits = 16. Entries are written as they are,
// not stretched to the width of the field; those of more than 8 bits do not go into one byte.
func WriteRaw(w io.Writer, t Table, bits int) error {
	if err := t.Check(); err != nil {
		return err
	}
	var raw []byte
	switch {
	case bits != 8 && bits != 16:
		return fmt.Errorf("raw table: fields of %d bits; expected 8 or 16; choose one", bits)
	case t.OutBits > bits:
		return fmt.Errorf("raw table: entries of %d bits for fields of %d; expected no more than the field holds; write 16 bits", t.OutBits, bits)
	case bits == 8:
		for _, e := range t.Entries {
			raw = append(raw, byte(e))
		}
	default:
		for _, e := range t.Entries {
			raw = binary.LittleEndian.AppendUint16(raw, e)
		}
	}
	return write(w, raw)
}

func write(w io.Writer, text []byte) error {
	n, err := w.Write(text)
	if err == nil && n < len(text) {
		err = io.ErrShortWrite
	}
	if err != nil {
		return fmt.Errorf("table: writing stopped after %d of %d bytes; expected room for all; free some or choose another place: %w", n, len(text), err)
	}
	return nil
}
