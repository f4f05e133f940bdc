package report

import (
	"fmt"
	"sync"
	"unicode"

	"golang.org/x/image/font"
	"golang.org/x/image/font/gofont/gobold"
	"golang.org/x/image/font/gofont/gomono"
	"golang.org/x/image/font/gofont/goregular"
	"golang.org/x/image/font/sfnt"
	"golang.org/x/image/math/fixed"
	"golang.org/x/text/unicode/norm"
)

// The typefaces are the Go fonts: free to embed, complete for Latin, Greek, Cyrillic and the signs
// of a report, and part of a module that is linked anyway.
var typefaces = map[Face][]byte{Regular: goregular.TTF, Bold: gobold.TTF, Mono: gomono.TTF}

var parsedFonts = sync.OnceValues(func() (map[Face]*sfnt.Font, error) {
	fonts := map[Face]*sfnt.Font{}
	for face, data := range typefaces {
		f, err := sfnt.Parse(data)
		if err != nil {
			return nil, fmt.Errorf("report: embedded font %d: %w", face, err)
		}
		fonts[face] = f
	}
	return fonts, nil
})

// ruler measures text as it will stand in the PDF. It is not safe for concurrent use.
type ruler struct {
	fonts    map[Face]*sfnt.Font
	buf      sfnt.Buffer
	advances map[glyph]float64
}

type glyph struct {
	face Face
	r    rune
}

func newRuler() (*ruler, error) {
	fonts, err := parsedFonts()
	if err != nil {
		return nil, err
	}
	return &ruler{fonts: fonts, advances: map[glyph]float64{}}, nil
}

// advance is the width of a rune at size 1, and whether the face has it.
func (m *ruler) advance(face Face, r rune) (float64, bool) {
	key := glyph{face, r}
	if a, ok := m.advances[key]; ok {
		return a, a >= 0
	}
	f := m.fonts[face]
	a := -1.0
	if i, err := f.GlyphIndex(&m.buf, r); err == nil && i != 0 {
		em := fixed.I(int(f.UnitsPerEm()))
		if w, err := f.GlyphAdvance(&m.buf, i, em, font.HintingNone); err == nil {
			a = float64(w) / float64(em)
		}
	}
	m.advances[key] = a
	return a, a >= 0
}

// TextWidth is the width of a text in points.
func (m *ruler) TextWidth(text string, t Type) float64 {
	w := 0.0
	for _, r := range text {
		if a, ok := m.advance(t.Face, r); ok {
			w += a
		}
	}
	return w * t.Size
}

// missing stands for a character that the fonts do not have: in a PDF it would leave no trace.
const missing = '□'

// tie is the space at which no line is broken.
const tie = '\u00a0'

// longest is how many characters of one text are set. What is longer is cut visibly; the record
// holds it whole.
const longest = 1600

// printable composes a text (accents and their letters become one sign), makes white space plain,
// and puts a visible mark in place of every character that cannot be printed: those that the font
// lacks, and those that would change the direction or the look of others unseen. What is longer than
// longest is cut.
func (m *ruler) printable(text string, face Face) string {
	n := 0
	for i := range text {
		if n++; n > longest {
			text = text[:i] + "…"
			break
		}
	}
	out := make([]rune, 0, len(text))
	for _, r := range norm.NFC.String(text) {
		switch _, ok := m.advance(face, r); {
		case r == tie:
		case unicode.IsSpace(r):
			r = ' '
		case !ok, unicode.IsControl(r), unicode.Is(unicode.Cf, r):
			r = missing
		}
		out = append(out, r)
	}
	return string(out)
}
