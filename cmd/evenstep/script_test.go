package main

import (
	"context"
	"encoding/json"
	"errors"
	"flag"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/testscript"
)

var update = flag.Bool("update", false, "write the golden files of the scripts anew")

// clock is the time that programs run by the scripts see: a record holds it.
func clock() time.Time { return time.Date(2026, 11, 30, 9, 15, 0, 0, time.UTC) }

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){
		"evenstep": func() {
			p := program{in: os.Stdin, out: os.Stdout, err: os.Stderr, now: clock, getenv: os.Getenv, self: os.Executable}
			os.Exit(p.run(context.Background(), os.Args[1:]))
		},
	})
}

func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir:           filepath.Join("testdata", "script"),
		UpdateScripts: *update,
		Setup: func(e *testscript.Env) error {
			e.Setenv("READINGS", "readings")
			return os.CopyFS(filepath.Join(e.WorkDir, "readings"), os.DirFS(filepath.Join("..", "..", "testdata", "readings")))
		},
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"code": exitCode, "oneline": oneLineOf, "json": jsonHas, "width": widthOf,
		},
	})
}

// exitCode runs evenstep and compares its exit code: code N args... stdout and stderr can be
// compared afterwards.
func exitCode(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: code N args...")
	}
	got := 0
	if err := ts.Exec("evenstep", args[1:]...); err != nil {
		var exit *exec.ExitError
		if !errors.As(err, &exit) {
			ts.Fatalf("%v", err)
		}
		got = exit.ExitCode()
	}
	if args[0] != strconv.Itoa(got) {
		ts.Fatalf("exit code %d, want %s", got, args[0])
	}
}

// oneLineOf checks that a file is one line that starts with the program's name: oneline FILE
func oneLineOf(ts *testscript.TestScript, neg bool, args []string) {
	text := ts.ReadFile(args[0])
	one := strings.HasPrefix(text, "evenstep: ") && strings.Count(text, "\n") == 1 && strings.HasSuffix(text, "\n")
	if one == neg {
		ts.Fatalf("%q", text)
	}
}

// jsonHas compares a figure of a JSON file: json FILE KEY VALUE, or json FILE KEY for being there.
func jsonHas(ts *testscript.TestScript, neg bool, args []string) {
	var all map[string]any
	if err := json.Unmarshal([]byte(ts.ReadFile(args[0])), &all); err != nil {
		ts.Fatalf("%v", err)
	}
	v, ok := all[args[1]]
	if len(args) == 2 {
		if ok == neg {
			ts.Fatalf("key %q: %v", args[1], ok)
		}
		return
	}
	text, err := json.Marshal(v)
	ts.Check(err)
	if (string(text) == args[2]) == neg {
		ts.Fatalf("%s is %s, want %s", args[1], text, args[2])
	}
}

// widthOf checks that no line of a file is longer than N characters: width FILE N
func widthOf(ts *testscript.TestScript, neg bool, args []string) {
	for _, line := range strings.Split(ts.ReadFile(args[0]), "\n") {
		if n := len([]rune(line)); n > textWidth {
			ts.Fatalf("%d characters: %s", n, line)
		}
	}
}
