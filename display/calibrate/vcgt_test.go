package calibrate

import (
	"bytes"
	"encoding/binary"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"
)

// What was written is read back, entry for entry, at every depth.
func TestVideoTableRoundTrip(t *testing.T) {
	c := still(t)
	for in := 8; in <= 12; in++ {
		for _, out := range []int{8, 10, 12, 16} {
			res := mustTable(t, c, Aim{}, in, out)
			b, err := Profile(c, res, origin(), ICCv4)
			if err != nil {
				t.Fatal(err)
			}
			v, err := ReadVideoTable(b)
			if err != nil {
				t.Fatal(err)
			}
			back, err := v.Table(out)
			if err != nil {
				t.Fatal(err)
			}
			if back.InBits != in || !slices.Equal(back.Entries, res.Table.Entries) {
				t.Errorf("%d bits in, %d out: other entries came back", in, out)
			}
		}
	}
}

// wrap is a profile that holds nothing but a video table.
func wrap(data []byte) []byte { return wrapTags([]tag{{"vcgt", data}}) }

func wrapTags(tags []tag) []byte { return assemble(ICCv2, time.Time{}, tags) }

// head is the beginning of a video table of entries.
func head(channels, entries, width uint16) []byte {
	b := typed("vcgt")
	put(b, uint32(0), channels, entries, width)
	return b.Bytes()
}

func TestVideoTableKinds(t *testing.T) {
	bytesOf := func(n int) []byte {
		out := make([]byte, n)
		for i := range out {
			out[i] = byte(i)
		}
		return out
	}
	formula := typed("vcgt")
	put(formula, uint32(1), [9]s15{2 * 65536, 0, 65536, 65536, 6554, 58982, 65536 / 2, 0, 32768})
	for _, c := range []struct {
		name    string
		data    []byte
		channel int
		at      int
		want    uint16
		gray    bool
	}{
		// One byte an entry: full scale is 255.
		{"one byte", append(head(3, 4, 1), 0, 64, 128, 255, 0, 1, 2, 3, 9, 8, 7, 6), 0, 3, 65535, false},
		{"one byte, blue", append(head(3, 4, 1), 0, 64, 128, 255, 0, 1, 2, 3, 9, 8, 7, 6), 2, 1, 8 * 257, false},
		{"one channel for all", append(head(1, 2, 2), 0x12, 0x34, 0xff, 0xfe), 2, 1, 0xfffe, true},
		// y = minimum + (maximum - minimum) x^gamma
		{"formula, red", formula.Bytes(), 0, 128, uint16(math.Round(65535 * math.Pow(128./255, 2))), false},
		{"formula, green starts at a tenth", formula.Bytes(), 1, 0, uint16(math.Round(65535 * 6554. / 65536)), false},
		{"formula, blue ends at a half", formula.Bytes(), 2, 255, 32768, false},
		// Old profiles say one byte an entry and hold two, in a tag of 1576 bytes.
		{"old profile", append(head(3, 256, 1), bytesOf(1576-18)...), 0, 1, 0x0203, true},
	} {
		t.Run(c.name, func(t *testing.T) {
			v, err := ReadVideoTable(wrap(c.data))
			if err != nil {
				t.Fatal(err)
			}
			if got := v.Channels[c.channel][c.at]; got != c.want {
				t.Errorf("%d; expected %d", got, c.want)
			}
			if v.Gray() != c.gray {
				t.Errorf("gray %v; expected %v", v.Gray(), c.gray)
			}
			if strings.HasPrefix(c.name, "formula") != v.Formula {
				t.Errorf("formula %v", v.Formula)
			}
		})
	}
}

func TestVideoTableRefused(t *testing.T) {
	whole := wrap(append(head(1, 2, 2), 0, 0, 255, 255))
	change := func(at int, to ...byte) []byte {
		b := bytes.Clone(whole)
		copy(b[at:], to)
		return b
	}
	bad := typed("vcgt")
	put(bad, uint32(1), [9]s15{-65536, 0, 65536, 65536, 0, 65536, 65536, 0, 65536})
	for _, c := range []struct {
		name string
		data []byte
		want string
	}{
		{"nothing", nil, "0 bytes"},
		{"text", bytes.Repeat([]byte("a"), 200), "no ICC profile"},
		{"cut off", whole[:len(whole)-4], "a size of"},
		{"size", change(0, 0, 0, 1, 0), "a size of"},
		{"many tags", change(128, 0, 0, 1, 0), "256 tags"},
		{"tag beyond the end", change(136, 0, 0, 16, 0), "the tag"},
		{"tag at odd place", change(136, 0, 0, 0, 145), "the tag"},
		{"tag in the header", change(136, 0, 0, 0, 4), "the tag"},
		{"large tag", change(140, 255, 255, 255, 255), "the tag"},
		{"no tag", wrapTags([]tag{{"cprt", textTag("x")}}), "no tag vcgt"},
		{"twice", wrapTags([]tag{{"vcgt", head(1, 2, 2)}, {"vcgt", nil}}), "twice"},
		{"other type", wrap(textTag("no table at all")), "do not begin"},
		{"kind", wrap(append(typed("vcgt").Bytes(), 0, 0, 0, 7)), "kind 7"},
		{"no head", wrap(append(typed("vcgt").Bytes(), 0, 0, 0, 0)), "12 bytes"},
		{"channels", wrap(append(head(2, 2, 2), make([]byte, 8)...)), "2 channels"},
		{"one entry", wrap(append(head(1, 1, 2), 0, 0)), "1 entries"},
		{"width", wrap(append(head(1, 2, 3), make([]byte, 6)...)), "3 bytes an entry"},
		{"short", wrap(append(head(3, 256, 2), make([]byte, 1000)...)), "1018 bytes"},
		{"long", wrap(append(head(1, 2, 2), make([]byte, 40)...)), "58 bytes"},
		{"formula cut off", wrap(append(typed("vcgt").Bytes(), 0, 0, 0, 1, 0, 0)), "a formula of"},
		{"formula that falls", wrap(bad.Bytes()), "gamma"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := ReadVideoTable(c.data)
			if err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
				t.Errorf("%v; expected one line with %q", err, c.want)
			}
		})
	}
}

// A video table that is no table for gray is refused as one.
func TestVideoTableToTable(t *testing.T) {
	gray := func(n int) VideoTable {
		v := VideoTable{}
		for k := range v.Channels {
			v.Channels[k] = make([]uint16, n)
		}
		return v
	}
	tinted := gray(256)
	tinted.Channels[1][7] = 1
	for _, c := range []struct {
		v    VideoTable
		bits int
		want string
	}{
		{gray(256), 7, "7 bits out"},
		{gray(256), 17, "17 bits out"},
		{gray(255), 10, "255 entries"},
		{gray(8192), 10, "8192 entries"},
		{tinted, 10, "differ"},
	} {
		if _, err := c.v.Table(c.bits); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%v; expected %q", err, c.want)
		}
	}
}

// Whatever comes in, reading ends with a table that holds together or with one line.
func FuzzReadVideoTable(f *testing.F) {
	for _, name := range []string{"annex-d-1-v2.icc", "annex-d-1-v4.icc"} {
		b, err := os.ReadFile(filepath.Join("testdata", name))
		if err != nil {
			f.Fatal(err)
		}
		f.Add(b)
	}
	formula := typed("vcgt")
	put(formula, uint32(1), [9]s15{144179, 0, 65536, 144179, 0, 65536, 144179, 0, 65536})
	f.Add(wrap(formula.Bytes()))
	f.Add(wrap(append(head(1, 2, 2), 0, 0, 255, 255)))
	f.Add(wrap(append(head(3, 2, 1), 0, 1, 2, 3, 4, 5)))
	f.Add([]byte("acsp"))
	f.Fuzz(func(t *testing.T, b []byte) {
		// A size that is right lets more inputs through to the tag.
		if len(b) >= 4 {
			binary.BigEndian.PutUint32(b, uint32(len(b)))
		}
		v, err := ReadVideoTable(b)
		if err != nil {
			if strings.Contains(err.Error(), "\n") {
				t.Errorf("%q is more than one line", err)
			}
			return
		}
		n := len(v.Channels[0])
		if n < 2 || n > 65535 || len(v.Channels[1]) != n || len(v.Channels[2]) != n {
			t.Errorf("%d, %d and %d entries", n, len(v.Channels[1]), len(v.Channels[2]))
		}
		if table, err := v.Table(10); err == nil {
			if err := table.Check(); err != nil {
				t.Error(err)
			}
		}
	})
}
