package dicom

import (
	"bytes"
	"crypto/sha256"
	"errors"
	"fmt"
	"io"
	"math"
	"math/big"
	"math/rand/v2"
	"reflect"
	"slices"
	"strings"
	"testing"
	"time"
)

// made is when the demo content was made.
var made = time.Date(2024, 5, 6, 7, 8, 9, 0, time.UTC)

// counter gives bytes that differ from UID to UID and are the same in each run.
func counter() io.Reader { return rand.NewChaCha8([32]byte{1}) }

// other is a counter of other UIDs, for an object beside another.
func other() io.Reader { return rand.NewChaCha8([32]byte{2}) }

// ramp has every value of a depth at least once where it has room.
func ramp(columns, rows, bits int) []uint16 {
	cells := make([]uint16, columns*rows)
	for i := range cells {
		cells[i] = uint16(i * (1<<bits - 1) / (len(cells) - 1))
	}
	return cells
}

func captured(t testing.TB, c Capture) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := WriteCapture(&b, c, counter(), made); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func TestCaptureReadsBack(t *testing.T) {
	for _, q := range []struct{ columns, rows, bits int }{{5, 7, 8}, {4, 4, 8}, {300, 300, 16}, {33, 65, 12}, {1, 1 << 14, 10}, {2, 1, 9}} {
		cells := ramp(q.columns, q.rows, q.bits)
		m := mustRead(t, captured(t, Capture{Columns: q.columns, Rows: q.rows, BitsStored: q.bits, Cells: cells, Title: "ramp"}))
		if m.Columns != q.columns || m.Rows != q.rows || m.BitsStored != q.bits || m.Signed || m.Inverse || m.Lossy || len(m.Notices) > 0 {
			t.Errorf("%v: %+v", q, m)
		}
		if !slices.Equal(mustFrame(t, m, 0), cells) {
			t.Errorf("%v: cells differ", q)
		}
		half := float64(int(1) << (q.bits - 1))
		want := Stages{Slope: 1, Function: "LINEAR", Windows: []Window{{half, 2 * half, "whole range"}}}
		if s := mustStages(t, m, 0); !reflect.DeepEqual(s, want) {
			t.Errorf("%v: %+v; expected %+v", q, s, want)
		}
	}
}

func TestCaptureRefusals(t *testing.T) {
	good := Capture{Columns: 2, Rows: 2, BitsStored: 10, Cells: []uint16{0, 1, 2, 1023}, Title: "x"}
	for _, q := range []struct {
		name   string
		change func(*Capture)
		want   string
	}{
		{"cells", func(c *Capture) { c.Rows = 3 }, "4 pixel cells for 3 rows of 2 columns"},
		{"none", func(c *Capture) { *c = Capture{BitsStored: 8} }, "0 rows"},
		{"too wide", func(c *Capture) { c.Columns, c.Rows, c.Cells = 65536, 1, make([]uint16, 65536) }, "65536 columns"},
		{"depth", func(c *Capture) { c.BitsStored = 7 }, "7 bits stored; expected 8 to 16"},
		{"value", func(c *Capture) { c.Cells = []uint16{0, 0, 1024, 0} }, "pixel cell 2 is 1024; expected at most 1023"},
		{"title", func(c *Capture) { c.Title = strings.Repeat("x", 52) }, "(0008,103E): text of 65 characters"},
		{"title with a backslash", func(c *Capture) { c.Title = `a\b` }, "(0008,103E)"},
		{"software", func(c *Capture) { c.Software = "1\n2" }, "(0018,1020)"},
	} {
		c := good
		q.change(&c)
		var b bytes.Buffer
		err := WriteCapture(&b, c, counter(), made)
		if err == nil || !errors.Is(err, ErrWrite) || !strings.Contains(err.Error(), q.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s: %v; expected %q", q.name, err, q.want)
		}
		if b.Len() > 0 {
			t.Errorf("%s: %d bytes are written", q.name, b.Len())
		}
	}
	if err := WriteCapture(io.Discard, good, strings.NewReader("short"), made); !errors.Is(err, io.ErrUnexpectedEOF) {
		t.Errorf("%v; expected an error of the source of randomness", err)
	}
	if err := WriteCapture(brokenPipe{}, good, counter(), made); !errors.Is(err, io.ErrClosedPipe) {
		t.Errorf("%v; expected the writer's error", err)
	}
}

type brokenPipe struct{}

func (brokenPipe) Write([]byte) (int, error) { return 0, io.ErrClosedPipe }

// The example of PS3.5 B.2; both forms are from memory, and agree with Python's uuid.UUID(...).int.
func TestUIDOf(t *testing.T) {
	uuid := [16]byte{0xf8, 0x1d, 0x4f, 0xae, 0x7d, 0xec, 0x11, 0xd0, 0xa7, 0x65, 0x00, 0xa0, 0xc9, 0x1e, 0x6b, 0xf6}
	if got, want := uidOf(uuid), "2.25.329800735698586629295641978511506172918"; got != want {
		t.Errorf("%s; expected %s", got, want)
	}
}

func TestNewUID(t *testing.T) {
	seen := map[string]bool{}
	for i := range 1000 {
		h := sha256.Sum256(fmt.Append(nil, i))
		uid, err := NewUID(bytes.NewReader(h[:]))
		if err != nil || !isUID(uid) || strings.HasPrefix(uid, "2.25.0") || seen[uid] {
			t.Fatalf("%q %v; expected a new UID", uid, err)
		}
		seen[uid] = true
		n, _ := new(big.Int).SetString(uid[5:], 10)
		b := n.FillBytes(make([]byte, 16))
		if b[6]>>4 != 4 || b[8]>>6 != 2 {
			t.Fatalf("%x; expected version 4 and variant 10", b)
		}
	}
	if !isUID(implementationClass) {
		t.Error("the Implementation Class UID is none")
	}
}

// DS: at most 16 characters (PS3.5 table 6.2-1), and as near as they allow.
func TestFormatDecimal(t *testing.T) {
	for _, q := range []struct {
		f    float64
		want string
	}{
		{0, "0"},
		{-1024, "-1024"},
		{0.684, "0.684"},
		{1.0 / 3, "0.33333333333333"},
		{-1e-300, "-1E-300"},
		{-1.0 / 3 * 1e-200, "-3.33333333E-201"},
		{1e20, "1E+20"},
		{65535.5, "65535.5"},
	} {
		if got := formatDecimal(q.f); got != q.want {
			t.Errorf("%g: %q; expected %q", q.f, got, q.want)
		}
	}
	random := rand.New(rand.NewPCG(7, 8))
	for range 10_000 {
		f := math.Float64frombits(random.Uint64())
		if math.IsNaN(f) || math.IsInf(f, 0) {
			continue
		}
		s := formatDecimal(f)
		// The worst form, -d.ddddddddE-ddd, has nine digits.
		if back := parseDecimal(s); len(s) > 16 || math.Abs(back-f) > 1e-8*math.Abs(f) {
			t.Fatalf("%g becomes %q", f, s)
		}
	}
}

// A LUT of 32768 entries or more in a short-form value once wrapped its length and was silently broken.
func TestValuesRefuse(t *testing.T) {
	for _, q := range []struct {
		name string
		do   func(*values)
		want string
	}{
		{"short form", func(v *values) { v.uint16s(tagLUTData, "US", make([]uint16, 32768)...) }, "a value US of 65536 bytes; expected at most 65534"},
		{"order", func(v *values) { v.uint16s(tagRows, "US", 1); v.uint16s(tagSamples, "US", 1) }, "expected ascending tags"},
		{"twice", func(v *values) { v.uint16s(tagRows, "US", 1); v.uint16s(tagRows, "US", 1) }, "expected ascending tags"},
		{"within a sequence", func(v *values) { v.sequence(tagVOILUT, func(v *values) { v.text(tagModality, "CS", "lower") }) }, "(0008,0060) Modality"},
		{"number", func(v *values) { v.decimals(tagSlope, math.Inf(1)) }, "+Inf; expected a finite number"},
		{"UID", func(v *values) { v.text(tagSOPClass, "UI", "1..2") }, "does not fit a UI"},
		{"LUT entries", func(v *values) { v.lut(LUT{Bits: 8}, "") }, "0 entries; expected 1 to 65536"},
		{"LUT bits", func(v *values) { v.lut(LUT{Bits: 7, Entries: []uint16{1}}, "") }, "entries of 7 bits"},
		{"LUT first", func(v *values) { v.lut(LUT{First: 1 << 16, Bits: 8, Entries: []uint16{1}}, "") }, "first input 65536"},
		{"LUT entry", func(v *values) { v.lut(LUT{Bits: 8, Entries: []uint16{1, 256}}, "") }, "entry 1 is 256; expected at most 255"},
	} {
		var v values
		q.do(&v)
		if v.err == nil || !errors.Is(v.err, ErrWrite) || !strings.Contains(v.err.Error(), q.want) {
			t.Errorf("%s: %v; expected %q", q.name, v.err, q.want)
		}
	}
	var v values
	if v.uint16s(tagLUTData, "US", make([]uint16, 32767)...); v.err != nil {
		t.Errorf("65534 bytes: %v", v.err)
	}
}

func demoState(t testing.TB) State {
	m, err := readBytes(captured(t, Capture{Columns: 33, Rows: 20, BitsStored: 12, Cells: ramp(33, 20, 12), Title: "ramp"}))
	if err != nil {
		t.Fatal(err)
	}
	ref, err := m.Reference()
	if err != nil {
		t.Fatal(err)
	}
	return State{Image: ref, Label: "WINDOW", Description: "A window", Window: &Window{Center: 2048, Width: 4096}}
}

func TestStateRefusals(t *testing.T) {
	for _, q := range []struct {
		name   string
		change func(*State)
		want   string
	}{
		{"no image", func(s *State) { s.Image = Reference{} }, "not named by four UIDs"},
		{"no size", func(s *State) { s.Image.Rows = 0 }, "0 rows of 33 columns"},
		{"no label", func(s *State) { s.Label = "" }, "no label"},
		{"label", func(s *State) { s.Label = "lower case" }, "(0070,0080)"},
		{"description", func(s *State) { s.Description = "\x00" }, "(0008,103E)"},
		{"two modality stages", func(s *State) { s.Slope, s.ModalityLUT = 1, &LUT{} }, "a slope and a modality LUT"},
		{"two VOI stages", func(s *State) { s.VOILUT = &LUT{} }, "a window and a VOI LUT"},
		{"two presentation stages", func(s *State) { s.Inverse, s.PresentationLUT = true, &LUT{} }, "a presentation LUT with a shape"},
		{"presentation LUT", func(s *State) { s.PresentationLUT = &LUT{First: 1} }, "first input other than 0"},
		{"LINEAR", func(s *State) { s.Window.Width = 0.5 }, "window width 0.5; expected at least 1"},
		{"LINEAR_EXACT", func(s *State) { s.Window.Width, s.Function = 0, "LINEAR_EXACT" }, "window width 0; expected above 0"},
		{"SIGMOID", func(s *State) { s.Window.Width, s.Function = math.NaN(), "SIGMOID" }, "window width NaN"},
		{"function", func(s *State) { s.Function = "CUBIC" }, `function "CUBIC"`},
		{"center", func(s *State) { s.Window.Center = math.Inf(-1) }, "-Inf; expected a finite number"},
	} {
		s := demoState(t)
		q.change(&s)
		var b bytes.Buffer
		err := WritePresentationState(&b, s, counter(), made)
		if err == nil || !errors.Is(err, ErrWrite) || !strings.Contains(err.Error(), q.want) || b.Len() > 0 {
			t.Errorf("%s: %v, %d bytes; expected %q", q.name, err, b.Len(), q.want)
		}
	}
	if err := WritePresentationState(io.Discard, demoState(t), strings.NewReader(""), made); !errors.Is(err, io.EOF) {
		t.Errorf("%v; expected an error of the source of randomness", err)
	}
}

// The same input writes the same bytes, and a presentation state is no image.
func TestStateBytes(t *testing.T) {
	var a, b bytes.Buffer
	for _, w := range []io.Writer{&a, &b} {
		if err := WritePresentationState(w, demoState(t), counter(), made); err != nil {
			t.Fatal(err)
		}
	}
	if !bytes.Equal(a.Bytes(), b.Bytes()) {
		t.Error("two runs differ")
	}
	if !Sniff(a.Bytes()) || Sniff(a.Bytes()[:131]) || Sniff(make([]byte, 200)) {
		t.Error("Sniff does not tell DICOM files")
	}
	_, err := readBytes(a.Bytes())
	isOneLine(t, err, "none in this file; expected an image")
}
