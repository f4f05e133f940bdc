package store

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"time"
)

// Backup writes a whole copy of the register to a new file and checks it. It does not disturb those who
// work with the register. A file that is there is left alone; the error then wraps fs.ErrExist.
func (s *Store) Backup(path string) error {
	if _, err := os.Lstat(path); err == nil {
		return fmt.Errorf("%s: is there already: %w; expected a new file; choose another name", path, fs.ErrExist)
	}
	beside := path + ".part"
	_ = os.Remove(beside)
	if _, err := s.read.Exec("VACUUM INTO $1", beside); err != nil {
		_ = os.Remove(beside)
		return fmt.Errorf("%s: the copy was not written: %w; expected room on the disk and a folder that can be written to", path, err)
	}
	err := checkCopy(beside)
	if err == nil {
		err = syncFile(beside)
	}
	if err == nil {
		err = os.Rename(beside, path)
	}
	if err != nil {
		_ = os.Remove(beside)
		return fmt.Errorf("%s: %w", path, err)
	}
	return nil
}

// checkCopy opens a copy as Open would and looks through all of it.
func checkCopy(path string) error {
	if err := precheck(path); err != nil {
		return err
	}
	db, err := open(path, "ro")
	if err != nil {
		return err
	}
	defer db.Close()
	var ok string
	if err := db.QueryRow("PRAGMA integrity_check(1)").Scan(&ok); err != nil || ok != "ok" {
		return errors.Join(fmt.Errorf("%s: %w (%s)", path, ErrDamaged, ok), err)
	}
	return nil
}

func syncFile(path string) error {
	f, err := os.OpenFile(path, os.O_RDWR, 0)
	if err != nil {
		return err
	}
	return errors.Join(f.Sync(), f.Close())
}

// RestoreFrom is Restore for a register that this program has open: it is closed, replaced and opened
// again. Where that fails the register is open as it was, or the error says that it is not.
func (s *Store) RestoreFrom(backup string, now time.Time) (kept string, err error) {
	if err := checkCopy(backup); err != nil {
		return "", fmt.Errorf("the backup is not sound, nothing was changed: %w", err)
	}
	if err := s.Close(); err != nil {
		return "", fmt.Errorf("%s: %w", s.path, err)
	}
	kept, err = Restore(backup, s.path, now)
	again, errOpen := Open(s.path)
	if errOpen != nil {
		return kept, errors.Join(err, errOpen)
	}
	s.write, s.read = again.write, again.read
	return kept, err
}

// Restore puts a backup in the place of a register that nobody has open. The backup is checked first;
// the register that was there is kept beside it under a name with the time, which is returned ("" where
// there was none).
func Restore(backup, register string, now time.Time) (kept string, err error) {
	if _, err := os.Stat(backup); err != nil {
		return "", fmt.Errorf("%s: %w; expected a backup; check the path", backup, err)
	}
	if err := checkCopy(backup); err != nil {
		return "", fmt.Errorf("the backup is not sound, nothing was changed: %w", err)
	}
	if err := os.MkdirAll(filepath.Dir(register), 0o755); err != nil {
		return "", fmt.Errorf("%s: %w", register, err)
	}
	if _, err := os.Stat(register); err == nil {
		// What still stands in the write-ahead log goes into the file before it is set aside.
		old, err := open(register, "rw")
		if err == nil {
			_, err = old.Exec("PRAGMA wal_checkpoint(TRUNCATE)")
			err = errors.Join(err, old.Close())
		}
		kept = register + "." + now.UTC().Format("20060102T150405Z")
		_ = err // a damaged register is set aside as it is
	}
	text, err := os.ReadFile(backup)
	if err != nil {
		return "", fmt.Errorf("%s: %w", backup, err)
	}
	beside := register + ".part"
	if err = os.WriteFile(beside, text, 0o644); err == nil {
		err = syncFile(beside)
	}
	if err == nil && kept != "" {
		err = os.Rename(register, kept)
	}
	if err == nil {
		for _, tail := range []string{"-wal", "-shm"} {
			_ = os.Remove(register + tail)
		}
		err = os.Rename(beside, register)
	}
	if err != nil {
		_ = os.Remove(beside)
		return kept, fmt.Errorf("%s: %w; expected a folder that can be written to; the register that was there is untouched or kept as %s", register, err, kept)
	}
	return kept, nil
}
