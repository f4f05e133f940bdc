package main

import (
	"bytes"
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// TestDesktopProgram: the bare command starts the window program beside it, or says that there is none.
func TestDesktopProgram(t *testing.T) {
	dir := t.TempDir()
	t.Setenv("PATH", "")
	var out, errs bytes.Buffer
	p := program{
		in: strings.NewReader(""), out: &out, err: &errs, now: time.Now, getenv: os.Getenv,
		self: func() (string, error) { return filepath.Join(dir, "evenstep"), nil },
	}
	if code := p.run(context.Background(), nil); code != exitSystem {
		t.Errorf("exit code %d, want %d", code, exitSystem)
	}
	if !strings.Contains(errs.String(), "evenstep-desktop is neither beside this program nor in PATH") || strings.Count(errs.String(), "\n") != 1 {
		t.Errorf("stderr %q", errs.String())
	}
	errs.Reset()
	script := "#!/bin/sh\necho window\nexit 7\n"
	if err := os.WriteFile(filepath.Join(dir, "evenstep-desktop"), []byte(script), 0o755); err != nil {
		t.Fatal(err)
	}
	if code := p.run(context.Background(), nil); code != 7 || out.String() != "window\n" || errs.Len() > 0 {
		t.Errorf("exit code %d, stdout %q, stderr %q; want the window program's own", code, out.String(), errs.String())
	}
}

type brokenWriter struct{}

func (brokenWriter) Write([]byte) (int, error) { return 0, errors.New("disk full") }

// TestOutputThatFails: a full disk behind standard output is the computer's fault, not the user's.
func TestOutputThatFails(t *testing.T) {
	var errs bytes.Buffer
	p := program{in: strings.NewReader("level,luminance\n0,1\n255,300\n"), out: brokenWriter{}, err: &errs, now: clock, getenv: os.Getenv, self: os.Executable}
	if code := p.run(context.Background(), []string{"assess", "-", "--dark-room"}); code != exitSystem {
		t.Errorf("exit code %d, want %d; %s", code, exitSystem, errs.String())
	}
	if strings.Count(errs.String(), "\n") != 1 || !strings.Contains(errs.String(), "disk full") {
		t.Errorf("stderr %q", errs.String())
	}
}
