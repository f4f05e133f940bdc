package main

import (
	"encoding/json"
	"fmt"
	"io"
	"strings"

	"github.com/spf13/cobra"

	"evenstep/display/criteria"
	"evenstep/display/report"
)

func (p program) criteriaCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "criteria",
		Short: "List and show the published limits that the program carries",
		Args:  cobra.NoArgs,
		RunE:  func(c *cobra.Command, _ []string) error { return c.Help() },
	}
	var asJSON bool
	list := &cobra.Command{
		Use:   "list",
		Short: "List schemes and their classes",
		Args:  cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			all, err := criteria.Schemes()
			if err != nil {
				return system(err)
			}
			if asJSON {
				return p.printJSON(listed(all))
			}
			t := &page{}
			for _, s := range all {
				t.paragraph("", s.ID+": "+s.Name+", "+s.Edition)
				for _, k := range s.Classes {
					t.line("  " + pad(k.ID, 29) + k.Name)
				}
			}
			return p.printText(t)
		},
	}
	list.Flags().BoolVar(&asJSON, "json", false, "print JSON")
	var class, site string
	var showJSON bool
	show := &cobra.Command{
		Use:   "show SCHEME",
		Short: "Show the limits of a scheme, each with its source and how well it is known",
		Args:  oneFile("a scheme"),
		RunE: func(_ *cobra.Command, args []string) error {
			s, err := criteria.Find(args[0])
			if err != nil {
				return err
			}
			classes := s.Classes
			if class != "" {
				k, err := s.FindClass(class)
				if err != nil {
					return err
				}
				classes = []criteria.Class{k}
			}
			var word *criteria.SiteFile
			if site != "" {
				if word, err = openSite(site); err != nil {
					return err
				}
			}
			var used []*criteria.Used
			for _, k := range classes {
				u, err := s.Use(k.ID, word)
				if err != nil {
					return err
				}
				used = append(used, u)
			}
			if showJSON {
				return p.printJSON(used)
			}
			t := &page{}
			t.paragraph("", fmt.Sprintf("%s, edition %s. %s", s.Name, s.Edition, s.Note))
			for i, u := range used {
				t.line("")
				t.line(u.Class + ": " + classes[i].Name)
				for _, l := range u.Limits {
					t.limit(l)
				}
			}
			return p.printText(t)
		},
	}
	show.Flags().StringVar(&class, "class", "", "only this `CLASS`")
	show.Flags().StringVar(&site, "site", "", "site `FILE` that confirms limits or sets the site's own")
	show.Flags().BoolVar(&showJSON, "json", false, "print JSON")
	c.AddCommand(list, show)
	return c
}

// limit writes one limit of a scheme.
func (t *page) limit(l criteria.Limit) {
	f := criteria.Finding{Quantity: string(l.Quantity), Comparison: l.Comparison, Limit: l.Limit, LimitHigh: l.LimitHigh, Unit: l.Unit}
	text := report.Name(string(l.Quantity)) + " " + report.Limit(f)
	if l.Formula != "" {
		text += " (" + l.Formula + ")"
	}
	if l.Basis != "" {
		text += ", " + string(l.Basis)
	}
	t.paragraph("  ", text)
	decides, notes := l.Deciding()
	if decides {
		notes = "decides"
	}
	if !strings.Contains(notes, string(l.Confidence)) {
		notes = string(l.Confidence) + ": " + notes
	}
	notes += "; " + l.Source
	if l.Section != "" {
		notes += "; " + l.Section
	}
	if l.Note != "" {
		notes += "; " + l.Note
	}
	switch {
	case l.Override != nil:
		notes = fmt.Sprintf("the site's own, in place of %s %v: %s (%s, %s)", l.Override.Comparison, l.Override.Limit, l.Override.Reason, l.Override.Name, l.Override.Date)
	case l.Confirmed != nil:
		notes += fmt.Sprintf("; confirmed in %s, page %s (%s, %s)", l.Confirmed.Document, l.Confirmed.Page, l.Confirmed.Person, l.Confirmed.Date)
	}
	t.paragraph("      ", notes)
}

type listedScheme struct {
	ID      string        `json:"id"`
	Name    string        `json:"name"`
	Edition string        `json:"edition"`
	Note    string        `json:"note"`
	Classes []listedClass `json:"classes"`
}

type listedClass struct {
	ID   string `json:"id"`
	Name string `json:"name"`
}

func listed(all []*criteria.Scheme) []listedScheme {
	var out []listedScheme
	for _, s := range all {
		one := listedScheme{ID: s.ID, Name: s.Name, Edition: s.Edition, Note: s.Note}
		for _, k := range s.Classes {
			one.Classes = append(one.Classes, listedClass(k))
		}
		out = append(out, one)
	}
	return out
}

func (p program) printJSON(v any) error {
	enc := json.NewEncoder(p.out)
	enc.SetIndent("", "  ")
	enc.SetEscapeHTML(false)
	if err := enc.Encode(v); err != nil {
		return system(fmt.Errorf("standard output: %w", err))
	}
	return nil
}

func (p program) printText(t *page) error {
	if _, err := io.WriteString(p.out, t.String()); err != nil {
		return system(fmt.Errorf("standard output: %w", err))
	}
	return nil
}
