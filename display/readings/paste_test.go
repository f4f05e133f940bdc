package readings

import (
	"errors"
	"strings"
	"testing"

	"evenstep/display/photometry"
)

func TestParsePaste(t *testing.T) {
	plan := []int{0, 15, 30}
	for _, c := range []struct {
		name, clip string
		levels     []int
		lum        []photometry.CdM2
	}{
		{"tabs", "0\t0.64\n15\t2.03\n", []int{0, 15}, []photometry.CdM2{.64, 2.03}},
		{"decimal commas", "0\t0,64\r\n15\t2,03\r\n", []int{0, 15}, []photometry.CdM2{.64, 2.03}},
		{"semicolons", "0;0,64\n15;12\n", []int{0, 15}, []photometry.CdM2{.64, 12}},
		{"spaces", "0  0.64\n 15 2.03", []int{0, 15}, []photometry.CdM2{.64, 2.03}},
		{"commas with points", "0,0.64\n15,2.03", []int{0, 15}, []photometry.CdM2{.64, 2.03}},
		{"a header", "level\tcd/m2\n0\t1\n255\t300", []int{0, 255}, []photometry.CdM2{1, 300}},
		{"luminances alone", "0.64\n2.03\n4.17", plan, []photometry.CdM2{.64, 2.03, 4.17}},
		{"one luminance", "0,64", plan[:1], []photometry.CdM2{.64}},
		{"fewer than the plan", "1\n2", plan[:2], []photometry.CdM2{1, 2}},
		{"comments and blank lines", "# x\n\n0\t1\n\n255\t300\n", []int{0, 255}, []photometry.CdM2{1, 300}},
	} {
		t.Run(c.name, func(t *testing.T) {
			got, err := ParsePaste(c.clip, plan)
			if err != nil {
				t.Fatal(err)
			}
			if len(got) != len(c.levels) {
				t.Fatalf("%d readings, want %d", len(got), len(c.levels))
			}
			for i, r := range got {
				if r.Level != c.levels[i] || r.Luminance != c.lum[i] || r.Role != Series {
					t.Errorf("%+v, want level %d, %v", r, c.levels[i], c.lum[i])
				}
			}
		})
	}
	for _, c := range []struct{ name, clip, want string }{
		{"empty", " \n", "no numbers"},
		{"words", "none\nof\nthese", "no numbers"},
		{"comma of two meanings", "15,203", "may be a level and a luminance or a decimal comma"},
		{"three columns", "0\t1\t2", "3 columns"},
		{"columns change", "0\t1\n2", "1 columns"},
		{"level no whole number", "0.5\t1\n1\t2", `level "0.5"`},
		{"both marks", "0\t0,64\n15\t2.03", "other decimal mark"},
		{"thousands", "0\t1.234,5", "thousands"},
		{"negative", "0\t-1", "luminance -1"},
		{"twice", "0\t1\n0\t2", "level 0 again"},
		{"more than planned", "1\n2\n3\n4", "more than 3 luminances"},
		{"text in a number", "0\t12 cd", `luminance "12 cd"`},
	} {
		t.Run(c.name, func(t *testing.T) {
			got, err := ParsePaste(c.clip, plan)
			var f *FormatError
			if !errors.As(err, &f) || !strings.Contains(err.Error(), c.want) {
				t.Errorf("%+v, %v; want an error with %q", got, err, c.want)
			}
		})
	}
}

func FuzzParsePaste(f *testing.F) {
	f.Add("0\t0,64\n15\t2,03\n")
	f.Add("0.64\n2.03")
	f.Add("15,203")
	f.Fuzz(func(t *testing.T, clip string) {
		rs, err := ParsePaste(clip, []int{0, 1, 2})
		var fault *FormatError
		if err != nil && (!errors.As(err, &fault) || strings.ContainsAny(err.Error(), "\r\n")) {
			t.Errorf("%q; want one line of type *FormatError", err)
		}
		if err == nil && len(rs) == 0 {
			t.Error("nothing was read and nothing said")
		}
	})
}
