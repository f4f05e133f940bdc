package criteria

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

const goodScheme = `id = "x-1"
name = "X"
edition = "1"

[[class]]
id = "a"
name = "A"

[[limit]]
classes = ["a"]
quantity = "luminance_max"
comparison = ">="
limit = 100
unit = "cd/m2"
basis = "with ambient"
source = "s"
confidence = "read"
`

func TestSchemeFaults(t *testing.T) {
	for _, c := range []struct{ name, old, new, want string }{
		{"misspelt key", "comparison =", "comparisson =", "x.toml:12: limit.comparisson: is no field of this file"},
		{"misspelt top key", "edition =", "editoin =", "x.toml:3: editoin: is no field"},
		{"quantity", `"luminance_max"`, `"luminance_maximum"`, `x.toml:11: limit.quantity: "luminance_maximum" is not known`},
		{"unit", `"cd/m2"`, `"fL"`, `x.toml:14: limit.unit: is "fL"; expected "cd/m2"`},
		{"class", `classes = ["a"]`, `classes = ["b"]`, `x.toml:10: limit.classes: "b" is no class`},
		{"no class", `classes = ["a"]`, `classes = []`, "x.toml:10: limit.classes: is empty"},
		{"comparison", `">="`, `"<="`, `x.toml:12: limit.comparison: is "<="`},
		{"limit of wrong type", "limit = 100", `limit = "100"`, "x.toml:13: limit.limit: incompatible types"},
		{"limit zero", "limit = 100", "limit = 0", "x.toml:13: limit.limit: is 0"},
		{"limit not a number", "limit = 100", "limit = nan", "x.toml:13: limit.limit: is NaN"},
		{"two ends", `comparison = ">="`, "comparison = \">=\"\nlimit_high = 200.0", "limit.limit_high: stands beside"},
		{"aim", `comparison = ">="`, "comparison = \">=\"\naim = 200.0", "limit.aim: stands beside"},
		{"basis", `"with ambient"`, `"primed"`, `x.toml:15: limit.basis: is "primed"`},
		{"confidence", `"read"`, `"sure"`, `x.toml:17: limit.confidence: is "sure"`},
		{"source", `source = "s"`, `source = " "`, "x.toml:16: limit.source: is missing"},
		{"id", `id = "x-1"`, `id = ""`, "x.toml: id: is missing"},
		{"class without name", `name = "A"`, `name = ""`, "x.toml:5: class: id or name is missing"},
		{"class twice", "[[limit]]", "[[class]]\nid = \"a\"\nname = \"B\"\n[[limit]]", "x.toml:9: class.id: \"a\" stands twice"},
		{"broken TOML", `[[limit]]`, `[[limit]`, "x.toml:10: class: expected end of table"},
		{"formula where none is", `unit = "cd/m2"`, `formula = "open"` + "\nunit = \"cd/m2\"", "limit.advisory: is missing"},
	} {
		t.Run(c.name, func(t *testing.T) {
			text := strings.Replace(goodScheme, c.old, c.new, 1)
			if text == goodScheme {
				t.Fatal("the case changes nothing")
			}
			_, err := ParseScheme("x.toml", []byte(text))
			checkFault(t, err, c.want)
		})
	}
	if _, err := ParseScheme("x.toml", []byte(goodScheme)); err != nil {
		t.Errorf("the good file: %v", err)
	}
	_, err := ParseScheme("x.toml", []byte(goodScheme+goodScheme[strings.Index(goodScheme, "[[limit]]"):]))
	checkFault(t, err, "stands twice")
	_, err = ParseScheme("x.toml", make([]byte, maxFile+1))
	checkFault(t, err, "bytes; expected at most")
	_, err = ParseScheme("x.toml", []byte(goodScheme[:strings.Index(goodScheme, "[[limit]]")]))
	checkFault(t, err, "limit: there is none")
	_, err = ParseScheme("x.toml", []byte("id=\"a\"\nname=\"b\"\nedition=\"c\"\n"))
	checkFault(t, err, "class: there is none")
}

func checkFault(t *testing.T, err error, want string) {
	t.Helper()
	if err == nil || !strings.Contains(err.Error(), want) {
		t.Fatalf("error %v; expected it to contain %q", err, want)
	}
	var f *FileError
	if !errors.As(err, &f) || strings.ContainsAny(err.Error(), "\n\r") {
		t.Errorf("error %q; expected one line of type *FileError", err)
	}
}

// TestSchemesAreWhole reads every scheme that the program carries.
func TestSchemesAreWhole(t *testing.T) {
	all, err := Schemes()
	if err != nil {
		t.Fatal(err)
	}
	if len(all) != 12 {
		t.Errorf("%d schemes, want 12", len(all))
	}
	for _, s := range all {
		for _, c := range s.Classes {
			if len(s.Limits(c.ID)) == 0 {
				t.Errorf("%s/%s has no limits", s.ID, c.ID)
			}
		}
	}
	if _, err := Find("nothing"); err == nil || !strings.Contains(err.Error(), "tg18-2005") {
		t.Errorf("an unknown scheme: %v; expected the known ones named", err)
	}
	tg18, err := Find("tg18-2005")
	if err != nil {
		t.Fatal(err)
	}
	if _, err := tg18.FindClass(""); err == nil || !strings.Contains(err.Error(), "primary, secondary") {
		t.Errorf("no class: %v; expected the classes named", err)
	}
	if _, err := tg18.FindClass("prmary"); err == nil || !strings.Contains(err.Error(), "primary, secondary") {
		t.Errorf("a misspelt class: %v; expected the classes named", err)
	}
	iaea, err := Find("iaea-hhs17-2011")
	if err != nil {
		t.Fatal(err)
	}
	if c, err := iaea.FindClass(""); err != nil || c.ID != "mammography" {
		t.Errorf("the only class: %v, %v", c, err)
	}
}

const goodSite = `site = "Northfield"

[[confirm]]
scheme = "tg270-2019"
class = "diagnostic"
quantity = "luminance_max"
limit = 350
document = "Report 270, 2019"
page = "14"
person = "p-014"
date = 2026-11-02

[[override]]
scheme = "tg270-2019"
class = "diagnostic"
quantity = "ambient_ratio"
comparison = "<="
limit = 0.2
reason = "two windows"
name = "p-014"
date = "2026-11-03"
`

func TestSiteFaults(t *testing.T) {
	for _, c := range []struct{ name, old, new, want string }{
		{"scheme", `"tg270-2019"`, `"tg-270"`, `site.toml:4: confirm.scheme: scheme "tg-270" is not known`},
		{"class", `"diagnostic"`, `"primary"`, "site.toml:5: confirm.class: scheme tg270-2019: class"},
		{"quantity", `"luminance_max"`, `"lmax"`, `site.toml:6: confirm.quantity: "lmax" is not known`},
		{"no such limit", `"luminance_max"`, `"pair_match"`, "site.toml:6: confirm.quantity: scheme tg270-2019 limits no pair_match"},
		{"formula", "limit = 350", "limit = 350\nformula = \"x\"", `has no formula "x" here`},
		{"other figure", "limit = 350", "limit = 400", "site.toml:7: confirm.limit: is 400 but the scheme file has 350"},
		{"no document", `document = "Report 270, 2019"`, "", "confirm.document: is missing"},
		{"no date", "date = 2026-11-02", "", "confirm.date: is missing"},
		{"bad date", "date = 2026-11-02", `date = "2.11.2026"`, `confirm.date: is "2.11.2026"`},
		{"number for a date", "date = 2026-11-02", `date = 7`, `confirm.date: is 7`},
		{"reason in confirm", `page = "14"`, "page = \"14\"\nreason = \"r\"", "confirm.reason: has no place"},
		{"key", "person =", "persona =", "persona: is no field"},
		{"no name", `name = "p-014"`, "", "override.name: is missing"},
		{"override out of range", "limit = 0.2", "limit = -1", "override.limit: is -1"},
		{"override comparison", `"<="`, `">="`, "override.comparison: is \">=\""},
		{"decides already", `quantity = "luminance_max"`, `quantity = "ambient_ratio"`, "decides already"},
		{"site", `site = "Northfield"`, "", "site: is missing"},
		{"unsure", "class = \"diagnostic\"\nquantity = \"luminance_max\"", "class = \"modality\"\nquantity = \"luminance_max\"", "unsure and never decides"},
		{"advisory", "quantity = \"luminance_max\"", "quantity = \"luminance_ratio_aim\"", "for information"},
	} {
		t.Run(c.name, func(t *testing.T) {
			text := strings.Replace(goodSite, c.old, c.new, 1)
			if text == goodSite {
				t.Fatal("the case changes nothing")
			}
			_, err := ParseSite("site.toml", []byte(text))
			checkFault(t, err, c.want)
		})
	}
	_, err := ParseSite("site.toml", []byte(goodSite+goodSite[strings.Index(goodSite, "[[confirm]]"):]))
	checkFault(t, err, "is named twice")
	_, err = ParseSite("site.toml", []byte("site=\"a\"\n[[override]]\nscheme=\"ranzcr-undated\"\nclass=\"mammography\"\nquantity=\"uniformity\"\nformula=\"open\"\nlimit=0.2\nreason=\"r\"\nname=\"n\"\ndate=2026-01-01\n"))
	checkFault(t, err, "formula of this limit is open")
}

func TestSiteWord(t *testing.T) {
	site, err := ParseSite("site.toml", []byte(goodSite))
	if err != nil {
		t.Fatal(err)
	}
	s, err := Find("tg270-2019")
	if err != nil {
		t.Fatal(err)
	}
	used, err := s.Use("diagnostic", site)
	if err != nil {
		t.Fatal(err)
	}
	if used.Site == nil || used.Site.Site != "Northfield" || len(used.Site.SHA256) != 64 {
		t.Errorf("site %+v", used.Site)
	}
	for _, l := range used.Limits {
		decides, _ := l.Deciding()
		switch l.Quantity {
		case LuminanceMax:
			if !decides || l.Confirmed == nil || l.Confirmed.Date != "2026-11-02" || l.Confirmed.Page != "14" {
				t.Errorf("confirmed limit: %+v", l)
			}
		case AmbientRatio:
			if !decides || l.Limit != 0.2 || l.Comparison != "<=" || l.Confidence != Site || l.Override.Limit != 0.25 || l.Override.Comparison != "<" {
				t.Errorf("the site's own limit: %+v, %+v", l, l.Override)
			}
		case ContrastDeviation:
			if decides {
				t.Error("a limit from memory decides without a word of the site")
			}
		}
	}
	other, err := s.Use("diagnostic-mammography", site)
	if err != nil {
		t.Fatal(err)
	}
	for _, l := range other.Limits {
		if l.Confirmed != nil || l.Override != nil {
			t.Errorf("another class took the site's word: %+v", l)
		}
	}
}

// TestAddWord builds the good site file entry by entry and gets the same limits out of it.
func TestAddWord(t *testing.T) {
	day := time.Date(2026, 11, 2, 15, 0, 0, 0, time.UTC)
	text, err := AddWord("site.toml", nil, "North \"field\"\n", Word{
		Scheme: "tg270-2019", Class: "diagnostic", Quantity: LuminanceMax, Limit: 350,
		Document: "Report 270 \\ 2019", Page: "14", Person: "p-014", Date: day,
	})
	if err != nil {
		t.Fatal(err)
	}
	text, err = AddWord("site.toml", append(text, "# a note of our own"...), "", Word{
		Scheme: "tg270-2019", Class: "diagnostic", Quantity: AmbientRatio, Comparison: "<=", Limit: .2,
		Reason: "two windows", Name: "p-014", Date: day,
	})
	if err != nil {
		t.Fatal(err)
	}
	site, err := ParseSite("site.toml", text)
	if err != nil {
		t.Fatalf("%v in:\n%s", err, text)
	}
	if site.ID.Site != "North \"field\"\n" || !strings.Contains(string(text), "# a note of our own\n") {
		t.Errorf("site %q in:\n%s", site.ID.Site, text)
	}
	s, err := Find("tg270-2019")
	if err != nil {
		t.Fatal(err)
	}
	used, err := s.Use("diagnostic", site)
	if err != nil {
		t.Fatal(err)
	}
	for _, l := range used.Limits {
		decides, _ := l.Deciding()
		if l.Quantity == LuminanceMax && (!decides || l.Confirmed.Document != "Report 270 \\ 2019") || l.Quantity == AmbientRatio && l.Limit != .2 {
			t.Errorf("%+v", l)
		}
	}
	if _, err := AddWord("site.toml", text, "", Word{Scheme: "tg270-2019", Class: "modality", Quantity: LuminanceMax, Limit: 350, Document: "d", Page: "1", Person: "p", Date: day}); err == nil {
		t.Error("an unsure limit was confirmed")
	}
}

func FuzzParseScheme(f *testing.F) {
	files, err := filepath.Glob("schemes/*.toml")
	if err != nil || len(files) == 0 {
		f.Fatal("no seeds")
	}
	for _, name := range files {
		text, err := os.ReadFile(name)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(text)
	}
	f.Add([]byte(goodScheme))
	f.Fuzz(func(t *testing.T, text []byte) {
		s, err := ParseScheme("f.toml", text)
		if err != nil {
			if strings.ContainsAny(err.Error(), "\n\r") {
				t.Errorf("error of several lines: %q", err)
			}
			return
		}
		for _, c := range s.Classes {
			if _, err := s.Use(c.ID, nil); err != nil {
				t.Errorf("class %q: %v", c.ID, err)
			}
		}
	})
}

func FuzzParseSite(f *testing.F) {
	f.Add([]byte(goodSite))
	f.Add([]byte("site = 1"))
	f.Fuzz(func(t *testing.T, text []byte) {
		if _, err := ParseSite("f.toml", text); err != nil && strings.ContainsAny(err.Error(), "\n\r") {
			t.Errorf("error of several lines: %q", err)
		}
	})
}
