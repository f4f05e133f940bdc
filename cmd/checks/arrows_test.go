package checks

import (
	"go/parser"
	"go/token"
	"path"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// arrows says what each package may import of this module. A package that has no place here fails the
// test; what stands on top (onTop) and the folders below luts (allowed) need none.
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
	"display/sheet":      {"luts", "luts/dicom", "patterns"},
	"display/screen":     {"display/photometry"},
	"luts":               nil,
	"patterns":           nil,
	"cmd/checks":         nil,
}

// within says whether a package is dir or lies below it.
func within(pkg, dir string) bool {
	return pkg == dir || strings.HasPrefix(pkg, dir+"/")
}

// onTop are the packages that may import all of display, luts and patterns.
func onTop(pkg string) bool {
	return within(pkg, "ui") || pkg == "cmd/evenstep" || pkg == "cmd/evenstep-desktop"
}

// windowed are the packages that know the window and its toolkit.
func windowed(pkg string) bool {
	return within(pkg, "ui") || pkg == "cmd/evenstep-desktop"
}

func allowed(pkg string) (imports []string, known bool) {
	if strings.HasPrefix(pkg, "luts/") {
		return []string{"luts"}, true
	}
	imports, known = arrows[pkg]
	return imports, known
}

// against says what is wrong with an import, or nothing. pkg is a folder of the tree.
func against(pkg, imported string) string {
	inner, ours := strings.CutPrefix(imported, module+"/")
	limits, known := allowed(pkg)
	switch {
	case within(imported, "fyne.io") || within(imported, "github.com/go-gl"):
		if !windowed(pkg) {
			return "only ui and cmd/evenstep-desktop know the window toolkit"
		}
	case !ours || inner == pkg: // a test from outside imports its own package
	case within(inner, "cmd"):
		return "nothing stands on a command"
	case within(inner, "ui"):
		if !windowed(pkg) {
			return "only cmd/evenstep-desktop stands on ui"
		}
	case onTop(pkg):
	case !known:
		return pkg + " has no place in arrows; give it one"
	case !slices.Contains(limits, inner):
		return "it may import of this module: " + strings.Join(limits, ", ")
	}
	return ""
}

// TestArrows reads the imports of every Go file, whatever system or build tag it is for.
func TestArrows(t *testing.T) {
	packages := map[string]bool{}
	for _, f := range tracked(t) {
		if path.Ext(f) != ".go" || strings.Contains(f, "testdata/") {
			continue
		}
		pkg := path.Dir(f)
		packages[pkg] = true
		content, _ := read(t, f)
		parsed, err := parser.ParseFile(token.NewFileSet(), f, content, parser.ImportsOnly)
		if err != nil {
			t.Error(err)
			continue
		}
		for _, spec := range parsed.Imports {
			imported, err := strconv.Unquote(spec.Path.Value)
			if err != nil {
				t.Fatal(err)
			}
			if wrong := against(pkg, imported); wrong != "" {
				t.Errorf("%s imports %s: %s", f, imported, wrong)
			}
		}
	}
	for pkg := range packages {
		if _, known := allowed(pkg); !known && !onTop(pkg) {
			t.Errorf("%s has no place in arrows; give it one", pkg)
		}
	}
	if len(packages) < 8 {
		t.Errorf("%d packages; expected the whole tree", len(packages))
	}
}

// TestAgainst: the check sees a wrong arrow where there is one.
func TestAgainst(t *testing.T) {
	for _, c := range []struct {
		pkg, imported string
		wrong         bool
	}{
		{"display/gsdf", "math", false},
		{"display/gsdf", module + "/display/photometry", false},
		{"display/gsdf", module + "/display/gsdf", false},
		{"display/photometry", module + "/display/gsdf", true},
		{"display/response", module + "/display/criteria", true},
		{"display/record", module + "/display/report", true},
		{"display/report", module + "/display/store", false},
		{"display/meter", module + "/display/screen", true},
		{"display/new", module + "/display/photometry", true},
		{"display/report", "fyne.io/fyne/v2", true},
		{"display/report", module + "/ui", true},
		{"luts", module + "/patterns", true},
		{"luts", module + "/display/photometry", true},
		{"luts/dicom", module + "/luts", false},
		{"luts/dicom", module + "/patterns", true},
		{"patterns", module + "/luts", true},
		{"cmd/evenstep", module + "/display/report", false},
		{"cmd/evenstep", module + "/ui", true},
		{"cmd/evenstep", "github.com/go-gl/gl/v2.1/gl", true},
		{"cmd/evenstep-desktop", module + "/ui", false},
		{"cmd/evenstep-desktop", module + "/cmd/evenstep", true},
		{"ui", module + "/display/store", false},
		{"ui/parts", "fyne.io/fyne/v2", false},
		{"ui", module + "/cmd/evenstep", true},
	} {
		if got := against(c.pkg, c.imported); (got != "") != c.wrong {
			t.Errorf("%s imports %s: %q; expected it to be wrong: %t", c.pkg, c.imported, got, c.wrong)
		}
	}
}
