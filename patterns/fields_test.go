package patterns

import (
	"image"
	"math"
	"math/rand/v2"
	"testing"
)

func TestLuminanceFieldIsATenthOfThePixels(t *testing.T) {
	for _, c := range []struct {
		width, height, side int
	}{
		// DICOM PS3.14 annex D, introduction: 724 x 724 on 2048 x 2560.
		{2048, 2560, 724},
		{2560, 2048, 724},
		// Computed by hand from the same rule, the square root of a tenth of the pixels, rounded.
		{800, 600, 219},
		{1600, 1200, 438},
		{8192, 4320, 1881},
	} {
		field, surround := uint16(200), uint16(90)
		p := draw(t, "luminance-field", Spec{
			Width: c.width, Height: c.height, Bits: 8, Field: &field, Surround: &surround,
		})
		n := counts(p)
		if len(n) != 2 || n[field] != c.side*c.side || n[surround] != c.width*c.height-c.side*c.side {
			t.Errorf("%dx%d: %v pixels of each level; want %d of %d and else only %d",
				c.width, c.height, n, c.side*c.side, field, surround)
		}
	}
}

func TestLuminanceFieldOnScreensOfAnySize(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for range 60 {
		w := 800 + r.IntN(1200)
		h := max(600, w/4) + r.IntN(800)
		bits := 8 + r.IntN(9)
		p := draw(t, "luminance-field", Spec{Width: w, Height: h, Bits: bits})
		n := counts(p)
		// Within one row of the square: its side is a whole number of pixels.
		if off := math.Abs(float64(n[p.Max()]) - 0.1*float64(w*h)); off > math.Sqrt(0.1*float64(w*h))+1 {
			t.Errorf("%dx%d: field of %d pixels, %v off a tenth", w, h, n[p.Max()], off)
		}
		left, right, top, bottom := edges(p, p.Max())
		if d := left - (w - 1 - right); d < -1 || d > 1 {
			t.Errorf("%dx%d: %d columns left of the field, %d right of it", w, h, left, w-1-right)
		}
		if d := top - (h - 1 - bottom); d < -1 || d > 1 {
			t.Errorf("%dx%d: %d rows above the field, %d below it", w, h, top, h-1-bottom)
		}
		if right-left != bottom-top {
			t.Errorf("%dx%d: field of %dx%d; want a square", w, h, right-left+1, bottom-top+1)
		}
	}
}

// edges is where the level v lies: first and last column, first and last row.
func edges(p *Plane, v uint16) (left, right, top, bottom int) {
	left, top, right, bottom = p.Width, p.Height, -1, -1
	for y := range p.Height {
		for x, l := range p.Row(y) {
			if l == v {
				left, right, top, bottom = min(left, x), max(right, x), min(top, y), max(bottom, y)
			}
		}
	}
	return left, right, top, bottom
}

func TestUniformIsOneLevel(t *testing.T) {
	for bits := 8; bits <= 16; bits++ {
		for _, field := range []uint16{0, 1, 26, 1<<bits - 1} {
			s := Spec{Width: 800, Height: 600, Bits: bits, Field: &field}
			if n := counts(draw(t, "uniform", s)); len(n) != 1 || n[field] != 800*600 {
				t.Errorf("%v, level %d: %v", s, field, n)
			}
		}
	}
}

func TestPlaces(t *testing.T) {
	// The outermost places lie a tenth of the side in: common practice, no source.
	corners := []image.Point{{100, 80}, {900, 80}, {100, 720}, {900, 720}}
	all := map[image.Point]bool{}
	for _, p := range Places(25, 1000, 800) {
		all[p] = true
	}
	for _, n := range []int{5, 9, 13, 25} {
		points := Places(n, 1000, 800)
		if len(points) != n {
			t.Fatalf("%d places for %d", len(points), n)
		}
		set := map[image.Point]bool{}
		for i, p := range points {
			set[p] = true
			if !all[p] {
				t.Errorf("%d places: %v is none of the 25", n, p)
			}
			if i > 0 && (p.Y < points[i-1].Y || p.Y == points[i-1].Y && p.X <= points[i-1].X) {
				t.Errorf("%d places: place %d at %v comes after %v", n, i+1, p, points[i-1])
			}
			if mirror := image.Pt(1000-p.X, 800-p.Y); points[n-1-i] != mirror {
				t.Errorf("%d places: opposite %v lies %v", n, p, points[n-1-i])
			}
		}
		for _, c := range append(corners, image.Pt(500, 400)) {
			if !set[c] {
				t.Errorf("%d places: none at %v", n, c)
			}
		}
	}
	if got := Places(7, 1000, 800); got != nil {
		t.Errorf("7 places: %v; want none", got)
	}
}

// The meter looks at the inside of the rings: it must be even and no mark may reach into it.
func TestPlacesAreLeftFree(t *testing.T) {
	for _, sc := range screens {
		for _, n := range placeCounts {
			level := uint16(1<<sc.bits - 1)
			p := draw(t, "places", Spec{Width: sc.width, Height: sc.height, Bits: sc.bits, Places: n, Field: &level})
			radius := min(sc.width, sc.height) * 5 / 100
			for i, at := range Places(n, sc.width, sc.height) {
				for y := at.Y - radius; y <= at.Y+radius; y++ {
					for x := at.X - radius; x <= at.X+radius; x++ {
						dx, dy := x-at.X, y-at.Y
						if dx*dx+dy*dy <= radius*radius && p.Level(x, y) != level {
							t.Fatalf("%dx%d, place %d of %d: level %d at %d, %d", sc.width, sc.height, i+1, n, p.Level(x, y), x, y)
						}
					}
				}
			}
			if len(counts(p)) != 2 {
				t.Errorf("%dx%d, %d places: %d levels; want field and marks", sc.width, sc.height, n, len(counts(p)))
			}
		}
	}
}

func TestOnePlaceMarksOnlyThat(t *testing.T) {
	s := Spec{Width: 1280, Height: 1024, Bits: 8, Places: 13}
	all := draw(t, "places", s)
	field := all.Level(0, 0)
	marks := 0
	for i, at := range Places(13, s.Width, s.Height) {
		s.Place = i + 1
		p := draw(t, "places", s)
		for y := range p.Height {
			for x, v := range p.Row(y) {
				if v == field {
					continue
				}
				marks++
				if v != all.Level(x, y) {
					t.Fatalf("place %d: a mark at %d, %d that is not on the sheet of all places", i+1, x, y)
				}
				if far := 1024 * 12 / 100; x < at.X-far || x > at.X+far || y < at.Y-far || y > at.Y+far {
					t.Fatalf("place %d at %v: a mark at %d, %d", i+1, at, x, y)
				}
			}
		}
	}
	if want := 1280*1024 - counts(all)[field]; marks != want {
		t.Errorf("%d pixels of marks one by one, %d all at once", marks, want)
	}
}

func TestPixelFaultsLeavesTheFieldEmpty(t *testing.T) {
	for _, sc := range screens {
		for _, level := range []uint16{0, 1<<sc.bits - 1} {
			p := draw(t, "pixel-faults", Spec{Width: sc.width, Height: sc.height, Bits: sc.bits, Field: &level})
			// Letters and figures keep to a rim of a tenth.
			rim := min(sc.width, sc.height) / 10
			for y := rim; y < p.Height-rim; y++ {
				for _, v := range p.Row(y)[rim : p.Width-rim] {
					if v != level {
						t.Fatalf("%dx%d: level %d in row %d of the field of level %d", sc.width, sc.height, v, y, level)
					}
				}
			}
			if len(counts(p)) != 2 {
				t.Errorf("%dx%d: levels %v; want field and rim", sc.width, sc.height, counts(p))
			}
		}
	}
}

// A disk holds exactly the pixels whose centre lies in the circle: counted here point by point.
func TestDiskAndRingCountedPointByPoint(t *testing.T) {
	p := newPlane(&Spec{Width: 120, Height: 120, Bits: 8})
	inside := func(d, x, y, size int) bool {
		off := (size - d) / 2
		dx, dy := float64(x-off)+0.5-float64(d)/2, float64(y-off)+0.5-float64(d)/2
		return dx*dx+dy*dy <= float64(d*d)/4
	}
	for d := 1; d <= 100; d++ {
		for hole := d % 2; hole < d; hole += 2 {
			p.Fill(0)
			p.ring(10, 10, d, hole, 1)
			for y := range d {
				for x := range d {
					want := uint16(0)
					if inside(d, x, y, d) && (hole == 0 || !inside(hole, x, y, d)) {
						want = 1
					}
					if got := p.Level(10+x, 10+y); got != want {
						t.Fatalf("diameter %d, hole %d: %d at %d, %d; want %d", d, hole, got, x, y, want)
					}
				}
			}
		}
	}
	// Over the edges nothing is drawn, and nothing breaks.
	p.Fill(0)
	p.disk(-50, -50, 100, 1)
	p.disk(100, 100, 90, 1)
	if p.Level(0, 0) != 1 || p.Level(119, 119) != 1 || p.Level(60, 60) != 0 {
		t.Error("disks cut off by the edge are wrong")
	}
}
