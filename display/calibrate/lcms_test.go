package calibrate

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

// tool is the path of a program of a Debian package; without it the test is skipped, or fails where
// everything must be there.
func tool(t *testing.T, name, debian string) string {
	t.Helper()
	path, err := exec.LookPath(name)
	if err != nil {
		missing(t, name+" of the Debian package "+debian)
	}
	return path
}

func missing(t *testing.T, what string) {
	t.Helper()
	if os.Getenv("CI") == "true" {
		t.Fatalf("no %s; expected it installed", what)
	}
	t.Skipf("no %s", what)
}

// A colour calculator of another make finds the display's luminance in the profile: Y over P-values, white
// being 100, by little-cms' transicc (Debian package liblcms2-utils).
func TestProfileOtherReader(t *testing.T) {
	transicc := tool(t, "transicc", "liblcms2-utils")
	c := mustCurve(t, exactly(t, "annex-d-1-1-characteristic-curve.csv"))
	var input strings.Builder
	for p := range 256 {
		fmt.Fprintln(&input, p, p, p)
	}
	for _, version := range []ICCVersion{ICCv2, ICCv4} {
		b, res := annexProfile(t, version)
		file := filepath.Join(t.TempDir(), "profile.icc")
		if err := os.WriteFile(file, b, 0o600); err != nil {
			t.Fatal(err)
		}
		cmd := exec.Command(transicc, "-n", "-t1", "-i"+file, "-o*XYZ")
		cmd.Stdin = strings.NewReader(input.String())
		out, err := cmd.Output()
		if err != nil {
			t.Fatal(err)
		}
		lines := strings.Split(strings.TrimSpace(string(out)), "\n")
		if len(lines) != 256 {
			t.Fatalf("version %d: %d lines; expected 256: %.200q", version, len(lines), out)
		}
		for p, line := range lines {
			var x, y, z float64
			if _, err := fmt.Sscan(line, &x, &y, &z); err != nil {
				t.Fatalf("%q: %v", line, err)
			}
			want := 100 * float64(c.At(Drive(float64(res.Table.Entries[p])/1023))) / 84.34
			// The curve is rounded to 1/65535 of white, the matrix to 1/65536, the print to 0.0001.
			if math.Abs(y-want) > 0.004 {
				t.Errorf("version %d, P-value %d: Y %v; expected %v", version, p, y, want)
			}
			if math.Abs(x-0.9642*y) > 0.004 || math.Abs(z-0.8249*y) > 0.004 {
				t.Errorf("version %d, P-value %d: %v %v %v is no gray of D50", version, p, x, y, z)
			}
		}
	}
}

// The library behind it reads the video table as it was meant: entry for entry.
func TestVideoTableOtherReader(t *testing.T) {
	python := tool(t, "python3", "python3")
	for _, version := range []ICCVersion{ICCv2, ICCv4} {
		b, res := annexProfile(t, version)
		file := filepath.Join(t.TempDir(), "profile.icc")
		if err := os.WriteFile(file, b, 0o600); err != nil {
			t.Fatal(err)
		}
		var stderr bytes.Buffer
		cmd := exec.Command(python, filepath.Join("testdata", "videotable.py"), file)
		cmd.Stderr = &stderr
		out, err := cmd.Output()
		var exit *exec.ExitError
		if errors.As(err, &exit) && exit.ExitCode() == 3 {
			missing(t, "library liblcms2.so.2 of the Debian package liblcms2-2")
		}
		if err != nil {
			t.Fatal(err, stderr.String())
		}
		lines := strings.Split(strings.TrimSpace(string(out)), "\n")
		if len(lines) != 256 {
			t.Fatalf("version %d: %d lines; expected 256", version, len(lines))
		}
		for p, line := range lines {
			want := int(math.Round(65535 * float64(res.Table.Entries[p]) / 1023))
			if line != fmt.Sprintf("%d %d %d", want, want, want) {
				t.Errorf("version %d, P-value %d: %q; expected %d three times", version, p, line, want)
			}
		}
	}
}
