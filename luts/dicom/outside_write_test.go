package dicom

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"maps"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"
)

// table is a rising LUT over its whole range.
func table(n, bits, first int) *LUT {
	l := &LUT{First: first, Bits: bits, Entries: make([]uint16, n), Explanation: "table"}
	for i := range l.Entries {
		l.Entries[i] = uint16(i * (1<<bits - 1) / (n - 1))
	}
	return l
}

// states are presentation states of every kind for the 12-bit demo image, with and without each stage.
func states(t *testing.T) map[string]State {
	all := map[string]State{}
	add := func(name string, change func(*State)) {
		s := demoState(t)
		change(&s)
		all[name] = s
	}
	add("window", func(s *State) { s.Software = "0.1" })
	add("narrow window, rescaled, inverse", func(s *State) {
		s.Slope, s.Intercept, s.Unit, s.Inverse = 0.5, -1024, "HU", true
		s.Window = &Window{-100, 400.5, "soft"}
	})
	add("exact window", func(s *State) { s.Function = "LINEAR_EXACT" })
	add("sigmoid", func(s *State) { s.Function = "SIGMOID" })
	add("VOI LUT of 65536 entries", func(s *State) { s.Window, s.VOILUT = nil, table(65536, 16, 0) })
	add("VOI LUT", func(s *State) { s.Window, s.VOILUT = nil, table(4096, 16, 0) })
	add("modality LUT, signed VOI LUT, presentation LUT", func(s *State) {
		s.ModalityLUT, s.Unit = table(4096, 16, 0), "OD"
		s.Window, s.VOILUT = nil, table(301, 8, -5)
		s.PresentationLUT = table(256, 10, 0)
	})
	add("no VOI stage, spacing", func(s *State) { s.Window, s.Image.Spacing = nil, [2]float64{0.1, 0.2} })
	add("aspect", func(s *State) { s.Image.Aspect = [2]int{3, 2} })
	return all
}

func stated(t *testing.T, s State) string {
	t.Helper()
	var b bytes.Buffer
	if err := WritePresentationState(&b, s, other(), made); err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "state.dcm")
	if err := os.WriteFile(path, b.Bytes(), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

// unknownPatient is what dciodvfy says of every object without a patient: it could not go into a DICOMDIR,
// and an empty Laterality means that it is unknown, which it is.
var unknownPatient = regexp.MustCompile(`^Warning - (Missing attribute or value that would be needed to build DICOMDIR - |is only permitted to be empty when actually unknown; .* - attribute <Laterality>$)`)

// dciodvfy of dicom3tools finds nothing wrong in what is written.
func TestDciodvfy(t *testing.T) {
	needed(t, "dciodvfy")
	verify := func(name, path, kind string) {
		out, err := exec.Command("dciodvfy", path).CombinedOutput()
		lines := strings.Split(strings.TrimSpace(string(out)), "\n")
		lines = slices.DeleteFunc(lines, unknownPatient.MatchString)
		if err != nil || !slices.Equal(lines, []string{kind}) {
			t.Errorf("%s: %v, %q; expected %s and nothing else", name, err, lines, kind)
		}
	}
	for name, path := range samples(t) {
		if strings.HasSuffix(name, "bits") {
			verify(name, path, "SCImage")
		}
	}
	for name, s := range states(t) {
		verify(name, stated(t, s), "GrayscaleSoftcopyPresentationState")
	}
}

// pydicom reads the pixels, windows and tables of a Secondary Capture and of the other samples alike.
func TestPydicomReadsSamples(t *testing.T) {
	all := samples(t)
	names := slices.Sorted(maps.Keys(all))
	var paths []string
	for _, name := range names {
		paths = append(paths, all[name])
	}
	for i, s := range pydicom(t, paths...) {
		m, err := readFile(t, paths[i])
		if err != nil {
			t.Fatal(err)
		}
		same(t, names[i], m, s)
	}
}

// What dcmdump of DCMTK shows of a presentation state.
func TestDcmdumpState(t *testing.T) {
	needed(t, "dcmdump")
	all := states(t)
	for _, q := range []struct {
		name string
		want []string
	}{
		{"window", []string{
			`(0008,0016) UI =GrayscaleSoftcopyPresentationStateStorage`,
			`(0008,1155) UI [` + all["window"].Image.SOPInstance + `]`,
			`(0020,000d) UI [` + all["window"].Image.Study + `]`,
			`(0010,0010) PN (no value available)`,
			`(0028,1050) DS [2048]`,
			`(0070,0053) SL 33\20`,
			`(0070,0102) IS [1\1]`,
			`(2050,0020) CS [IDENTITY]`,
		}},
		{"narrow window, rescaled, inverse", []string{`(0028,1051) DS [400.5]`, `(0028,1052) DS [-1024]`, `(0028,1053) DS [0.5]`, `(0028,1054) LO [HU]`, `(2050,0020) CS [INVERSE]`}},
		{"sigmoid", []string{`(0028,1056) CS [SIGMOID]`}},
		{"VOI LUT of 65536 entries", []string{`(0028,3002) US 0\0\16`, `# 131072, 1 LUTData`}},
		{"modality LUT, signed VOI LUT, presentation LUT", []string{`(0028,3002) US 4096\0\16`, `(0028,3004) LO [OD]`, `(0028,3002) SS 302\-5\8`, `# 302, 1 LUTData`, `(0028,3002) US 256\0\10`}},
		{"no VOI stage, spacing", []string{`(0070,0101) DS [0.1\0.2]`}},
		{"aspect", []string{`(0070,0102) IS [3\2]`}},
	} {
		got := outside(t, "dcmdump", stated(t, all[q.name]))
		for _, w := range q.want {
			if !strings.Contains(got, w) {
				t.Errorf("%s: dcmdump does not show %s in\n%s", q.name, w, got)
			}
		}
	}
}

// DCMTK's dcmp2pgm applies a presentation state to the image that it names. Its 8-bit picture is that of
// the formulas of PS3.3 C.11.2.1.2 and C.11.6.1, within one level for its rounding. That program takes no state without a name, which ours never has: dcmodify puts one in.
func TestDCMTKAppliesState(t *testing.T) {
	needed(t, "dcmp2pgm", "dcmodify")
	cells := ramp(33, 20, 12)
	image := filepath.Join(t.TempDir(), "image.dcm")
	if err := os.WriteFile(image, captured(t, Capture{Columns: 33, Rows: 20, BitsStored: 12, Cells: cells, Title: "ramp"}), 0o600); err != nil {
		t.Fatal(err)
	}
	linear := func(x, c, w float64) float64 { return max(0, min((x-(c-0.5))/(w-1)+0.5, 1)) }
	all := states(t)
	for name, fraction := range map[string]func(x float64) float64{
		"window":                           func(x float64) float64 { return linear(x, 2048, 4096) },
		"narrow window, rescaled, inverse": func(x float64) float64 { return 1 - linear(0.5*x-1024, -100, 400.5) },
		"VOI LUT":                          func(x float64) float64 { return x / 4095 },
	} {
		out := filepath.Join(t.TempDir(), "out.pgm")
		state := stated(t, all[name])
		outside(t, "dcmodify", "-nb", "-m", "PatientName=NOBODY", state)
		outside(t, "dcmp2pgm", "-p", state, image, out)
		b, err := os.ReadFile(out)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.HasPrefix(b, []byte("P5")) || len(b) < len(cells) {
			t.Fatalf("%s: %d bytes; expected a PGM of %d", name, len(b), len(cells))
		}
		differ := 0
		for i, got := range b[len(b)-len(cells):] {
			want := 255 * fraction(float64(cells[i]))
			if math.Abs(float64(got)-want) > 1+1.0/3 {
				t.Fatalf("%s: stored %d becomes %d; expected %.2f", name, cells[i], got, want)
			}
			if float64(got) != math.Round(want) {
				differ++
			}
		}
		t.Logf("%s: %d of %d levels are not those of rounding", name, differ, len(cells))
	}
}

// Where GDCM's tools are, gdcmraw gives the cells as they were written. GDCM is not needed elsewhere, so it
// may be missing even under CI=true.
func TestGDCM(t *testing.T) {
	if _, err := exec.LookPath("gdcmraw"); err != nil {
		t.Skip("gdcmraw is missing")
	}
	for name, path := range samples(t) {
		if !strings.HasSuffix(name, "bits") {
			continue
		}
		m, err := readFile(t, path)
		if err != nil {
			t.Fatal(err)
		}
		raw := filepath.Join(t.TempDir(), "cells.raw")
		outside(t, "gdcmraw", "-i", path, "-o", raw)
		got, err := os.ReadFile(raw)
		if err != nil {
			t.Fatal(err)
		}
		cells := mustFrame(t, m, 0)
		want := words16(binary.LittleEndian, cells)
		if m.BitsStored == 8 {
			want = make([]byte, len(cells)+len(cells)%2)
			for i, c := range cells {
				want[i] = byte(c)
			}
		}
		if !bytes.Equal(got, want) {
			t.Errorf("%s: GDCM reads other cells", name)
		}
		for _, way := range []string{"--jpeg", "--rle"} {
			packed := filepath.Join(t.TempDir(), "packed.dcm")
			outside(t, "gdcmconv", way, path, packed)
			p, err := readFile(t, packed)
			if err != nil || sum(t, p) != sum(t, m) {
				t.Errorf("%s, gdcmconv %s: %v", name, way, fmt.Sprint(err))
			}
		}
	}
}
