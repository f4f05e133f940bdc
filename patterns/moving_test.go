package patterns

import (
	"bytes"
	"testing"
)

func TestReadingGoesFromCornerToCorner(t *testing.T) {
	for _, sc := range screens {
		s := Spec{Width: sc.width, Height: sc.height, Bits: sc.bits}
		top := uint16(1<<sc.bits - 1)
		s.Steps = []Step{{Low: 0, High: top}, {Low: top, High: top - 3}, {Low: 5, High: 9}, {Low: top / 2, High: top/2 + 2}}
		p := draw(t, "reading", s)
		want := map[uint16]bool{}
		for _, st := range s.Steps {
			want[st.Low], want[st.High] = true, true
		}
		n := counts(p)
		for v := range n {
			if !want[v] {
				t.Errorf("%v: level %d; want only those given", s, v)
			}
		}
		for v := range want {
			if n[v] == 0 {
				t.Errorf("%v: level %d is not there", s, v)
			}
		}
		// There is ink in each corner box of a twelfth.
		w, h := s.Width/12, s.Height/12
		for _, at := range [][2]int{{0, 0}, {s.Width - w, 0}, {0, s.Height - h}, {s.Width - w, s.Height - h}} {
			levels := map[uint16]bool{}
			for y := at[1]; y < at[1]+h; y++ {
				for _, v := range p.Row(y)[at[0] : at[0]+w] {
					levels[v] = true
				}
			}
			if len(levels) != 2 {
				t.Errorf("%v: levels %v in the corner at %v; want paper and ink", s, levels, at)
			}
		}
	}
}

func TestReadingHoldsAsManyBlocksAsItSays(t *testing.T) {
	for k := 1; k <= maxReadingSteps; k++ {
		steps := make([]Step, k)
		for i := range steps {
			steps[i] = Step{Low: uint16(10 * i), High: uint16(10*i + 5)}
		}
		s := Spec{Width: 1000, Height: 700, Bits: 8, Steps: steps}
		n := counts(draw(t, "reading", s))
		if len(n) != 2*k {
			t.Errorf("%d blocks: %d levels; want %d", k, len(n), 2*k)
		}
	}
}

func TestMotionMovesByTheSameStep(t *testing.T) {
	for _, size := range [][2]int{{800, 600}, {1080, 1920}, {1921, 1080}} {
		s := Spec{Width: size[0], Height: size[1], Bits: 10}
		first := draw(t, "motion", s)
		p := newPlane(&s)
		for _, frame := range []int{1, 2, 39, 240, -7, 1 << 40} {
			s.Frame = frame
			if err := DrawOn(p, "motion", s); err != nil {
				t.Fatal(err)
			}
			shift := frame % s.Width * MotionStep(s.Width) % s.Width
			for y := range s.Height {
				row, was := p.Row(y), first.Row(y)
				for x := range row {
					if row[x] != was[((x-shift)%s.Width+s.Width)%s.Width] {
						t.Fatalf("%v, frame %d: column %d of row %d is not that of frame 0 moved by %d", s, frame, x, y, shift)
					}
				}
			}
		}
	}
	s := Spec{Width: 800, Height: 600, Bits: 8, Steps: []Step{{Low: 100, High: 103}}}
	if n := counts(draw(t, "motion", s)); n[103] != 800/16*200 || n[100] != (800-800/16)*200 {
		t.Errorf("the third lane has %d and %d pixels of its step", n[100], n[103])
	}
}

func TestColourFieldIsTheColourGiven(t *testing.T) {
	want := [3]uint16{1000, 0, 77}
	c, err := DrawRGB("colour-field", Spec{Width: 800, Height: 600, Bits: 10, Colour: &want})
	if err != nil {
		t.Fatal(err)
	}
	for i, p := range []*Plane{c.R, c.G, c.B} {
		if n := counts(p); len(n) != 1 || n[want[i]] != 800*600 {
			t.Errorf("channel %d: %v; want only %d", i, n, want[i])
		}
	}
}

// The eight colours are all the ways to switch three channels: each has an eighth of the sheet, less the
// names and the darker third.
func TestColoursHasAllMixtures(t *testing.T) {
	for _, size := range [][2]int{{1200, 960}, {960, 1200}} {
		c, err := DrawRGB("colours", Spec{Width: size[0], Height: size[1], Bits: 8})
		if err != nil {
			t.Fatal(err)
		}
		n := map[[3]uint16]int{}
		for i := range c.R.Pix {
			n[[3]uint16{c.R.Pix[i], c.G.Pix[i], c.B.Pix[i]}]++
		}
		for _, full := range []uint16{255, 128} {
			for mix := 1; mix < 8; mix++ {
				v := [3]uint16{}
				for k := range v {
					if mix>>k&1 == 1 {
						v[k] = full
					}
				}
				want := size[0] * size[1] / 8 / 3
				if full == 255 {
					want = want * 19 / 10 // two thirds, less the name in black or white
				}
				if n[v] < want {
					t.Errorf("%v: %d pixels of %v; want %d at least", size, n[v], v, want)
				}
			}
		}
		if len(n) != 15 {
			t.Errorf("%v: %d colours; want seven and their halves, and black", size, len(n))
		}
	}
}

func TestGrayTracking(t *testing.T) {
	for _, sc := range screens {
		c, err := DrawRGB("gray-tracking", Spec{Width: sc.width, Height: sc.height, Bits: sc.bits})
		if err != nil {
			t.Fatal(err)
		}
		tint := c.R.frac(trackingTint, 100)
		plain, red, blue := trackingRows(sc.width, sc.height)
		for i := range trackingGrays {
			v := c.R.frac(i+1, trackingGrays+1)
			for _, strip := range []struct {
				name string
				y    int
				want [3]uint16
			}{
				{"plain", plain.Min.Y + 1, [3]uint16{v, v, v}},
				{"plain", plain.Max.Y - 1, [3]uint16{v, v, v}},
				{"red", red.Min.Y + 1, [3]uint16{v + tint, v, v}},
				{"blue", blue.Max.Y - 1, [3]uint16{v, v, v + tint}},
			} {
				k := cell(plain, i, trackingGrays, 0, 1)
				x := (k.Min.X + k.Max.X) / 2
				got := [3]uint16{c.R.Level(x, strip.y), c.G.Level(x, strip.y), c.B.Level(x, strip.y)}
				if got != strip.want {
					t.Errorf("%dx%d, gray %d, %s strip: %v; want %v", sc.width, sc.height, i, strip.name, got, strip.want)
				}
			}
		}
	}
}

// Letters are drawn in one level, whole and upright: the picture shows it.
func TestTextHasNoGrayEdges(t *testing.T) {
	p := newPlane(&Spec{Width: 30, Height: 14, Bits: 8})
	c := canvas{Plane: p, max: 255, short: 14}
	f := c.face(14)
	if c.err != nil {
		t.Fatal(c.err)
	}
	c.write(f, 1, 12, []byte("Rn8"), 1)
	var b bytes.Buffer
	for y := range p.Height {
		line := make([]byte, p.Width)
		for x, v := range p.Row(y) {
			line[x] = " #"[v]
		}
		b.Write(bytes.TrimRight(line, " "))
		b.WriteByte('\n')
	}
	const want = `

  #######            ####
  ##    #           ##   #
  ##    #           ##   #
  ##    #   ######   ## #
  ##  ###   ##  ##   ###
  ######    #   ##   # ###
  ##   #    #   ##  #    #
  ##   ##   #   ##  #    #
  ##    ##  #   ##  #    #
  ##     #  #   ##   ####


`
	if b.String() != want {
		t.Errorf("got\n%s\nwant\n%s", b.String(), want)
	}
}

func TestTextOfEverySize(t *testing.T) {
	p := newPlane(&Spec{Width: 400, Height: 400, Bits: 8})
	c := canvas{Plane: p, max: 255, short: 400}
	last := 0
	for _, size := range textSizes {
		f := c.face(size)
		if c.err != nil {
			t.Fatal(c.err)
		}
		w := f.width([]byte("1.8 JND ≤ µ²"))
		if w <= last {
			t.Errorf("%d px: %d wide, no wider than the size before", size, w)
		}
		last = w
		for _, r := range []rune{'A', 'é', '²', '−', '≤', '\u4e2d'} {
			if g := f.glyph(r); g.last <= g.first || g.advance <= 0 {
				t.Errorf("%d px: nothing drawn for %q", size, r)
			}
		}
		if f.glyph('\u4e2d') != f.glyph('\u0416') {
			t.Errorf("%d px: two signs that the sheets lack look different", size)
		}
	}
	// Half outside the plane, or wider than its room: cut, never broken.
	c.write(c.face(160), -50, 60, []byte("WWWWWWWW"), 1)
	c.write(c.face(160), 10, 460, []byte("W"), 1)
	p.Fill(0)
	room := middle(c.bounds(), 40, 20)
	c.label(room, 160, []byte("far too long for this"), 1)
	left, right, top, bottom := edges(p, 1)
	if left < room.Min.X-1 || right > room.Max.X || top < room.Min.Y-1 || bottom > room.Max.Y || right < 0 {
		t.Errorf("label in columns %d to %d, rows %d to %d; its room is %v", left, right, top, bottom, room)
	}
}
