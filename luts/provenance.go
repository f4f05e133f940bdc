package luts

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
)

// Provenance says where a table comes from, in words and numbers of whoever made it. It travels with the table
// and is not looked at. Values are those of encoding/json; numbers that were read are json.Number.
type Provenance map[string]any

// maxProvenance keeps provenance to what someone may have written. In bytes of JSON.
const maxProvenance = 64 << 10

// maxDepth is how many objects and arrays may lie in one another.
const maxDepth = 16

// checkProvenance says what keeps JSON from being provenance: its size, its depth, a name given twice.
func checkProvenance(text []byte) *flaw {
	if len(text) > maxProvenance {
		return newFlaw("shorten it", "provenance of %d bytes", len(text)).wants("at most %d", maxProvenance)
	}
	d := json.NewDecoder(bytes.NewReader(text))
	d.UseNumber()
	if f := checkValue(d, 0); f != nil {
		return f
	}
	if _, err := d.Token(); !errors.Is(err, io.EOF) {
		return newFlaw("remove the rest", "more text behind the provenance").wants("one object")
	}
	if text = bytes.TrimLeft(text, " \t\r\n"); text[0] != '{' {
		return newFlaw("correct it", "provenance that is no object").wants(`{"name": value, …}`)
	}
	return nil
}

func checkValue(d *json.Decoder, depth int) *flaw {
	token, err := d.Token()
	if err != nil {
		return brokenProvenance(err)
	}
	open, ok := token.(json.Delim)
	if !ok {
		return nil
	}
	if depth == maxDepth {
		return newFlaw("flatten it", "provenance of more than %d values in one another", maxDepth).wants("less")
	}
	names := map[string]bool{}
	for d.More() {
		if open == '{' {
			name, err := d.Token()
			if err != nil {
				return brokenProvenance(err)
			}
			if names[name.(string)] {
				return newFlaw("keep one of them", "the name %s twice in the provenance", quote(name.(string))).wants("each name once")
			}
			names[name.(string)] = true
		}
		if f := checkValue(d, depth+1); f != nil {
			return f
		}
	}
	if _, err := d.Token(); err != nil {
		return brokenProvenance(err)
	}
	return nil
}

func brokenProvenance(err error) *flaw {
	return newFlaw("correct it", "provenance that is no JSON (%v)", err).wants("an object")
}

// marshalProvenance is p as one line of JSON. No provenance is an empty object.
func marshalProvenance(p Provenance) ([]byte, error) {
	if p == nil {
		p = Provenance{}
	}
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(p); err != nil {
		return nil, fmt.Errorf("provenance: %w; expected what JSON can hold; leave the value out", err)
	}
	text := bytes.TrimSpace(b.Bytes())
	if f := checkProvenance(text); f != nil {
		return nil, fmt.Errorf("table: %w", f)
	}
	return text, nil
}

// unmarshalProvenance reads what marshalProvenance wrote.
func unmarshalProvenance(text []byte) (Provenance, *flaw) {
	if f := checkProvenance(text); f != nil {
		return nil, f
	}
	d := json.NewDecoder(bytes.NewReader(text))
	d.UseNumber()
	var p Provenance
	if err := d.Decode(&p); err != nil {
		return nil, brokenProvenance(err)
	}
	return p, nil
}
