package checks

import (
	"bytes"
	"debug/buildinfo"
	"debug/elf"
	"encoding/json"
	"os"
	"path/filepath"
	"regexp"
	"runtime"
	"strings"
	"testing"
)

// build makes a program as cmd/run does and returns its path: the command line without C, the window with.
func build(t *testing.T, name string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if name == "evenstep-desktop" { // with the flags of every other build: the toolkit takes minutes to compile
		run(t, []string{"CGO_ENABLED=1"}, "go", "build", "-o", path, "./cmd/"+name)
		return path
	}
	run(t, []string{"CGO_ENABLED=0"}, "go", "build", "-trimpath", "-ldflags", "-s -w", "-o", path, "./cmd/"+name)
	return path
}

// TestStatic: the command-line program runs where no library of the system is.
func TestStatic(t *testing.T) {
	if runtime.GOOS != "linux" {
		t.Skip("looks at a Linux program")
	}
	f, err := elf.Open(build(t, "evenstep"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	for _, p := range f.Progs {
		if p.Type == elf.PT_INTERP || p.Type == elf.PT_DYNAMIC {
			t.Errorf("the program is linked dynamically: %v", p.Type)
		}
	}
}

// licences are the texts that a linked module may come under, by words that stand in them and in no other.
var licences = []struct {
	name  string
	words *regexp.Regexp
}{
	{"BSD", regexp.MustCompile(`(?is)redistribution and use in source and binary forms.*with or without.*permitted provided`)},
	{"MIT", regexp.MustCompile(`(?is)permission is hereby granted, free of charge, to any person obtaining a copy.*the above copyright notice and this permission notice`)},
	{"Apache-2.0", regexp.MustCompile(`(?is)apache license\s+version 2\.0, january 2004`)},
	{"ISC", regexp.MustCompile(`(?is)permission to use, copy, modify, and/or distribute this software for any purpose with or without fee is hereby granted`)},
	{"zlib", regexp.MustCompile(`(?is)provided 'as-is', without any express or implied warranty.*altered source versions must be plainly marked`)},
}

// TestLicences reads the licence of every module that the programs are linked with.
func TestLicences(t *testing.T) {
	for _, name := range []string{"evenstep", "evenstep-desktop"} {
		t.Run(name, func(t *testing.T) { checkLicences(t, name) })
	}
}

func checkLicences(t *testing.T, program string) {
	info, err := buildinfo.ReadFile(build(t, program))
	if err != nil {
		t.Fatal(err)
	}
	if len(info.Deps) < 5 {
		t.Fatalf("%d modules linked; expected several", len(info.Deps))
	}
	for _, d := range info.Deps {
		var m struct{ Dir string }
		if err := json.Unmarshal(run(t, nil, "go", "mod", "download", "-json", d.Path+"@"+d.Version), &m); err != nil {
			t.Fatal(err)
		}
		files, err := filepath.Glob(filepath.Join(m.Dir, "[LC][IiO][CcP][EeY][NnI]*"))
		if err != nil || len(files) == 0 {
			t.Errorf("%s %s has no licence file", d.Path, d.Version)
			continue
		}
		name := ""
		for _, f := range files {
			text, err := os.ReadFile(f)
			if err != nil {
				continue // a folder of licences: the file beside it decides
			}
			for _, l := range licences {
				if l.words.Match(bytes.Join(bytes.Fields(text), []byte(" "))) {
					name = l.name
				}
			}
		}
		if name == "" {
			t.Errorf("%s %s: none of the permissive licences was found in %v", d.Path, d.Version, files)
			continue
		}
		t.Logf("%s %s: %s", d.Path, d.Version, name)
	}
}

// TestPins: modules that only work together in the versions that one of them names.
func TestPins(t *testing.T) {
	var mod struct {
		Require []struct{ Path, Version string }
	}
	if err := json.Unmarshal(run(t, nil, "go", "mod", "edit", "-json"), &mod); err != nil {
		t.Fatal(err)
	}
	have := map[string]string{}
	for _, r := range mod.Require {
		have[r.Path] = r.Version
	}
	if v := have["golang.org/x/image"]; v != "v0.48.0" {
		t.Errorf("golang.org/x/image is %q; expected v0.48.0, the first without the decoder faults of older ones", v)
	}
	// The follower's version is the one that the leader's own go.mod names.
	for _, pair := range []struct{ leader, follower string }{
		{"modernc.org/sqlite", "modernc.org/libc"},
		{"fyne.io/fyne/v2", "github.com/go-gl/glfw/v3.4/glfw"},
		{"fyne.io/fyne/v2", "github.com/go-gl/gl"},
	} {
		lead, ok := have[pair.leader]
		if !ok {
			continue
		}
		var m struct{ GoMod string }
		if err := json.Unmarshal(run(t, nil, "go", "mod", "download", "-json", pair.leader+"@"+lead), &m); err != nil {
			t.Fatal(err)
		}
		text, err := os.ReadFile(m.GoMod)
		if err != nil {
			t.Fatal(err)
		}
		found := regexp.MustCompile(`(?m)^\s*` + regexp.QuoteMeta(pair.follower) + ` (\S+)`).FindSubmatch(text)
		if found == nil {
			t.Errorf("%s %s does not name %s; expected the pair to be known", pair.leader, lead, pair.follower)
			continue
		}
		if want := string(found[1]); have[pair.follower] != want {
			t.Errorf("%s is %q; expected %s, as %s %s has it", pair.follower, have[pair.follower], want, pair.leader, lead)
		}
	}
	bindings := 0
	for path := range have {
		if strings.HasPrefix(path, "github.com/go-gl/glfw/") {
			bindings++
		}
	}
	if bindings > 1 {
		t.Errorf("%d bindings of one window library; two do not link together", bindings)
	}
}
