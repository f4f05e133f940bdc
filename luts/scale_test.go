package luts

import (
	"math/rand/v2"
	"testing"
)

// overlap is the length that [a0, a1) and [b0, b1) have in common.
func overlap(a0, a1, b0, b1 int) int { return max(0, min(a1, b1)-max(a0, b0)) }

// meanByHand is the mean of the stored values under output pixel (x, y), by the overlap with every source pixel,
// rounded, halves away from zero.
func meanByHand[S Sample](src Plane[S], stored Stored, x, y, width, height int) int {
	sum := 0
	for j := range src.Height {
		high := overlap(j*height, (j+1)*height, y*src.Height, (y+1)*src.Height)
		for i, s := range src.row(j) {
			sum += high * overlap(i*width, (i+1)*width, x*src.Width, (x+1)*src.Width) * stored.Value(uint16(s))
		}
	}
	area := src.Width * src.Height
	if sum < 0 {
		return -((-2*sum + area) / (2 * area))
	}
	return (2*sum + area) / (2 * area)
}

func testScale[S, D Sample](t *testing.T, out int) {
	r := rand.New(rand.NewPCG(11, uint64(out)))
	for _, sizes := range [][4]int{ // of the source, of the output
		{1, 1, 1, 1},
		{4, 4, 2, 2},   // whole ratio
		{6, 9, 2, 3},   // whole ratio, odd
		{7, 5, 3, 2},   // both edges lie within pixels
		{3, 2, 7, 5},   // enlarged
		{5, 8, 5, 3},   // one axis only
		{8, 3, 20, 1},  // larger in one axis, smaller in the other
		{64, 61, 1, 1}, // mean of all
		{37, 41, 36, 40},
	} {
		for _, stored := range []Stored{{12, false}, {12, true}, {16, true}, {16, false}, {3, true}} {
			table := randomWindowTable(r, stored.Bits, stored.Signed, out)
			a, err := NewApplier[S, D](table)
			if err != nil {
				t.Fatal(err)
			}
			src := noise[S](r, sizes[0], sizes[1])
			width, height := sizes[2], sizes[3]
			for how, value := range map[Sampling]func(x, y int) int{
				Area: func(x, y int) int { return meanByHand(src, stored, x, y, width, height) },
				Nearest: func(x, y int) int {
					// The middle of the output pixel, in halves of an output pixel.
					i, j := (2*x+1)*src.Width/(2*width), (2*y+1)*src.Height/(2*height)
					return stored.Value(uint16(src.row(j)[i]))
				},
			} {
				dst := marked[D](r, width, height)
				if err := a.Scale(dst, src, how); err != nil {
					t.Fatal(err)
				}
				for y := range height {
					for x := range width {
						if want := D(table.At(value(x, y))); dst.row(y)[x] != want {
							t.Fatalf("sampling %d, %v, %+v: %d at %d, %d, want %d, the level of %d", how, sizes, stored, dst.row(y)[x], x, y, want, value(x, y))
						}
					}
				}
				checkGaps(t, dst)
			}
		}
	}
}

func TestScale(t *testing.T) {
	t.Run("16 to 8", func(t *testing.T) { testScale[uint16, uint8](t, 8) })
	t.Run("16 to 16", func(t *testing.T) { testScale[uint16, uint16](t, 16) })
	t.Run("8 to 8", func(t *testing.T) { testScale[uint8, uint8](t, 8) })
}

// levels is the table of 16 bits whose output is the stored value, counted from the least one.
func levels(signed bool) Table {
	t := Table{Kind: Window, InBits: 16, OutBits: 16, First: Stored{16, signed}.Min(), Entries: make([]uint16, 1<<16)}
	for i := range t.Entries {
		t.Entries[i] = uint16(i)
	}
	return t
}

// Worked by hand: halves go away from zero, below it as above.
func TestMeanRoundsHalvesAwayFromZero(t *testing.T) {
	a, err := NewApplier[uint16, uint16](levels(true))
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ first, second, mean int16 }{{1, 2, 2}, {-1, -2, -2}, {-1, 0, -1}, {0, 1, 1}, {-1, 1, 0}, {-32768, 32767, -1}, {-32768, -32768, -32768}} {
		dst := NewPlane[uint16](1, 1)
		if err := a.Scale(dst, Plane[uint16]{[]uint16{uint16(c.first), uint16(c.second)}, 2, 1, 2}, Area); err != nil {
			t.Fatal(err)
		}
		if got := int(dst.Pix[0]) - 32768; got != int(c.mean) {
			t.Errorf("mean of %d and %d: %d, want %d", c.first, c.second, got, c.mean)
		}
	}
}

// Scaling to the same size changes nothing, and a flat picture stays flat at any size.
func TestScaleLaws(t *testing.T) {
	processors(t, 4)
	r := rand.New(rand.NewPCG(12, 12))
	a, err := NewApplier[uint16, uint16](levels(false))
	if err != nil {
		t.Fatal(err)
	}
	src := noise[uint16](r, 450, 400)
	flat := NewPlane[uint16](700, 300)
	for i := range flat.Pix {
		flat.Pix[i] = 0xFFFF
	}
	for _, how := range []Sampling{Nearest, Area} {
		same := NewPlane[uint16](src.Width, src.Height)
		if err := a.Scale(same, src, how); err != nil {
			t.Fatal(err)
		}
		for y := range src.Height {
			for x, s := range src.row(y) {
				if got := same.row(y)[x]; got != s {
					t.Fatalf("sampling %d, same size: %d at %d, %d, want %d", how, got, x, y, s)
				}
			}
		}
		// Sizes grow and shrink, so that kept memory is used anew.
		for range 20 {
			dst := NewPlane[uint16](1+r.IntN(900), 1+r.IntN(500))
			if err := a.Scale(dst, flat, how); err != nil {
				t.Fatal(err)
			}
			for i, s := range dst.Pix {
				if s != 0xFFFF {
					t.Fatalf("sampling %d: sample %d of a flat picture of %d x %d is %d", how, i, dst.Width, dst.Height, s)
				}
			}
		}
	}
}

// The largest sums: planes at the limit of a side, every sample at its greatest.
func TestMeanOfTheLargestPlanes(t *testing.T) {
	a, err := NewApplier[uint16, uint16](levels(false))
	if err != nil {
		t.Fatal(err)
	}
	full := make([]uint16, 2*maxSide)
	for i := range full {
		full[i] = 0xFFFF
	}
	for _, src := range []Plane[uint16]{{full, maxSide, 2, maxSide}, {full, 2, maxSide, 2}} {
		for _, size := range [][2]int{{1, 1}, {3, 1}, {1, 3}, {src.Width / 2, src.Height / 2}} {
			dst := NewPlane[uint16](size[0], size[1])
			if err := a.Scale(dst, src, Area); err != nil {
				t.Fatal(err)
			}
			for i, s := range dst.Pix {
				if s != 0xFFFF {
					t.Fatalf("%d x %d from %d x %d: sample %d is %d", dst.Width, dst.Height, src.Width, src.Height, i, s)
				}
			}
		}
	}
}
