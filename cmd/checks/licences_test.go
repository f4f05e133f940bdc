package checks

import (
	"bytes"
	"debug/buildinfo"
	"encoding/json"
	"errors"
	"io"
	"maps"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"
)

// licences are the texts that a linked module may come under, by phrases of theirs in small letters with
// single spaces: MIT, BSD with two and three clauses, ISC and zlib in the words of the Open Source
// Initiative's list, Apache 2.0 by its title, and the dedication of the one library that has no licence.
var licences = []struct {
	name    string
	phrases []string
}{
	{"Apache-2.0", []string{"apache license version 2.0, january 2004", "terms and conditions for use, reproduction, and distribution"}},
	{"MIT", []string{"permission is hereby granted, free of charge, to any person obtaining a copy", "to use, copy, modify, merge, publish, distribute, sublicense, and/or sell", "the above copyright notice and this permission notice shall be included"}},
	{"BSD-3-Clause", []string{"redistribution and use in source and binary forms, with or without modification, are permitted", "redistributions of source code must retain", "redistributions in binary form must reproduce", "neither the name"}},
	{"BSD-2-Clause", []string{"redistribution and use in source and binary forms, with or without modification, are permitted", "redistributions of source code must retain", "redistributions in binary form must reproduce"}},
	{"ISC", []string{"permission to use, copy, modify, and/or distribute this software for any purpose with or without fee is hereby granted"}},
	{"zlib", []string{"without any express or implied warranty", "altered source versions must be plainly marked as such", "this notice may not be removed or altered from any source distribution"}},
	{"public domain", []string{"has been dedicated to the public domain by the authors", "anyone is free to copy, modify, publish, use, compile, sell, or distribute"}},
}

// judged are files beside the licences that a person has read, by module, version and name, with what they
// are. A new version is read anew.
var judged = map[string]string{
	"modernc.org/libc@v1.80.1/LICENSE-3RD-PARTY.md":   "a list; what is linked is MIT, BSD",
	"modernc.org/memory@v1.12.1/LICENSE-LOGO":         "where a picture came from that is not linked",
	"modernc.org/sqlite@v1.62.0/LICENSE-3RD-PARTY.md": "a list; what is linked is MIT, BSD, public domain",
}

// conditions are phrases of terms that go further; a text that holds one of them needs a look, whatever else
// it says.
var conditions = []string{
	"gnu general public license", "gnu lesser general public", "gnu library general public", "gnu affero", "mozilla public license",
	"eclipse public license", "server side public license", "business source license", "commons clause", "creative commons",
	"non-commercial use", "noncommercial use", "non-commercial purposes", "noncommercial purposes", "all advertising materials mentioning", "elastic license",
}

// licenceOf names the licence of a text, or is empty where it is none of those that are wanted.
func licenceOf(text []byte) string {
	words := strings.ToLower(string(bytes.Join(bytes.Fields(text), []byte(" "))))
	holds := func(phrase string) bool { return strings.Contains(words, phrase) }
	if slices.ContainsFunc(conditions, holds) {
		return ""
	}
	for _, l := range licences {
		if !slices.ContainsFunc(l.phrases, func(p string) bool { return !holds(p) }) {
			return l.name
		}
	}
	return ""
}

// linked is a module that a program is linked with, and the folders of those of its packages that are.
type linked struct {
	version, dir string
	folders      map[string]bool
}

// linkedModules are the modules of one of our programs on a system, by path.
func linkedModules(t *testing.T, program, system, cgo string) map[string]*linked {
	t.Helper()
	out := run(t, []string{"GOOS=" + system, "CGO_ENABLED=" + cgo}, "go", "list", "-deps", "-json=Dir,Module", "./cmd/"+program)
	all := map[string]*linked{}
	for d := json.NewDecoder(bytes.NewReader(out)); ; {
		var p struct {
			Dir    string
			Module *struct {
				Path, Version, Dir string
				Main               bool
			}
		}
		if err := d.Decode(&p); errors.Is(err, io.EOF) {
			return all
		} else if err != nil {
			t.Fatal(err)
		}
		if p.Module == nil || p.Module.Main {
			continue
		}
		m := all[p.Module.Path]
		if m == nil {
			m = &linked{version: p.Module.Version, dir: p.Module.Dir, folders: map[string]bool{}}
			all[p.Module.Path] = m
		}
		for dir := p.Dir; len(dir) >= len(m.dir); dir = filepath.Dir(dir) {
			m.folders[dir] = true
		}
	}
}

var licenceFile = regexp.MustCompile(`(?i)^(licen[cs]e|copying|unlicense)`)

// licenceFiles are the texts of licences in a folder.
func licenceFiles(t *testing.T, dir string) []string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	var files []string
	for _, e := range entries {
		if licenceFile.MatchString(e.Name()) && !e.IsDir() && filepath.Ext(e.Name()) != ".go" {
			files = append(files, filepath.Join(dir, e.Name()))
		}
	}
	return files
}

// TestLicences reads the licences of every module that the programs are linked with, on every system they
// are for: at the top of the module, and beside the packages that are used.
func TestLicences(t *testing.T) {
	for _, program := range []struct{ name, cgo string }{{"evenstep", "0"}, {"evenstep-desktop", "1"}} {
		for _, system := range []string{"linux", "windows", "darwin"} {
			t.Run(program.name+"/"+system, func(t *testing.T) {
				modules := linkedModules(t, program.name, system, program.cgo)
				if len(modules) < 5 {
					t.Fatalf("%d modules linked; expected several", len(modules))
				}
				for path, m := range modules {
					if len(licenceFiles(t, m.dir)) == 0 {
						t.Errorf("%s %s has no licence file; expected one at its top", path, m.version)
					}
					for folder := range m.folders {
						for _, file := range licenceFiles(t, folder) {
							if why, ok := judged[path+"@"+m.version+"/"+filepath.Base(file)]; ok && folder == m.dir {
								t.Logf("%s %s: %s: %s", path, m.version, filepath.Base(file), why)
								continue
							}
							text, err := os.ReadFile(file)
							if err != nil {
								t.Fatal(err)
							}
							name := licenceOf(text)
							if name == "" {
								t.Errorf("%s %s: %s is none of the permissive licences, or says more; expected one of them alone; read it", path, m.version, file)
							}
							t.Logf("%s %s: %s", path, m.version, name)
						}
					}
				}
			})
		}
	}
}

// TestLinkedModules: the list that TestLicences goes by is what the linker writes into the program.
func TestLinkedModules(t *testing.T) {
	info, err := buildinfo.ReadFile(build(t))
	if err != nil {
		t.Fatal(err)
	}
	var built []string
	for _, d := range info.Deps {
		built = append(built, d.Path+" "+d.Version)
	}
	var listed []string
	for path, m := range linkedModules(t, "evenstep", "linux", "0") {
		listed = append(listed, path+" "+m.version)
	}
	slices.Sort(built)
	slices.Sort(listed)
	if !slices.Equal(built, listed) {
		t.Errorf("the program says that it is linked with %v; listed are %v", built, listed)
	}
}

// TestLicenceOf: each licence is known by its phrases and no other text passes.
func TestLicenceOf(t *testing.T) {
	texts := map[string]string{
		"":                              "",
		"All rights reserved.":          "",
		"GNU General Public\n  License": "",
	}
	for _, l := range licences {
		whole := strings.Join(l.phrases, " ... ")
		texts[strings.ToUpper(strings.ReplaceAll(whole, " ", "\n\t"))] = l.name
		for _, c := range conditions {
			texts[whole+" "+c] = ""
		}
		if l.name != "BSD-3-Clause" && len(l.phrases) > 1 {
			texts[strings.Join(l.phrases[1:], " ")] = ""
		}
	}
	for _, text := range slices.Sorted(maps.Keys(texts)) {
		if got := licenceOf([]byte(text)); got != texts[text] {
			t.Errorf("%q: %q; expected %q", text, got, texts[text])
		}
	}
}
