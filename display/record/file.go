package record

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"syscall"
)

// WriteFile writes a whole file or none: beside its place under another name, to the disk, then moved
// there. Without replace it leaves another file that is there alone; the error then wraps fs.ErrExist.
// A file that holds text already is as good as written.
func WriteFile(path string, text []byte, replace bool) (err error) {
	dir := filepath.Dir(path)
	f, err := os.CreateTemp(dir, ".evenstep-*")
	if err != nil {
		return fmt.Errorf("%s: %w; expected a folder that can be written to", path, err)
	}
	beside := f.Name()
	defer func() {
		if err != nil {
			f.Close()
			os.Remove(beside)
		}
	}()
	if _, err = f.Write(text); err == nil {
		err = f.Chmod(0o644)
	}
	if err == nil {
		err = f.Sync()
	}
	if err == nil {
		err = f.Close()
	}
	if err != nil {
		return fmt.Errorf("%s: %w; expected room on the disk; what was there is untouched", path, err)
	}
	if replace {
		err = os.Rename(beside, path)
	} else if err = os.Link(beside, path); err == nil { // unlike a move, a link never replaces
		err = os.Remove(beside)
	} else if !errors.Is(err, fs.ErrExist) { // a file system without links
		if _, there := os.Lstat(path); there == nil {
			err = &fs.PathError{Op: "write", Path: path, Err: fs.ErrExist}
		} else {
			err = os.Rename(beside, path)
		}
	}
	if errors.Is(err, fs.ErrExist) && !replace {
		if holds(path, text) {
			os.Remove(beside)
			return syncFolder(path)
		}
		return fmt.Errorf("%s: %w; expected no file there; choose another name or remove it", path, fs.ErrExist)
	}
	if err != nil {
		return fmt.Errorf("%s: %w; expected a place for a file; choose another name", path, err)
	}
	return syncFolder(path)
}

func holds(path string, text []byte) bool {
	info, err := os.Lstat(path)
	if err != nil || !info.Mode().IsRegular() || info.Size() != int64(len(text)) {
		return false
	}
	there, err := os.ReadFile(path)
	return err == nil && bytes.Equal(there, text)
}

// syncFolder makes the name of a file outlive a power cut. Windows cannot, nor can some file systems
// elsewhere; there is nothing to be done about it then.
func syncFolder(path string) error {
	if runtime.GOOS == "windows" {
		return nil
	}
	d, err := os.Open(filepath.Dir(path))
	if errors.Is(err, fs.ErrPermission) {
		return nil // a folder that may be written to and not be read
	}
	if err == nil {
		err = d.Sync()
		d.Close()
	}
	if err != nil && !errors.Is(err, errors.ErrUnsupported) && !errors.Is(err, syscall.EINVAL) {
		return fmt.Errorf("%s: the file is written, but its folder may not be on the disk: %w; expected a sound disk; write it again", path, err)
	}
	return nil
}
