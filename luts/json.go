package luts

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"strconv"
)

// perLine keeps written tables readable. In entries.
const perLine = 16

// WriteJSON writes a table as one JSON object: "kind", "in_bits", "out_bits", "first", "provenance" (an object,
// empty for nil), "entries" (one integer per input, the least input first).
func WriteJSON(w io.Writer, t Table, p Provenance) error {
	if err := t.Check(); err != nil {
		return err
	}
	line, err := marshalProvenance(p)
	if err != nil {
		return err
	}
	var b bytes.Buffer
	fmt.Fprintf(&b, "{\n  \"kind\": %q,\n  \"in_bits\": %d,\n  \"out_bits\": %d,\n  \"first\": %d,\n  \"provenance\": ",
		t.Kind, t.InBits, t.OutBits, t.First)
	if err := json.Indent(&b, line, "  ", "  "); err != nil {
		return fmt.Errorf("provenance: %w; expected what JSON can hold; leave the value out", err)
	}
	b.WriteString(",\n  \"entries\": [")
	for i, e := range t.Entries {
		if i > 0 {
			b.WriteByte(',')
		}
		if i%perLine == 0 {
			b.WriteString("\n    ")
		} else {
			b.WriteByte(' ')
		}
		b.WriteString(strconv.Itoa(int(e)))
	}
	b.WriteString("\n  ]\n}\n")
	return write(w, b.Bytes())
}

// ReadJSON reads what WriteJSON writes, in any order and layout. "first" may be left out and is then 0,
// "provenance" as well. Anything else is refused: other names, a name twice, numbers that are no integers,
// entries too many, too few or too large, text behind the object, more than 2 MiB. The error is a
// *FormatError with the file's name as given.
func ReadJSON(file string, r io.Reader) (Table, Provenance, error) {
	text, err := readText(file, r)
	if err != nil {
		return Table{}, nil, err
	}
	d := json.NewDecoder(bytes.NewReader(text))
	d.UseNumber()
	j := jsonReader{file: file, text: text, Decoder: d}
	if err := j.object(); err != nil {
		return Table{}, nil, err
	}
	if f := j.table.flaw(); f != nil {
		return Table{}, nil, f.at(file, 0)
	}
	return j.table, j.provenance, nil
}

type jsonReader struct {
	file string
	text []byte
	*json.Decoder

	table      Table
	provenance Provenance
}

// here places a flaw at what was read last.
func (j *jsonReader) here(f *flaw) error {
	return f.at(j.file, lineAt(j.text, int(j.InputOffset())))
}

// token is the next token, or an error with its place.
func (j *jsonReader) token() (json.Token, error) {
	token, err := j.Token()
	if err == nil {
		return token, nil
	}
	if errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) {
		return nil, newFlaw("fetch the file anew", "the file breaks off").wants("a whole JSON object").
			at(j.file, lineAt(j.text, len(j.text)))
	}
	// The decoder stands behind the last token; what is wrong comes after the space and separators there.
	rest := j.text[min(int(j.InputOffset()), len(j.text)):]
	at := len(j.text) - len(bytes.TrimLeft(rest, " \t\r\n,:"))
	return nil, newFlaw("correct the file or write the table anew", "no JSON (%v)", err).wants("one JSON object").
		at(j.file, lineAt(j.text, at))
}

func (j *jsonReader) object() error {
	if token, err := j.token(); err != nil {
		return err
	} else if token != json.Delim('{') {
		return j.here(newFlaw("choose the file of a table", "%s at the start", tokenText(token)).wants("a JSON object"))
	}
	seen := map[string]bool{}
	for j.More() {
		token, err := j.token()
		if err != nil {
			return err
		}
		name, _ := token.(string)
		if seen[name] {
			return j.here(newFlaw("keep one of them", "%s twice", quote(name)).wants("each name once"))
		}
		seen[name] = true
		if err := j.member(name); err != nil {
			return err
		}
	}
	if _, err := j.token(); err != nil {
		return err
	}
	if _, err := j.Token(); !errors.Is(err, io.EOF) {
		return j.here(newFlaw("remove the rest", "more text behind the object").wants("the end of the file"))
	}
	for _, name := range []string{"kind", "in_bits", "out_bits", "entries"} {
		if !seen[name] {
			return newFlaw("write the table anew", "no %q", name).wants("kind, in_bits, out_bits and entries").at(j.file, 0)
		}
	}
	return nil
}

func (j *jsonReader) member(name string) (err error) {
	t := &j.table
	switch name {
	case "kind":
		token, err := j.token()
		if err != nil {
			return err
		}
		kind, ok := token.(string)
		if !ok || kind != string(Calibration) && kind != string(Window) {
			return j.here(newFlaw("say what the table is for", "%s as kind", tokenText(token)).wants("%q or %q", Calibration, Window))
		}
		t.Kind = Kind(kind)
	case "in_bits":
		t.InBits, err = j.integer(name, 1, 16)
	case "out_bits":
		t.OutBits, err = j.integer(name, 1, 16)
	case "first":
		t.First, err = j.integer(name, -1<<15, 0)
	case "entries":
		err = j.entries()
	case "provenance":
		var raw json.RawMessage
		if err := j.Decode(&raw); err != nil {
			return j.here(brokenProvenance(err))
		}
		var line bytes.Buffer // without the layout, which does not count
		if err := json.Compact(&line, raw); err != nil {
			return j.here(brokenProvenance(err))
		}
		p, f := unmarshalProvenance(line.Bytes())
		if f != nil {
			return j.here(f)
		}
		j.provenance = p
	default:
		return j.here(newFlaw("move it into provenance or remove it", "the name %s", quote(name)).
			wants("kind, in_bits, out_bits, first, entries or provenance"))
	}
	return err
}

func (j *jsonReader) integer(what string, least, most int) (int, error) {
	token, err := j.token()
	if err != nil {
		return 0, err
	}
	number, ok := token.(json.Number)
	n, err := strconv.Atoi(number.String())
	if !ok || err != nil || n < least || n > most {
		return 0, j.here(newFlaw("correct the number or write the table anew", "%s as %s", tokenText(token), what).
			wants("an integer from %d to %d", least, most))
	}
	return n, nil
}

func (j *jsonReader) entries() error {
	token, err := j.token()
	if err != nil {
		return err
	}
	if token != json.Delim('[') {
		return j.here(newFlaw("write the table anew", "%s as entries", tokenText(token)).wants("a list of integers"))
	}
	for j.More() {
		if len(j.table.Entries) == 1<<16 {
			return j.here(newFlaw("write the table anew", "more than 65536 entries").wants("one per input"))
		}
		n, err := j.integer("entry "+strconv.Itoa(len(j.table.Entries)), 0, 1<<16-1)
		if err != nil {
			return err
		}
		j.table.Entries = append(j.table.Entries, uint16(n))
	}
	_, err = j.token()
	return err
}

// tokenText is a token for a message.
func tokenText(token json.Token) string {
	switch v := token.(type) {
	case json.Delim:
		if v == '[' || v == ']' {
			return "a list"
		}
		return "an object"
	case string:
		return quote(v)
	case nil:
		return "null"
	case json.Number:
		return quote(v.String())
	}
	return fmt.Sprint(token)
}
