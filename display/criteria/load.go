package criteria

import (
	"bytes"
	"embed"
	"errors"
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"github.com/BurntSushi/toml"
)

//go:embed schemes/*.toml
var embedded embed.FS

// FileError is a fault in a scheme or site file.
type FileError struct {
	File  string
	Line  int    // 0 where the whole file is meant
	Field string // dotted key, "" where none is meant
	Err   error
}

func (e *FileError) Error() string {
	place := e.File
	if e.Line > 0 {
		place = fmt.Sprintf("%s:%d", e.File, e.Line)
	}
	if e.Field != "" {
		place += ": " + e.Field
	}
	return fmt.Sprintf("%s: %v", place, e.Err)
}

func (e *FileError) Unwrap() error { return e.Err }

// maxFile bounds scheme and site files: the largest scheme has 30 kB.
const maxFile = 1 << 20

// Schemes returns every scheme that the program carries, by id.
func Schemes() ([]*Scheme, error) {
	files, err := embedded.ReadDir("schemes")
	if err != nil {
		return nil, fmt.Errorf("schemes: %w", err)
	}
	var all []*Scheme
	for _, f := range files {
		text, err := embedded.ReadFile("schemes/" + f.Name())
		if err != nil {
			return nil, fmt.Errorf("schemes: %w", err)
		}
		s, err := ParseScheme(f.Name(), text)
		if err != nil {
			return nil, err
		}
		if f.Name() != s.ID+".toml" {
			return nil, &FileError{f.Name(), 0, "id", fmt.Errorf("is %q; expected the name of the file; rename one", s.ID)}
		}
		all = append(all, s)
	}
	return all, nil
}

// Find returns the scheme with the given id.
func Find(id string) (*Scheme, error) {
	files, err := embedded.ReadDir("schemes")
	if err != nil {
		return nil, fmt.Errorf("schemes: %w", err)
	}
	var ids []string
	for _, f := range files {
		if f.Name() != id+".toml" {
			ids = append(ids, strings.TrimSuffix(f.Name(), ".toml"))
			continue
		}
		text, err := embedded.ReadFile("schemes/" + f.Name())
		if err != nil {
			return nil, fmt.Errorf("schemes: %w", err)
		}
		return ParseScheme(f.Name(), text)
	}
	return nil, fmt.Errorf("scheme %q is not known; expected one of %s; run \"evenstep criteria list\"", id, strings.Join(ids, ", "))
}

// FindClass returns the class with the given id. Where id is empty and the scheme has a single
// class, that one.
func (s *Scheme) FindClass(id string) (Class, error) {
	if id == "" && len(s.Classes) == 1 {
		return s.Classes[0], nil
	}
	var ids []string
	for _, c := range s.Classes {
		if c.ID == id {
			return c, nil
		}
		ids = append(ids, c.ID)
	}
	if id == "" {
		return Class{}, fmt.Errorf("scheme %s: no class was given; expected one of %s; state the use of the monitor with --class", s.ID, strings.Join(ids, ", "))
	}
	return Class{}, fmt.Errorf("scheme %s: class %q is not known; expected one of %s; run \"evenstep criteria show %s\"", s.ID, id, strings.Join(ids, ", "), s.ID)
}

// Limits returns the limits of a class, in the order of the file.
func (s *Scheme) Limits(class string) []Limit {
	var out []Limit
	for _, l := range s.limits {
		if slices.Contains(l.classes, class) {
			out = append(out, l)
		}
	}
	return out
}

type schemeFile struct {
	ID      string      `toml:"id"`
	Name    string      `toml:"name"`
	Edition string      `toml:"edition"`
	Note    string      `toml:"note"`
	Class   []Class     `toml:"class"`
	Limit   []limitFile `toml:"limit"`
}

type limitFile struct {
	Classes []string `toml:"classes"`
	Limit
}

// ParseScheme reads a scheme file. Every fault is a *FileError that names line and field.
func ParseScheme(name string, text []byte) (*Scheme, error) {
	var f schemeFile
	at, err := decode(name, text, &f)
	if err != nil {
		return nil, err
	}
	top := func(field, value string) error {
		if strings.TrimSpace(value) == "" {
			return &FileError{name, 0, field, errors.New("is missing; expected a text; add it")}
		}
		return nil
	}
	if err := errors.Join(top("id", f.ID), top("name", f.Name), top("edition", f.Edition)); err != nil {
		return nil, first(err)
	}
	if len(f.Class) == 0 {
		return nil, &FileError{name, 0, "class", errors.New("there is none; expected at least one [[class]]; add it")}
	}
	s := &Scheme{ID: f.ID, Name: f.Name, Edition: f.Edition, Note: f.Note, Classes: f.Class}
	var ids []string
	for i, c := range f.Class {
		line := at("class", i)
		if c.ID == "" || c.Name == "" {
			return nil, &FileError{name, line, "class", errors.New("id or name is missing; expected both; add them")}
		}
		if slices.Contains(ids, c.ID) {
			return nil, &FileError{name, line, "class.id", fmt.Errorf("%q stands twice; expected each class once; rename one", c.ID)}
		}
		ids = append(ids, c.ID)
	}
	if len(f.Limit) == 0 {
		return nil, &FileError{name, 0, "limit", errors.New("there is none; expected at least one [[limit]]; add it")}
	}
	seen := map[string]bool{}
	for i, lf := range f.Limit {
		line := at("limit", i)
		l := lf.Limit
		fault := func(field, format string, args ...any) error {
			return &FileError{name, at("limit", i, field), "limit." + field, fmt.Errorf(format, args...)}
		}
		l.classes = lf.Classes
		if len(lf.Classes) == 1 && lf.Classes[0] == "*" {
			l.classes = ids
		}
		if len(l.classes) == 0 {
			return nil, fault("classes", "is empty; expected class ids or [\"*\"]; name the classes")
		}
		for _, c := range l.classes {
			if !slices.Contains(ids, c) {
				return nil, fault("classes", "%q is no class of this file; expected one of %s; correct the spelling", c, strings.Join(ids, ", "))
			}
		}
		if field, err := l.check(); err != nil {
			return nil, fault(field, "%w", err)
		}
		for _, c := range l.classes {
			key := c + "/" + string(l.Quantity) + "/" + l.Formula
			if seen[key] {
				return nil, &FileError{name, line, "limit", fmt.Errorf("%s of class %q stands twice with formula %q; expected once; tell them apart or remove one", l.Quantity, c, l.Formula)}
			}
			seen[key] = true
		}
		s.limits = append(s.limits, l)
	}
	return s, nil
}

// first unwraps the first error of a join, so that a user sees one line.
func first(err error) error {
	var joined interface{ Unwrap() []error }
	if errors.As(err, &joined) {
		for _, e := range joined.Unwrap() {
			if e != nil {
				return e
			}
		}
	}
	return err
}

// decode reads TOML strictly: an unknown key is a fault. at finds the line of an element of an array
// of tables, or of a key in it.
func decode(name string, text []byte, into any) (at func(table string, index int, key ...string) int, err error) {
	if len(text) > maxFile {
		return nil, &FileError{name, 0, "", fmt.Errorf("has %d bytes; expected at most %d; is it the right file?", len(text), maxFile)}
	}
	meta, err := toml.NewDecoder(bytes.NewReader(text)).Decode(into)
	if err != nil {
		var p toml.ParseError
		if errors.As(err, &p) {
			return nil, &FileError{name, p.Position.Line, p.LastKey, fmt.Errorf("%s; expected TOML; correct the line", oneLine(p.Message))}
		}
		// A value of the wrong type comes as plain text with its line and key in it.
		if m := typeFault.FindStringSubmatch(err.Error()); m != nil {
			line, _ := strconv.Atoi(m[1])
			return nil, &FileError{name, line, m[2], fmt.Errorf("%s; expected another kind of value; correct the line", oneLine(m[3]))}
		}
		return nil, &FileError{name, 0, "", fmt.Errorf("%s; expected TOML; correct the file", oneLine(err.Error()))}
	}
	at = func(table string, index int, key ...string) int { return lineOf(text, table, index, key...) }
	if extra := meta.Undecoded(); len(extra) > 0 {
		key := extra[0]
		return nil, &FileError{name, lineOfKey(text, key[len(key)-1]), key.String(), errors.New("is no field of this file; expected a known one; correct the spelling")}
	}
	return at, nil
}

var typeFault = regexp.MustCompile(`line (\d+) \(last key "([^"]*)"\): (.*)`)

func oneLine(s string) string { return strings.Join(strings.Fields(s), " ") }

// lineOf finds the line of the index-th [[table]], or of a key below it; 0 where it is not found.
func lineOf(text []byte, table string, index int, key ...string) int {
	header := 0
	seen := -1
	for i, line := range strings.Split(string(text), "\n") {
		line = strings.TrimSpace(line)
		if strings.HasPrefix(line, "[[") {
			if seen == index {
				break
			}
			if strings.Trim(line, "[] \t\r") == table {
				if seen++; seen == index {
					if header = i + 1; len(key) == 0 {
						return header
					}
				}
			}
		}
		if seen == index && len(key) > 0 && keyOf(line) == key[0] {
			return i + 1
		}
	}
	return header
}

func lineOfKey(text []byte, key string) int {
	for i, line := range strings.Split(string(text), "\n") {
		if keyOf(line) == key || strings.Trim(strings.TrimSpace(line), "[] ") == key {
			return i + 1
		}
	}
	return 0
}

func keyOf(line string) string {
	k, _, ok := strings.Cut(line, "=")
	if !ok {
		return ""
	}
	return strings.Trim(strings.TrimSpace(k), `"'`)
}
