// Command evenstep-desktop is the window of Evenstep.
package main

import (
	"flag"
	"fmt"
	"os"
	"time"

	"fyne.io/fyne/v2/app"

	"evenstep/display/store"
	"evenstep/ui"
)

func main() {
	register := flag.String("register", "", "the register's `FILE` (default: EVENSTEP_REGISTER, else the user's data folder)")
	flag.Parse()
	if err := run(*register); err != nil {
		fmt.Fprintf(os.Stderr, "evenstep-desktop: %v\n", err)
		os.Exit(3)
	}
}

func run(path string) error {
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
	a := app.NewWithID("evenstep")
	w := a.NewWindow("Evenstep")
	if err := ui.Start(a, w, ui.Deps{Store: s, Now: time.Now, Program: "evenstep development"}); err != nil {
		return err
	}
	w.ShowAndRun()
	return nil
}
