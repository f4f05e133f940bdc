// Command evenstep-desktop is the window of Evenstep.
package main

import (
	"context"
	"errors"
	"flag"
	"fmt"
	"io"
	"log"
	"os"
	"runtime/debug"
	"strings"
	"time"

	"fyne.io/fyne/v2/app"

	"evenstep/display/demo"
	"evenstep/display/store"
	"evenstep/ui"
)

// Exit codes, as those of the commands.
const (
	exitUse    = 2 // wrong use, or a file that is no register
	exitSystem = 3 // no display, a disk that fails
)

func main() {
	f := flag.NewFlagSet("evenstep-desktop", flag.ContinueOnError)
	f.SetOutput(io.Discard)
	register := f.String("register", "", "the register's `FILE` (default: EVENSTEP_REGISTER, else the user's data folder)")
	fill := f.Bool("demo", false, "fill an empty register with an invented site")
	err := f.Parse(os.Args[1:])
	switch {
	case errors.Is(err, flag.ErrHelp):
		f.SetOutput(os.Stdout)
		fmt.Println("evenstep-desktop opens the window of Evenstep on a register.")
		f.PrintDefaults()
		return
	case err == nil && f.NArg() > 0:
		err = fmt.Errorf("%q was given; expected flags only; run \"evenstep-desktop --help\"", f.Arg(0))
	case err != nil:
		err = fmt.Errorf("%w; expected --register FILE or --demo; run \"evenstep-desktop --help\"", err)
	}
	code := exitUse
	if err == nil {
		err = run(*register, *fill)
		if !errors.Is(err, store.ErrForeign) && !errors.Is(err, store.ErrNewer) && !errors.Is(err, store.ErrDamaged) {
			code = exitSystem
		}
	}
	if err != nil {
		fmt.Fprintf(os.Stderr, "evenstep-desktop: %s\n", strings.Join(strings.Fields(err.Error()), " "))
		os.Exit(code)
	}
}

func run(path string, fill bool) error {
	if path == "" {
		var err error
		if path, err = store.DefaultPath(os.Getenv); err != nil {
			return err
		}
	}
	s, err := store.Open(path)
	if err != nil {
		return err
	}
	defer s.Close()
	if fill {
		o := demo.Options{Seed: 1, Now: time.Now().UTC(), Program: program()}
		if err := demo.Fill(context.Background(), s, o, nil); err != nil && !errors.Is(err, demo.ErrNotEmpty) {
			return err
		}
	}
	if os.Getenv("XDG_RUNTIME_DIR") == "" { // a system library complains aloud where it is missing
		os.Setenv("XDG_RUNTIME_DIR", os.TempDir())
	}
	width, height, err := tryWindow()
	if err != nil {
		return fmt.Errorf("no window can be opened: %w; expected a display with OpenGL; the commands do the same without a window (assess, record, criteria, register): run \"evenstep help\"", err)
	}
	if os.Getenv("EVENSTEP_LOG") == "" {
		log.SetOutput(io.Discard) // the toolkit's notes about desktop services that are not there
	}
	a := app.NewWithID("evenstep")
	w := a.NewWindow("Evenstep")
	d := ui.Deps{Store: s, Now: time.Now, Program: program(), Width: width, Height: height}
	if err := ui.Start(a, w, d); err != nil {
		return err
	}
	w.ShowAndRun()
	return nil
}

// program is the name and version that records carry.
func program() string {
	v := "development"
	if info, ok := debug.ReadBuildInfo(); ok && info.Main.Version != "" && info.Main.Version != "(devel)" {
		v = info.Main.Version
	}
	return "evenstep-desktop " + v
}
