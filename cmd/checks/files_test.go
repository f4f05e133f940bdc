package checks

import (
	"bytes"
	"path"
	"testing"
)

// TestFiles: a Go file fits in the head, and every clone carries each large file for ever.
func TestFiles(t *testing.T) {
	const (
		longest = 600     // lines of a Go file
		largest = 2 << 20 // bytes of any file
	)
	for _, f := range tracked(t) {
		content, _ := read(t, f)
		if len(content) > largest {
			t.Errorf("%s has %d bytes; expected at most %d", f, len(content), largest)
		}
		if n := bytes.Count(content, []byte("\n")); path.Ext(f) == ".go" && n > longest {
			t.Errorf("%s has %d lines; expected at most %d; divide it by topic", f, n, longest)
		}
	}
}
