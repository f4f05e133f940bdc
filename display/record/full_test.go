//go:build linux || darwin

package record

import (
	"bytes"
	"os"
	"os/signal"
	"path/filepath"
	"syscall"
	"testing"
)

// TestWriteFileOnFullDisk bounds the size of files, which fails a write halfway as a full disk does.
func TestWriteFileOnFullDisk(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "r.json")
	if err := WriteFile(path, []byte("old"), false); err != nil {
		t.Fatal(err)
	}
	var before syscall.Rlimit
	if err := syscall.Getrlimit(syscall.RLIMIT_FSIZE, &before); err != nil {
		t.Skip(err)
	}
	signal.Ignore(syscall.SIGXFSZ)
	defer signal.Reset(syscall.SIGXFSZ)
	if err := syscall.Setrlimit(syscall.RLIMIT_FSIZE, &syscall.Rlimit{Cur: 4096, Max: before.Max}); err != nil {
		t.Skip(err)
	}
	err := WriteFile(path, bytes.Repeat([]byte("n"), 8192), true)
	if back := syscall.Setrlimit(syscall.RLIMIT_FSIZE, &before); back != nil {
		t.Fatal(back)
	}
	if err == nil {
		t.Error("a file larger than allowed was written")
	}
	if b, err := os.ReadFile(path); err != nil || string(b) != "old" {
		t.Errorf("%q, %v; want the old file", b, err)
	}
	if left, err := os.ReadDir(dir); err != nil || len(left) != 1 {
		t.Errorf("left behind: %v, %v", left, err)
	}
}
