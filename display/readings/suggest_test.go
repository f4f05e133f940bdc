package readings

import "testing"

// TestMistypedKey: mistakes are named, words of their own are left alone.
func TestMistypedKey(t *testing.T) {
	rows := []struct{ key, want string }{
		{"Bits", "bits"},
		{"bit", "bits"},
		{"bist", "bits"},
		{"ibts", "bits"},
		{"bitss", "bits"},
		{"b-i t_s", "bits"},
		{"RD", "rd"},
		{"r_d", "rd"},
		{"metre", "meter"},
		{"Meter", "meter"},
		{"seral", "serial"},
		{"serail", "serial"},
		{"shceme", "scheme"},
		{"shem", "scheme"},
		{"clas", "class"},
		{"romp", "ramp"},
		{"repeatibility", "repeatability"},
		{"repeatabilty", "repeatability"},
		{"noise floor", "noise_floor"},
		{"noisefloor", "noise_floor"},
		{"noise", "noise_floor"},
		{"Ambient", "ambient_cd_m2"},
		{"ambient_cd/m2", "ambient_cd_m2"},
		{"ambient_cdm2", "ambient_cd_m2"},
		{"illuminance", "illuminance_lx"},
		{"illuminance_lux", "illuminance_lx"},
		{"iluminance_lx", "illuminance_lx"},
		{"serial_number", "serial"},
		{"meter-id", "meter"},
		{"bits_per_pixel", "bits"},
		{"# bits", "bits"},

		{"", ""},
		{"rt", ""},
		{"d", ""},
		{"site", ""},
		{"name", ""},
		{"note", ""},
		{"date", ""},
		{"time", ""},
		{"source", ""},
		{"room", ""},
		{"screen", ""},
		{"model", ""},
		{"number", ""},
		{"ambient light", ""},
		{"meter calibrated", ""},
		{"https", ""},
		{"Harbour clinic, reading room 1", ""},
	}
	for _, row := range rows {
		if got := mistypedKey(row.key); got != row.want {
			t.Errorf("key %q is taken for %q, want %q", row.key, got, row.want)
		}
	}
	for _, key := range metadataKeys {
		if got := mistypedKey(key); got != key {
			t.Errorf("key %q is taken for %q", key, got)
		}
	}
}

// TestEdits checks distances counted by hand.
func TestEdits(t *testing.T) {
	long := "a word of more letters than any that is known here"
	rows := []struct {
		a, b string
		want int
	}{
		{"", "", 0},
		{"bits", "bits", 0},
		{"bits", "bit", 1},
		{"bits", "bots", 1},
		{"bits", "btis", 1},
		{"bits", "bists", 1},
		{"bits", "its", 1},
		{"bits", "stib", 3},
		{"ab", "", 2},
		{"abc", "", 3},
		{"meter", "metre", 1},
		{"serial", "series", 2},
		{"ca", "abc", 3}, // the alignment is restricted: no letter is edited twice
		{long, long, 3},  // too long to be compared
	}
	for _, row := range rows {
		if got := edits(row.a, row.b); got != row.want {
			t.Errorf("edits(%q, %q) = %d, want %d", row.a, row.b, got, row.want)
		}
		if got, back := edits(row.a, row.b), edits(row.b, row.a); got != back {
			t.Errorf("edits(%q, %q) is %d one way and %d the other", row.a, row.b, got, back)
		}
	}
}

func TestNearest(t *testing.T) {
	columns := []string{"level", "luminance_cd_m2", "luminance", "luminance_fl", "role"}
	rows := []struct{ word, want string }{
		{"lvl", "level"},
		{"Level.", "level"},
		{"luminance-fl", "luminance_fl"},
		{"luminance in the dark", "luminance"},
		{"comment", ""},
		{"***", ""},
	}
	for _, row := range rows {
		if got := nearest(row.word, columns); got != row.want {
			t.Errorf("nearest to %q is %q, want %q", row.word, got, row.want)
		}
	}
}
