package dicom

import (
	"bufio"
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"encoding/json"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// needed finds a program of the Debian packages dcmtk, dicom3tools, python3-pydicom, python3-numpy. Where it
// is missing the test is skipped, and under CI=true fails.
func needed(t *testing.T, names ...string) {
	t.Helper()
	for _, name := range names {
		if _, err := exec.LookPath(name); err != nil {
			missing(t, name)
		}
	}
}

func missing(t *testing.T, name string) {
	t.Helper()
	if os.Getenv("CI") == "true" {
		t.Fatalf("%s is missing", name)
	}
	t.Skipf("%s is missing", name)
}

// outside runs a program and gives what it prints on both outputs.
func outside(t *testing.T, name string, args ...string) string {
	t.Helper()
	out, err := exec.Command(name, args...).CombinedOutput()
	if err != nil {
		t.Fatalf("%s %s: %v\n%s", name, strings.Join(args, " "), err, out)
	}
	return string(out)
}

// seen is what testdata/dicom/values.py prints of a file.
type seen struct {
	File, Syntax, Name, Photometric, Function, Modality, Reason string
	Image, Signed                                               bool
	Rows, Columns, Frames, Allocated, Stored, Low, High         int
	Slope, Intercept                                            *float64
	Centers, Widths                                             []float64
	VOI                                                         []struct {
		Descriptor [3]int
		Data       []uint16
	}
	SHA256 *string
}

// pydicomFiles is what pydicom says of its own test data, once asked.
var pydicomFiles []seen

// pydicom runs values.py with the Python that has pydicom: the one in PATH, or Debian's.
func pydicom(t *testing.T, files ...string) []seen {
	t.Helper()
	if files == nil && pydicomFiles != nil {
		return pydicomFiles
	}
	for _, python := range []string{"python3", "/usr/bin/python3"} {
		if exec.Command(python, "-c", "import pydicom, numpy").Run() != nil {
			continue
		}
		script := filepath.Join("..", "..", "testdata", "dicom", "values.py")
		c := exec.Command(python, append([]string{script}, files...)...)
		var stderr bytes.Buffer
		c.Stderr = &stderr
		out, err := c.Output()
		if err != nil {
			t.Fatalf("%v: %s", err, stderr.String())
		}
		var all []seen
		lines := bufio.NewScanner(bytes.NewReader(out))
		lines.Buffer(nil, 8<<20)
		for lines.Scan() {
			var s seen
			if err := json.Unmarshal(lines.Bytes(), &s); err != nil {
				t.Fatalf("%v: %s", err, lines.Text())
			}
			all = append(all, s)
		}
		if files == nil {
			pydicomFiles = all
		}
		return all
	}
	missing(t, "pydicom or numpy for Python")
	return nil
}

func readFile(t *testing.T, path string) (*Image, error) {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { f.Close() })
	info, err := f.Stat()
	if err != nil {
		t.Fatal(err)
	}
	return Read(filepath.Base(path), f, info.Size())
}

// sum is the hash that values.py takes of all frames.
func sum(t *testing.T, m *Image) string {
	t.Helper()
	h := sha256.New()
	for i := range m.Frames {
		cells := mustFrame(t, m, i)
		b := make([]byte, 4*len(cells))
		for k, c := range cells {
			binary.LittleEndian.PutUint32(b[4*k:], uint32(m.value(c)))
		}
		h.Write(b)
	}
	return hex.EncodeToString(h.Sum(nil))
}

// Every image of pydicom's test data is read value for value as pydicom reads it, or refused for a reason
// that this test knows by pydicom's view of the file.
func TestPydicomFiles(t *testing.T) {
	read, reasons := 0, map[string]int{}
	for _, s := range pydicom(t) {
		m, err := readFile(t, s.File)
		short := s.File[strings.LastIndex(s.File, "data/")+5:]
		transfer := findTransfer(s.Syntax)
		want := ""
		switch {
		case !s.Image:
			if err == nil {
				t.Errorf("%s: is read; pydicom finds no image", short)
			}
			continue
		case transfer.coding == refused:
			want = s.Name
		case !strings.HasPrefix(s.Photometric, "MONOCHROME"):
			want = "a colour image"
		case s.Allocated != 8 && s.Allocated != 16:
			want = "Bits Allocated"
			if strings.HasSuffix(short, "badVR.dcm") {
				want = "Number of Frames"
			}
		case strings.HasSuffix(short, "MR_truncated.dcm"):
			want = "expected at most the"
		}
		if want != "" {
			reasons[want]++
			if err == nil || !strings.Contains(err.Error(), want) || strings.Contains(err.Error(), "\n") {
				t.Errorf("%s: %v; expected %q", short, err, want)
			}
			continue
		}
		if err != nil {
			t.Errorf("%s: %v; pydicom reads it", short, err)
			continue
		}
		read++
		same(t, short, m, s)
	}
	if read < 40 || len(reasons) < 8 {
		t.Errorf("%d files read, refused %v; expected at least 40, and 8 reasons", read, reasons)
	}
	t.Logf("%d files read, refused: %v", read, reasons)
}

// same compares an image with what pydicom says of the same file.
func same(t *testing.T, name string, m *Image, s seen) {
	t.Helper()
	if m.Rows != s.Rows || m.Columns != s.Columns || m.Frames != s.Frames || m.BitsStored != s.Stored ||
		m.Signed != s.Signed || m.Inverse != (s.Photometric == "MONOCHROME1") || m.Modality != s.Modality {
		t.Errorf("%s: %+v; pydicom says %+v", name, m, s)
		return
	}
	if s.SHA256 == nil {
		t.Errorf("%s: pydicom decodes no pixels: %s", name, s.Reason)
	} else if got := sum(t, m); got != *s.SHA256 {
		t.Errorf("%s: the stored values differ from pydicom's", name)
	}
	stages := mustStages(t, m, 0)
	slope, intercept := 1.0, 0.0
	if s.Slope != nil {
		slope, intercept = *s.Slope, *s.Intercept
	}
	if stages.Slope != slope || stages.Intercept != intercept || len(stages.Windows) != len(s.Centers) || len(stages.VOILUTs) != len(s.VOI) {
		t.Errorf("%s: stages %+v; pydicom says %+v", name, stages, s)
		return
	}
	for i, w := range stages.Windows {
		if w.Center != s.Centers[i] || w.Width != s.Widths[i] {
			t.Errorf("%s: window %d is %v; pydicom says %v, %v", name, i, w, s.Centers[i], s.Widths[i])
		}
	}
	for i, l := range stages.VOILUTs {
		if d := s.VOI[i].Descriptor; l.First != d[1] || l.Bits != d[2] || !slices.Equal(l.Entries, s.VOI[i].Data) {
			t.Errorf("%s: VOI LUT %d is %v; pydicom says %v", name, i, l, s.VOI[i])
		}
	}
}

// samples are images to be compressed: test patterns of ours, and where pydicom's files are there, two that
// scanners made.
func samples(t *testing.T) map[string]string {
	t.Helper()
	dir := t.TempDir()
	all := map[string]string{}
	for name, c := range map[string]Capture{
		"8 bits":  {Columns: 100, Rows: 61, BitsStored: 8, Cells: ramp(100, 61, 8)},
		"10 bits": {Columns: 64, Rows: 64, BitsStored: 10, Cells: noise(64, 64, 10)},
		"12 bits": {Columns: 129, Rows: 33, BitsStored: 12, Cells: ramp(129, 33, 12)},
		"16 bits": {Columns: 300, Rows: 300, BitsStored: 16, Cells: noise(300, 300, 16)},
	} {
		c.Title = name
		path := filepath.Join(dir, strings.ReplaceAll(name, " ", "-")+".dcm")
		if err := os.WriteFile(path, captured(t, c), 0o600); err != nil {
			t.Fatal(err)
		}
		all[name] = path
	}
	base, _ := plain()
	base = base.with(parts{
		tagPatientName: {"PN", ""}, tagPatientID: {"LO", ""},
		tagRows: {"US", []uint16{60}}, tagColumns: {"US", []uint16{50}}, tagFrames: {"IS", "4"},
		tagVOILUT: {"SQ", []parts{
			{tagLUTDescriptor: {"SS", []uint16{3, 0xFFFE, 16}}, tagLUTData: {"OW", []uint16{1, 300, 65535}}},
			{tagLUTDescriptor: {"US", []uint16{2, 7, 12}}, tagLUTData: {"US", []uint16{5, 4095}}},
		}},
	})
	cells := noise(50, 4*60, 12)
	extended := make([]uint16, len(cells))
	for i, c := range cells {
		extended[i] = uint16(int16(c<<4) >> 4)
	}
	for name, p := range map[string]parts{
		"4 frames":         base.with(parts{tagPixels: {"OW", cells}}),
		"4 frames, signed": base.with(parts{tagPixels: {"OW", extended}, tagRepresentation: {"US", []uint16{1}}}),
	} {
		path := filepath.Join(dir, strings.ReplaceAll(name, " ", "-")+".dcm")
		if err := os.WriteFile(path, filed(explicitLittleUID, p), 0o600); err != nil {
			t.Fatal(err)
		}
		all[name] = path
	}
	for _, s := range pydicom(t) {
		for _, name := range []string{"CT_small.dcm", "MR_small.dcm"} {
			if filepath.Base(s.File) == name {
				all[name+" (signed)"] = s.File
			}
		}
	}
	return all
}

// noise is a texture of all values, the same in each run.
func noise(columns, rows, bits int) []uint16 {
	cells := make([]uint16, columns*rows)
	x := uint32(1)
	for i := range cells {
		x = x*1664525 + 1013904223
		cells[i] = uint16(x >> 16 >> (16 - bits))
	}
	return cells
}

// What DCMTK's dcmcjpeg, dcmcrle and dcmconv make of an image decodes to the image's own values.
func TestDCMTKLossless(t *testing.T) {
	needed(t, "dcmcjpeg", "dcmcrle", "dcmconv")
	ways := map[string][]string{
		"RLE":                         {"dcmcrle"},
		"JPEG lossless":               {"dcmcjpeg", "+e1"},
		"JPEG lossless, plain tables": {"dcmcjpeg", "+e1", "-ho"},
		"JPEG lossless, in fragments": {"dcmcjpeg", "+e1", "+fs", "2"},
		"the same without offsets":    {"dcmcjpeg", "+e1", "+fs", "2", "-ot"},
		"implicit":                    {"dcmconv", "+ti"},
		"big endian":                  {"dcmconv", "+tb"},
		"deflated":                    {"dcmconv", "+td", "+cl", "9"},
		"sequences of open length":    {"dcmconv", "+te", "-e"},
		"without meta information":    {"dcmconv", "-F", "+ti"},
	}
	for v := range 7 {
		ways["JPEG lossless, selection value "+string(rune('1'+v))] = []string{"dcmcjpeg", "+el", "+sv", string(rune('1' + v))}
	}
	for sample, path := range samples(t) {
		original, err := readFile(t, path)
		if err != nil {
			t.Fatal(err)
		}
		want := sum(t, original)
		for way, command := range ways {
			out := filepath.Join(t.TempDir(), "out.dcm")
			outside(t, command[0], append(command[1:], path, out)...)
			m, err := readFile(t, out)
			if err != nil {
				t.Errorf("%s, %s: %v", sample, way, err)
				continue
			}
			if got := sum(t, m); got != want {
				t.Errorf("%s, %s (%s): the values differ", sample, way, m.TransferSyntax)
			}
		}
	}
}

// JPEG baseline of DCMTK's dcmcjpeg decodes to what dcmdjpeg makes of it, within the 1 that two inverse
// cosine transforms may differ (ITU-T T.83 leaves decoders that freedom).
func TestDCMTKBaseline(t *testing.T) {
	needed(t, "dcmcjpeg", "dcmdjpeg")
	path := samples(t)["8 bits"]
	dir := t.TempDir()
	packed, plain := filepath.Join(dir, "packed.dcm"), filepath.Join(dir, "plain.dcm")
	for _, quality := range []string{"50", "90", "100"} {
		outside(t, "dcmcjpeg", "+eb", "+q", quality, path, packed)
		outside(t, "dcmdjpeg", packed, plain)
		m, err := readFile(t, packed)
		if err != nil {
			t.Fatal(err)
		}
		want, err := readFile(t, plain)
		if err != nil {
			t.Fatal(err)
		}
		if !m.Lossy {
			t.Error("it is not marked lossy")
		}
		a, b := mustFrame(t, m, 0), mustFrame(t, want, 0)
		differ := 0
		for i := range a {
			if a[i] != b[i] {
				differ++
			}
			if d := int(a[i]) - int(b[i]); d < -1 || d > 1 {
				t.Fatalf("quality %s, cell %d: %d; dcmdjpeg says %d", quality, i, a[i], b[i])
			}
		}
		t.Logf("quality %s: %d of %d cells differ by 1", quality, differ, len(a))
	}
}

// What DCMTK encodes in ways we do not read is refused by name.
func TestDCMTKRefused(t *testing.T) {
	needed(t, "dcmcjpeg", "dcmcjpls")
	path := samples(t)["12 bits"]
	for _, q := range []struct{ command, option, name string }{
		{"dcmcjpeg", "+ee", "JPEG Extended (Process 2 and 4)"},
		{"dcmcjpls", "+el", "JPEG-LS Lossless Image Compression"},
		{"dcmcjpls", "+en", "JPEG-LS Lossy (Near-Lossless) Image Compression"},
	} {
		out := filepath.Join(t.TempDir(), "out.dcm")
		outside(t, q.command, q.option, path, out)
		_, err := readFile(t, out)
		if !errors.Is(err, ErrUnsupported) || !strings.Contains(err.Error(), q.name) {
			t.Errorf("%s %s: %v; expected %s", q.command, q.option, err, q.name)
		}
	}
}
