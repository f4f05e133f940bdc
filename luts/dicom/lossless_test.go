package dicom

import (
	"fmt"
	"math/bits"
	"math/rand/v2"
	"slices"
	"testing"
)

type losslessOptions struct {
	precision, predictor, transform, restartRows int
	oneLength                                    bool // codes of equal length instead of longer ones for larger categories
}

// encodeLossless is a plain encoder of T.81 annex H for the tests of the decoder: predictions cell by cell,
// bits one by one, and a fixed table with codes of 1 to 16 bits or of 5.
func encodeLossless(cells []uint16, columns int, o losslessOptions) []byte {
	rows := len(cells) / columns
	counts := []byte{1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 2}
	if o.oneLength {
		counts = []byte{0, 0, 0, 0, 17, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0}
	}
	out := []byte{0xFF, markerSOI}
	segment := func(marker byte, body ...byte) {
		n := len(body) + 2
		out = append(append(out, 0xFF, marker, byte(n>>8), byte(n)), body...)
	}
	segment(0xE0, 1, 2, 3)
	segment(markerSOF3, byte(o.precision), byte(rows>>8), byte(rows), byte(columns>>8), byte(columns), 1, 7, 0x11, 0)
	table := append([]byte{2}, counts...)
	for c := range 17 {
		table = append(table, byte(c))
	}
	segment(markerDHT, table...)
	if o.restartRows > 0 {
		n := o.restartRows * columns
		segment(markerDRI, byte(n>>8), byte(n))
	}
	segment(markerSOS, 1, 7, 0x20, byte(o.predictor), 0, byte(o.transform))

	var acc byte
	free := 8
	put := func(v uint32, n int) {
		for n--; n >= 0; n-- {
			free--
			acc |= byte(v>>n&1) << free
			if free == 0 {
				if out = append(out, acc); acc == 0xFF {
					out = append(out, 0)
				}
				acc, free = 0, 8
			}
		}
	}
	code := func(category int) (uint32, int) {
		switch {
		case o.oneLength:
			return uint32(category), 5
		case category == 16:
			return 0xFFFF, 16
		case category == 15:
			return 0xFFFE, 16
		}
		return 1<<(category+1) - 2, category + 1
	}
	at := func(x, y int) int { return int(cells[y*columns+x]) >> o.transform }
	for y := range rows {
		first := y == 0 || o.restartRows > 0 && y%o.restartRows == 0
		if first && y > 0 {
			if free < 8 {
				put(0xFF, free)
			}
			out = append(out, 0xFF, markerRST0|byte(y/o.restartRows-1)&7)
		}
		for x := range columns {
			var p int
			switch {
			case first && x == 0:
				p = 1 << (o.precision - o.transform - 1)
			case first:
				p = at(x-1, y)
			case x == 0:
				p = at(x, y-1)
			default:
				a, b, c := at(x-1, y), at(x, y-1), at(x-1, y-1)
				p = []int{0, a, b, c, a + b - c, a + (b-c)>>1, b + (a-c)>>1, (a + b) >> 1}[o.predictor]
			}
			d := int(int16(at(x, y) - p))
			if d == -32768 {
				put(code(16))
				continue
			}
			category := bits.Len(uint(max(d, -d)))
			put(code(category))
			if d < 0 {
				d += 1<<category - 1
			}
			put(uint32(d), category)
		}
	}
	if free < 8 {
		put(0xFF, free)
	}
	out = append(out, 0xFF, markerEOI)
	if len(out)%2 != 0 {
		out = append(out, 0)
	}
	return out
}

// Every selection value, precision, point transform and restart interval comes back as it was.
func TestLosslessRoundTrip(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	for predictor := 1; predictor <= 7; predictor++ {
		for precision := 2; precision <= 16; precision++ {
			for _, o := range []losslessOptions{{}, {transform: 1}, {restartRows: 1}, {restartRows: 3, oneLength: true}} {
				o.predictor, o.precision = predictor, precision
				columns, rows := 1+random.IntN(20), 1+random.IntN(40)
				cells := make([]uint16, columns*rows)
				for i := range cells {
					v := random.IntN(1 << precision)
					if i%3 > 0 { // smooth and rough alike
						v = int(cells[i-1]) + random.IntN(3) - 1
					}
					cells[i] = uint16(max(0, min(v, 1<<precision-1)) >> o.transform << o.transform)
				}
				data := encodeLossless(cells, columns, o)
				fill, err := openLossless(data, columns, rows)
				if err != nil {
					t.Fatalf("%+v: %v", o, err)
				}
				got := make([]uint16, len(cells))
				if err := fill(got); err != nil || !slices.Equal(got, cells) {
					t.Fatalf("%+v, %d by %d: %v; %v; expected %v", o, columns, rows, err, got, cells)
				}
			}
		}
	}
}

// T.81 H.1.2.2: a difference of 32768 is category 16, without further bits; arithmetic is modulo 2^16.
func TestLosslessExtremes(t *testing.T) {
	cells := []uint16{0, 32768, 0, 65535, 32767, 65535, 0, 1, 65535, 32768}
	for predictor := 1; predictor <= 7; predictor++ {
		fill, err := openLossless(encodeLossless(cells, 5, losslessOptions{precision: 16, predictor: predictor}), 5, 2)
		if err != nil {
			t.Fatal(err)
		}
		got := make([]uint16, len(cells))
		if err := fill(got); err != nil || !slices.Equal(got, cells) {
			t.Errorf("selection value %d: %v %v; expected %v", predictor, err, got, cells)
		}
	}
}

func TestLosslessRefusals(t *testing.T) {
	cells := make([]uint16, 64)
	for i := range cells {
		cells[i] = uint16(i * 61)
	}
	good := encodeLossless(cells, 8, losslessOptions{precision: 12, predictor: 1, restartRows: 4})
	// Positions by the encoder: SOI 2, APP0 7, SOF3 13, DHT 38, DRI 6, SOS 10, then the scan.
	const sof, dht, dri, sos, scan = 9, 22, 60, 66, 76
	cut := func(n int) []byte { return good[:n] }
	set := func(at int, v ...byte) []byte {
		b := slices.Clone(good)
		copy(b[at:], v)
		return b
	}
	for _, q := range []struct {
		name string
		b    []byte
		want string
	}{
		{"empty", nil, "start of image"},
		{"headers end", cut(sof), "no JPEG marker"},
		{"no length", cut(sof + 3), "end within a marker"},
		{"length", cut(sof + 12), "a JPEG segment of 11 bytes"},
		{"baseline frame", set(sof+1, markerSOF0), "FF C0; expected lossless"},
		{"end before the scan", set(sof+1, markerEOI), "FF D9 before the scan"},
		{"no frame", set(sof+1, 0xE1), "behind"},
		{"precision", set(sof+4, 17), "samples of 17 bits"},
		{"rows", set(sof+5, 0, 9), "9 rows of 8 columns; expected 8 of 8"},
		{"components", set(sof+9, 2), "frame header of 9 bytes"},
		{"table class", set(dht+4, 0x12), "Huffman table 12"},
		{"table length", set(dht+5, 200), "Huffman codes; expected at most 17"},
		{"too many short codes", set(dht+5, 3, 0, 0), "do not fit"},
		{"category", set(dht+4+17, 99), "category 16"},
		{"no table", set(sos+6, 0x30), "table 3 is not defined"},
		{"table number", set(sos+6, 0x40), "Huffman table 4"},
		{"selection value", set(sos+7, 0), "selection value 0"},
		{"point transform", set(sos+9, 12), "point transform of 12"},
		{"component", set(sos+5, 9), "other components"},
		{"restart", set(dri+4, 0, 12), "every 12 pixel cells"},
		{"short scan", cut(scan + 5), "a JPEG scan of 5 bytes"},
		{"scan ends", cut(scan + 20), "row"},
		{"marker in the scan", set(scan, 0xFF, markerEOI), "row 0 does not decode"},
		{"no code", set(scan, 0xFE, 0xFF, 0, 0xFF, 0), "row"},
	} {
		t.Run(q.name, func(t *testing.T) {
			fill, err := openLossless(q.b, 8, 8)
			if err == nil {
				err = fill(make([]uint16, 64))
			}
			if err == nil || !containsAll(err.Error(), q.want) {
				t.Errorf("error %v; expected %q in it", err, q.want)
			}
		})
	}
	t.Run("restart marker", func(t *testing.T) {
		b := slices.Clone(good)
		for i := scan; i+1 < len(b); i++ {
			if b[i] == 0xFF && b[i+1] == markerRST0 {
				b[i+1]++
			}
		}
		fill, err := openLossless(b, 8, 8)
		if err != nil {
			t.Fatal(err)
		}
		if err = fill(make([]uint16, 64)); err == nil || !containsAll(err.Error(), "restart marker FF D0 before row 4") {
			t.Error(err)
		}
	})
}

func BenchmarkLossless(b *testing.B) {
	const columns, rows = 1024, 1024
	random := rand.New(rand.NewPCG(1, 2))
	cells := make([]uint16, columns*rows)
	for i := range cells {
		cells[i] = uint16(2000 + i%columns + random.IntN(16))
	}
	for _, predictor := range []int{1, 7} {
		data := encodeLossless(cells, columns, losslessOptions{precision: 12, predictor: predictor})
		b.Run(fmt.Sprint(predictor), func(b *testing.B) {
			b.SetBytes(2 * columns * rows)
			for b.Loop() {
				fill, err := openLossless(data, columns, rows)
				if err != nil {
					b.Fatal(err)
				}
				if err := fill(cells); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
