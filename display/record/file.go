package record

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
)

// WriteFile writes a whole file or none: beside its place under another name, to the disk, then moved
// there. Without replace it leaves a file that is there alone; the error then wraps fs.ErrExist.
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
	if err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	if d, e := os.Open(dir); e == nil { // so that the name outlives a power cut; not every system can
		_ = d.Sync()
		d.Close()
	}
	return nil
}
