package store

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// TestLocksAreKept looks at the system's list of locks: a register that this process opens twice, or takes
// for a backup, stays locked (sqlite.org, "How To Corrupt An SQLite Database File", 2.2: POSIX advisory
// locks cancelled by a separate thread doing close()).
func TestLocksAreKept(t *testing.T) {
	dir := t.TempDir()
	path, link := filepath.Join(dir, "register.db"), filepath.Join(dir, "link.db")
	s := openAt(t, path)
	must[int64](t)(s.SaveRoom(Room{Name: "first"}))
	if !locked(t, path) {
		t.Skip("the system does not list the lock of an open register")
	}
	if err := os.Symlink(path, link); err != nil {
		t.Fatal(err)
	}
	for _, at := range []string{path, link} {
		if err := precheckOf(at); err != nil {
			t.Error(err)
		}
		if !locked(t, path) {
			t.Fatalf("opening %s a second time gave up the lock", at)
		}
		if err := checkCopy(at); err == nil {
			t.Error("the register was taken for a copy of it")
		}
		if !locked(t, path) {
			t.Fatalf("looking at %s as at a backup gave up the lock", at)
		}
	}
}

// precheckOf is what Open does before the engine is asked.
func precheckOf(path string) error {
	key := place(path)
	if err := opened.add(key, func() error { return precheck(path) }); err != nil {
		return err
	}
	opened.remove(key)
	return nil
}

// locked says whether this process holds a lock on a file, by /proc/locks (proc(5)).
func locked(t *testing.T, path string) bool {
	t.Helper()
	info := must[os.FileInfo](t)(os.Stat(path))
	list := must[[]byte](t)(os.ReadFile("/proc/locks"))
	for _, line := range strings.Split(string(list), "\n") {
		f := strings.Fields(line)
		if len(f) > 5 && f[4] == fmt.Sprint(os.Getpid()) && strings.HasSuffix(f[5], fmt.Sprintf(":%d", info.Sys().(*syscall.Stat_t).Ino)) {
			return true
		}
	}
	return false
}
