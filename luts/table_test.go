package luts

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func calibration(in, out int, entries ...uint16) Table {
	return Table{Kind: Calibration, InBits: in, OutBits: out, Entries: entries}
}

func TestTableCheck(t *testing.T) {
	for _, c := range []struct {
		table Table
		want  string // "" for none
	}{
		{calibration(2, 8, 0, 1, 2, 255), ""},
		{Table{Window, 2, 8, -2, []uint16{0, 1, 2, 3}}, ""},
		{Table{Window, 1, 16, -1, []uint16{0, 65535}}, ""},
		{Table{"ramp", 2, 8, 0, make([]uint16, 4)}, `table: kind "ramp"; expected "calibration" or "window"`},
		{calibration(0, 8), "table: an input of 0 bits; expected 1 to 16"},
		{calibration(17, 8), "table: an input of 17 bits"},
		{calibration(2, 0), "table: an output of 0 bits; expected 1 to 16"},
		{calibration(2, 17), "table: an output of 17 bits"},
		{Table{Calibration, 2, 8, -2, make([]uint16, 4)}, "table: -2 as the first input; expected 0, as P-values have no sign"},
		{Table{Window, 2, 8, -1, make([]uint16, 4)}, "table: -1 as the first input; expected 0, or -2 for signed data of 2 bits"},
		{calibration(2, 8, 1, 2, 3), "table: 3 entries; expected 4, one for every input of 2 bits"},
		{Table{Window, 2, 8, -2, []uint16{0, 1, 256, 3}}, "table: 256 for the input 0; expected at most 255 in 8 bits"},
	} {
		err := c.table.Check()
		if c.want != "" {
			checkError(t, err, c.want)
		} else if err != nil {
			t.Errorf("%+v: %v", c.table, err)
		}
	}
}

func TestTableEnds(t *testing.T) {
	table := Table{Window, 2, 8, -2, []uint16{5, 6, 7, 8}}
	for x, want := range map[int]uint16{-3: 5, -2: 5, 1: 8, 2: 8, 0: 7, math.MaxInt: 8, math.MinInt + 2: 5} {
		if got := table.At(x); got != want {
			t.Errorf("%d gives %d, want %d", x, got, want)
		}
	}
	if got := (Table{}).At(3); got != 0 {
		t.Errorf("no entries: %d", got)
	}
}

func TestTraits(t *testing.T) {
	for _, c := range []struct {
		table        Table
		levels       int
		falls, rises []int
		merged       []Run
	}{
		{Table{Window, 3, 8, -4, []uint16{0, 0, 0, 3, 5, 5, 2, 9}}, 5, []int{2}, []int{-1, 0, 3}, []Run{{-4, -2, 0}, {0, 1, 5}}},
		{calibration(2, 8, 7, 7, 7, 7), 1, nil, nil, []Run{{0, 3, 7}}},
		{calibration(2, 8, 3, 2, 1, 0), 4, []int{1, 2, 3}, nil, nil},
		{calibration(2, 16, 0, 65535, 0, 0), 2, []int{2}, []int{1}, []Run{{2, 3, 0}}},
		{Table{}, 0, nil, nil, nil},
	} {
		if got := c.table.Levels(); got != c.levels {
			t.Errorf("%v: %d levels, want %d", c.table.Entries, got, c.levels)
		}
		if got := c.table.Falls(); !slices.Equal(got, c.falls) {
			t.Errorf("%v: falls at %v, want %v", c.table.Entries, got, c.falls)
		}
		if got := c.table.Rises(); !slices.Equal(got, c.rises) {
			t.Errorf("%v: rises at %v, want %v", c.table.Entries, got, c.rises)
		}
		if got := c.table.Merged(); !slices.Equal(got, c.merged) {
			t.Errorf("%v: merged %v, want %v", c.table.Entries, got, c.merged)
		}
	}
}

func TestResampleByHand(t *testing.T) {
	for _, c := range []struct {
		from Table
		bits int
		want []uint16
	}{
		// Up: input k of 2 bits lies at k/3 of an input of 1 bit: 0, 3.33, 6.67, 10.
		{calibration(1, 8, 0, 10), 2, []uint16{0, 3, 7, 10}},
		// Halves away from zero: 0, 0.5, 1, 1.5 ... do not occur at thirds, but at fifths of 2 to 4 bits: 5 steps each.
		{calibration(2, 8, 0, 5, 5, 0), 4, []uint16{0, 1, 2, 3, 4, 5, 5, 5, 5, 5, 5, 4, 3, 2, 1, 0}},
		// Down: every fifth entry lies on an input of 4 bits.
		{calibration(4, 8, 9, 1, 1, 1, 1, 20, 1, 1, 1, 1, 30, 1, 1, 1, 1, 41), 2, []uint16{9, 20, 30, 41}},
		// Down without meeting: input 1 of 2 bits lies at 7/3 of an input of 3 bits, input 2 at 14/3.
		{calibration(3, 8, 0, 10, 20, 30, 40, 50, 60, 70), 2, []uint16{0, 23, 47, 70}},
		{calibration(2, 8, 4, 3, 2, 1), 2, []uint16{4, 3, 2, 1}},
	} {
		got, err := c.from.Resample(c.bits)
		if err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(got.Entries, c.want) || got.InBits != c.bits || got.OutBits != 8 || got.Kind != Calibration {
			t.Errorf("%v to %d bits: %+v, want %v", c.from.Entries, c.bits, got, c.want)
		}
	}
}

func TestResampleLaws(t *testing.T) {
	r := rand.New(rand.NewPCG(13, 13))
	for range 200 {
		from := randomTable(r, 1+r.IntN(12), 1+r.IntN(16))
		slices.Sort(from.Entries)
		bits := 1 + r.IntN(13)
		to, err := from.Resample(bits)
		if err != nil {
			t.Fatal(err)
		}
		if err := to.Check(); err != nil {
			t.Fatal(err)
		}
		if n := to.Falls(); n != nil {
			t.Fatalf("%d to %d bits: a table that never falls falls at %v", from.InBits, bits, n)
		}
		first, last := from.Entries[0], from.Entries[len(from.Entries)-1]
		if to.Entries[0] != first || to.Entries[len(to.Entries)-1] != last {
			t.Fatalf("%d to %d bits: ends %d and %d, want %d and %d", from.InBits, bits, to.Entries[0], to.Entries[len(to.Entries)-1], first, last)
		}
		if again, err := from.Resample(from.InBits); err != nil || !slices.Equal(again.Entries, from.Entries) {
			t.Fatalf("%d to %d bits changes the table: %v", from.InBits, from.InBits, err)
		}
		// Against interpolation in floating point: off by one only where that is within a rounding of a half.
		for k, e := range to.Entries {
			at := float64(k) * float64(top(from.InBits)) / float64(top(bits))
			i := min(int(at), len(from.Entries)-2)
			y := float64(from.Entries[i]) + (at-float64(i))*(float64(from.Entries[i+1])-float64(from.Entries[i]))
			if math.Abs(float64(e)-y) > 0.5+1e-9 {
				t.Fatalf("%d to %d bits: input %d gives %d, want %g", from.InBits, bits, k, e, y)
			}
		}
	}
}

func TestResampleErrors(t *testing.T) {
	good := calibration(1, 8, 0, 10)
	_, err := good.Resample(0)
	checkError(t, err, "table: resampling to 0 bits; expected 1 to 16")
	_, err = good.Resample(17)
	checkError(t, err, "table: resampling to 17 bits")
	_, err = Table{Window, 1, 8, -1, []uint16{0, 1}}.Resample(2)
	checkError(t, err, "table: first input -1; expected 0")
	_, err = Table{}.Resample(2)
	checkError(t, err, `table: kind ""`)
}

func TestThrough(t *testing.T) {
	window := Table{Window, 2, 2, -2, []uint16{0, 0, 2, 3}}
	ramp := calibration(2, 10, 7, 100, 500, 1023)
	got, err := window.Through(ramp)
	if err != nil {
		t.Fatal(err)
	}
	want := Table{Window, 2, 10, -2, []uint16{7, 7, 500, 1023}}
	if got.Kind != want.Kind || got.InBits != 2 || got.OutBits != 10 || got.First != -2 || !slices.Equal(got.Entries, want.Entries) {
		t.Errorf("%+v, want %+v", got, want)
	}
	// One after the other is the same as both at once.
	r := rand.New(rand.NewPCG(14, 14))
	a, b, c := randomTable(r, 9, 8), randomTable(r, 8, 10), randomTable(r, 10, 12)
	chain := func(tables ...Table) Table {
		result := tables[0]
		for _, next := range tables[1:] {
			if result, err = result.Through(next); err != nil {
				t.Fatal(err)
			}
		}
		return result
	}
	if left, right := chain(chain(a, b), c), chain(a, chain(b, c)); !slices.Equal(left.Entries, right.Entries) {
		t.Error("composing depends on the order in which tables are joined")
	}
	// A chain with a calibration is the window's table through that, where nothing else rounds.
	m := compose(t, Chain{Stored: Stored{9, true}, VOI: Windowing{Linear, 3, 200}, OutBits: 8})
	with := compose(t, Chain{Stored: Stored{9, true}, VOI: Windowing{Linear, 3, 200}, Calibration: &b})
	if got := chain(m.Table(), b); !slices.Equal(got.Entries, with.Table().Entries) {
		t.Error("a window through a calibration differs from their chain")
	}

	_, err = window.Through(window)
	checkError(t, err, `second table: kind "window"; expected "calibration"`)
	_, err = window.Through(calibration(1, 8, 0, 255))
	checkError(t, err, "second table: input of 1 bits after an output of 2; expected the same depth; resample the second table to 2 bits")
	_, err = Table{}.Through(ramp)
	checkError(t, err, "first: table: kind")
	_, err = window.Through(Table{})
	checkError(t, err, "second: table: kind")
}
