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

// TestReadmeIsTrue: the output that README.md shows is what the program prints.
func TestReadmeIsTrue(t *testing.T) {
	t.Chdir(filepath.Join("..", ".."))
	readme, err := os.ReadFile("README.md")
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		args []string
		from string // where the part that is shown starts
		to   string // and before what it ends; "": at the end
	}{
		{[]string{"assess", "testdata/readings/demo-good.csv"}, "", ""},
		{[]string{"assess", "testdata/readings/ppp-annex.csv", "--places", "testdata/readings/ppp-uniformity.csv", "--scheme", "nyc-2016", "--class", "primary-diagnostic"}, "uniformity  ", "\nquantity"},
		{[]string{"criteria", "show", "tg18-2005", "--class", "primary"}, "", "\n  luminance ratio"},
	} {
		var out, errs bytes.Buffer
		p := program{in: strings.NewReader(""), out: &out, err: &errs, now: clock, getenv: os.Getenv, self: os.Executable}
		if code := p.run(context.Background(), c.args); code != exitMeets {
			t.Fatalf("%v: exit code %d, %s", c.args, code, errs.String())
		}
		shown := out.String()
		if i := strings.Index(shown, c.from); i > 0 {
			shown = shown[i:]
		}
		if i := strings.Index(shown, c.to); c.to != "" && i > 0 {
			shown = shown[:i]
		}
		if !strings.Contains(string(readme), "$ evenstep "+strings.Join(c.args, " ")+"\n") {
			t.Errorf("README.md does not show %v", c.args)
		}
		if !strings.Contains(string(readme), strings.TrimRight(shown, "\n")) {
			t.Errorf("%v: README.md does not show what is printed:\n%s", c.args, shown)
		}
	}
}
