package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"runtime/debug"
	"strings"
	"time"

	"github.com/spf13/cobra"
)

// Exit codes of every command.
const (
	exitMeets  = 0 // done, and nothing fails
	exitFails  = 1 // done, and something does not meet its limit
	exitUse    = 2 // wrong use or bad input
	exitSystem = 3 // the computer failed: disk, port, display
)

// program holds what the commands take from outside.
type program struct {
	in       io.Reader
	out, err io.Writer
	now      func() time.Time
	getenv   func(string) string
	self     func() (string, error) // path of this executable
}

// failure is an error with the exit code it asks for.
type failure struct {
	code int
	err  error
}

func (f *failure) Error() string { return f.err.Error() }
func (f *failure) Unwrap() error { return f.err }

// system marks an error as the computer's, not the user's.
func system(err error) error { return &failure{exitSystem, err} }

// errFails ends a command that was carried out and found something that does not meet its limit.
var errFails = &failure{code: exitFails, err: errors.New("")}

// run executes one command line and returns the exit code. Errors go to p.err as one line.
func (p program) run(ctx context.Context, args []string) int {
	root := p.root()
	root.SetArgs(append([]string{}, args...)) // a nil list would mean the arguments of the process
	root.SetIn(p.in)
	root.SetOut(p.out)
	root.SetErr(p.err)
	err := root.ExecuteContext(ctx)
	if err == nil {
		return exitMeets
	}
	code := exitUse
	var f *failure
	if errors.As(err, &f) {
		code = f.code
	}
	if text := oneLine(err.Error()); text != "" {
		fmt.Fprintf(p.err, "evenstep: %s\n", text)
	}
	return code
}

func oneLine(s string) string { return strings.Join(strings.Fields(s), " ") }

func (p program) root() *cobra.Command {
	root := &cobra.Command{
		Use:           "evenstep",
		Short:         "Check and calibrate the grays of reading-room monitors",
		Long:          "Evenstep judges a monitor from its luminance readings against the Grayscale Standard\nDisplay Function (DICOM PS3.14) and a published set of limits. It supports a qualified\nperson and decides nothing in their place.",
		Version:       version(),
		SilenceErrors: true,
		SilenceUsage:  true,
		Args:          cobra.ArbitraryArgs,
		RunE: func(c *cobra.Command, args []string) error {
			if len(args) > 0 {
				return fmt.Errorf("%q is no command; expected one of %s; run \"evenstep help\"", args[0], commandNames(c))
			}
			return p.startDesktop(c.Context())
		},
	}
	root.CompletionOptions.HiddenDefaultCmd = true
	root.SetVersionTemplate("evenstep {{.Version}}\n")
	root.SetFlagErrorFunc(func(c *cobra.Command, err error) error {
		return fmt.Errorf("%w; run \"%s --help\" for the flags", err, c.CommandPath())
	})
	root.AddCommand(p.assessCommand(), p.criteriaCommand(), p.recordCommand(), p.registerCommand(), p.demoCommand(), p.patternCommand(), p.calibrateCommand(), p.windowCommand(), p.renderCommand())
	return root
}

func commandNames(c *cobra.Command) string {
	var names []string
	for _, s := range c.Root().Commands() {
		if s.IsAvailableCommand() && s.Name() != "help" {
			names = append(names, s.Name())
		}
	}
	return strings.Join(names, ", ")
}

// version is the module version this program was built from, with the revision where it is a
// development build.
func version() string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return "unknown"
	}
	v := info.Main.Version
	if v == "" || v == "(devel)" {
		v = "development"
		for _, s := range info.Settings {
			if s.Key == "vcs.revision" && len(s.Value) >= 12 {
				v += " " + s.Value[:12]
			}
		}
	}
	return v
}
