package criteria

import (
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

func findLimit(t *testing.T, scheme, class, quantity, formula string) Limit {
	t.Helper()
	s, err := Find(scheme)
	if err != nil {
		t.Fatal(err)
	}
	for _, l := range s.Limits(class) {
		if string(l.Quantity) == quantity && l.Formula == formula {
			return l
		}
	}
	t.Fatalf("%s/%s has no %s %q", scheme, class, quantity, formula)
	return Limit{}
}

// TestCollectedTable compares every limit of the scheme files with the collected table of acceptance
// limits, which names the document of each row, and sees to it that no row is lost: it is carried, or
// the table says why it is no limit.
func TestCollectedTable(t *testing.T) {
	f, err := os.Open(filepath.Join("..", "..", "testdata", "criteria", "acceptance-table.csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	col := map[string]int{}
	for i, name := range rows[0] {
		col[name] = i
	}
	carried := map[string]bool{}
	for _, row := range rows[1:] {
		at := func(name string) string { return row[col[name]] }
		if (at("carried") == "") == (at("reason") == "") {
			t.Errorf("row %s: carried %q, reason %q; expected one of the two", at("row"), at("carried"), at("reason"))
		}
		if at("carried") == "" {
			continue
		}
		for _, path := range strings.Split(at("carried"), " ; ") {
			carried[path] = true
			part := append(strings.SplitN(path, "/", 4), "")
			l := findLimit(t, part[0], part[1], part[2], part[3])
			compareRow(t, at, l)
		}
	}
	all, err := Schemes()
	if err != nil {
		t.Fatal(err)
	}
	for _, s := range all {
		for _, c := range s.Classes {
			for _, l := range s.Limits(c.ID) {
				path := strings.TrimSuffix(strings.Join([]string{s.ID, c.ID, string(l.Quantity), l.Formula}, "/"), "/")
				if !carried[path] {
					t.Errorf("%s stands in no row of the table", path)
				}
			}
		}
	}
}

func compareRow(t *testing.T, at func(string) string, l Limit) {
	t.Helper()
	var figures []float64
	for _, w := range strings.Fields(at("limit")) {
		if v, err := strconv.ParseFloat(w, 64); err == nil {
			if at("unit") == "%" {
				v /= 100
			}
			figures = append(figures, v)
		}
	}
	comparison := at("comparison")
	want := math.NaN()
	if len(figures) > 0 {
		want = figures[0]
	}
	switch comparison {
	case "minimum / recommended":
		comparison = ">="
		if l.Quantity == ContrastDeviation {
			comparison = "<="
		}
		if l.Formula == "recommended" {
			want = figures[1]
		}
	case "target":
		comparison, want = "<=", 0.01 // the note of the row names the distance beside the target
	case "about":
		want = *l.Aim
		if *l.Aim != figures[0] || l.Limit != 250 || *l.LimitHigh != 450 {
			t.Errorf("row %s: aim %v within %v to %v", at("row"), *l.Aim, l.Limit, *l.LimitHigh)
		}
	}
	got := l.Limit
	if l.Aim != nil {
		got = *l.Aim
	}
	if got != want || l.Comparison != comparison {
		t.Errorf("row %s: scheme file has %s %v, table %s %v", at("row"), l.Comparison, got, comparison, want)
	}
	if l.Comparison == "within" && *l.LimitHigh != figures[1] {
		t.Errorf("row %s: upper end %v, table %v", at("row"), *l.LimitHigh, figures[1])
	}
	if c := confidenceOf(at("confidence")); c != l.Confidence {
		t.Errorf("row %s: confidence %q, table says %q (%s)", at("row"), l.Confidence, c, at("confidence"))
	}
	decides, _ := l.Deciding()
	needsWord := l.Confidence == Weak || l.Confidence == FromMemory
	if l.Confirmed = (&Confirmation{}); needsWord {
		after, _ := l.Deciding()
		if decides {
			t.Errorf("row %s: a %s limit decides before it is confirmed", at("row"), l.Confidence)
		}
		decides = after
	}
	if decides != (at("decides") == "yes") {
		t.Errorf("row %s: decides %v, table says %s", at("row"), decides, at("decides"))
	}
}

// confidenceOf maps the words of the table. A restatement by a single company counts as weak.
func confidenceOf(s string) Confidence {
	oneCompany := []string{
		"SECONDARY (weak", "SECONDARY one display maker's", "SECONDARY a Japanese web page restating the grade table",
		"SECONDARY a Finnish company page", "SECONDARY a company page",
	}
	for _, p := range oneCompany {
		if strings.HasPrefix(s, p) && !strings.Contains(s, "confirmed by") {
			return Weak
		}
	}
	switch {
	case strings.HasPrefix(s, "READ"):
		return Read
	case strings.HasPrefix(s, "SECONDARY"):
		return SecondHand
	case strings.HasPrefix(s, "FROM MEMORY (firm"):
		return FromMemory
	case strings.HasPrefix(s, "FROM MEMORY (unsure"):
		return Unsure
	}
	return ""
}
