package luts

import (
	"fmt"
	"image"
	"math/rand/v2"
	"runtime"
	"testing"
)

// noise is a plane with gaps between its rows and every bit of its samples at random.
func noise[T Sample](r *rand.Rand, width, height int) Plane[T] {
	p := Plane[T]{Width: width, Height: height, Stride: width + r.IntN(5)}
	p.Pix = make([]T, p.Stride*height)
	for i := range p.Pix {
		p.Pix[i] = T(r.Uint32())
	}
	return p
}

// untouched marks the samples that no call may write.
const untouched = 0xA5

func marked[T Sample](r *rand.Rand, width, height int) Plane[T] {
	p := noise[T](r, width, height)
	for i := range p.Pix {
		p.Pix[i] = untouched
	}
	return p
}

func checkGaps[T Sample](t *testing.T, p Plane[T]) {
	t.Helper()
	for i, s := range p.Pix {
		if i%p.Stride >= p.Width && s != untouched {
			t.Fatalf("column %d of row %d, beyond the width of %d, was written", i%p.Stride, i/p.Stride, p.Width)
		}
	}
}

func randomWindowTable(r *rand.Rand, bits int, signed bool, out int) Table {
	t := randomTable(r, bits, out)
	t.Kind, t.First = Window, Stored{bits, signed}.Min()
	return t
}

func testApply[S, D Sample](t *testing.T, out int) {
	r := rand.New(rand.NewPCG(7, uint64(out)))
	for _, bits := range []int{1, 7, 8, 12, 16} {
		for _, signed := range []bool{false, true} {
			stored := Stored{bits, signed}
			table := randomWindowTable(r, bits, signed, out)
			a, err := NewApplier[S, D](table)
			if err != nil {
				t.Fatal(err)
			}
			// The last one is large enough to be shared out.
			for _, size := range [][2]int{{1, 1}, {15, 2}, {16, 1}, {17, 3}, {100, 7}, {601, 557}} {
				src, dst := noise[S](r, size[0], size[1]), marked[D](r, size[0], size[1])
				if err := a.Apply(dst, src); err != nil {
					t.Fatal(err)
				}
				for y := range size[1] {
					for x, s := range src.row(y) {
						if want := D(table.At(stored.Value(uint16(s)))); dst.row(y)[x] != want {
							t.Fatalf("%+v, %v pixels: sample %#x at %d, %d gives %d, want %d", stored, size, s, x, y, dst.row(y)[x], want)
						}
					}
				}
				checkGaps(t, dst)
			}
		}
	}
}

// processors makes sure that work is shared out whatever computer this runs on.
func processors(t *testing.T, n int) {
	before := runtime.GOMAXPROCS(n)
	t.Cleanup(func() { runtime.GOMAXPROCS(before) })
}

func TestApply(t *testing.T) {
	processors(t, 4)
	t.Run("16 to 8", func(t *testing.T) { testApply[uint16, uint8](t, 8) })
	t.Run("16 to 10", func(t *testing.T) { testApply[uint16, uint16](t, 10) })
	t.Run("16 to 16", func(t *testing.T) { testApply[uint16, uint16](t, 16) })
	t.Run("8 to 8", func(t *testing.T) { testApply[uint8, uint8](t, 8) })
	t.Run("8 to 12", func(t *testing.T) { testApply[uint8, uint16](t, 12) })
}

func TestApplyByManyAtOnce(t *testing.T) {
	processors(t, 4)
	r := rand.New(rand.NewPCG(8, 8))
	table := randomWindowTable(r, 12, true, 8)
	a, err := NewApplier[uint16, uint8](table)
	if err != nil {
		t.Fatal(err)
	}
	done := make(chan error)
	const callers = 8
	for i := range callers {
		r := rand.New(rand.NewPCG(9, uint64(i)))
		go func() {
			src, dst := noise[uint16](r, 500, 300), NewPlane[uint8](500, 300)
			if err := a.Apply(dst, src); err != nil {
				done <- err
				return
			}
			for y := range src.Height {
				for x, s := range src.row(y) {
					if want := uint8(table.At(Stored{12, true}.Value(s))); dst.row(y)[x] != want {
						done <- fmt.Errorf("caller %d: %d at %d, %d, want %d", i, dst.row(y)[x], x, y, want)
						return
					}
				}
			}
			done <- nil
		}()
	}
	for range callers {
		if err := <-done; err != nil {
			t.Error(err)
		}
	}
}

func TestRegion(t *testing.T) {
	r := rand.New(rand.NewPCG(10, 10))
	p := noise[uint16](r, 40, 30)
	rect := image.Rect(3, 5, 17, 30)
	sub, err := p.Sub(rect)
	if err != nil {
		t.Fatal(err)
	}
	if sub.Width != 14 || sub.Height != 25 {
		t.Fatalf("%d x %d pixels, want 14 x 25", sub.Width, sub.Height)
	}
	for y := range sub.Height {
		for x, s := range sub.row(y) {
			if want := p.row(y + 5)[x+3]; s != want {
				t.Fatalf("%d at %d, %d of the region, want %d", s, x, y, want)
			}
		}
	}
	whole, err := p.Sub(image.Rect(0, 0, 40, 30))
	if err != nil || whole.Width != 40 || whole.Height != 30 {
		t.Errorf("the whole plane: %d x %d, %v", whole.Width, whole.Height, err)
	}
	if none, err := p.Sub(image.Rect(7, 7, 7, 9)); err != nil || !none.empty() {
		t.Errorf("an empty region: %+v, %v", none, err)
	}
	for _, rect := range []image.Rectangle{image.Rect(-1, 0, 5, 5), image.Rect(0, 0, 41, 5), image.Rect(0, 29, 1, 31)} {
		_, err := p.Sub(rect)
		checkError(t, err, "region: ")
	}
}

func TestPlaneErrors(t *testing.T) {
	table := randomTable(rand.New(rand.NewPCG(1, 1)), 8, 8)
	a, err := NewApplier[uint16, uint8](table)
	if err != nil {
		t.Fatal(err)
	}
	good, out := NewPlane[uint16](4, 3), NewPlane[uint8](4, 3)
	huge := int(^uint(0)>>1) / 2
	for _, c := range []struct {
		src  Plane[uint16]
		dst  Plane[uint8]
		want string
	}{
		{Plane[uint16]{good.Pix, -4, 3, 4}, out, "source: plane: -4 x 3 pixels; expected sides from 0 to 65536"},
		{Plane[uint16]{good.Pix, 4, 65537, 4}, out, "source: plane: 4 x 65537 pixels"},
		{Plane[uint16]{good.Pix, 4, 3, 3}, out, "source: plane: stride 3; expected at least the width of 4"},
		{Plane[uint16]{good.Pix[:11], 4, 3, 4}, out, "source: plane: 11 samples for 3 rows of 4 with stride 4"},
		{Plane[uint16]{good.Pix, 4, 3, huge}, out, "source: plane: 12 samples for 3 rows of 4"},
		{Plane[uint16]{nil, 4, 1, 4}, out, "source: plane: 0 samples for 1 rows of 4"},
		{good, Plane[uint8]{out.Pix, 4, 3, 5}, "output: plane: 12 samples for 3 rows of 4 with stride 5"},
	} {
		checkError(t, a.Apply(c.dst, c.src), c.want)
		checkError(t, a.Scale(c.dst, c.src, Nearest), c.want)
	}
	_, err = Plane[uint16]{Width: 2, Height: 2, Stride: 2}.Sub(image.Rect(0, 0, 1, 1))
	checkError(t, err, "plane: 0 samples")
	checkError(t, a.Apply(NewPlane[uint8](3, 3), good), "plane: 3 x 3 pixels for a source of 4 x 3; expected the same size")
	checkError(t, a.Scale(out, NewPlane[uint16](0, 3), Area), "source: 0 x 3 pixels; expected at least one")
	checkError(t, a.Scale(out, good, samplingNone), "sampling: 2; expected Nearest or Area")
	if err := a.Apply(Plane[uint8]{}, Plane[uint16]{}); err != nil {
		t.Errorf("nothing to apply: %v", err)
	}
	if err := a.Scale(Plane[uint8]{}, good, Area); err != nil {
		t.Errorf("nothing to fill: %v", err)
	}
}

func TestLoadErrorsKeepTheTable(t *testing.T) {
	identity := Table{Kind: Calibration, InBits: 8, OutBits: 8, Entries: make([]uint16, 256)}
	for i := range identity.Entries {
		identity.Entries[i] = uint16(i)
	}
	a, err := NewApplier[uint8, uint8](identity)
	if err != nil {
		t.Fatal(err)
	}
	deep := identity
	deep.OutBits = 10
	checkError(t, a.Load(deep), "table: entries of 10 bits; expected at most 8 for samples of one byte")
	checkError(t, a.Load(Table{}), `table: kind ""`)
	_, err = NewApplier[uint8, uint8](deep)
	checkError(t, err, "table: entries of 10 bits")
	dst := NewPlane[uint8](1, 1)
	if err := a.Apply(dst, Plane[uint8]{[]uint8{77}, 1, 1, 1}); err != nil || dst.Pix[0] != 77 {
		t.Errorf("77 gives %d, %v", dst.Pix[0], err)
	}
}

// perCall is how often fn allocates, all goroutines counted, which testing.AllocsPerRun on its one processor
// would not show. Each processor of the runtime comes to keep some 64 ended goroutines for later ones before none
// is made anew; so many runs make these few.
func perCall(fn func()) float64 {
	fn()
	var before, after runtime.MemStats
	const runs = 1000
	runtime.ReadMemStats(&before)
	for range runs {
		fn()
	}
	runtime.ReadMemStats(&after)
	return float64(after.Mallocs-before.Mallocs) / runs
}

func TestNothingIsAllocatedPerCall(t *testing.T) {
	table := randomWindowTable(rand.New(rand.NewPCG(1, 1)), 12, false, 8)
	a, err := NewApplier[uint16, uint8](table)
	if err != nil {
		t.Fatal(err)
	}
	src := noise[uint16](rand.New(rand.NewPCG(2, 2)), 310, 250)
	dst, view := NewPlane[uint8](310, 250), NewPlane[uint8](280, 240)
	for name, fn := range map[string]func() error{
		"Apply":   func() error { return a.Apply(dst, src) },
		"Nearest": func() error { return a.Scale(view, src, Nearest) },
		"Area":    func() error { return a.Scale(view, src, Area) },
		"Load":    func() error { return a.Load(table) },
	} {
		run := func() {
			if err := fn(); err != nil {
				t.Error(err)
			}
		}
		if n := testing.AllocsPerRun(20, run); n != 0 {
			t.Errorf("%s on one processor: %g allocations per call", name, n)
		}
		t.Run(name, func(t *testing.T) {
			processors(t, 2)
			// One allocation in every call would be 1.
			if n := perCall(run); n > 0.5 {
				t.Errorf("on two processors: %g allocations per call", n)
			}
		})
	}
}
