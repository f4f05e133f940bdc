// Package store keeps a site's register: rooms, stations, monitors, meters and persons, visits while
// they are measured, and sealed records. It keeps what it is given in one SQLite file and judges
// nothing. A reading is on disk when the call that adds it returns.
package store

import (
	"bytes"
	"context"
	"crypto/sha256"
	"database/sql"
	"embed"
	"encoding/hex"
	"errors"
	"fmt"
	"io/fs"
	"net/url"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"time"

	_ "modernc.org/sqlite" // the engine, by its name "sqlite"
)

//go:embed schema/*.sql
var schema embed.FS

// application marks a file as a register, so that another program's database is not taken for one.
const application = 0x45565331 // "EVS1"

// What Open refuses.
var (
	ErrForeign = errors.New("is no register")
	ErrNewer   = errors.New("is a register of a newer program")
	ErrDamaged = errors.New("is a damaged register")
)

// Store is an open register. Its methods may be called from several goroutines.
type Store struct {
	path     string
	write    *sql.DB // one connection: writers queue here and not in the file
	read     *sql.DB
	warnings []string
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
func Open(path string) (*Store, error) {
	if err := precheck(path); err != nil {
		return nil, err
	}
	if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
		return nil, fmt.Errorf("%s: its folder cannot be made: %w; expected a folder that can be written to", path, err)
	}
	s := &Store{path: path}
	if w := networkWarning(path); w != "" {
		s.warnings = append(s.warnings, w)
	}
	var err error
	if s.write, err = open(path, "rwc"); err != nil {
		return nil, err
	}
	s.write.SetMaxOpenConns(1)
	if err := s.migrate(); err != nil {
		s.write.Close()
		return nil, err
	}
	if s.read, err = open(path, "rw"); err != nil {
		s.write.Close()
		return nil, err
	}
	s.read.SetMaxOpenConns(4)
	return s, nil
}

func open(path, mode string) (*sql.DB, error) {
	q := url.Values{}
	q.Set("mode", mode)
	pragmas := []string{"busy_timeout(5000)", "journal_mode(WAL)", "foreign_keys(1)", "synchronous(FULL)"}
	if mode == "ro" {
		pragmas = pragmas[:1]
	}
	for _, p := range pragmas {
		q.Add("_pragma", p)
	}
	q.Set("_txlock", "immediate")
	abs, err := filepath.Abs(path)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	u := url.URL{Scheme: "file", Path: filepath.ToSlash(abs), RawQuery: q.Encode()}
	db, err := sql.Open("sqlite", u.String())
	if err != nil {
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	return db, nil
}

// precheck looks at a file without the engine, which would write to it.
func precheck(path string) error {
	f, err := os.Open(path)
	if errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	if err != nil {
		return fmt.Errorf("%s: %w; expected a register that can be read", path, err)
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	if info.IsDir() {
		return fmt.Errorf("%s: %w: it is a folder; expected a file; name the file in it", path, ErrForeign)
	}
	if info.Size() == 0 {
		return nil
	}
	head := make([]byte, 100)
	n, _ := f.ReadAt(head, 0)
	// The first 100 bytes, by the description of the SQLite file format, section 1.3.
	switch {
	case n < 100 || !bytes.HasPrefix(head, []byte("SQLite format 3\x00")):
		return fmt.Errorf("%s: %w; expected a file that this program made; choose another name", path, ErrForeign)
	case be32(head[68:]) != application && !pendingLog(path):
		return fmt.Errorf("%s: %w but another program's database; expected a file that this program made; choose another name", path, ErrForeign)
	}
	page := int64(head[16])<<8 | int64(head[17])
	if page == 1 {
		page = 65536
	}
	if pages := int64(be32(head[28:])); page*pages > info.Size() {
		return fmt.Errorf("%s: %w: it has %d bytes of %d; expected the whole file; restore a backup", path, ErrDamaged, info.Size(), page*pages)
	}
	return nil
}

// pendingLog says whether a write-ahead log lies beside a file: then its head may be out of date, and
// the engine is asked in its place.
func pendingLog(path string) bool {
	info, err := os.Stat(path + "-wal")
	return err == nil && info.Size() > 0
}

func be32(b []byte) uint32 {
	return uint32(b[0])<<24 | uint32(b[1])<<16 | uint32(b[2])<<8 | uint32(b[3])
}

// migrate brings the schema up to date: numbered files, each in one transaction, each remembered with
// its hash.
func (s *Store) migrate() error {
	fail := func(err error) error {
		if strings.Contains(err.Error(), "malformed") || strings.Contains(err.Error(), "not a database") {
			return fmt.Errorf("%s: %w (%w); expected the whole file; restore a backup", s.path, ErrDamaged, err)
		}
		return fmt.Errorf("%s: %w; expected a register that can be written to", s.path, err)
	}
	files, err := fs.Glob(schema, "schema/*.sql")
	if err != nil {
		return fail(err)
	}
	var have int
	if err := s.write.QueryRow("PRAGMA user_version").Scan(&have); err != nil {
		return fail(err)
	}
	if have > len(files) {
		return fmt.Errorf("%s: %w (schema %d, known %d); expected an older one; use the newer program", s.path, ErrNewer, have, len(files))
	}
	if have > 0 {
		var ok string
		if err := s.write.QueryRow("PRAGMA quick_check(1)").Scan(&ok); err != nil || ok != "ok" {
			return fmt.Errorf("%s: %w (%s); expected a sound file; restore a backup", s.path, ErrDamaged, strings.Join(strings.Fields(ok), " "))
		}
	}
	var mark, tables int
	if err := s.write.QueryRow("PRAGMA application_id").Scan(&mark); err != nil {
		return fail(err)
	}
	if err := s.write.QueryRow("SELECT count(*) FROM sqlite_master").Scan(&tables); err != nil {
		return fail(err)
	}
	if tables > 0 && mark != application {
		return fmt.Errorf("%s: %w but another program's database; expected a file that this program made; choose another name", s.path, ErrForeign)
	}
	for i := have; i < len(files); i++ {
		text, err := schema.ReadFile(files[i])
		if err != nil {
			return fail(err)
		}
		sum := sha256.Sum256(text)
		tx, err := s.write.Begin()
		if err != nil {
			return fail(err)
		}
		_, err = tx.Exec("CREATE TABLE IF NOT EXISTS migrations (number INTEGER PRIMARY KEY, sha256 TEXT NOT NULL, time TEXT NOT NULL)")
		if err == nil {
			_, err = tx.Exec(string(text))
		}
		if err == nil {
			_, err = tx.Exec("INSERT INTO migrations (number, sha256, time) VALUES ($1, $2, $3)", i+1, hex.EncodeToString(sum[:]), instant(time.Now()))
		}
		if err == nil { // a pragma takes no parameters
			_, err = tx.Exec(fmt.Sprintf("PRAGMA application_id = %d; PRAGMA user_version = %d", application, i+1))
		}
		if err != nil {
			_ = tx.Rollback()
			return fail(err)
		}
		if err := tx.Commit(); err != nil {
			return fail(err)
		}
		if _, err := s.write.Exec("PRAGMA wal_checkpoint(TRUNCATE)"); err != nil { // the mark belongs in the file's own head
			return fail(err)
		}
	}
	return nil
}

// Path is the file that the register lies in.
func (s *Store) Path() string { return s.path }

// Warnings says what is unwise about the place of the file; a line each.
func (s *Store) Warnings() []string { return s.warnings }

// Close closes the register.
func (s *Store) Close() error { return errors.Join(s.read.Close(), s.write.Close()) }

// instant is how times stand in the register: RFC 3339, UTC.
func instant(t time.Time) string { return t.UTC().Format(time.RFC3339Nano) }

// in runs do in one transaction that is on disk when in returns.
func (s *Store) in(ctx context.Context, do func(*sql.Tx) error) error {
	tx, err := s.write.BeginTx(ctx, nil)
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
	switch text := err.Error(); {
	case errors.As(err, &own), errors.Is(err, context.Canceled), errors.Is(err, ErrNotFound):
		return err
	case strings.Contains(text, "SQLITE_BUSY"):
		return fmt.Errorf("%s: another program writes to the register and does not end: %w; close it and try again", s.path, err)
	case strings.Contains(text, "SQLITE_FULL"):
		return fmt.Errorf("%s: the disk is full: %w; nothing that was kept is lost; make room and try again", s.path, err)
	}
	return fmt.Errorf("%s: %w", s.path, err)
}

// ErrNotFound is returned for what is not in the register.
var ErrNotFound = errors.New("is not in the register")

// Error is a fault in what was to be kept.
type Error struct{ What, Expected, Do string }

func (e *Error) Error() string { return e.What + "; expected " + e.Expected + "; " + e.Do }

// networkWarning says that a file lies on a network share, where several computers' locks do not hold.
func networkWarning(path string) string {
	mounts, err := os.ReadFile("/proc/mounts")
	if err != nil {
		return "" // no such list on this system
	}
	abs, err := filepath.Abs(path)
	if err != nil {
		return ""
	}
	return networkMount(string(mounts), abs)
}

func networkMount(mounts, path string) string {
	best, kind := "", ""
	for _, line := range strings.Split(mounts, "\n") {
		f := strings.Fields(line)
		if len(f) < 3 {
			continue
		}
		at := strings.NewReplacer(`\040`, " ", `\011`, "\t", `\134`, `\`).Replace(f[1])
		inside := path == at || strings.HasPrefix(path, strings.TrimSuffix(at, "/")+"/")
		if inside && len(at) >= len(best) {
			best, kind = at, f[2]
		}
	}
	for _, k := range []string{"nfs", "nfs4", "cifs", "smb3", "smbfs", "9p", "fuse.sshfs", "afs", "ncpfs", "ceph", "glusterfs"} {
		if kind == k {
			return fmt.Sprintf("%s lies on a network share (%s at %s): two computers that write to it at once may damage it; keep the register on a disk of this computer and share backups", path, kind, best)
		}
	}
	return ""
}
