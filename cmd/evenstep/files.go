package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	"github.com/spf13/cobra"

	"evenstep/display/criteria"
	"evenstep/display/record"
)

// openError says in one line that a file the user named cannot be read.
func openError(path, what string, err error) error {
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return fmt.Errorf("%s: there is no such file; expected a %s file; check the path", path, what)
	case errors.Is(err, fs.ErrPermission):
		return fmt.Errorf("%s: may not be read; expected a readable %s file; check its permissions", path, what)
	}
	if info, e := os.Stat(path); e == nil && info.IsDir() {
		return fmt.Errorf("%s: is a folder; expected a %s file; name the file", path, what)
	}
	return system(fmt.Errorf("%s: %w; expected a readable %s file", path, err, what))
}

// open opens a file that the user named.
func open(path, what string) (*os.File, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, openError(path, what, err)
	}
	if info, err := f.Stat(); err == nil && info.IsDir() {
		f.Close()
		return nil, fmt.Errorf("%s: is a folder; expected a %s file; name the file", path, what)
	}
	return f, nil
}

func openSite(path string) (*criteria.SiteFile, error) {
	text, err := os.ReadFile(path)
	if err != nil {
		return nil, openError(path, "site", err)
	}
	return criteria.ParseSite(filepath.Base(path), text)
}

func alreadyThere(path string) error {
	return fmt.Errorf("%s: is there already; expected a new file; choose another name, or give --replace", path)
}

// writeFile writes a whole file or none.
func writeFile(path string, text []byte, replace bool) error {
	err := record.WriteFile(path, text, replace)
	switch {
	case err == nil:
		return nil
	case errors.Is(err, fs.ErrExist):
		return alreadyThere(path)
	case errors.Is(err, fs.ErrNotExist):
		return fmt.Errorf("%s: its folder does not exist; expected one; make it first", path)
	}
	return system(err)
}

func (p program) recordCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "record",
		Short: "Verify sealed records and print reports from them",
		Args:  cobra.NoArgs,
		RunE:  func(c *cobra.Command, _ []string) error { return c.Help() },
	}
	verify := &cobra.Command{
		Use:   "verify RECORD.json...",
		Short: "Check that sealed records are unaltered",
		Args:  cobra.MinimumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			bad := 0
			for _, path := range args {
				r, err := openRecord(path)
				switch {
				case errors.Is(err, record.ErrAltered), errors.Is(err, record.ErrTruncated):
					bad++
					fmt.Fprintf(p.out, "altered  %s\n", oneLine(err.Error()))
				case err != nil:
					return err
				default:
					fmt.Fprintf(p.out, "sealed   %s  %s  %s\n", path, r.Code(), r.Visit.Time)
				}
			}
			if bad > 0 {
				return errFails
			}
			return nil
		},
	}
	var o outputs
	export := &cobra.Command{
		Use:   "export RECORD.json",
		Short: "Print the report of a sealed record again",
		Args:  oneFile("a record"),
		RunE: func(_ *cobra.Command, args []string) error {
			r, err := openRecord(args[0])
			if err != nil {
				return err
			}
			if o.pdf == "" && o.csv == "" {
				return errors.New("nothing to write; expected --pdf or --csv; name a file")
			}
			if err := o.checkPaths("", args[0]); err != nil {
				return err
			}
			return o.write(r)
		},
	}
	o.add(export)
	c.AddCommand(verify, export, p.rejudgeCommand())
	return c
}

// largestRecord bounds what is read: a record of 65536 levels has about 30 MB.
const largestRecord = 64 << 20

func openRecord(path string) (*record.Record, error) {
	info, err := os.Stat(path)
	if err == nil && info.Size() > largestRecord {
		return nil, fmt.Errorf("%s: has %d bytes; expected a record of at most %d; is it the right file?", path, info.Size(), largestRecord)
	}
	text, err := os.ReadFile(path)
	if err != nil {
		return nil, openError(path, "record", err)
	}
	return record.Read(path, text)
}
