package store

import (
	"bytes"
	"context"
	"database/sql"
	"database/sql/driver"
	"embed"
	"errors"
	"fmt"
	"io/fs"
	"net/url"
	"os"
	"path/filepath"
	"strings"

	"modernc.org/sqlite"
)

//go:embed schema/*.sql
var schema embed.FS

// application marks a file as a register, so that another program's database is not taken for one.
const application = 0x45565331 // "EVS1"

// wholeCheck is the size up to which a file is looked through at every start. A larger one would keep
// the user waiting; its backups are looked through all the same.
const wholeCheck = 64 << 20 // bytes

func init() {
	// The engine's own lower knows ASCII only.
	sqlite.MustRegisterDeterministicScalarFunction("lower", 1, func(_ *sqlite.FunctionContext, args []driver.Value) (driver.Value, error) {
		if s, ok := args[0].(string); ok {
			return strings.ToLower(s), nil
		}
		return args[0], nil
	})
}

// sqliteFile is the engine of a register in one file.
type sqliteFile struct {
	path string
	key  string // under which opened knows it; "" while it is not open
}

func (e *sqliteFile) name() string { return e.path }

func (e *sqliteFile) open() (write, read *sql.DB, err error) {
	key := place(e.path)
	if err := opened.add(key, func() error { return precheck(e.path) }); err != nil {
		return nil, nil, err
	}
	e.key = key
	defer func() {
		if err != nil {
			e.closed()
		}
	}()
	if err := os.MkdirAll(filepath.Dir(e.path), 0o755); err != nil {
		return nil, nil, fmt.Errorf("%s: its folder cannot be made: %w; expected a folder that can be written to", e.path, err)
	}
	if write, err = openFile(e.path, "rwc"); err != nil {
		return nil, nil, err
	}
	write.SetMaxOpenConns(1)
	if err := e.look(write); err != nil {
		write.Close()
		return nil, nil, err
	}
	if read, err = openFile(e.path, "rw"); err != nil {
		write.Close()
		return nil, nil, err
	}
	read.SetMaxOpenConns(4)
	return write, read, nil
}

func (e *sqliteFile) closed() {
	if e.key != "" {
		opened.remove(e.key)
		e.key = ""
	}
}

func openFile(path, mode string) (*sql.DB, error) {
	q := url.Values{}
	q.Set("mode", mode)
	pragmas := []string{"busy_timeout(5000)", "journal_mode(WAL)", "foreign_keys(1)", "synchronous(FULL)", "secure_delete(1)"} // a name that was erased is gone from the file
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
	slashed := filepath.ToSlash(abs)
	if !strings.HasPrefix(slashed, "/") { // a drive letter
		slashed = "/" + slashed
	}
	u := url.URL{Scheme: "file", Path: slashed, RawQuery: q.Encode()}
	db, err := sql.Open("sqlite", u.String())
	if err != nil {
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	return db, nil
}

// precheck looks at a file without the engine, which would write to it. The file must not be open in
// this process: closing it here would give up the engine's locks.
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
	case pendingLog(path): // the head may be out of date: the engine is asked in its place
		return nil
	case be32(head[68:]) != application:
		return otherProgram(path)
	}
	page := int64(head[16])<<8 | int64(head[17])
	if page == 1 {
		page = 65536
	}
	if pages := int64(be32(head[28:])); page*pages > info.Size() {
		return fmt.Errorf("%s: %w: it has %d bytes of %d; expected the whole file; restore a backup", path, ErrDamaged, info.Size(), page*pages)
	}
	if have, known := int(be32(head[60:])), knownSchema(); have > known {
		return newer(path, have, known)
	}
	return nil
}

func otherProgram(path string) error {
	return fmt.Errorf("%s: %w but another program's database; expected a file that this program made; choose another name", path, ErrForeign)
}

// pendingLog says whether a write-ahead log lies beside a file.
func pendingLog(path string) bool {
	info, err := os.Stat(path + "-wal")
	return err == nil && info.Size() > 0
}

func be32(b []byte) uint32 {
	return uint32(b[0])<<24 | uint32(b[1])<<16 | uint32(b[2])<<8 | uint32(b[3])
}

func knownSchema() int {
	all, _ := fs.Glob(schema, "schema/*.sql")
	return len(all)
}

// look asks the engine what precheck could not know.
func (e *sqliteFile) look(db *sql.DB) error {
	fail := func(err error) error {
		if said := e.explain(err); said != nil {
			return fmt.Errorf("%s: %w", e.path, said)
		}
		return fmt.Errorf("%s: %w; expected a register that can be written to", e.path, err)
	}
	var mark, tables, pages, size int64
	for text, into := range map[string]*int64{
		"PRAGMA application_id": &mark, "SELECT count(*) FROM sqlite_master": &tables, "PRAGMA page_count": &pages, "PRAGMA page_size": &size,
	} {
		if err := db.QueryRow(text).Scan(into); err != nil {
			return fail(err)
		}
	}
	switch {
	case tables == 0:
		return nil
	case mark != application:
		return otherProgram(e.path)
	case pages*size > wholeCheck:
		return nil
	}
	return sound(db, e.path, "quick_check")
}

// sound runs one of the engine's checks of a whole file.
func sound(db *sql.DB, path, check string) error {
	var said string
	if err := db.QueryRow("PRAGMA " + check + "(1)").Scan(&said); err != nil {
		return fmt.Errorf("%s: %w (%w); expected a sound file; restore a backup", path, ErrDamaged, err)
	}
	if said != "ok" {
		return fmt.Errorf("%s: %w (%s); expected a sound file; restore a backup", path, ErrDamaged, strings.Join(strings.Fields(said), " "))
	}
	return nil
}

func (e *sqliteFile) migrations() fs.FS {
	sub, err := fs.Sub(schema, "schema")
	if err != nil { // the folder is part of the program
		return schema
	}
	return sub
}

func (e *sqliteFile) version(db *sql.DB) (n int, err error) {
	err = db.QueryRow("PRAGMA user_version").Scan(&n)
	return n, err
}

func (e *sqliteFile) mark(tx *sql.Tx, version int) error {
	_, err := tx.Exec(fmt.Sprintf("PRAGMA application_id = %d; PRAGMA user_version = %d", application, version)) // a pragma takes no parameters
	return err
}

// settle brings the mark into the file's own head, where precheck looks.
func (e *sqliteFile) settle(db *sql.DB) error {
	_, err := db.Exec("PRAGMA wal_checkpoint(TRUNCATE)")
	return err
}

// Result codes of the engine, by its list of result and extended result codes.
const (
	codeBusy       = 5
	codeReadOnly   = 8
	codeCorrupt    = 11
	codeFull       = 13
	codeNoDatabase = 26
	codeForeignKey = 787
	codePrimaryKey = 1555
	codeUnique     = 2067
)

func (e *sqliteFile) explain(err error) error {
	var own *sqlite.Error
	if !errors.As(err, &own) {
		return nil
	}
	switch own.Code() {
	case codeUnique, codePrimaryKey:
		_, column, _ := strings.Cut(own.Error(), "constraint failed: ")
		column, _, _ = strings.Cut(strings.TrimPrefix(column, "UNIQUE constraint failed: "), " ")
		return bad(column+" is there already", "each once", "choose another, or change the one that is there")
	case codeForeignKey:
		return fmt.Errorf("what this belongs to %w; expected a room, station, monitor or visit that is there; look at the register again", ErrNotFound)
	}
	switch own.Code() & 0xff {
	case codeBusy:
		return fmt.Errorf("another program writes to the register and does not end: %w; close it and try again", err)
	case codeFull:
		return fmt.Errorf("the disk is full: %w; nothing that was kept is lost; make room and try again", err)
	case codeReadOnly:
		return fmt.Errorf("the file may not be written to: %w; expected a register of this user's own; check its permissions", err)
	case codeCorrupt, codeNoDatabase:
		return fmt.Errorf("%w (%w); expected the whole file; restore a backup", ErrDamaged, err)
	}
	return nil
}

func (e *sqliteFile) copyTo(ctx context.Context, db *sql.DB, path string) error {
	_, err := db.ExecContext(ctx, "VACUUM INTO $1", path)
	if err == nil {
		err = checkCopy(path)
	}
	return err
}

// checkCopy opens a copy as Open would and looks through all of it.
func checkCopy(path string) error {
	if opened.has(place(path)) {
		return fmt.Errorf("%s: is the register that is open; expected a copy of it; name the copy", path)
	}
	if err := precheck(path); err != nil {
		return err
	}
	if pendingLog(path) {
		return fmt.Errorf("%s: %w but a register in use: a write-ahead log lies beside it; expected a file that a backup wrote; close what uses it", path, errNoCopy)
	}
	db, err := openFile(path, "ro")
	if err != nil {
		return err
	}
	defer db.Close()
	return sound(db, path, "integrity_check")
}

var errNoCopy = errors.New("is no backup")
