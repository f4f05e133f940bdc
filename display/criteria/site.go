package criteria

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"slices"
	"strconv"
	"strings"
	"time"
)

// SiteFile is a site's own word on limits: which it has checked against the scheme's document, and
// which it replaces by its own.
type SiteFile struct {
	ID        SiteID
	confirms  []siteEntry
	overrides []siteEntry
}

type siteEntry struct {
	Scheme     string   `toml:"scheme"`
	Class      string   `toml:"class"`
	Quantity   Quantity `toml:"quantity"`
	Formula    string   `toml:"formula"`
	Comparison string   `toml:"comparison"`
	Limit      float64  `toml:"limit"`
	LimitHigh  *float64 `toml:"limit_high"`
	Document   string   `toml:"document"`
	Page       string   `toml:"page"`
	Person     string   `toml:"person"`
	Reason     string   `toml:"reason"`
	Name       string   `toml:"name"`
	Date       any      `toml:"date"`
}

// ParseSite reads a site file and checks every entry against the schemes that the program carries.
// Every fault is a *FileError that names line and field.
func ParseSite(name string, text []byte) (*SiteFile, error) {
	var f struct {
		Site     string      `toml:"site"`
		Confirm  []siteEntry `toml:"confirm"`
		Override []siteEntry `toml:"override"`
	}
	at, err := decode(name, text, &f)
	if err != nil {
		return nil, err
	}
	if strings.TrimSpace(f.Site) == "" {
		return nil, &FileError{name, 0, "site", errors.New("is missing; expected the name of the site; add it")}
	}
	sum := sha256.Sum256(text)
	site := &SiteFile{ID: SiteID{Site: f.Site, File: name, SHA256: hex.EncodeToString(sum[:])}}
	seen := map[string]bool{}
	for _, table := range []struct {
		name    string
		entries []siteEntry
		out     *[]siteEntry
	}{{"confirm", f.Confirm, &site.confirms}, {"override", f.Override, &site.overrides}} {
		for i, e := range table.entries {
			if field, err := e.check(table.name); err != nil {
				return nil, &FileError{name, at(table.name, i, field), table.name + "." + field, err}
			}
			key := strings.Join([]string{e.Scheme, e.Class, string(e.Quantity), e.Formula}, "/")
			if seen[key] {
				return nil, &FileError{name, at(table.name, i), table.name, fmt.Errorf("%s is named twice; expected one entry a limit; remove one", key)}
			}
			seen[key] = true
			*table.out = append(*table.out, e)
		}
	}
	return site, nil
}

// check returns the field at fault and what is wrong with it.
func (e *siteEntry) check(table string) (field string, err error) {
	s, err := Find(e.Scheme)
	if err != nil {
		return "scheme", err
	}
	if _, err := s.FindClass(e.Class); err != nil {
		return "class", err
	}
	if _, ok := rules[e.Quantity]; !ok {
		return "quantity", fmt.Errorf("%q is not known; expected one of %v; correct the spelling", e.Quantity, Quantities())
	}
	l, err := e.target(s.Limits(e.Class))
	if err != nil {
		return "quantity", err
	}
	day, err := isoDay(e.Date)
	if err != nil {
		return "date", err
	}
	e.Date = day
	texts := []struct{ field, value string }{{"document", e.Document}, {"page", e.Page}, {"person", e.Person}}
	unused := []struct{ field, value string }{{"reason", e.Reason}, {"name", e.Name}, {"comparison", e.Comparison}}
	if table == "override" {
		texts = []struct{ field, value string }{{"reason", e.Reason}, {"name", e.Name}}
		unused = []struct{ field, value string }{{"document", e.Document}, {"page", e.Page}, {"person", e.Person}}
	}
	for _, t := range texts {
		if strings.TrimSpace(t.value) == "" {
			return t.field, fmt.Errorf("is missing; expected a text in [[%s]]; add it", table)
		}
	}
	for _, t := range unused {
		if t.value != "" {
			return t.field, fmt.Errorf("has no place in [[%s]]; remove it", table)
		}
	}
	if table == "confirm" {
		switch {
		case l.Confidence == Unsure:
			return "quantity", errors.New("this limit is unsure and never decides; expected a surer one; where the site has the document, set its figure with [[override]]")
		case l.Confidence == Read || l.Confidence == SecondHand:
			return "quantity", fmt.Errorf("this limit decides already (%s); expected one that is weak or from memory; remove the entry", l.Confidence)
		case l.Advisory != "":
			return "quantity", fmt.Errorf("this limit is for information (%s); expected one that may decide; use [[override]] to set the site's own", l.Advisory)
		case e.Limit != l.Limit:
			return "limit", fmt.Errorf("is %v but the scheme file has %v; expected the same figure, as read in the document; where the document differs, use [[override]]", e.Limit, l.Limit)
		}
		return "", nil
	}
	if l.Formula == OpenFormula {
		return "quantity", errors.New("the formula of this limit is open, so no figure can be judged; expected a limit with a formula; leave it out")
	}
	own := l
	own.Limit, own.LimitHigh = e.Limit, e.LimitHigh
	if e.Comparison != "" {
		own.Comparison = e.Comparison
	}
	if own.Comparison == "about" && own.Aim != nil && own.LimitHigh != nil {
		mid := min(max(*own.Aim, own.Limit), *own.LimitHigh)
		own.Aim = &mid
	}
	return own.check()
}

// target is the limit that an entry speaks of.
func (e *siteEntry) target(limits []Limit) (Limit, error) {
	var formulas []string
	for _, l := range limits {
		if l.Quantity != e.Quantity {
			continue
		}
		if l.Formula == e.Formula {
			return l, nil
		}
		formulas = append(formulas, fmt.Sprintf("%q", l.Formula))
	}
	if formulas != nil {
		return Limit{}, fmt.Errorf("%s has no formula %q here; expected formula = %s; correct it", e.Quantity, e.Formula, strings.Join(formulas, " or "))
	}
	return Limit{}, fmt.Errorf("scheme %s limits no %s for class %s; expected a limit that it has; run \"evenstep criteria show %s\"", e.Scheme, e.Quantity, e.Class, e.Scheme)
}

func isoDay(v any) (string, error) {
	switch d := v.(type) {
	case time.Time:
		return d.Format(time.DateOnly), nil
	case string:
		if _, err := time.Parse(time.DateOnly, d); err == nil {
			return d, nil
		}
		return "", fmt.Errorf("is %q; expected a day as 2026-11-30; correct it", d)
	case nil:
		return "", errors.New("is missing; expected a day as 2026-11-30; add it")
	}
	return "", fmt.Errorf("is %v; expected a day as 2026-11-30; correct it", v)
}

// Word is what a site says of one limit, for AddWord. Document, Page and Person confirm the limit as
// it stands; Reason and Name put Limit (and Comparison, where it differs) in its place.
type Word struct {
	Scheme, Class  string
	Quantity       Quantity
	Formula        string
	Limit          float64
	LimitHigh      *float64
	Comparison     string
	Document, Page string
	Person         string
	Reason, Name   string
	Date           time.Time
}

// AddWord adds an entry to the text of a site file and leaves the rest of it as it is. An empty text
// starts a new file for the site of the given name. It fails, as ParseSite does, where the file would
// not be sound with the entry in it.
func AddWord(file string, text []byte, site string, w Word) ([]byte, error) {
	var b strings.Builder
	b.Write(text)
	if len(text) == 0 {
		fmt.Fprintf(&b, "site = %s\n", quoted(site))
	} else if text[len(text)-1] != '\n' {
		b.WriteByte('\n')
	}
	table := "confirm"
	if w.Reason != "" || w.Name != "" {
		table = "override"
	}
	fmt.Fprintf(&b, "\n[[%s]]\n", table)
	for _, f := range []struct{ key, value string }{
		{"scheme", w.Scheme},
		{"class", w.Class},
		{"quantity", string(w.Quantity)},
		{"formula", w.Formula},
		{"comparison", w.Comparison},
		{"document", w.Document},
		{"page", w.Page},
		{"person", w.Person},
		{"reason", w.Reason},
		{"name", w.Name},
	} {
		if f.value != "" {
			fmt.Fprintf(&b, "%s = %s\n", f.key, quoted(f.value))
		}
	}
	fmt.Fprintf(&b, "limit = %s\n", strconv.FormatFloat(w.Limit, 'f', -1, 64))
	if w.LimitHigh != nil {
		fmt.Fprintf(&b, "limit_high = %s\n", strconv.FormatFloat(*w.LimitHigh, 'f', -1, 64))
	}
	fmt.Fprintf(&b, "date = %s\n", w.Date.Format(time.DateOnly))
	out := []byte(b.String())
	if _, err := ParseSite(file, out); err != nil {
		return nil, err
	}
	return out, nil
}

// quoted is a TOML basic string.
func quoted(s string) string {
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range s {
		switch {
		case r == '"' || r == '\\':
			b.WriteByte('\\')
			b.WriteRune(r)
		case r < ' ' || r == 0x7f:
			fmt.Fprintf(&b, "\\u%04X", r)
		default:
			b.WriteRune(r)
		}
	}
	b.WriteByte('"')
	return b.String()
}

// Use returns the limits of a class as they are to be judged, with a site's confirmations and own
// limits in them. site may be nil.
func (s *Scheme) Use(class string, site *SiteFile) (*Used, error) {
	c, err := s.FindClass(class)
	if err != nil {
		return nil, err
	}
	u := &Used{ID: s.ID, Name: s.Name, Edition: s.Edition, Class: c.ID, Limits: s.Limits(c.ID)}
	if site == nil {
		return u, nil
	}
	id := site.ID
	u.Site = &id
	mine := func(e siteEntry, l Limit) bool {
		return e.Scheme == s.ID && e.Class == c.ID && e.Quantity == l.Quantity && e.Formula == l.Formula
	}
	for i := range u.Limits {
		l := &u.Limits[i]
		if k := slices.IndexFunc(site.confirms, func(e siteEntry) bool { return mine(e, *l) }); k >= 0 {
			e := site.confirms[k]
			l.Confirmed = &Confirmation{Document: e.Document, Page: e.Page, Person: e.Person, Date: e.Date.(string)}
		}
		if k := slices.IndexFunc(site.overrides, func(e siteEntry) bool { return mine(e, *l) }); k >= 0 {
			e := site.overrides[k]
			l.Override = &Override{Limit: l.Limit, Comparison: l.Comparison, Reason: e.Reason, Name: e.Name, Date: e.Date.(string)}
			l.Limit, l.LimitHigh, l.Confidence = e.Limit, e.LimitHigh, Site
			if e.Comparison != "" {
				l.Comparison = e.Comparison
			}
		}
	}
	return u, nil
}

// Deciding says whether a limit may decide a verdict, and if not, why not.
func (l Limit) Deciding() (decides bool, why string) {
	switch {
	case l.Formula == OpenFormula:
		return false, "for information: " + l.Advisory
	case l.Override != nil:
		return true, ""
	case l.Confidence == Unsure:
		return false, "limit unsure: it never decides"
	case l.Advisory != "":
		return false, "for information: " + l.Advisory
	case (l.Confidence == Weak || l.Confidence == FromMemory) && l.Confirmed == nil:
		return false, fmt.Sprintf("limit not confirmed (%s): it decides once the site has confirmed it", l.Confidence)
	}
	return true, ""
}
