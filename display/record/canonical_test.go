package record

import (
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strconv"
	"strings"
	"testing"
)

// TestPublishedVectors checks the vectors of the scheme's author (testdata/jcs/SOURCE).
func TestPublishedVectors(t *testing.T) {
	inputs, err := filepath.Glob("testdata/jcs/*.json")
	if err != nil || len(inputs) != 6 {
		t.Fatalf("%d vectors, want 6 (%v)", len(inputs), err)
	}
	for _, name := range inputs {
		in, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		want, err := os.ReadFile(strings.TrimSuffix(name, ".json") + ".canonical")
		if err != nil {
			t.Fatal(err)
		}
		got, err := Canonical(in)
		if err != nil {
			t.Errorf("%s: %v", name, err)
		}
		if !bytes.Equal(got, want) {
			t.Errorf("%s:\n got %s\nwant %s", name, got, want)
		}
		if again, err := Canonical(got); err != nil || !bytes.Equal(again, got) {
			t.Errorf("%s: the canonical form is not its own canonical form: %s, %v", name, again, err)
		}
	}
}

// TestNumberSeries runs the published number series (testdata/jcs/SOURCE) and compares the checksums
// published for its first lines.
func TestNumberSeries(t *testing.T) {
	text, err := os.ReadFile("testdata/jcs/numbers.txt")
	if err != nil {
		t.Fatal(err)
	}
	var series []float64
	for _, line := range strings.Split(strings.TrimSpace(string(text)), "\n") {
		if strings.HasPrefix(line, "#") {
			continue
		}
		u, err := strconv.ParseUint(line, 16, 64)
		if err != nil {
			t.Fatal(err)
		}
		series = append(series, math.Float64frombits(u))
	}
	for i := range uint64(2000) {
		series = append(series, math.Float64frombits(0x0010000000000000+i))
	}
	want := map[int]string{
		1000:   "be18b62b6f69cdab33a7e0dae0d9cfa869fda80ddc712221570f9f40a5878687",
		10000:  "b9f7a8e75ef22a835685a52ccba7f7d6bdc99e34b010992cbc5864cd12be6892",
		100000: "22776e6d4b49fa294a0d0f349268e5c28808fe7e0cb2bcbe28f63894e494d4c7",
	}
	var block [32]byte
	left := block[:0]
	sum := sha256.New()
	for n := 1; n <= 100000; n++ {
		var f float64
		if n <= len(series) {
			f = series[n-1]
		} else {
			for f == 0 || math.IsNaN(f) || math.IsInf(f, 0) {
				if len(left) == 0 {
					block = sha256.Sum256(block[:])
					left = block[:]
				}
				f = math.Float64frombits(binary.LittleEndian.Uint64(left))
				left = left[8:]
			}
		}
		sum.Write([]byte(strconv.FormatUint(math.Float64bits(f), 16) + ","))
		sum.Write(appendNumber(nil, f))
		sum.Write([]byte("\n"))
		if w, ok := want[n]; ok {
			if got := hex.EncodeToString(sum.Sum(nil)); got != w {
				t.Fatalf("first %d numbers: checksum %s, want %s", n, got, w)
			}
		}
	}
}

func TestCanonicalRefuses(t *testing.T) {
	for _, c := range []struct{ name, text, want string }{
		{"empty", "", "ends too early"},
		{"cut off", `{"a":[1,2`, "ends too early"},
		{"cut in a word", `{"a":tr`, "ends too early"},
		{"no JSON", `{a:1}`, "expected JSON"},
		{"two values", `{} {}`, "text follows"},
		{"key twice", `{"a":1,"b":2,"a":1}`, `key "a" stands twice`},
		{"key twice, escaped", `{"a":1,"\u0061":1}`, `key "a" stands twice`},
		{"number too large", `[1e400]`, "a double holds"},
		{"first half of a pair", `["\ud800"]`, "half a surrogate pair"},
		{"second half of a pair", `["\udc00"]`, "half a surrogate pair"},
		{"two first halves", `["\ud800\ud800"]`, "half a surrogate pair"},
		{"not UTF-8", "[\"\xff\"]", "not UTF-8"},
		{"too deep", strings.Repeat("[", deepest+2) + strings.Repeat("]", deepest+2), "nests deeper"},
		{"too long", `"` + strings.Repeat("a", longest) + `"`, "expected at most"},
	} {
		t.Run(c.name, func(t *testing.T) {
			got, err := Canonical([]byte(c.text))
			if err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("got %.60s, error %v; want one with %q", got, err, c.want)
			}
		})
	}
	if got, err := Canonical([]byte(`["\ud83d\ude00","\\ud800"]`)); err != nil || string(got) != `["😀","\\ud800"]` {
		t.Errorf("a whole pair, and an escaped backslash: %s, %v", got, err)
	}
}

func FuzzCanonical(f *testing.F) {
	inputs, err := filepath.Glob("testdata/jcs/*.json")
	if err != nil || len(inputs) == 0 {
		f.Fatal("no seeds")
	}
	for _, name := range inputs {
		text, err := os.ReadFile(name)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(text)
	}
	f.Add([]byte("-0"))
	f.Fuzz(func(t *testing.T, text []byte) {
		got, err := Canonical(text)
		if err != nil {
			return
		}
		again, err := Canonical(got)
		if err != nil || !bytes.Equal(again, got) {
			t.Errorf("%q became %q, then %q (%v)", text, got, again, err)
		}
		var a, b any
		if json.Unmarshal(text, &a) != nil || json.Unmarshal(got, &b) != nil {
			t.Fatalf("%q or its form %q is no JSON to the standard library", text, got)
		}
		if !reflect.DeepEqual(a, b) { // minus zero is zero here, as in the canonical form
			t.Errorf("%q means %v, its form %v", text, a, b)
		}
	})
}
