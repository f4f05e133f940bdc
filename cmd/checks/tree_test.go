package checks

import (
	"bytes"
	"encoding/json"
	"errors"
	"io"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"
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

// run runs a program in the top folder. Where it is missing the test is skipped, and under CI=true fails.
func run(t *testing.T, env []string, name string, args ...string) []byte {
	t.Helper()
	if _, err := exec.LookPath(name); err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatalf("%s is missing", name)
		}
		t.Skipf("%s is missing", name)
	}
	c := exec.Command(name, args...)
	c.Dir = root(t)
	c.Env = append(os.Environ(), env...)
	out, err := c.Output()
	if err != nil {
		var exit *exec.ExitError
		if errors.As(err, &exit) {
			err = errors.New(string(exit.Stderr))
		}
		t.Fatalf("%s %s: %v", name, strings.Join(args, " "), err)
	}
	return out
}

// arrows says what each package may import of this module. A package that is not listed here fails
// the test: give it its place.
var arrows = map[string][]string{
	"display/photometry": nil,
	"display/gsdf":       {"display/photometry"},
	"display/readings":   {"display/photometry"},
	"display/response":   {"display/gsdf", "display/photometry", "display/readings"},
	"display/criteria":   {"display/gsdf", "display/photometry", "display/readings", "display/response"},
	"display/record":     {"display/criteria", "display/gsdf", "display/photometry", "display/readings", "display/response"},
	"display/store":      {"display/criteria", "display/gsdf", "display/monitor", "display/photometry", "display/readings", "display/record", "display/response"},
	"display/demo":       {"display/criteria", "display/gsdf", "display/photometry", "display/readings", "display/record", "display/response", "display/store"},
	"display/report":     {"display/criteria", "display/gsdf", "display/photometry", "display/readings", "display/record", "display/response", "display/store"},
	"display/calibrate":  {"display/gsdf", "display/photometry", "display/readings", "display/response", "luts"},
	"display/inspect":    {"display/gsdf", "display/photometry", "display/response", "luts"},
	"display/meter":      {"display/photometry"},
	"display/monitor":    {"display/photometry"},
	"display/screen":     {"display/photometry"},
	"luts":               nil,
	"luts/dicom":         {"luts"},
	"patterns":           nil,
	"cmd/checks":         nil,
}

// onTop are the packages that may import everything but each other's mains.
func onTop(path string) bool {
	return path == "ui" || strings.HasPrefix(path, "ui/") || path == "cmd/evenstep" || path == "cmd/evenstep-desktop"
}

type listed struct {
	ImportPath                         string
	Imports, TestImports, XTestImports []string
}

func packages(t *testing.T) []listed {
	t.Helper()
	d := json.NewDecoder(bytes.NewReader(run(t, nil, "go", "list", "-json=ImportPath,Imports,TestImports,XTestImports", "./...")))
	var all []listed
	for {
		var p listed
		if err := d.Decode(&p); errors.Is(err, io.EOF) {
			break
		} else if err != nil {
			t.Fatal(err)
		}
		all = append(all, p)
	}
	if len(all) < 8 {
		t.Fatalf("%d packages; expected the whole tree", len(all))
	}
	return all
}

func TestArrows(t *testing.T) {
	for _, p := range packages(t) {
		path := strings.TrimPrefix(p.ImportPath, module+"/")
		allowed, known := arrows[path]
		if !known && !onTop(path) {
			t.Errorf("%s has no place among the arrows", path)
		}
		for _, imported := range slices.Concat(p.Imports, p.TestImports, p.XTestImports) {
			inner, ours := strings.CutPrefix(imported, module+"/")
			switch {
			case !ours:
				window := strings.HasPrefix(imported, "fyne.io/") || strings.HasPrefix(imported, "github.com/go-gl/")
				if window && path != "cmd/evenstep-desktop" && path != "ui" && !strings.HasPrefix(path, "ui/") {
					t.Errorf("%s imports %s: only ui and cmd/evenstep-desktop know the toolkit", path, imported)
				}
			case inner == path:
			case strings.HasPrefix(inner, "cmd/"):
				t.Errorf("%s imports %s: nothing stands on a command", path, inner)
			case inner == "ui" || strings.HasPrefix(inner, "ui/"):
				if path != "cmd/evenstep-desktop" && path != "ui" && !strings.HasPrefix(path, "ui/") {
					t.Errorf("%s imports %s: nothing stands on the window", path, inner)
				}
			case !onTop(path) && !slices.Contains(allowed, inner):
				t.Errorf("%s imports %s against the arrows", path, inner)
			}
		}
	}
}

// tracked lists the files of the tree, those under version control where git knows.
func tracked(t *testing.T) []string {
	t.Helper()
	if _, err := os.Stat(filepath.Join(root(t), ".git")); err == nil {
		if _, err := exec.LookPath("git"); err == nil {
			out := run(t, nil, "git", "ls-files", "-z", "--cached", "--others", "--exclude-standard")
			return strings.Split(strings.TrimRight(string(out), "\x00"), "\x00")
		}
	}
	var all []string
	err := filepath.WalkDir(root(t), func(path string, d fs.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			rel, _ := filepath.Rel(root(t), path)
			all = append(all, filepath.ToSlash(rel))
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return all
}

func TestTopLevel(t *testing.T) {
	allowed := []string{"cmd", "ui", "display", "luts", "patterns", "testdata", "bin", "go.mod", "go.sum", "README.md", "DEVELOPERS.md"}
	for _, f := range tracked(t) {
		if top, _, _ := strings.Cut(f, "/"); !slices.Contains(allowed, top) && !strings.HasPrefix(top, ".") {
			t.Errorf("%s lies outside the fixed top level", f)
		}
	}
}

// TestFiles holds files to what they may say and how long they may be.
func TestFiles(t *testing.T) {
	// The patterns are put together from pieces, so that this file does not match itself.
	forbidden := map[string]*regexp.Regexp{
		"a path of one machine": regexp.MustCompile(`(^|[^\w.])/` + `(wor` + `k|ro` + `ot|ho` + `me/\w+)/`),
		"work that is left":     regexp.MustCompile(`\b(TO` + `DO|FIX` + `ME|XX` + `X)\b`),
	}
	const (
		longest = 600     // lines of a Go file: it should fit in the head
		largest = 2 << 20 // bytes
	)
	for _, f := range tracked(t) {
		text, err := os.ReadFile(filepath.Join(root(t), f))
		if err != nil {
			if errors.Is(err, fs.ErrNotExist) {
				continue // removed, not yet recorded
			}
			t.Fatal(err)
		}
		if len(text) > largest {
			t.Errorf("%s has %d bytes; expected at most %d", f, len(text), largest)
		}
		if bytes.IndexByte(text, 0) >= 0 || strings.HasPrefix(f, "bin/") {
			continue
		}
		if n := bytes.Count(text, []byte("\n")); strings.HasSuffix(f, ".go") && n > longest {
			t.Errorf("%s has %d lines; expected at most %d", f, n, longest)
		}
		for what, pattern := range forbidden {
			if m := pattern.Find(text); m != nil && f != "go.sum" {
				t.Errorf("%s holds %s: %q", f, what, m)
			}
		}
	}
}
