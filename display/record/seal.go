package record

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"reflect"
	"slices"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"
)

// What Read refuses, beside text that is no JSON at all.
var (
	ErrAltered   = errors.New("the record was altered after it was sealed")
	ErrTruncated = errors.New("the record is not whole")
	ErrNewer     = errors.New("the record was written by a newer program")
	ErrForeign   = errors.New("the file is no record")
)

// Kinds are the kinds of visit.
func Kinds() []string { return []string{"acceptance", "constancy", "check", "after change"} }

// longestID bounds ids, so that a report can show them.
const longestID = 64

// Seal sets schema, version and hash of a copy of r and returns it, as Read will, with its canonical
// bytes, which end with a line break. It fails where a field is not fit to be kept: a time that is not
// RFC 3339, an id with a line break, an unknown kind of visit, a number that is not finite.
func Seal(r Record) (*Record, []byte, error) {
	r.Schema, r.Version, r.SHA256 = Schema, Version, ""
	if err := r.check(); err != nil {
		return nil, nil, fmt.Errorf("record: %w", err)
	}
	sealed, err := r.clone()
	if err != nil {
		return nil, nil, fmt.Errorf("record: %w", err)
	}
	fill(reflect.ValueOf(sealed))
	body, err := sealed.canonical()
	if err != nil {
		return nil, nil, fmt.Errorf("record: %w", err)
	}
	sealed.SHA256 = hashOf(body)
	text, err := sealed.canonical()
	if err != nil {
		return nil, nil, fmt.Errorf("record: %w", err)
	}
	return sealed, append(text, '\n'), nil
}

// clone gives the record that its own JSON reads back as. It shares nothing with r, and text that is
// not UTF-8, as a file name may hold, is in it as the file will have it.
func (r *Record) clone() (*Record, error) {
	text, err := r.canonical()
	if err != nil {
		return nil, err
	}
	var c Record
	if err := json.Unmarshal(text, &c); err != nil {
		return nil, fmt.Errorf("its own form cannot be read back: %w", err)
	}
	return &c, nil
}

func (r *Record) canonical() ([]byte, error) {
	text, err := json.Marshal(r)
	if err != nil {
		return nil, fmt.Errorf("a figure cannot be written: %w; expected finite numbers", err)
	}
	return Canonical(text)
}

// check says what is not fit to be kept.
func (r *Record) check() error {
	if !slices.Contains(Kinds(), r.Visit.Kind) {
		return fmt.Errorf("kind of visit is %q; expected one of %s; choose one", r.Visit.Kind, strings.Join(Kinds(), ", "))
	}
	if !isTime(r.Visit.Time) {
		return fmt.Errorf("time of the visit is %q; expected RFC 3339, as 2026-11-30T09:15:00Z; correct it", r.Visit.Time)
	}
	if d := r.Meter.CalibratedOn; d != "" {
		if _, err := time.Parse(time.DateOnly, d); err != nil {
			return fmt.Errorf("day of the meter's calibration is %q; expected a day as 2026-11-30; correct it", d)
		}
	}
	type named struct{ what, id string }
	ids := []named{{"monitor's serial", r.Monitor.Serial}, {"monitor's name", r.Monitor.Name}, {"meter's id", r.Meter.ID}}
	for _, p := range r.Persons {
		if p.ID == "" {
			return errors.New("a person has no id; expected one; name the person or leave them out")
		}
		ids = append(ids, named{"person's id", p.ID})
	}
	if r.Neighbour != nil {
		ids = append(ids, named{"neighbour's serial", r.Neighbour.Serial})
	}
	for _, n := range ids {
		if utf8.RuneCountInString(n.id) > longestID || !utf8.ValidString(n.id) || strings.ContainsFunc(n.id, unicode.IsControl) {
			return fmt.Errorf("the %s is %q; expected at most %d characters and no line breaks; shorten it", n.what, shorten(n.id), longestID)
		}
	}
	const longestNote = 4000 // two pages of a report have no room for more
	if n := utf8.RuneCountInString(r.Visit.Notes); n > longestNote || !utf8.ValidString(r.Visit.Notes) {
		return fmt.Errorf("the notes have %d characters; expected at most %d; shorten them", n, longestNote)
	}
	for _, rd := range r.Readings {
		if rd.Time != "" && !isTime(rd.Time) {
			return fmt.Errorf("level %d: time of the reading is %q; expected RFC 3339; correct it", rd.Level, rd.Time)
		}
	}
	return nil
}

// isTime is stricter than time.Parse, which lets an hour of one digit and a comma before the fraction
// pass.
func isTime(s string) bool {
	_, err := time.Parse(time.RFC3339, s)
	return err == nil && s[len("2026-11-30T09")] == ':' && !strings.Contains(s, ",")
}

// fill puts an empty list wherever one is missing that the form always shows, so that a list never
// reads null.
func fill(v reflect.Value) {
	switch v.Kind() {
	case reflect.Pointer:
		if !v.IsNil() {
			fill(v.Elem())
		}
	case reflect.Slice:
		for i := range v.Len() {
			fill(v.Index(i))
		}
	case reflect.Struct:
		for i := range v.NumField() {
			field := v.Type().Field(i)
			if !field.IsExported() {
				continue
			}
			f := v.Field(i)
			if f.Kind() == reflect.Slice && f.IsNil() && !strings.Contains(field.Tag.Get("json"), ",omitempty") {
				f.Set(reflect.MakeSlice(f.Type(), 0, 0))
			}
			fill(f)
		}
	}
}

// Read reads a sealed record strictly: its bytes are the canonical form, its hash is that of its
// content, and it has no field that this program does not know. It does not check again what Seal
// checked, so that a record stays readable where the checks grow stricter. name stands for the file in errors;
// errors.Is finds ErrForeign, ErrNewer, ErrTruncated or ErrAltered in them.
func Read(name string, text []byte) (*Record, error) {
	fault := func(err error, do string) error {
		return fmt.Errorf("%s: %w; expected a sealed record as this program writes it; %s", name, err, do)
	}
	const (
		restore = "take it from a copy that verifies"
		check   = "check that it is the right file"
	)
	body, ended := bytes.CutSuffix(text, []byte("\n"))
	v, err := parse(body)
	if err != nil {
		if errors.Is(err, errNotWhole) {
			return nil, fault(ErrTruncated, restore)
		}
		if !looksOwn(body) {
			return nil, fault(fmt.Errorf("%w (%w)", ErrForeign, err), check)
		}
		return nil, fault(fmt.Errorf("%w (%w)", ErrAltered, err), restore)
	}
	top, ok := v.(object)
	if !ok || top.text("schema") != Schema {
		return nil, fault(ErrForeign, check)
	}
	if n, ok := top.get("version").(float64); !ok || n != Version {
		if ok && n > Version {
			return nil, fault(fmt.Errorf("%w (version %v, known %d)", ErrNewer, n, Version), "use the newer program")
		}
		return nil, fault(ErrAltered, restore)
	}
	if !ended {
		return nil, fault(ErrTruncated, restore)
	}
	if !bytes.Equal(appendCanonical(nil, top), body) {
		return nil, fault(ErrAltered, restore)
	}
	bare := slices.DeleteFunc(slices.Clone(top), func(m member) bool { return m.key == "sha256" })
	if top.text("sha256") != hashOf(appendCanonical(nil, bare)) {
		return nil, fault(ErrAltered, restore)
	}
	if key, odd := oddKey(top); odd {
		return nil, fault(fmt.Errorf("%w (unknown key %q)", ErrForeign, shorten(key)), check)
	}
	var r Record
	d := json.NewDecoder(bytes.NewReader(body))
	d.DisallowUnknownFields()
	if err := d.Decode(&r); err != nil {
		return nil, fault(fmt.Errorf("%w (%w)", ErrForeign, err), check)
	}
	if _, err := d.Token(); !errors.Is(err, io.EOF) {
		return nil, fault(ErrAltered, restore)
	}
	return &r, nil
}

// looksOwn tells a record that lost its form from a file that never was one. "assessment" is the first
// of a record's keys.
func looksOwn(text []byte) bool {
	return bytes.HasPrefix(text, []byte(`{"assessment":`)) || bytes.Contains(text, []byte(`"schema":"`+Schema+`"`))
}

// oddKey finds a key that is not spelled as a record's keys are. The decoder would take "Program" for
// "program", and the last of both.
func oddKey(v any) (key string, odd bool) {
	switch v := v.(type) {
	case []any:
		for _, e := range v {
			if key, odd = oddKey(e); odd {
				return key, true
			}
		}
	case object:
		for _, m := range v {
			if strings.Trim(m.key, "abcdefghijklmnopqrstuvwxyz0123456789_") != "" {
				return m.key, true
			}
			if key, odd = oddKey(m.value); odd {
				return key, true
			}
		}
	}
	return "", false
}

func hashOf(text []byte) string {
	sum := sha256.Sum256(text)
	return hex.EncodeToString(sum[:])
}

func (o object) get(key string) any {
	for _, m := range o {
		if m.key == key {
			return m.value
		}
	}
	return nil
}

func (o object) text(key string) string {
	s, _ := o.get(key).(string)
	return s
}

// Code is the start of the hash in a form that can be read aloud and written on paper.
func (r *Record) Code() string {
	if len(r.SHA256) < 12 {
		return ""
	}
	h := strings.ToUpper(r.SHA256)
	return h[:4] + "-" + h[4:8] + "-" + h[8:12]
}
