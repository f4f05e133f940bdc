package checks

import (
	"slices"
	"strings"
	"testing"
)

// TestTopLevel: what lies at the top is fixed, but for names that begin with a dot.
func TestTopLevel(t *testing.T) {
	top := []string{"cmd", "ui", "display", "luts", "patterns", "testdata", "go.mod", "go.sum", "README.md", "DEVELOPERS.md"}
	for _, f := range tracked(t) {
		if first, _, _ := strings.Cut(f, "/"); !slices.Contains(top, first) && !strings.HasPrefix(first, ".") {
			t.Errorf("%s lies outside the fixed top level; expected it below one of %v", f, top)
		}
	}
}
