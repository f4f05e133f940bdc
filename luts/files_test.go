package luts

import (
	"bytes"
	"encoding/json"
	"errors"
	"flag"
	"io"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "write the golden files instead of comparing with them")

// samples are the tables of the golden files.
func samples(t testing.TB) map[string]Table {
	t.Helper()
	m, err := Chain{Stored: Stored{5, true}, Modality: Rescale{2, -4}, VOI: Windowing{Linear, 0, 40}, OutBits: 8}.Compose()
	if err != nil {
		t.Fatal(err)
	}
	return map[string]Table{
		"window-signed":   m.Table(),
		"calibration-3-9": calibration(3, 9, 0, 20, 51, 96, 160, 248, 366, 511),
	}
}

var sampleProvenance = Provenance{
	"made":   "2026-03-02T10:15:00+01:00",
	"stages": []any{"rescale 2, -4", "window 0/40 LINEAR"},
	"curve":  map[string]any{"levels": json.Number("18"), "gain": json.Number("0.25"), "note": "a<b & \"c\", dim, 21 °C"},
}

type format struct {
	suffix string
	write  func(io.Writer, Table, Provenance) error
	read   func(string, io.Reader) (Table, Provenance, error)
}

var formats = []format{{".json", WriteJSON, ReadJSON}, {".csv", WriteCSV, ReadCSV}}

func golden(t *testing.T, name string, got []byte) {
	t.Helper()
	path := filepath.Join("..", "testdata", "luts", name)
	if *update {
		if err := os.WriteFile(path, got, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(got, want) {
		t.Errorf("%s differs:\n%s\nwant:\n%s", name, got, want)
	}
}

func TestGoldenFiles(t *testing.T) {
	for name, table := range samples(t) {
		for _, f := range formats {
			var b bytes.Buffer
			if err := f.write(&b, table, sampleProvenance); err != nil {
				t.Fatal(err)
			}
			golden(t, name+f.suffix, b.Bytes())
			got, p, err := f.read(name, &b)
			if err != nil {
				t.Fatal(err)
			}
			if !reflect.DeepEqual(got, table) || !reflect.DeepEqual(p, sampleProvenance) {
				t.Errorf("%s%s comes back as %+v, %v", name, f.suffix, got, p)
			}
		}
	}
}

// What other programs read in a written file: plain JSON with the documented names.
func TestJSONIsPlain(t *testing.T) {
	var b bytes.Buffer
	if err := WriteJSON(&b, calibration(1, 16, 3, 65535), nil); err != nil {
		t.Fatal(err)
	}
	var got map[string]any
	if err := json.Unmarshal(b.Bytes(), &got); err != nil {
		t.Fatal(err)
	}
	want := map[string]any{"kind": "calibration", "in_bits": 1.0, "out_bits": 16.0, "first": 0.0, "entries": []any{3.0, 65535.0}, "provenance": map[string]any{}}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("%v, want %v", got, want)
	}
}

func TestLargestTableFitsItsFiles(t *testing.T) {
	table := Table{Window, 16, 16, -32768, slices.Repeat([]uint16{65535}, 1<<16)}
	p := Provenance{"note": strings.Repeat("x", maxProvenance-20)}
	for _, f := range formats {
		var b bytes.Buffer
		if err := f.write(&b, table, p); err != nil {
			t.Fatal(err)
		}
		crlf := bytes.ReplaceAll(b.Bytes(), []byte("\n"), []byte("\r\n"))
		if got, _, err := f.read("largest", bytes.NewReader(crlf)); err != nil || !reflect.DeepEqual(got, table) {
			t.Errorf("%s of %d bytes: %v", f.suffix, len(crlf), err)
		}
	}
}

func TestRaw(t *testing.T) {
	for _, c := range []struct {
		table Table
		bits  int
		want  []byte
	}{
		{Table{Window, 2, 8, -2, []uint16{1, 2, 3, 255}}, 8, []byte{1, 2, 3, 255}},
		{Table{Window, 2, 8, -2, []uint16{1, 2, 3, 255}}, 16, []byte{1, 0, 2, 0, 3, 0, 255, 0}},
		{calibration(1, 12, 0x0102, 0x0FFE), 16, []byte{2, 1, 0xFE, 0x0F}},
	} {
		var b bytes.Buffer
		if err := WriteRaw(&b, c.table, c.bits); err != nil || !bytes.Equal(b.Bytes(), c.want) {
			t.Errorf("%v in %d bits: % x, want % x, %v", c.table.Entries, c.bits, b.Bytes(), c.want, err)
		}
	}
	checkError(t, WriteRaw(io.Discard, calibration(1, 10, 0, 1023), 8), "raw table: entries of 10 bits for fields of 8")
	checkError(t, WriteRaw(io.Discard, calibration(1, 8, 0, 255), 12), "raw table: fields of 12 bits; expected 8 or 16")
	checkError(t, WriteRaw(io.Discard, Table{}, 8), `table: kind ""`)
}

// full is a disk with room for so many bytes.
type full struct{ room int }

var errFull = errors.New("no space left")

func (f full) Write(p []byte) (int, error) {
	if len(p) > f.room {
		return f.room, errFull
	}
	return len(p), nil
}

type short struct{}

func (short) Write(p []byte) (int, error) { return len(p) / 2, nil }

func TestWriteErrors(t *testing.T) {
	good := calibration(1, 8, 0, 255)
	deep := any(1)
	for range maxDepth {
		deep = []any{deep}
	}
	for _, f := range formats {
		err := f.write(full{10}, good, nil)
		checkError(t, err, "table: writing stopped after 10 of ")
		if !errors.Is(err, errFull) {
			t.Errorf("%v does not wrap its cause", err)
		}
		if err := f.write(short{}, good, nil); !errors.Is(err, io.ErrShortWrite) {
			t.Errorf("short write: %v", err)
		}
		checkError(t, f.write(io.Discard, Table{}, nil), `table: kind ""`)
		checkError(t, f.write(io.Discard, good, Provenance{"x": math.NaN()}), "provenance: json: unsupported value")
		checkError(t, f.write(io.Discard, good, Provenance{"x": strings.Repeat("x", maxProvenance)}), "table: provenance of 65544 bytes; expected at most 65536")
		checkError(t, f.write(io.Discard, good, Provenance{"x": deep}), "table: provenance of more than 16 values in one another")
	}
}

// broken is a file that stops being readable.
type broken struct{}

func (broken) Read([]byte) (int, error) { return 0, errFull }

func TestReadErrorsOfBothFormats(t *testing.T) {
	for _, f := range formats {
		_, _, err := f.read("in\x1b.x", broken{})
		checkError(t, err, `in\x1b.x: reading stopped: no space left; expected a file that can be read to its end`)
		if !errors.Is(err, errFull) {
			t.Errorf("%v does not wrap its cause", err)
		}
		_, _, err = f.read("", strings.NewReader(strings.Repeat(" ", maxFile+1)))
		checkError(t, err, "table: more than 2097152 bytes; expected a table")
		_, _, err = f.read("t", strings.NewReader("\n\nx\xff"))
		checkError(t, err, "t:3: bytes that are no UTF-8; expected text")
	}
}
