package store

import (
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// Backup writes a whole copy of the register to a new file and checks it. It does not disturb those who
// work with the register. A file that is there is left alone; the error then wraps fs.ErrExist.
func (s *Store) Backup(path string) (err error) {
	if _, err := os.Lstat(path); err == nil {
		return fmt.Errorf("%s: is there already: %w; expected a new file; choose another name", path, fs.ErrExist)
	}
	beside, err := emptyBeside(path)
	if err != nil {
		return fmt.Errorf("%s: %w; expected a folder that can be written to", path, err)
	}
	defer os.Remove(beside)
	if err := s.engine.copyTo(context.Background(), s.reader(), beside); err != nil {
		if said := s.engine.explain(err); said != nil {
			err = said
		}
		return fmt.Errorf("%s: the copy was not written: %w; expected room on the disk and a sound register", path, err)
	}
	if err := syncFile(beside); err != nil {
		return fmt.Errorf("%s: %w; expected room on the disk", path, err)
	}
	if err := os.Link(beside, path); errors.Is(err, fs.ErrExist) { // unlike a move, a link never replaces
		return fmt.Errorf("%s: is there already: %w; expected a new file; choose another name", path, fs.ErrExist)
	} else if err != nil { // a file system without links
		if err := os.Rename(beside, path); err != nil {
			return fmt.Errorf("%s: %w", path, err)
		}
	}
	syncFolder(path)
	return nil
}

// RestoreFrom is Restore for a register that this program has open: it is closed, replaced and opened
// again. Where that fails the register is open as it was, or the error says that it is not.
func (s *Store) RestoreFrom(backup string, now time.Time) (kept string, err error) {
	path := s.Path()
	if err := checkBackup(backup); err != nil {
		return "", err
	}
	if err := s.Close(); err != nil {
		return "", fmt.Errorf("%s: %w", path, err)
	}
	kept, err = Restore(backup, path, now)
	again, errOpen := Open(path)
	if errOpen != nil {
		return kept, errors.Join(err, errOpen)
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	s.engine, s.write, s.read = again.engine, again.write, again.read
	return kept, err
}

// Restore puts a backup in the place of a register that nobody has open. The backup is checked first;
// the register that was there is kept beside it under a name with the time, which is returned ("" where
// there was none). A register that another program has open is refused.
func Restore(backup, register string, now time.Time) (kept string, err error) {
	if err := checkBackup(backup); err != nil {
		return "", err
	}
	if opened.has(place(register)) {
		return "", fmt.Errorf("%s: %w; expected one that nobody has open; close it first", register, ErrInUse)
	}
	if err := os.MkdirAll(filepath.Dir(register), 0o755); err != nil {
		return "", fmt.Errorf("%s: its folder cannot be made: %w; expected a folder that can be written to", register, err)
	}
	beside, err := emptyBeside(register)
	if err == nil {
		err = copyFile(backup, beside)
		defer os.Remove(beside)
	}
	if err != nil {
		return "", fmt.Errorf("%s: %w; expected a folder that can be written to and room on the disk; nothing was changed", register, err)
	}
	if _, err := os.Lstat(register); err == nil {
		if err := fold(register); err != nil {
			return "", err
		}
		if kept, err = setAside(register, now); err != nil {
			return "", err
		}
	}
	if err := os.Rename(beside, register); err != nil {
		return kept, fmt.Errorf("%s: %w; the register that was there is kept as %s; give it its name back", register, err, kept)
	}
	syncFolder(register)
	return kept, nil
}

// ErrInUse is returned where a register that is open is to be replaced.
var ErrInUse = errors.New("is in use")

func checkBackup(path string) error {
	if _, err := os.Stat(path); err != nil {
		return fmt.Errorf("%s: %w; expected a backup; check the path", path, err)
	}
	if err := checkCopy(path); err != nil {
		return fmt.Errorf("the backup is not sound, nothing was changed: %w", err)
	}
	return nil
}

// fold brings what stands in the write-ahead log into the file. The engine leaves its log only where
// nobody else has the file open. A damaged register stays as it is.
func fold(register string) error {
	if precheck(register) != nil {
		return nil
	}
	db, err := openFile(register, "rw")
	if err != nil {
		return nil
	}
	defer db.Close()
	db.SetMaxOpenConns(1)
	if _, err := db.Exec("PRAGMA busy_timeout = 500"); err != nil {
		return nil
	}
	var mode string
	err = db.QueryRow("PRAGMA journal_mode = DELETE").Scan(&mode)
	if err != nil && strings.Contains(err.Error(), "locked") || err == nil && mode == "wal" {
		return fmt.Errorf("%s: another program has it open, it %w; expected a register that nobody has open; close it and try again", register, ErrInUse)
	}
	return nil
}

// setAside gives a register, and a log that could not be folded into it, a name with the time.
func setAside(register string, now time.Time) (string, error) {
	stamped := register + "." + now.UTC().Format("20060102T150405Z")
	kept := stamped
	for n := 2; ; n++ { // twice in one second
		if _, err := os.Lstat(kept); errors.Is(err, fs.ErrNotExist) {
			break
		}
		kept = fmt.Sprintf("%s.%d", stamped, n)
	}
	for _, tail := range []string{"-wal", "-shm", ""} {
		if err := os.Rename(register+tail, kept+tail); err != nil && (tail == "" || !errors.Is(err, fs.ErrNotExist)) {
			return "", fmt.Errorf("%s: cannot be set aside: %w; expected a folder that can be written to; nothing was changed", register, err)
		}
	}
	return kept, nil
}

// emptyBeside makes an empty file in the folder of path.
func emptyBeside(path string) (string, error) {
	f, err := os.CreateTemp(filepath.Dir(path), ".evenstep-*")
	if err != nil {
		return "", err
	}
	if err := errors.Join(f.Chmod(0o644), f.Close()); err != nil {
		os.Remove(f.Name())
		return "", err
	}
	return f.Name(), nil
}

func copyFile(from, to string) error {
	in, err := os.Open(from)
	if err != nil {
		return err
	}
	defer in.Close()
	out, err := os.OpenFile(to, os.O_WRONLY|os.O_TRUNC, 0)
	if err != nil {
		return err
	}
	_, err = io.Copy(out, in)
	return errors.Join(err, out.Sync(), out.Close())
}

func syncFile(path string) error {
	f, err := os.OpenFile(path, os.O_RDWR, 0)
	if err != nil {
		return err
	}
	return errors.Join(f.Sync(), f.Close())
}

// syncFolder lets a name outlive a power cut; not every system can.
func syncFolder(path string) {
	if d, err := os.Open(filepath.Dir(path)); err == nil {
		_ = d.Sync()
		d.Close()
	}
}
