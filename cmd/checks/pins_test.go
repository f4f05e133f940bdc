package checks

import (
	"encoding/json"
	"strings"
	"testing"
)

// modFile is what go mod edit -json says of a go.mod.
type modFile struct {
	Require []struct{ Path, Version string }
	Replace []struct {
		Old struct{ Path string }
	}
}

func (m modFile) versions() map[string]string {
	all := map[string]string{}
	for _, r := range m.Require {
		all[r.Path] = r.Version
	}
	return all
}

func readModFile(t *testing.T, args ...string) modFile {
	t.Helper()
	var m modFile
	if err := json.Unmarshal(run(t, nil, "go", append([]string{"mod", "edit", "-json"}, args...)...), &m); err != nil {
		t.Fatal(err)
	}
	return m
}

// TestPins: modules that only work together in the versions that one of them names, and versions that were
// chosen for what they cure.
func TestPins(t *testing.T) {
	ours := readModFile(t)
	for _, r := range ours.Replace {
		t.Errorf("go.mod replaces %s; expected no replacement: it hides which version is used", r.Old.Path)
	}
	have := ours.versions()
	if v := have["golang.org/x/image"]; v != "v0.48.0" {
		t.Errorf("golang.org/x/image is %q; expected v0.48.0: the toolkit asks for a version whose decoders have known faults", v)
	}
	for _, pair := range []struct {
		leader    string
		followers []string // with what lies below them
	}{
		// The database is translated from C against one version of the C library.
		{"modernc.org/sqlite", []string{"modernc.org/libc"}},
		// The toolkit's bindings of OpenGL and of windows.
		{"fyne.io/fyne/v2", []string{"github.com/go-gl/glfw", "github.com/go-gl/gl"}},
	} {
		version, used := have[pair.leader]
		if !used {
			continue
		}
		var m struct{ GoMod string }
		if err := json.Unmarshal(run(t, nil, "go", "mod", "download", "-json", pair.leader+"@"+version), &m); err != nil {
			t.Fatal(err)
		}
		wanted := readModFile(t, m.GoMod).versions()
		for _, follower := range pair.followers {
			named := 0
			for path, want := range wanted {
				if !within(path, follower) {
					continue
				}
				named++
				if have[path] != want {
					t.Errorf("%s is %q; expected %s, as the go.mod of %s %s has it", path, have[path], want, pair.leader, version)
				}
			}
			if named == 0 {
				t.Errorf("%s %s names no %s; expected it to: look which one it works with now", pair.leader, version, follower)
			}
		}
	}
	var bindings []string
	for path := range have {
		if within(path, "github.com/go-gl/glfw") {
			bindings = append(bindings, path)
		}
	}
	if len(bindings) > 1 {
		t.Errorf("%s; expected one: two define the same C functions and do not link", strings.Join(bindings, ", "))
	}
}
