package store

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func TestBackupAndRestore(t *testing.T) {
	s := newStore(t)
	must[int64](t)(s.SaveRoom(Room{Name: "before"}))
	copyPath := filepath.Join(t.TempDir(), "backup.db")
	if err := s.Backup(copyPath); err != nil {
		t.Fatal(err)
	}
	if err := s.Backup(copyPath); !errors.Is(err, fs.ErrExist) {
		t.Errorf("written over: %v", err)
	}
	must[int64](t)(s.SaveRoom(Room{Name: "after"}))
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	if _, err := Restore(filepath.Join(t.TempDir(), "none"), s.Path(), noon); err == nil {
		t.Error("restored from nothing")
	}
	bad := filepath.Join(t.TempDir(), "bad.db")
	if err := os.WriteFile(bad, []byte("no database, but long enough to be looked at in the first hundred bytes of what it says it is, or not"), 0o644); err != nil {
		t.Fatal(err)
	}
	if _, err := Restore(bad, s.Path(), noon); !errors.Is(err, ErrForeign) {
		t.Errorf("%v; want %v", err, ErrForeign)
	}
	kept, err := Restore(copyPath, s.Path(), noon)
	if err != nil {
		t.Fatal(err)
	}
	again := must[*Store](t)(Open(s.Path()))
	defer again.Close()
	if rooms := must[[]Room](t)(again.Rooms()); len(rooms) != 1 || rooms[0].Name != "before" {
		t.Errorf("%+v", rooms)
	}
	old := must[*Store](t)(Open(kept))
	defer old.Close()
	if rooms := must[[]Room](t)(old.Rooms()); len(rooms) != 2 {
		t.Errorf("what was set aside has %+v", rooms)
	}
}

// TestRestoreWhileOpen replaces a register that is open and goes on with it.
func TestRestoreWhileOpen(t *testing.T) {
	s := newStore(t)
	must[int64](t)(s.SaveRoom(Room{Name: "before"}))
	copyPath := filepath.Join(t.TempDir(), "backup.db")
	if err := s.Backup(copyPath); err != nil {
		t.Fatal(err)
	}
	must[int64](t)(s.SaveRoom(Room{Name: "after"}))
	if _, err := s.RestoreFrom(filepath.Join(t.TempDir(), "none.db"), noon); err == nil {
		t.Error("restored from nothing")
	}
	if rooms := must[[]Room](t)(s.Rooms()); len(rooms) != 2 {
		t.Errorf("a failed restore changed the register: %+v", rooms)
	}
	if _, err := s.RestoreFrom(copyPath, noon); err != nil {
		t.Fatal(err)
	}
	must[int64](t)(s.SaveRoom(Room{Name: "later"}))
	if rooms := must[[]Room](t)(s.Rooms()); len(rooms) != 2 || rooms[0].Name != "before" || rooms[1].Name != "later" {
		t.Errorf("%+v", rooms)
	}
}

// TestRestoreInUse: a register that another handle has open is not taken from under it.
func TestRestoreInUse(t *testing.T) {
	s := newStore(t)
	must[int64](t)(s.SaveRoom(Room{Name: "before"}))
	copyPath := filepath.Join(t.TempDir(), "backup.db")
	if err := s.Backup(copyPath); err != nil {
		t.Fatal(err)
	}
	must[int64](t)(s.SaveRoom(Room{Name: "after"}))
	if _, err := Restore(copyPath, s.Path(), noon); !errors.Is(err, ErrInUse) {
		t.Errorf("by this process: %v; want %v", err, ErrInUse)
	}
	if rooms := must[[]Room](t)(s.Rooms()); len(rooms) != 2 {
		t.Errorf("%+v", rooms)
	}
	if _, err := Restore(s.Path(), filepath.Join(t.TempDir(), "new.db"), noon); err == nil {
		t.Error("a register in use was taken for a backup")
	}
	if left := must[[]string](t)(filepath.Glob(filepath.Join(filepath.Dir(s.Path()), ".evenstep-*"))); len(left) != 0 {
		t.Errorf("left behind: %v", left)
	}
}

// TestRestoreInUseElsewhere asks a second process for the restore.
func TestRestoreInUseElsewhere(t *testing.T) {
	s := newStore(t)
	must[int64](t)(s.SaveRoom(Room{Name: "before"}))
	copyPath := filepath.Join(t.TempDir(), "backup.db")
	if err := s.Backup(copyPath); err != nil {
		t.Fatal(err)
	}
	if said, err := elsewhere(t, "RESTORER="+s.Path(), "BACKUP="+copyPath); err == nil || !strings.Contains(said, "another program has it open") {
		t.Errorf("%v: %s", err, said)
	}
	must[int64](t)(s.SaveRoom(Room{Name: "after"}))
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	if rooms := must[[]Room](t)(openAt(t, s.Path()).Rooms()); len(rooms) != 2 {
		t.Errorf("%+v", rooms)
	}
}

// TestRestoreOverDamage sets a damaged register aside with its log, and twice within one second.
func TestRestoreOverDamage(t *testing.T) {
	s := newStore(t)
	must[int64](t)(s.SaveRoom(Room{Name: "before"}))
	dir := t.TempDir()
	copyPath, path := filepath.Join(dir, "backup.db"), filepath.Join(dir, "r.db")
	if err := s.Backup(copyPath); err != nil {
		t.Fatal(err)
	}
	var kept []string
	for range 2 {
		for _, tail := range []string{"", "-wal"} {
			if err := os.WriteFile(path+tail, []byte("not a register any more"), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		kept = append(kept, must[string](t)(Restore(copyPath, path, noon)))
		for _, tail := range []string{"", "-wal"} {
			if text, err := os.ReadFile(kept[len(kept)-1] + tail); err != nil || string(text) != "not a register any more" {
				t.Errorf("what was there is not kept: %q, %v", text, err)
			}
		}
		again := must[*Store](t)(Open(path))
		if rooms := must[[]Room](t)(again.Rooms()); len(rooms) != 1 {
			t.Errorf("%+v", rooms)
		}
		if err := again.Close(); err != nil {
			t.Fatal(err)
		}
	}
	if kept[0] == kept[1] {
		t.Errorf("both are kept as %s", kept[0])
	}
}
