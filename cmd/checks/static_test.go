package checks

import (
	"debug/elf"
	"path/filepath"
	"testing"
)

// build makes the command-line program as cmd/run does and returns its path.
func build(t *testing.T) string {
	t.Helper()
	file := filepath.Join(t.TempDir(), "evenstep")
	// No stamp of version control: it is not what is looked at, and fails in a tree of another user.
	run(t, []string{"CGO_ENABLED=0", "GOOS=linux"}, "go", "build", "-buildvcs=false", "-trimpath", "-ldflags", "-s -w", "-o", file, "./cmd/evenstep")
	return file
}

// TestStatic: the command-line program runs where no library of the system is.
func TestStatic(t *testing.T) {
	f, err := elf.Open(build(t))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	for _, p := range f.Progs {
		if p.Type == elf.PT_INTERP || p.Type == elf.PT_DYNAMIC {
			t.Errorf("the program has a segment %v; expected none: it is linked dynamically", p.Type)
		}
	}
	for _, s := range f.Sections {
		if s.Type == elf.SHT_DYNAMIC || s.Type == elf.SHT_DYNSYM {
			t.Errorf("the program has a section %s; expected none: it is linked dynamically", s.Name)
		}
	}
}
