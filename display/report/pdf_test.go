package report

import (
	"bytes"
	"os"
	"path/filepath"
	"testing"
)

func TestLook(t *testing.T) {
	dir := os.Getenv("LOOK")
	if dir == "" {
		t.Skip()
	}
	for name, r := range samples(t) {
		for _, p := range []Paper{A4, Letter} {
			var b bytes.Buffer
			if err := PDF(&b, r, Options{Paper: p}); err != nil {
				t.Fatal(err)
			}
			os.WriteFile(filepath.Join(dir, name+"-"+string(p)+".pdf"), b.Bytes(), 0o644)
		}
	}
}
