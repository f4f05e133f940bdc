package record

import (
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"testing"
	"unicode/utf16"
	"unicode/utf8"
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

// TestNumbers holds the samples that the reference material shows (testdata/README.md, "Sample lines",
// of the module in testdata/jcs/SOURCE), and the forms that JSON texts give a number beside.
func TestNumbers(t *testing.T) {
	for _, c := range []struct {
		bits uint64
		want string
	}{
		{0x4340000000000001, "9007199254740994"},
		{0x4340000000000002, "9007199254740996"},
		{0x444b1ae4d6e2ef50, "1e+21"},
		{0x3eb0c6f7a0b5ed8d, "0.000001"},
		{0x3eb0c6f7a0b5ed8c, "9.999999999999997e-7"},
		{0x8000000000000000, "0"},
		{0, "0"},
	} {
		if got := string(appendNumber(nil, math.Float64frombits(c.bits))); got != c.want {
			t.Errorf("%x: %s, want %s", c.bits, got, c.want)
		}
	}
	for text, want := range map[string]string{"-0": "0", "-0.0e5": "0", "1E2": "100", "10.50": "10.5", "1e-400": "0"} {
		if got, err := Canonical([]byte(text)); err != nil || string(got) != want {
			t.Errorf("%s: %s (%v), want %s", text, got, err, want)
		}
	}
}

// TestEscapes holds RFC 8785 section 3.2.2.2 (from memory): short escapes where JSON has them, \u00xx
// in lower case for other controls, all else as it is.
func TestEscapes(t *testing.T) {
	const in = `"\u0008\u0009\u000A\u000C\u000D\u0000\u001F\u0022\u005C\/\u007F\u2028\u003C"`
	const want = `"\b\t\n\f\r\u0000\u001f\"\\/` + "\x7f\u2028<" + `"`
	if got, err := Canonical([]byte(in)); err != nil || string(got) != want {
		t.Errorf("%s (%v), want %s", got, err, want)
	}
}

// TestSameMeaningSameForm writes random values in two ways and compares: keys in any order, text
// escaped or not, white space or none.
func TestSameMeaningSameForm(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for range 2000 {
		v := randomValue(rng, 4)
		plain, err := Canonical(looseForm(rng, v))
		if err != nil {
			t.Fatal(err)
		}
		other, err := Canonical(looseForm(rng, v))
		if err != nil || !bytes.Equal(plain, other) {
			t.Fatalf("two forms of one value: %q, %q (%v)", plain, other, err)
		}
		if again, err := Canonical(plain); err != nil || !bytes.Equal(again, plain) {
			t.Fatalf("%q became %q (%v)", plain, again, err)
		}
	}
}

func randomValue(rng *rand.Rand, depth int) any {
	kinds := 6
	if depth == 0 {
		kinds = 4
	}
	switch rng.IntN(kinds) {
	case 0:
		return nil
	case 1:
		return rng.IntN(2) == 0
	case 2:
		for {
			if f := math.Float64frombits(rng.Uint64()); !math.IsNaN(f) && !math.IsInf(f, 0) {
				return f
			}
		}
	case 3:
		return randomText(rng)
	case 4:
		list := make([]any, rng.IntN(5))
		for i := range list {
			list[i] = randomValue(rng, depth-1)
		}
		return list
	}
	m := map[string]any{}
	for range rng.IntN(5) {
		m[randomText(rng)] = randomValue(rng, depth-1)
	}
	return m
}

func randomText(rng *rand.Rand) string {
	alphabet := []rune("ab\"\\/\x00\x1f\x7f\n\t\u0080ö€\u2028\ufb33\ufffd😀𝄞<>&")
	text := make([]rune, rng.IntN(6))
	for i := range text {
		text[i] = alphabet[rng.IntN(len(alphabet))]
	}
	return string(text)
}

func looseForm(rng *rand.Rand, v any) []byte {
	space := func() string { return []string{"", " ", "\n", "\t", "\r\n"}[rng.IntN(5)] }
	var b []byte
	switch v := v.(type) {
	case nil:
		b = append(b, "null"...)
	case bool:
		b = strconv.AppendBool(b, v)
	case float64:
		b = strconv.AppendFloat(b, v, "eE"[rng.IntN(2)], -1+18*rng.IntN(2), 64)
	case string:
		b = append(b, '"')
		for _, r := range v {
			if rng.IntN(2) == 0 && r >= ' ' && r != '"' && r != '\\' {
				b = utf8.AppendRune(b, r)
				continue
			}
			for _, u := range utf16.Encode([]rune{r}) {
				b = fmt.Appendf(b, []string{`\u%04x`, `\u%04X`}[rng.IntN(2)], u)
			}
		}
		b = append(b, '"')
	case []any:
		b = append(b, '[')
		for i, e := range v {
			if i > 0 {
				b = append(b, ',')
			}
			b = append(b, looseForm(rng, e)...)
		}
		b = append(b, space()+"]"...)
	case map[string]any:
		keys := slices.Sorted(maps.Keys(v))
		rng.Shuffle(len(keys), func(i, j int) { keys[i], keys[j] = keys[j], keys[i] })
		b = append(b, '{')
		for i, k := range keys {
			if i > 0 {
				b = append(b, ',')
			}
			b = append(b, looseForm(rng, k)...)
			b = append(b, ':')
			b = append(b, looseForm(rng, v[k])...)
		}
		b = append(b, space()+"}"...)
	}
	return append([]byte(space()), append(b, space()...)...)
}

func TestCanonicalRefuses(t *testing.T) {
	for _, c := range []struct{ name, text, want string }{
		{"empty", "", "ends too early"},
		{"cut off", `{"a":[1,2`, "ends too early"},
		{"cut in a word", `{"a":tr`, "ends too early"},
		{"no JSON", `{a:1}`, "expected JSON"},
		{"comma before the end", `[1,]`, "expected JSON"},
		{"brackets that do not match", `[1}`, "expected JSON"},
		{"key that is no text", `{1:2}`, "expected"},
		{"leading zero", `[01]`, "expected JSON"},
		{"not a number", `[NaN]`, "expected JSON"},
		{"two values", `{} {}`, "text follows"},
		{"key twice", `{"a":1,"b":2,"a":1}`, `key "a" stands twice`},
		{"key twice, escaped", `{"a":1,"\u0061":1}`, `key "a" stands twice`},
		{"number too large", `[1e400]`, "a double holds"},
		{"first half of a pair", `["\ud800"]`, "half a surrogate pair"},
		{"second half of a pair", `["\udc00"]`, "half a surrogate pair"},
		{"first half before plain text", `["\ud800x"]`, "half a surrogate pair"},
		{"first half at the end", `["\ud800`, "ends too early"},
		{"two first halves", `["\ud800\ud800"]`, "half a surrogate pair"},
		{"cut in a character", "[\"\xf0\x9f\x98", "ends too early"},
		{"not UTF-8, and cut", "[\"\xff\xf0\x9f", "not UTF-8"},
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
