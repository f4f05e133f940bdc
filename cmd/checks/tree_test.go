package checks

import (
	"errors"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"unicode/utf8"
)

// module is the name in go.mod.
const module = "evenstep"

// root is the top of the tree.
func root(t *testing.T) string {
	t.Helper()
	dir, err := filepath.Abs(filepath.Join("..", ".."))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(filepath.Join(dir, "go.mod")); err != nil {
		t.Fatal(err)
	}
	return dir
}

// missing ends a test whose outside program is not there: skipped, and failed under CI=true.
func missing(t *testing.T, name string) {
	t.Helper()
	if os.Getenv("CI") == "true" {
		t.Fatalf("%s is missing; expected it under CI=true; install it", name)
	}
	t.Skipf("%s is missing", name)
}

// run runs a program in the top folder and returns what it printed.
func run(t *testing.T, env []string, name string, args ...string) []byte {
	t.Helper()
	if _, err := exec.LookPath(name); err != nil {
		missing(t, name)
	}
	c := exec.Command(name, args...)
	c.Dir = root(t)
	c.Env = append(os.Environ(), env...)
	out, err := c.Output()
	if err != nil {
		if exit, ok := errors.AsType[*exec.ExitError](err); ok {
			err = errors.New(string(exit.Stderr))
		}
		t.Fatalf("%s %s: %v", name, strings.Join(args, " "), err)
	}
	return out
}

// tracked lists the files of the tree by their paths from the top: those that version control has or would
// take, and where there is no version control all but what is built.
func tracked(t *testing.T) []string {
	t.Helper()
	dir := root(t)
	var all []string
	// The tree may belong to another user, as in a container.
	c := exec.Command("git", "-c", "safe.directory=*", "ls-files", "-z", "--cached", "--others", "--exclude-standard")
	c.Dir = dir
	if out, err := c.Output(); err == nil {
		for _, f := range strings.Split(strings.TrimRight(string(out), "\x00"), "\x00") {
			if _, err := os.Lstat(filepath.Join(dir, f)); err == nil { // else removed, not yet recorded
				all = append(all, f)
			}
		}
	} else {
		err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
			if err != nil {
				return err
			}
			rel, err := filepath.Rel(dir, path)
			switch {
			case err != nil:
				return err
			case rel == ".git" || rel == "bin":
				return fs.SkipDir
			case !d.IsDir():
				all = append(all, filepath.ToSlash(rel))
			}
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
	}
	if len(all) < 50 {
		t.Fatalf("%d files; expected the whole tree", len(all))
	}
	return all
}

// read reads a file of the tree; text says whether it is UTF-8 without zero bytes.
func read(t *testing.T, path string) (content []byte, text bool) {
	t.Helper()
	content, err := os.ReadFile(filepath.Join(root(t), path))
	if err != nil {
		t.Fatal(err)
	}
	return content, utf8.Valid(content) && !strings.Contains(string(content), "\x00")
}
