package record

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode/utf16"
	"unicode/utf8"
)

// The bounds of what is read. A record nests eight deep; its size is that of its readings.
const (
	deepest = 64
	longest = 64 << 20 // bytes: more than a record of 65536 levels
)

// Canonical returns the canonical form of a JSON text by RFC 8785 (JSON Canonicalization Scheme):
// keys in the order of their UTF-16 code units, numbers as ECMAScript writes doubles, strings with
// the least of escapes, no white space. It refuses what that form cannot hold: a key that stands
// twice, a number beyond a double, half a surrogate pair, text that is not UTF-8.
func Canonical(text []byte) ([]byte, error) {
	v, err := parse(text)
	if err != nil {
		return nil, err
	}
	return appendCanonical(nil, v), nil
}

// errNotWhole is the fault of a text that ends before its value does.
var errNotWhole = errors.New("the JSON text ends too early; expected a whole value")

type member struct {
	key   string
	units []uint16
	value any
}

// object is a JSON object with its keys in canonical order.
type object []member

func parse(text []byte) (any, error) {
	if len(text) > longest {
		return nil, fmt.Errorf("the JSON text has %d bytes; expected at most %d", len(text), longest)
	}
	if !utf8.Valid(text) {
		if cutInCharacter(text) {
			return nil, errNotWhole
		}
		return nil, errors.New("the JSON text is not UTF-8; expected UTF-8")
	}
	if err := checkSurrogates(text); err != nil {
		return nil, err
	}
	d := json.NewDecoder(bytes.NewReader(text))
	d.UseNumber()
	v, err := parseValue(d, 0)
	if err != nil {
		return nil, err
	}
	if _, err := d.Token(); !errors.Is(err, io.EOF) {
		return nil, errors.New("text follows the JSON value; expected its end")
	}
	return v, nil
}

// cutInCharacter tells text that ends within a character of several bytes from text that is no UTF-8.
func cutInCharacter(text []byte) bool {
	for n := 1; n < utf8.UTFMax && n <= len(text); n++ {
		if head, tail := text[:len(text)-n], text[len(text)-n:]; !utf8.FullRune(tail) {
			return utf8.Valid(head)
		}
	}
	return false
}

func parseValue(d *json.Decoder, depth int) (any, error) {
	if depth > deepest {
		return nil, fmt.Errorf("the JSON text nests deeper than %d; expected less", deepest)
	}
	t, err := d.Token()
	if err != nil {
		if errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) {
			return nil, errNotWhole
		}
		return nil, fmt.Errorf("at byte %d: %w; expected JSON", d.InputOffset(), err)
	}
	switch v := t.(type) {
	case json.Number:
		f, err := strconv.ParseFloat(string(v), 64)
		if err != nil || math.IsInf(f, 0) {
			return nil, fmt.Errorf("number %s; expected one that a double holds", shorten(string(v)))
		}
		return f, nil
	case json.Delim:
		if v == '[' {
			list := []any{}
			for d.More() {
				e, err := parseValue(d, depth+1)
				if err != nil {
					return nil, err
				}
				list = append(list, e)
			}
			return list, closing(d)
		}
		return parseObject(d, depth)
	}
	return t, nil
}

func parseObject(d *json.Decoder, depth int) (any, error) {
	o := object{}
	for d.More() {
		t, err := d.Token()
		if err != nil {
			if errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) {
				return nil, errNotWhole
			}
			return nil, fmt.Errorf("at byte %d: %w; expected JSON", d.InputOffset(), err)
		}
		key, ok := t.(string)
		if !ok {
			return nil, fmt.Errorf("at byte %d: %v; expected a key", d.InputOffset(), t)
		}
		e, err := parseValue(d, depth+1)
		if err != nil {
			return nil, err
		}
		o = append(o, member{key, utf16.Encode([]rune(key)), e})
	}
	if err := closing(d); err != nil {
		return nil, err
	}
	slices.SortFunc(o, func(a, b member) int { return slices.Compare(a.units, b.units) })
	for i := 1; i < len(o); i++ {
		if o[i].key == o[i-1].key {
			return nil, fmt.Errorf("key %q stands twice; expected once", shorten(o[i].key))
		}
	}
	return o, nil
}

func closing(d *json.Decoder) error {
	if _, err := d.Token(); err != nil {
		if errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) {
			return errNotWhole
		}
		return fmt.Errorf("at byte %d: %w; expected JSON", d.InputOffset(), err)
	}
	return nil
}

// checkSurrogates finds an escaped half of a surrogate pair, which the decoder would replace in silence.
func checkSurrogates(text []byte) error {
	high := false // the escape just before was the first half
	for i := 0; i < len(text); i++ {
		unit := -1
		step := 0
		if text[i] == '\\' {
			step = 1
			if i+5 < len(text) && text[i+1] == 'u' {
				if u, err := strconv.ParseUint(string(text[i+2:i+6]), 16, 16); err == nil {
					unit, step = int(u), 5
				}
			}
		}
		low := unit >= 0xDC00 && unit <= 0xDFFF
		if low != high {
			return fmt.Errorf("at byte %d: half a surrogate pair; expected both halves", i)
		}
		high = unit >= 0xD800 && unit <= 0xDBFF
		i += step
	}
	if high {
		return errNotWhole
	}
	return nil
}

func appendCanonical(b []byte, v any) []byte {
	switch v := v.(type) {
	case nil:
		return append(b, "null"...)
	case bool:
		return strconv.AppendBool(b, v)
	case float64:
		return appendNumber(b, v)
	case string:
		return appendString(b, v)
	case []any:
		b = append(b, '[')
		for i, e := range v {
			if i > 0 {
				b = append(b, ',')
			}
			b = appendCanonical(b, e)
		}
		return append(b, ']')
	case object:
		b = append(b, '{')
		for i, m := range v {
			if i > 0 {
				b = append(b, ',')
			}
			b = appendString(b, m.key)
			b = append(b, ':')
			b = appendCanonical(b, m.value)
		}
		return append(b, '}')
	}
	return b // parse makes no other type
}

// appendNumber writes a double as ECMAScript does (ECMA-262, Number::toString): the shortest digits
// that read back, plain from 1e-6 up to below 1e21, else with an exponent without leading zeros.
func appendNumber(b []byte, f float64) []byte {
	if f == 0 {
		return append(b, '0') // minus zero too
	}
	if a := math.Abs(f); a >= 1e-6 && a < 1e21 {
		return strconv.AppendFloat(b, f, 'f', -1, 64)
	}
	text := strconv.FormatFloat(f, 'e', -1, 64)
	mantissa, exponent, _ := strings.Cut(text, "e")
	b = append(b, mantissa...)
	b = append(b, 'e', exponent[0])
	return append(b, strings.TrimLeft(exponent[1:], "0")...)
}

func appendString(b []byte, s string) []byte {
	const hex = "0123456789abcdef"
	b = append(b, '"')
	for i := range len(s) {
		switch c := s[i]; {
		case c == '"' || c == '\\':
			b = append(b, '\\', c)
		case c >= ' ':
			b = append(b, c)
		case c == '\b':
			b = append(b, '\\', 'b')
		case c == '\t':
			b = append(b, '\\', 't')
		case c == '\n':
			b = append(b, '\\', 'n')
		case c == '\f':
			b = append(b, '\\', 'f')
		case c == '\r':
			b = append(b, '\\', 'r')
		default:
			b = append(b, '\\', 'u', '0', '0', hex[c>>4], hex[c&15])
		}
	}
	return append(b, '"')
}

func shorten(s string) string {
	const most = 40
	if r := []rune(s); len(r) > most {
		return string(r[:most]) + "…"
	}
	return s
}
