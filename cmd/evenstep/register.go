package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"strings"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"evenstep/display/demo"
	"evenstep/display/store"
)

// registerPath is what --register names, or the usual place.
func (p program) registerPath(path string) (string, error) {
	if path != "" {
		return path, nil
	}
	return store.DefaultPath(p.getenv)
}

// openRegister opens the register that --register names, or the usual one; it makes one where there is
// none.
func (p program) openRegister(path string) (*store.Store, error) {
	path, err := p.registerPath(path)
	if err != nil {
		return nil, err
	}
	s, err := store.Open(path)
	if err != nil {
		return nil, registerError(err)
	}
	for _, w := range s.Warnings() {
		fmt.Fprintf(p.err, "evenstep: warning: %s\n", w)
	}
	return s, nil
}

// existingRegister is openRegister for commands that have nothing to do with an empty one: a mistyped
// path makes no file.
func (p program) existingRegister(path string) (*store.Store, error) {
	path, err := p.registerPath(path)
	if err != nil {
		return nil, err
	}
	if _, err := os.Stat(path); errors.Is(err, fs.ErrNotExist) {
		return nil, fmt.Errorf("%s: there is no register; expected one; check --register, or make one with \"evenstep register import\" or \"evenstep demo\"", path)
	}
	return p.openRegister(path)
}

// registerError tells what the user named wrongly from what the computer failed at.
func registerError(err error) error {
	for _, use := range []error{store.ErrForeign, store.ErrNewer, store.ErrDamaged, store.ErrInUse, fs.ErrNotExist, fs.ErrExist} {
		if errors.Is(err, use) {
			return err
		}
	}
	return system(err)
}

func registerFlag(c *cobra.Command, path *string) {
	c.PersistentFlags().StringVar(path, "register", "", "the register's `FILE` (default: EVENSTEP_REGISTER, else the user's data folder)")
}

func (p program) registerCommand() *cobra.Command {
	var path string
	c := &cobra.Command{
		Use:   "register",
		Short: "The site's monitors: list, import, backup, restore",
		Args:  cobra.NoArgs,
		RunE:  func(c *cobra.Command, _ []string) error { return c.Help() },
	}
	registerFlag(c, &path)
	var asJSON bool
	list := &cobra.Command{
		Use:   "list",
		Short: "List monitors with their last verdict",
		Args:  cobra.NoArgs,
		RunE:  func(*cobra.Command, []string) error { return p.listRegister(path, asJSON) },
	}
	list.Flags().BoolVar(&asJSON, "json", false, "print JSON")
	var dry bool
	imp := &cobra.Command{
		Use:   "import LIST.csv",
		Short: "Add and change monitors from a spreadsheet's CSV",
		Long: `Add and change monitors from a spreadsheet's CSV. The first line names the columns: serial (needed),
room, station, place, label, model, scheme, class, calibrated_in, bits, rd, orientation,
backlight_hours, notes. An empty cell leaves what is there. All lines are carried out or none.`,
		Args: oneFile("a list of monitors"),
		RunE: func(_ *cobra.Command, args []string) error { return p.importList(path, args[0], dry) },
	}
	imp.Flags().BoolVar(&dry, "dry-run", false, "say what would change and change nothing")
	backup := &cobra.Command{
		Use:   "backup FILE",
		Short: "Write a checked copy of the register",
		Args:  oneFile("the copy to write"),
		RunE: func(_ *cobra.Command, args []string) error {
			s, err := p.existingRegister(path)
			if err != nil {
				return err
			}
			defer s.Close()
			if err := s.Backup(args[0]); err != nil {
				return registerError(err)
			}
			fmt.Fprintf(p.out, "copied %s to %s\n", s.Path(), args[0])
			return nil
		},
	}
	restore := &cobra.Command{
		Use:   "restore FILE",
		Short: "Put a backup in the register's place; what was there is kept beside it",
		Args:  oneFile("a backup"),
		RunE: func(_ *cobra.Command, args []string) error {
			at, err := p.registerPath(path)
			if err != nil {
				return err
			}
			kept, err := store.Restore(args[0], at, p.now())
			if err != nil {
				return registerError(err)
			}
			fmt.Fprintf(p.out, "restored %s from %s\n", at, args[0])
			if kept != "" {
				fmt.Fprintf(p.out, "what was there is kept as %s\n", kept)
			}
			return nil
		},
	}
	c.AddCommand(list, imp, backup, restore)
	return c
}

type listedMonitor struct {
	Serial  string  `json:"serial"`
	Room    string  `json:"room"`
	Station string  `json:"station"`
	Label   string  `json:"label"`
	Scheme  string  `json:"scheme"`
	Class   string  `json:"class"`
	Retired bool    `json:"retired"`
	Last    *string `json:"last_visit"`
	Verdict *string `json:"last_verdict"`
}

func (p program) listRegister(path string, asJSON bool) error {
	s, err := p.existingRegister(path)
	if err != nil {
		return err
	}
	defer s.Close()
	monitors, err := s.Monitors()
	if err != nil {
		return system(err)
	}
	latest, err := s.Latest()
	if err != nil {
		return system(err)
	}
	out := []listedMonitor{}
	t := &page{}
	for _, m := range monitors {
		one := listedMonitor{Serial: m.Serial, Room: m.Room, Station: m.Station, Label: m.Label, Scheme: m.Scheme, Class: m.Class, Retired: m.Retired}
		state := "no visit"
		if e, ok := latest[m.ID]; ok {
			day, verdict := e.Time, string(e.Verdict)
			one.Last, one.Verdict = &day, &verdict
			state = verdict + ", " + strings.SplitN(day, "T", 2)[0]
		}
		if m.Retired {
			state = "taken out"
		}
		out = append(out, one)
		t.line(pad(m.Serial, 18) + " " + pad(m.Title(), 44) + " " + state)
	}
	if asJSON {
		return p.printJSON(out)
	}
	return p.printText(t)
}

func (p program) importList(path, list string, dry bool) error {
	s, err := p.openRegister(path)
	if err != nil {
		return err
	}
	defer s.Close()
	f, err := open(list, "list")
	if err != nil {
		return err
	}
	defer f.Close()
	plan, err := s.PlanImport(list, f)
	if err != nil {
		return err
	}
	t := &page{}
	count := map[string]int{}
	var firstErr error
	for _, c := range plan {
		count[c.What]++
		switch {
		case c.Err != "":
			if firstErr == nil {
				firstErr = fmt.Errorf("%s:%d: %s; nothing was imported", list, c.Line, c.Err)
			}
			t.paragraph("", fmt.Sprintf("error    %s: %s", c.Serial, c.Err))
		case c.What != "same":
			t.paragraph("", strings.TrimRight(pad(c.What, 8)+" "+c.Serial+"  "+strings.Join(c.Fields, "; "), " "))
		}
	}
	t.line(fmt.Sprintf("%d new, %d changed, %d the same, %d with errors", count["new"], count["changed"], count["same"], count["error"]))
	if dry || firstErr == nil {
		if err := p.printText(t); err != nil {
			return err
		}
	}
	if firstErr != nil {
		return firstErr
	}
	if dry {
		return nil
	}
	if err := s.Import(plan); err != nil {
		return system(err)
	}
	return nil
}

func (p program) demoCommand() *cobra.Command {
	var path string
	var o demo.Options
	c := &cobra.Command{
		Use:   "demo",
		Short: "Fill an empty register with an invented site",
		Args:  cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			if o.Monitors < 0 || o.Visits < 0 || o.Monitors > 100000 || o.Visits > 1000 {
				return errors.New("--monitors or --visits is out of range; expected at most 100000 monitors and 1000 visits each; choose less")
			}
			s, err := p.openRegister(path)
			if err != nil {
				return err
			}
			defer s.Close()
			o.Now, o.Program = p.now().UTC(), "evenstep "+version()
			var progress func(done, all int)
			if f, ok := p.err.(*os.File); ok && term.IsTerminal(int(f.Fd())) {
				progress = func(done, all int) { fmt.Fprintf(p.err, "\r%d of %d visits", done, all) }
				defer fmt.Fprintln(p.err)
			}
			if err := demo.Fill(c.Context(), s, o, progress); err != nil {
				if errors.Is(err, demo.ErrNotEmpty) {
					return err
				}
				return system(err)
			}
			fmt.Fprintf(p.out, "%s: an invented site; nothing in it is real\n", s.Path())
			return nil
		},
	}
	registerFlag(c, &path)
	c.Flags().IntVar(&o.Monitors, "monitors", 16, "how many `N` monitors")
	c.Flags().IntVar(&o.Visits, "visits", 7, "how many `M` visits a monitor, half a year apart")
	c.Flags().Uint64Var(&o.Seed, "seed", 1, "`S`: the same seed makes the same site")
	return c
}
