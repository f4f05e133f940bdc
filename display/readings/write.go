package readings

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"strconv"
	"time"

	"evenstep/display/photometry"
)

// Write writes f as a file that Parse reads back: the same but for Name, SHA256 and the line numbers.
// An empty Scale, Unit or Role and a bit depth of 0 are written as their defaults, and monotonic
// clock readings and names of time zones are lost. In foot-lambert a luminance that no number of
// foot-lambert gives exactly can change in its last digit.
//
// What Parse would refuse is refused before anything is written, with a *FormatError whose line is
// that of the file as it would have been.
func Write(w io.Writer, f *File) error {
	b, err := render(f)
	if err != nil {
		return err
	}
	if _, err := Parse(f.Name, bytes.NewReader(b)); err != nil {
		return err
	}
	if _, err := w.Write(b); err != nil {
		return fmt.Errorf("%s: the readings could not be written: %w", printable(f.Name), err)
	}
	return nil
}

// render is the file of f, which need not make sense.
func render(f *File) ([]byte, error) {
	s := &sheet{name: f.Name}
	var b bytes.Buffer
	for _, key := range metadataKeys {
		value := f.Metadata.get(key)
		if value == "" {
			continue
		}
		if problem := checkText(value); problem != "" {
			return nil, s.fail(0, key+" "+problem, fmt.Sprintf("a text of at most %d characters on one line", maxText), "correct it")
		}
		fmt.Fprintf(&b, "# %s: %s\n", key, value)
	}

	level, luminance := "level", "luminance_cd_m2"
	switch f.Scale {
	case "", DDL:
	case PValue:
		level = "p_value"
	default:
		return nil, s.fail(0, "scale "+quote(string(f.Scale)), "ddl or p_value", "correct it")
	}
	format := func(l photometry.CdM2) string { return plainNumber(float64(l)) }
	switch f.Unit {
	case "", candela:
	case footLambert:
		luminance, format = "luminance_fl", formatFootLambert
	default:
		return nil, s.fail(0, "unit "+quote(f.Unit), "cd/m2 or fL", "correct it")
	}

	var role, ambient, clock bool // whether the column is wanted
	for _, r := range f.Readings {
		role = role || r.Role != Series && r.Role != ""
		ambient = ambient || r.Ambient != Unstated
		clock = clock || !r.Time.IsZero()
	}
	b.WriteString(level + "," + luminance)
	for _, c := range []struct {
		wanted bool
		name   string
	}{{role, roleColumn}, {ambient, ambientColumn}, {clock, timeColumn}} {
		if c.wanted {
			b.WriteString("," + c.name)
		}
	}
	b.WriteByte('\n')
	for i, r := range f.Readings {
		b.WriteString(strconv.Itoa(r.Level) + "," + format(r.Luminance))
		if role {
			switch r.Role {
			case "", Series, Repeat, Drift:
				b.WriteString("," + string(r.Role))
			default:
				return nil, s.fail(0, fmt.Sprintf("role %s of reading %d", quote(string(r.Role)), i+1), "series, repeat or drift", "correct it")
			}
		}
		if ambient {
			switch r.Ambient {
			case Unstated:
				b.WriteByte(',')
			case Included:
				b.WriteString(",yes")
			case Excluded:
				b.WriteString(",no")
			default:
				return nil, s.fail(0, fmt.Sprintf("ambient state %s of reading %d", quote(string(r.Ambient)), i+1), "included, excluded or empty", "correct it")
			}
		}
		if clock {
			b.WriteByte(',')
			if !r.Time.IsZero() {
				b.WriteString(formatTime(r.Time))
			}
		}
		b.WriteByte('\n')
	}
	return b.Bytes(), nil
}

// formatTime gives up an offset that is not in whole minutes, which RFC 3339 cannot say.
func formatTime(t time.Time) string {
	if _, offset := t.Zone(); offset%60 != 0 {
		t = t.UTC()
	}
	return t.Format(time.RFC3339Nano)
}

// get is the value of a key as written, "" where it was not stated.
func (m *Metadata) get(key string) string {
	switch key {
	case "bits":
		if m.Bits != 0 {
			return strconv.Itoa(m.Bits)
		}
	case "ambient_cd_m2":
		return stated(m.Ambient)
	case "illuminance_lx":
		return stated(m.Illuminance)
	case "rd":
		return stated(m.Rd)
	case "repeatability":
		return stated(m.Repeatability)
	case "noise_floor":
		return stated(m.NoiseFloor)
	case "meter":
		return m.Meter
	case "serial":
		return m.Serial
	case "ramp":
		return m.Ramp
	case "scheme":
		return m.Scheme
	case "class":
		return m.Class
	}
	return ""
}

func stated[T ~float64](v *T) string {
	if v == nil {
		return ""
	}
	return plainNumber(float64(*v))
}

// formatFootLambert is the shortest number of foot-lambert that converts to l exactly, or the nearest
// where none does. Numbers a few units of the last place apart can give the same l.
func formatFootLambert(l photometry.CdM2) string {
	nearest := float64(l.FootLambert())
	best := plainNumber(nearest)
	exact := photometry.FootLambert(nearest).CdM2() == l
	down := nearest
	for range 2 {
		down = math.Nextafter(down, math.Inf(-1))
	}
	for v, i := down, 0; i < 5; v, i = math.Nextafter(v, math.Inf(1)), i+1 {
		if photometry.FootLambert(v).CdM2() != l {
			continue
		}
		if s := plainNumber(v); !exact || len(s) < len(best) {
			best, exact = s, true
		}
	}
	return best
}
