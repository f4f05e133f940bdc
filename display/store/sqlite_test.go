package store

import (
	"bytes"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

func TestFilesThatAreNoRegister(t *testing.T) {
	dir := t.TempDir()
	good := filepath.Join(dir, "good.db")
	s := must[*Store](t)(Open(good))
	for i := range 50 {
		must[int64](t)(s.SaveRoom(Room{Name: fmt.Sprint(i), Notes: strings.Repeat("x", 2000)}))
	}
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	whole := must[[]byte](t)(os.ReadFile(good))
	put := func(name string, text []byte) string {
		t.Helper()
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, text, 0o644); err != nil {
			t.Fatal(err)
		}
		return path
	}
	newer := put("newer.db", whole)
	db := must[*Store](t)(Open(newer))
	if _, err := db.write.Exec("PRAGMA user_version = 99"); err != nil {
		t.Fatal(err)
	}
	if err := db.Close(); err != nil {
		t.Fatal(err)
	}
	other := bytes.Clone(whole)
	copy(other[68:72], []byte{0, 0, 0, 1})
	damaged := bytes.Clone(whole)
	for i := 4096; i < len(damaged); i += 97 {
		damaged[i] ^= 0xff
	}
	for _, c := range []struct {
		name string
		path string
		want error
	}{
		{"text", put("text.db", []byte("level,luminance\n")), ErrForeign},
		{"another program's", put("other.db", other), ErrForeign},
		{"half", put("half.db", whole[:len(whole)/2]), ErrDamaged},
		{"damaged", put("damaged.db", damaged), ErrDamaged},
		{"newer", newer, ErrNewer},
		{"a folder", dir, ErrForeign},
	} {
		t.Run(c.name, func(t *testing.T) {
			before, _ := os.ReadFile(c.path)
			_, err := Open(c.path)
			if !errors.Is(err, c.want) || strings.ContainsAny(err.Error(), "\r\n") {
				t.Errorf("%v; want one line with %q", err, c.want)
			}
			if after, _ := os.ReadFile(c.path); !bytes.Equal(before, after) {
				t.Error("the file was touched")
			}
		})
	}
	if s, err := Open(put("empty.db", nil)); err != nil {
		t.Errorf("an empty file: %v", err)
	} else {
		s.Close()
	}
}

// TestNetworkShare reads a list of mounts as Linux gives it in /proc/mounts (proc(5)).
func TestNetworkShare(t *testing.T) {
	mounts := "/dev/sda1 / ext4 rw 0 0\nserver:/x /mnt/share nfs4 rw 0 0\n//s/y /mnt/my\\040disk cifs rw 0 0\n/dev/sdb1 /mnt/share/local ext4 rw 0 0\n"
	for path, warned := range map[string]bool{
		"/mnt/share/a.db": true, "/mnt/my disk/a.db": true, "/mnt/shared/a.db": false, "/mnt/share/local/a.db": false, "/x.db": false,
	} {
		if kind, where := networkMount(mounts, path); (kind != "") != warned {
			t.Errorf("%s: %q at %q", path, kind, where)
		}
	}
}

// TestNewerIsUntouched: a copy is not in write-ahead mode, and merely opening it in that mode would write
// to it.
func TestNewerIsUntouched(t *testing.T) {
	s := newStore(t)
	path := filepath.Join(t.TempDir(), "newer.db")
	if err := s.Backup(path); err != nil {
		t.Fatal(err)
	}
	text := must[[]byte](t)(os.ReadFile(path))
	text[60], text[61], text[62], text[63] = 0, 0, 0, 99 // user_version, SQLite file format 1.3
	if err := os.WriteFile(path, text, 0o644); err != nil {
		t.Fatal(err)
	}
	if _, err := Open(path); !errors.Is(err, ErrNewer) {
		t.Errorf("%v; want %v", err, ErrNewer)
	}
	if after := must[[]byte](t)(os.ReadFile(path)); !bytes.Equal(text, after) {
		t.Error("the file was touched")
	}
	if _, err := Restore(path, s.Path()+".other", noon); !errors.Is(err, ErrNewer) {
		t.Errorf("restored: %v; want %v", err, ErrNewer)
	}
}

// elsewhere runs the test program as another process (see TestMain) and returns what it says.
func elsewhere(t *testing.T, settings ...string) (string, error) {
	t.Helper()
	c := exec.Command(os.Args[0])
	c.Env = os.Environ()
	for _, s := range settings {
		c.Env = append(c.Env, "STORE_TEST_"+s)
	}
	out, err := c.CombinedOutput()
	return string(out), err
}

// TestDiskFull lets the file grow no further, as a full disk would.
func TestDiskFull(t *testing.T) {
	s := newStore(t)
	var pages int
	if err := s.write.QueryRow("PRAGMA page_count").Scan(&pages); err != nil {
		t.Fatal(err)
	}
	limit := func(n int) {
		t.Helper()
		if _, err := s.write.Exec(fmt.Sprintf("PRAGMA max_page_count = %d", n)); err != nil {
			t.Fatal(err)
		}
	}
	limit(pages + 8)
	kept := 0
	var err error
	for ; kept < 1000 && err == nil; kept++ {
		_, err = s.SaveRoom(Room{Name: fmt.Sprint("room ", kept), Notes: strings.Repeat("x", 3000)})
	}
	kept-- // the last was refused
	if err == nil || !strings.Contains(err.Error(), "disk is full") || strings.ContainsAny(err.Error(), "\r\n") {
		t.Fatalf("%v; want a line that says that the disk is full", err)
	}
	if rooms := must[[]Room](t)(s.Rooms()); len(rooms) != kept || kept < 4 {
		t.Errorf("%d rooms of %d are there", len(rooms), kept)
	}
	limit(pages + 1000)
	must[int64](t)(s.SaveRoom(Room{Name: "with room again"}))
}

func TestLocked(t *testing.T) {
	s := newStore(t)
	other := must[*Store](t)(Open(s.Path()))
	defer other.Close()
	tx, err := other.write.Begin()
	if err != nil {
		t.Fatal(err)
	}
	if _, err := s.write.Exec("PRAGMA busy_timeout = 1"); err != nil {
		t.Fatal(err)
	}
	if _, err := s.SaveRoom(Room{Name: "r"}); err == nil || !strings.Contains(err.Error(), "another program writes to the register") {
		t.Errorf("%v; want a line that says who is in the way", err)
	}
	if err := tx.Rollback(); err != nil {
		t.Fatal(err)
	}
	must[int64](t)(s.SaveRoom(Room{Name: "r"}))
}

// TestErasedNameIsGone looks for the bytes of a name in the file.
func TestErasedNameIsGone(t *testing.T) {
	s := newStore(t)
	const name = "Nobody Whatsoever"
	if err := s.SavePerson(Person{ID: "p-001", Name: name}); err != nil {
		t.Fatal(err)
	}
	look := func() bool {
		t.Helper()
		if err := s.engine.settle(s.write); err != nil {
			t.Fatal(err)
		}
		return bytes.Contains(must[[]byte](t)(os.ReadFile(s.Path())), []byte(name))
	}
	if !look() {
		t.Fatal("the name is not in the file while it is kept: the test sees nothing")
	}
	if err := s.SavePerson(Person{ID: "p-001"}); err != nil {
		t.Fatal(err)
	}
	if look() {
		t.Error("the name is still in the file")
	}
}
