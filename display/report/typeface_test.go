package report

import (
	"math"
	"strings"
	"testing"
	"unicode/utf8"

	"evenstep/display/criteria"
)

func TestFontsHaveEverySignThatIsUsed(t *testing.T) {
	m, err := newRuler()
	if err != nil {
		t.Fatal(err)
	}
	text := "≥≤<>²Δ'·…−+–%±□∆" + title + caution
	for _, v := range []criteria.Verdict{criteria.Meets, criteria.MeetsUncertainly, criteria.FailsUncertainly, criteria.Fails, criteria.NotAssessed} {
		text += Sign(v) + string(v)
	}
	for _, q := range terms {
		text += q.symbol + q.text
	}
	for _, face := range []Face{Regular, Bold, Mono} {
		for _, r := range text {
			if _, ok := m.advance(face, r); !ok {
				t.Errorf("face %d lacks %q", face, r)
			}
		}
	}
}

func TestPrintable(t *testing.T) {
	m, err := newRuler()
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ name, in, want string }{
		{"kept", "Łódź Ωμέγα ЖЩ cd/m² ≥", "Łódź Ωμέγα ЖЩ cd/m² ≥"},
		{"composed", "U\u0308ber", "Über"},
		{"white space", "a\tb\nc\r\nd\u2003e", "a b c  d e"},
		{"tie kept", "1\u00a0lx", "1\u00a0lx"},
		{"no glyph", "検査 ok", "□□ ok"},
		{"beyond the basic plane", "\U0001F600", "□"},
		{"turned direction", "a\u202eb", "a□b"},
		{"unseen", "a\u200bb\u00adc\ufeff", "a□b□c□"},
		{"control", "a\x00b\x1b[31m", "a□b□[31m"},
		{"not UTF-8", "a\xffb", "a" + m.printable("\ufffd", Regular) + "b"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if got := m.printable(c.in, Regular); got != c.want {
				t.Errorf("got %q; expected %q", got, c.want)
			}
		})
	}
}

func FuzzWrap(f *testing.F) {
	for _, s := range []string{"", "one", "a long line with words", longName, "検査室 □", strings.Repeat("x", 300), "a\u00a0b c", "\xff\xfe"} {
		f.Add(s, 60.0)
	}
	f.Fuzz(func(t *testing.T, text string, w float64) {
		if math.IsNaN(w) || w < 20 || w > 1000 || len(text) > 5000 {
			t.Skip()
		}
		m, err := newRuler()
		if err != nil {
			t.Fatal(err)
		}
		set := Type{Size: 8}
		s := &sheet{ruler: m}
		text = m.printable(text, Regular)
		lines := wrap(s, text, set, w)
		strip := func(s string) string { return strings.ReplaceAll(s, " ", "") }
		if got, want := strip(strings.Join(lines, "")), strip(text); got != want {
			t.Errorf("wrapping changed %q to %q", want, got)
		}
		const rounding = 1e-6
		for _, l := range lines {
			if s.TextWidth(l, set) > w+rounding && utf8.RuneCountInString(l) > 1 {
				t.Errorf("%q is wider than %v", l, w)
			}
		}
		if short := shorten(s, text, set, w); s.TextWidth(short, set) > w+rounding {
			t.Errorf("%q is wider than %v", short, w)
		}
	})
}
