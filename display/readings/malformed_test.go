package readings

import (
	"errors"
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"unicode"
)

var update = flag.Bool("update", false, "write the expected errors anew")

var malformed = filepath.Join("testdata", "malformed.txt")

// fault is one case of malformed.txt.
type fault struct{ kind, name, content, want string }

// parse reads the content as what its kind says.
func (f fault) parse() error {
	var err error
	if f.kind == "places" {
		_, err = ParsePlaces(f.name+".csv", strings.NewReader(f.content))
	} else {
		_, err = Parse(f.name+".csv", strings.NewReader(f.content))
	}
	return err
}

func faults(t testing.TB) []fault {
	t.Helper()
	b, err := os.ReadFile(malformed)
	if err != nil {
		t.Fatal(err)
	}
	var all []fault
	var f *fault
	for _, l := range strings.Split(string(b), "\n") {
		switch {
		case strings.HasPrefix(l, "-- ") && strings.HasSuffix(l, " --"):
			words := strings.Fields(l)
			f = &fault{kind: words[1], name: words[2]}
		case f == nil: // the words at the top
		case strings.HasPrefix(l, ">>"):
			f.want = strings.TrimPrefix(l[2:], " ")
			all = append(all, *f)
			f = nil
		default:
			s, err := strconv.Unquote(`"` + strings.ReplaceAll(strings.ReplaceAll(l, `\"`, `"`), `"`, `\"`) + `"`)
			if err != nil {
				t.Fatalf("%s: case %s: line %q: %v", malformed, f.name, l, err)
			}
			f.content += s + "\n"
		}
	}
	return all
}

// checkFormatError demands what is promised of every refusal.
func checkFormatError(t *testing.T, name string, err error) {
	t.Helper()
	var fe *FormatError
	if !errors.As(err, &fe) {
		t.Fatalf("%s: error %v is %T, want *FormatError", name, err, err)
	}
	if fe.File != name {
		t.Errorf("%s: file is %q", name, fe.File)
	}
	line := err.Error()
	if strings.ContainsFunc(line, func(r rune) bool { return !unicode.IsPrint(r) }) {
		t.Errorf("%s: %q holds what does not print", name, line)
	}
	place := printable(name)
	if fe.Line > 0 {
		place = fmt.Sprintf("%s:%d", place, fe.Line)
	}
	if !strings.HasPrefix(line, place+": ") {
		t.Errorf("%s: %q does not begin with its place", name, line)
	}
	if strings.Count(line, "; expected ") != 1 || fe.Found == "" || fe.Expected == "" || fe.Do == "" {
		t.Errorf("%s: %q does not say what was found, expected and to do", name, line)
	}
	// Long cells are shortened; the longest fixed text is the list of columns.
	if most := len(printable(name)) + 400; len(line) > most {
		t.Errorf("%s: %d bytes in %q, want at most %d", name, len(line), line, most)
	}
}

func TestMalformed(t *testing.T) {
	all := faults(t)
	if len(all) < 40 {
		t.Fatalf("%d cases in %s, want at least 40", len(all), malformed)
	}
	seen := map[string]bool{}
	got := map[string]string{}
	for _, f := range all {
		key := f.kind + " " + f.name
		if seen[key] {
			t.Errorf("case %s stands twice", key)
		}
		seen[key] = true
		err := f.parse()
		if err == nil {
			t.Errorf("%s was accepted", key)
			continue
		}
		checkFormatError(t, f.name+".csv", err)
		got[key] = err.Error()
		if !*update && err.Error() != f.want {
			t.Errorf("%s:\n got %s\nwant %s", key, err, f.want)
		}
	}
	if *update {
		rewrite(t, got)
	}
}

// rewrite puts the errors into malformed.txt.
func rewrite(t *testing.T, got map[string]string) {
	b, err := os.ReadFile(malformed)
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(string(b), "\n")
	key := ""
	for i, l := range lines {
		switch {
		case strings.HasPrefix(l, "-- ") && strings.HasSuffix(l, " --"):
			key = strings.TrimSuffix(strings.TrimPrefix(l, "-- "), " --")
		case key != "" && strings.HasPrefix(l, ">>"):
			lines[i] = ">> " + got[key]
		}
	}
	if err := os.WriteFile(malformed, []byte(strings.Join(lines, "\n")), 0o644); err != nil {
		t.Fatal(err)
	}
}
