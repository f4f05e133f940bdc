package luts

import (
	"bytes"
	"errors"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
)

const (
	goodJSON = `{"kind":"window","in_bits":1,"out_bits":8,"first":-1,"entries":[0,255]}`
	goodCSV  = "# kind: window\n# in_bits: 1\n# out_bits: 8\ninput,output\n-1,0\n0,255\n"
)

// What readers bear with: any order and layout, what editors and spreadsheets do to a file.
func TestReadersBearWith(t *testing.T) {
	want := Table{Window, 1, 8, -1, []uint16{0, 255}}
	unsigned := Table{Window, 1, 8, 0, []uint16{0, 255}}
	for _, c := range []struct {
		f    format
		text string
		want Table
	}{
		{formats[0], goodJSON, want},
		{formats[0], "\ufeff" + goodJSON + "\r\n", want},
		{formats[0], `{ "entries": [ 0 , 255 ], "first": -1, "provenance": {"a": [1, {}]}, "out_bits": 8, "in_bits": 1, "kind": "window" }`, want},
		{formats[0], strings.Replace(goodJSON, `"first":-1,`, "", 1), unsigned},
		{formats[1], goodCSV, want},
		{formats[1], "\ufeff" + strings.ReplaceAll(goodCSV, "\n", "\r\n"), want},
		{formats[1], strings.ReplaceAll(goodCSV, ",", ";"), want},
		{formats[1], strings.ReplaceAll(goodCSV, ",", "\t"), want},
		{formats[1], strings.ReplaceAll(goodCSV, ",", " , "), want},
		{formats[1], strings.TrimSuffix(goodCSV, "\n"), want},
		{formats[1], "# a word\n\n" + strings.ReplaceAll(goodCSV, "\n", "\n#\n# note: said\n"), want},
		{formats[1], strings.NewReplacer("-1,0", "0,0", "0,255", "1,255").Replace(goodCSV), unsigned},
	} {
		got, _, err := c.f.read("t", strings.NewReader(c.text))
		if err != nil || !reflect.DeepEqual(got, c.want) {
			t.Errorf("%q: %+v, want %+v, %v", c.text, got, c.want, err)
		}
	}
}

// damaged are files that are refused, each with the start of its error.
type damagedFile struct{ text, want string }

func replaced(good, old, new string) string { return strings.Replace(good, old, new, 1) }

var damagedJSON = []damagedFile{
	{"", "t:1: the file breaks off; expected a whole JSON object"},
	{"{", "t:1: the file breaks off"},
	{"[]", "t:1: a list at the start; expected a JSON object"},
	{"null", "t:1: null at the start"},
	{"true", "t:1: true at the start"},
	{"input,output\n", "t:1: no JSON ("},
	{"{\n\"kind\":\n'x'}", "t:3: no JSON ("},
	{goodJSON[:len(goodJSON)-1], "t:1: the file breaks off"},
	{goodJSON[:len(goodJSON)-5], "t:1: the file breaks off"},
	{goodJSON + "{}", "t:1: more text behind the object; expected the end of the file"},
	{goodJSON + "\n]", "t:2: more text behind the object"},
	{replaced(goodJSON, `"kind"`, `"Kind"`), `t:1: the name "Kind"; expected kind, in_bits, out_bits, first, entries or provenance; move it into provenance`},
	{replaced(goodJSON, `"first"`, `"in_bits"`), `t:1: "in_bits" twice; expected each name once`},
	{replaced(goodJSON, `"kind":"window",`, ""), `t: no "kind"; expected kind, in_bits, out_bits and entries`},
	{replaced(goodJSON, `"in_bits":1,`, ""), `t: no "in_bits"`},
	{replaced(goodJSON, `"out_bits":8,`, ""), `t: no "out_bits"`},
	{replaced(goodJSON, `,"entries":[0,255]`, ""), `t: no "entries"`},
	{replaced(goodJSON, `"window"`, `"ramp"`), `t:1: "ramp" as kind; expected "calibration" or "window"`},
	{replaced(goodJSON, `"window"`, `3`), `t:1: "3" as kind`},
	{replaced(goodJSON, `"window"`, `{}`), `t:1: an object as kind`},
	{replaced(goodJSON, `"window"`, `"calibration"`), `t: -1 as the first input; expected 0`},
	{replaced(goodJSON, `"window"`, "wind"), "t:1: no JSON ("},
	{replaced(goodJSON, `"in_bits":1`, "\n\"in_bits\":17"), `t:2: "17" as in_bits; expected an integer from 1 to 16`},
	{replaced(goodJSON, `"in_bits":1`, `"in_bits":1.0`), `t:1: "1.0" as in_bits`},
	{replaced(goodJSON, `"in_bits":1`, `"in_bits":1e0`), `t:1: "1e0" as in_bits`},
	{replaced(goodJSON, `"in_bits":1`, `"in_bits":"1"`), `t:1: "1" as in_bits`},
	{replaced(goodJSON, `"in_bits":1`, `"in_bits":null`), `t:1: null as in_bits`},
	{replaced(goodJSON, `"in_bits":1`, `"in_bits":2`), `t: -1 as the first input; expected 0, or -2`},
	{replaced(goodJSON, `"out_bits":8`, `"out_bits":0`), `t:1: "0" as out_bits`},
	{replaced(goodJSON, `"out_bits":8`, `"out_bits":7`), `t: 255 for the input 0; expected at most 127 in 7 bits`},
	{replaced(goodJSON, `"first":-1`, `"first":1`), `t:1: "1" as first; expected an integer from -32768 to 0`},
	{replaced(goodJSON, `[0,255]`, `{}`), "t:1: an object as entries; expected a list of integers"},
	{replaced(goodJSON, `[0,255]`, `[0]`), "t: 1 entries; expected 2"},
	{replaced(goodJSON, `[0,255]`, `[0,1,2]`), "t: 3 entries; expected 2"},
	{replaced(goodJSON, `[0,255]`, "[0,\n65536]"), `t:2: "65536" as entry 1; expected an integer from 0 to 65535`},
	{replaced(goodJSON, `[0,255]`, `[0,-1]`), `t:1: "-1" as entry 1`},
	{replaced(goodJSON, `[0,255]`, `[0,[1]]`), `t:1: a list as entry 1`},
	{replaced(goodJSON, `[0,255]`, `[0,99999999999999999999]`), `t:1: "99999999999999999999" as entry 1`},
	{replaced(goodJSON, `[0,255]`, `[0 255]`), "t:1: no JSON ("},
	{replaced(goodJSON, `[0,255]`, `[0,255`), "t:1: no JSON ("},
	{replaced(goodJSON, `[0,255]`, "["+strings.Repeat("0,", 1<<16)+"0]"), "t:1: more than 65536 entries; expected one per input"},
	{replaced(goodJSON, `{`, `{"provenance":null,`), "t:1: provenance that is no object; expected {"},
	{replaced(goodJSON, `{`, `{"provenance":[1],`), "t:1: provenance that is no object"},
	{replaced(goodJSON, `{`, `{"provenance":{"a":1,"a":2},`), `t:1: the name "a" twice in the provenance; expected each name once`},
	{replaced(goodJSON, `{`, `{"provenance":{"a":`+strings.Repeat("[", 16)+strings.Repeat("]", 16)+`},`), "t:1: provenance of more than 16 values in one another"},
	{replaced(goodJSON, `{`, `{"provenance":{"a":"`+strings.Repeat("x", 1<<16)+`"},`), "t:1: provenance of 65544 bytes; expected at most 65536"},
	{replaced(goodJSON, `{`, `{"provenance":`), "t:1: provenance that is no object"},
	{replaced(goodJSON, `{`, `{"provenance":{]`), "t:1: provenance that is no JSON ("},
	{strings.Repeat("[", 1<<20), "t:1: a list at the start"},
	{`{"provenance":` + strings.Repeat("[", 1<<20), "t:1: provenance that is no JSON ("},
}

var damagedCSV = []damagedFile{
	{"", "t: no header; expected input,output"},
	{"# kind: window\n", "t: no header"},
	{"{\n", `t:1: "{" as header; expected input,output`},
	{replaced(goodCSV, "input", "stored"), `t:4: "stored,output" as header`},
	{replaced(goodCSV, "input,output\n", ""), `t:4: "-1,0" as header`},
	{replaced(goodCSV, "# kind: window\n", ""), `t:3: no line "# kind:" above the header`},
	{replaced(goodCSV, "# in_bits: 1\n", "# in bits: 1\n"), `t:4: no line "# in_bits:" above the header`},
	{replaced(goodCSV, "# out_bits: 8\n", ""), `t:3: no line "# out_bits:" above the header`},
	{replaced(goodCSV, "window", "ramp"), `t:1: "ramp" as kind; expected calibration or window`},
	{replaced(goodCSV, "window", "calibration"), "t: -1 as the first input; expected 0"},
	{replaced(goodCSV, "in_bits: 1", "in_bits: 0"), `t:2: "0" as in_bits; expected an integer from 1 to 16`},
	{replaced(goodCSV, "out_bits: 8", "out_bits: eight"), `t:3: "eight" as out_bits`},
	{replaced(goodCSV, "# out_bits: 8", "# in_bits: 8"), "t:3: in_bits twice; expected it once"},
	{goodCSV + "# kind: window\n", "t:7: kind below the header; expected it above"},
	{replaced(goodCSV, "# in", "# provenance: [1]\n# in"), "t:2: provenance that is no object"},
	{replaced(goodCSV, "# in", "# provenance:\n# in"), "t:2: provenance that is no JSON (EOF)"},
	{replaced(goodCSV, "# in", "# provenance: {} {}\n# in"), "t:2: more text behind the provenance; expected one object"},
	{replaced(goodCSV, "# in", "# provenance: {\"a\"}\n# in"), "t:2: provenance that is no JSON ("},
	{replaced(goodCSV, "# in", "# provenance: {\"a\":[1}\n# in"), "t:2: provenance that is no JSON ("},
	{replaced(goodCSV, "# in", "# provenance: {1:2}\n# in"), "t:2: provenance that is no JSON ("},
	{replaced(goodCSV, "-1,0", "-1;0"), `t:5: "-1;0"; expected an input and an output`},
	{replaced(goodCSV, "-1,0", "-1,0,0"), `t:5: "0,0" as output; expected an integer from 0 to 255`},
	{replaced(goodCSV, "-1,0", "-1.0,0"), `t:5: "-1.0" as input; expected an integer`},
	{replaced(goodCSV, "-1,0", "-1,"), `t:5: "" as output`},
	{replaced(goodCSV, "-1,0", "-1,-1"), `t:5: "-1" as output`},
	{replaced(goodCSV, "0,255", "0,256"), `t:6: "256" as output; expected an integer from 0 to 255`},
	{replaced(goodCSV, "-1,0\n", "-2,0\n"), "t:5: input -2 in the first row; expected 0, or -1 for signed data"},
	{replaced(goodCSV, "0,255", "1,255"), "t:6: input 1; expected 0; put all rows in order"},
	{replaced(goodCSV, "0,255", "-1,255"), "t:6: input -1; expected 0"},
	{replaced(goodCSV, "0,255\n", ""), "t: 1 entries; expected 2"},
	{goodCSV + "1,255\n", "t:7: a row for input 1; expected no more than 2 rows for 1 bits"},
}

func TestReadersRefuse(t *testing.T) {
	for i, files := range [][]damagedFile{damagedJSON, damagedCSV} {
		for _, c := range files {
			table, p, err := formats[i].read("t", strings.NewReader(c.text))
			checkError(t, err, c.want)
			var place *FormatError
			if !errors.As(err, &place) || place.File != "t" {
				t.Errorf("%v is no FormatError", err)
			}
			if table.Entries != nil || p != nil {
				t.Errorf("%s: a refused file gives %+v, %v", c.want, table, p)
			}
		}
	}
}

// Half a file is never taken for a table.
func TestEveryPrefixIsRefused(t *testing.T) {
	for i, good := range []string{goodJSON, strings.TrimSuffix(goodCSV, "55\n")} {
		for n := range len(good) {
			if _, _, err := formats[i].read("t", strings.NewReader(good[:n])); err == nil {
				t.Errorf("%q is read", good[:n])
			}
		}
	}
}

func fuzzReader(f *testing.F, at int, damaged []damagedFile, good ...string) {
	for _, c := range damaged {
		if len(c.text) < 4096 {
			f.Add([]byte(c.text))
		}
	}
	for name := range samples(f) {
		text, err := os.ReadFile(filepath.Join("..", "testdata", "luts", name+formats[at].suffix))
		if err != nil {
			f.Fatal(err)
		}
		good = append(good, string(text))
	}
	for _, text := range good {
		if _, _, err := formats[at].read("seed", strings.NewReader(text)); err != nil {
			f.Fatal(err)
		}
		f.Add([]byte(text))
	}
	f.Fuzz(func(t *testing.T, text []byte) {
		table, p, err := formats[at].read("t", bytes.NewReader(text))
		if err != nil {
			checkOneLine(t, err)
			return
		}
		if err := table.Check(); err != nil {
			t.Fatal(err)
		}
		// What was read is written and read in both formats without a change.
		for _, other := range formats {
			var b bytes.Buffer
			if err := other.write(&b, table, p); err != nil {
				t.Fatal(err)
			}
			again, q, err := other.read("again", &b)
			if err != nil {
				t.Fatal(err)
			}
			if p == nil {
				p = Provenance{}
			}
			if !reflect.DeepEqual(again, table) || !reflect.DeepEqual(q, p) {
				t.Fatalf("%+v, %v comes back as %+v, %v", table, p, again, q)
			}
		}
	})
}

// FuzzReadJSON: no file makes ReadJSON panic, every error is one line, every table read is sound.
func FuzzReadJSON(f *testing.F) { fuzzReader(f, 0, damagedJSON, goodJSON) }

// FuzzReadCSV: the same for ReadCSV.
func FuzzReadCSV(f *testing.F) { fuzzReader(f, 1, damagedCSV, goodCSV) }
