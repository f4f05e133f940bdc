package main

import (
	"errors"
	"fmt"
	"os"
	"time"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"evenstep/display/criteria"
	"evenstep/display/report"
	"evenstep/display/store"
)

// rejudged is the outcome of judging a register again.
type rejudged struct {
	Scheme   string                   `json:"scheme"`
	Class    string                   `json:"class"`
	Records  int                      `json:"records"`
	Verdicts map[criteria.Verdict]int `json:"verdicts"`
	Changed  int                      `json:"changed"`
	Broken   int                      `json:"unreadable"`
	Seconds  float64                  `json:"seconds"`
}

func (p program) rejudgeCommand() *cobra.Command {
	var path, scheme, class, site string
	var asJSON bool
	c := &cobra.Command{
		Use:   "rejudge",
		Short: "Judge every record of the register by other limits; no record is changed",
		Args:  cobra.NoArgs,
		RunE: func(c *cobra.Command, _ []string) error {
			s, err := criteria.Find(scheme)
			if err != nil {
				return err
			}
			var word *criteria.SiteFile
			if site != "" {
				if word, err = openSite(site); err != nil {
					return err
				}
			}
			used, err := s.Use(class, word)
			if err != nil {
				return err
			}
			st, err := p.existingRegister(path)
			if err != nil {
				return err
			}
			defer st.Close()
			var progress func(done, all int)
			if f, ok := p.err.(*os.File); ok && !asJSON && term.IsTerminal(int(f.Fd())) {
				progress = func(done, all int) { fmt.Fprintf(p.err, "\r%d of %d", done, all) }
				defer fmt.Fprintln(p.err)
			}
			out := rejudged{Scheme: used.ID, Class: used.Class, Verdicts: map[criteria.Verdict]int{}}
			began := time.Now()
			err = st.Rejudge(c.Context(), used, func(r store.Rejudged) {
				out.Records++
				switch {
				case r.Err != nil:
					out.Broken++
				default:
					out.Verdicts[r.After]++
					if r.After != r.Before {
						out.Changed++
					}
				}
			}, progress)
			out.Seconds = time.Since(began).Seconds()
			if err != nil {
				return system(err)
			}
			if asJSON {
				err = p.printJSON(out)
			} else {
				t := &page{}
				t.line(fmt.Sprintf("%d records by %s, class %s, in %.1f s", out.Records, out.Scheme, out.Class, out.Seconds))
				for _, v := range []criteria.Verdict{criteria.Meets, criteria.MeetsUncertainly, criteria.FailsUncertainly, criteria.Fails, criteria.NotAssessed} {
					t.line(fmt.Sprintf("%8d %s %s", out.Verdicts[v], report.Sign(v), v))
				}
				t.line(fmt.Sprintf("%8d come to another verdict than the record's own limits gave", out.Changed))
				err = p.printText(t)
			}
			if err == nil && out.Broken > 0 {
				return errors.Join(fmt.Errorf("%d records could not be read; expected sealed ones; restore them from a backup", out.Broken), errFails)
			}
			return err
		},
	}
	registerFlag(c, &path)
	c.Flags().StringVar(&scheme, "scheme", "", "judge by this `SCHEME`")
	c.Flags().StringVar(&class, "class", "", "a `CLASS` of the scheme")
	c.Flags().StringVar(&site, "site", "", "site `FILE` that confirms limits or sets the site's own")
	c.Flags().BoolVar(&asJSON, "json", false, "print JSON")
	return c
}
