package dicom

import (
	"compress/flate"
	"errors"
	"io"
	"sync"
)

// window is how much source reads at a time; no single read of it is longer.
const window = 64 << 10

// source reads a file in windows, so that walking many small elements costs few reads.
type source struct {
	r    io.ReaderAt
	size int64
	at   int64
	buf  []byte // what is held, from at on
	room []byte
}

// bytes gives n bytes at off; they hold until the next call. The caller has checked them against size.
func (s *source) bytes(off int64, n int) ([]byte, error) {
	if off < s.at || off+int64(n) > s.at+int64(len(s.buf)) {
		if s.room == nil {
			s.room = make([]byte, min(window, s.size))
		}
		s.at, s.buf = off, s.room[:min(window, s.size-off)]
		if err := readFull(s.r, s.buf, off); err != nil {
			s.buf = nil
			return nil, err
		}
	}
	i := off - s.at
	return s.buf[i : i+int64(n)], nil
}

// readFull reads all of b; an early end of the file is io.ErrUnexpectedEOF.
func readFull(r io.ReaderAt, b []byte, off int64) error {
	n, err := r.ReadAt(b, off)
	switch {
	case n == len(b):
		return nil
	case err == nil || errors.Is(err, io.EOF):
		return io.ErrUnexpectedEOF
	}
	return err
}

// inflated reads a deflated data set as if it were a file, without holding it: it goes forward in the
// stream, and back by starting anew.
type inflated struct {
	mu    sync.Mutex
	r     *io.SectionReader
	flate io.ReadCloser
	at    int64
}

// errTooLarge says that a deflated data set exceeds its limit.
var errTooLarge = errors.New("too large when inflated")

// inflateLimit is the largest data set that n deflated bytes may become. A flat image of 13 megapixels
// deflates a thousandfold, so small files have 64 MiB free.
func inflateLimit(n int64) int64 { return max(64<<20, 32*n) }

// inflate opens the deflated data set in r from off to size and gives its inflated size.
func inflate(r io.ReaderAt, off, size int64) (*inflated, int64, error) {
	z := &inflated{r: io.NewSectionReader(r, off, size-off)}
	if err := z.rewind(); err != nil {
		return nil, 0, err
	}
	limit := inflateLimit(size)
	n, err := io.Copy(io.Discard, io.LimitReader(z.flate, limit+1))
	z.at = n
	if err == nil && n > limit {
		err = errTooLarge
	}
	return z, n, err
}

func (z *inflated) rewind() error {
	if _, err := z.r.Seek(0, io.SeekStart); err != nil {
		return err
	}
	z.at = 0
	if z.flate == nil {
		z.flate = flate.NewReader(z.r)
		return nil
	}
	return z.flate.(flate.Resetter).Reset(z.r, nil)
}

// ReadAt implements io.ReaderAt.
func (z *inflated) ReadAt(b []byte, off int64) (int, error) {
	z.mu.Lock()
	defer z.mu.Unlock()
	if off < z.at {
		if err := z.rewind(); err != nil {
			return 0, err
		}
	}
	skipped, err := io.CopyN(io.Discard, z.flate, off-z.at)
	z.at += skipped
	if err != nil {
		return 0, err
	}
	n, err := io.ReadFull(z.flate, b)
	z.at += int64(n)
	if errors.Is(err, io.ErrUnexpectedEOF) {
		err = io.EOF
	}
	return n, err
}
