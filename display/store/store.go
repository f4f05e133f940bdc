// Package store keeps a site's register: rooms, stations, monitors, meters and persons, visits while
// they are measured, and sealed records. It keeps what it is given in one SQLite file and judges
// nothing. A reading is on disk when the call that adds it returns.
package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"path/filepath"
	"runtime"
	"sync"
	"time"
)

// What Open refuses.
var (
	ErrForeign = errors.New("is no register")
	ErrNewer   = errors.New("is a register of a newer program")
	ErrDamaged = errors.New("is a damaged register")
)

// Store is an open register. Its methods may be called from several goroutines.
type Store struct {
	engine engine

	mu    sync.RWMutex // over the handles, which RestoreFrom exchanges
	write *sql.DB      // one connection: writers queue here and not in the file
	read  *sql.DB
}

// DefaultPath is where the register lies where no path was given: EVENSTEP_REGISTER, else the user's
// data folder.
func DefaultPath(getenv func(string) string) (string, error) {
	if p := getenv("EVENSTEP_REGISTER"); p != "" {
		return p, nil
	}
	dir := getenv("XDG_DATA_HOME")
	switch {
	case dir != "":
	case runtime.GOOS == "windows" && getenv("LOCALAPPDATA") != "":
		dir = getenv("LOCALAPPDATA")
	case runtime.GOOS == "darwin" && getenv("HOME") != "":
		dir = filepath.Join(getenv("HOME"), "Library", "Application Support")
	case getenv("HOME") != "":
		dir = filepath.Join(getenv("HOME"), ".local", "share")
	default:
		return "", errors.New("the register has no place: neither EVENSTEP_REGISTER, XDG_DATA_HOME nor HOME is set; expected one; name the file with --register")
	}
	return filepath.Join(dir, "evenstep", "register.db"), nil
}

// Open opens a register, or makes one where there is no file. A file that is no register, is damaged,
// or belongs to a newer program is refused and left as it is.
func Open(path string) (*Store, error) { return openWith(&sqliteFile{path: path}) }

func openWith(e engine) (*Store, error) {
	s := &Store{engine: e}
	var err error
	if s.write, s.read, err = e.open(); err != nil {
		return nil, err
	}
	if err := migrate(e, s.write, e.migrations()); err != nil {
		_ = s.Close()
		return nil, err
	}
	return s, nil
}

// Path is the file that the register lies in.
func (s *Store) Path() string { return s.engine.name() }

// Warnings says what is unwise about the place of the file; a line each.
func (s *Store) Warnings() []string { return s.engine.warnings() }

// Close closes the register.
func (s *Store) Close() error {
	s.mu.Lock()
	defer s.mu.Unlock()
	err := errors.Join(s.read.Close(), s.write.Close())
	s.engine.closed()
	return err
}

func (s *Store) reader() *sql.DB {
	s.mu.RLock()
	defer s.mu.RUnlock()
	return s.read
}

func (s *Store) writer() *sql.DB {
	s.mu.RLock()
	defer s.mu.RUnlock()
	return s.write
}

// instant is how times stand in the register: RFC 3339, UTC.
func instant(t time.Time) string { return t.UTC().Format(time.RFC3339Nano) }

// toSecond is an instant to the second, as it is sorted and compared.
func toSecond(t time.Time) string { return t.UTC().Format(time.RFC3339) }

// in runs do in one transaction that is on disk when in returns.
func (s *Store) in(ctx context.Context, do func(*sql.Tx) error) error {
	tx, err := s.writer().BeginTx(ctx, nil)
	if err != nil {
		return s.fault(err)
	}
	if err := do(tx); err != nil {
		_ = tx.Rollback()
		return s.fault(err)
	}
	return s.fault(tx.Commit())
}

// fault names the file in an error of the engine and says what to do about the usual ones.
func (s *Store) fault(err error) error {
	if err == nil {
		return nil
	}
	var own *Error
	if errors.As(err, &own) || errors.Is(err, context.Canceled) || errors.Is(err, ErrNotFound) {
		return err
	}
	if said := s.wrong(err); said != nil {
		return said
	}
	if said := s.engine.explain(err); said != nil {
		err = said
	}
	return fmt.Errorf("%s: %w", s.engine.name(), err)
}

// wrong says what is wrong with what was to be kept, where that is what the engine complains of; else nil.
func (s *Store) wrong(err error) error {
	var own *Error
	if said := s.engine.explain(err); errors.As(said, &own) || errors.Is(said, ErrNotFound) {
		return said
	}
	return nil
}

// ErrNotFound is returned for what is not in the register.
var ErrNotFound = errors.New("is not in the register")

// Error is a fault in what was to be kept.
type Error struct{ What, Expected, Do string }

func (e *Error) Error() string { return e.What + "; expected " + e.Expected + "; " + e.Do }
