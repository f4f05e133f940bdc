package patterns

import "testing"

// TestWedgeHasEveryLevelOnceAndAlike checks, for every depth, that each level has one cell, that all cells are
// of one size, and that they follow in order.
func TestWedgeHasEveryLevelOnceAndAlike(t *testing.T) {
	for _, size := range [][2]int{{800, 600}, {600, 800}, {1923, 1081}, {2160, 3840}} {
		for bits := 8; bits <= 16; bits++ {
			s := Spec{Width: size[0], Height: size[1], Bits: bits}
			p := draw(t, "wedge", s)
			g := newWedgeGrid(s.Width, s.Height, bits, min(s.Width, s.Height)/48)
			if g.cell.X < 2 || g.cell.Y < 2 {
				t.Fatalf("%v: cells of %v", s, g.cell)
			}
			if g.bands*g.perBand != 1<<bits {
				t.Fatalf("%v: %d bands of %d", s, g.bands, g.perBand)
			}
			for v := range 1 << bits {
				x := g.origin.X + v%g.perBand*g.cell.X
				y := g.origin.Y + v/g.perBand*g.pitch.Y
				for dy := range g.cell.Y {
					for _, got := range p.Row(y + dy)[x : x+g.cell.X] {
						if int(got) != v {
							t.Fatalf("%v: level %d in the cell of %d", s, got, v)
						}
					}
				}
			}
			surround, ink := p.frac(1, 2), p.frac(1, 2)-p.frac(1, 3)
			for v, n := range counts(p) {
				if n != g.cell.X*g.cell.Y && v != surround && v != ink {
					t.Fatalf("%v: %d pixels of level %d; want %d", s, n, v, g.cell.X*g.cell.Y)
				}
			}
		}
	}
}

// frac mirrors canvas.frac for planes in tests: num/den of the range, rounded half up.
func (p *Plane) frac(num, den int) uint16 {
	return uint16((int(p.Max())*num*2 + den) / (2 * den))
}

// A wedge in one piece turned by half a turn is its own negative.
func TestWedgeTurnedIsItsNegative(t *testing.T) {
	p := draw(t, "wedge", Spec{Width: 1920, Height: 1080, Bits: 8})
	g := newWedgeGrid(1920, 1080, 8, 1080/48)
	for y := g.origin.Y; y < g.origin.Y+g.cell.Y; y++ {
		row := p.Row(y)
		for x := g.origin.X; x < 1920-g.origin.X; x++ {
			if row[x]+row[1919-x] != 255 {
				t.Fatalf("levels %d and %d at columns %d and %d", row[x], row[1919-x], x, 1919-x)
			}
		}
	}
}

// teeth reads the sawtooth back: the four levels of each tooth, from the middle of its columns.
func teeth(p *Plane, g sawGrid) [][toothSteps]uint16 {
	top := (p.Height - g.pitch*g.bands + g.pitch - g.height) / 2
	var all [][toothSteps]uint16
	for i := range g.teeth {
		row := p.Row(top + i/g.perBand*g.pitch + g.height/2)
		var tooth [toothSteps]uint16
		for k := range tooth {
			tooth[k] = row[g.left+(i%g.perBand*toothSteps+k)*g.step+g.step/2]
		}
		all = append(all, tooth)
	}
	return all
}

func sawOf(t *testing.T, s Spec) (*Plane, sawGrid) {
	t.Helper()
	p := draw(t, "sawtooth", s)
	margin := 0
	g := newSawGrid(s.Width, s.Height, s.Bits, 0)
	c := canvas{Plane: p, short: min(s.Width, s.Height)}
	if f := c.face(c.labelSize() * 3 / 4); g.height >= f.height {
		margin = f.width(c.number(int(p.Max()))) * 3 / 2
		g = newSawGrid(s.Width, s.Height, s.Bits, margin)
	}
	return p, g
}

func TestSawtoothClimbsFourLevelsAtATime(t *testing.T) {
	for _, size := range [][2]int{{800, 600}, {600, 800}, {1923, 1081}, {2160, 3840}} {
		for bits := 8; bits <= 16; bits++ {
			s := Spec{Width: size[0], Height: size[1], Bits: bits}
			p, g := sawOf(t, s)
			if g.teeth != 1<<bits-3 {
				t.Fatalf("%v: %d teeth", s, g.teeth)
			}
			for i, tooth := range teeth(p, g) {
				for k, v := range tooth {
					if int(v) != i+k {
						t.Fatalf("%v: tooth %d is %v", s, i, tooth)
					}
				}
			}
			// A level is in as many teeth as reach it: four, fewer at the ends. Surround and labels have more.
			surround, ink := p.frac(1, 2), p.frac(1, 2)-p.frac(1, 3)
			for v, n := range counts(p) {
				in := min(int(v)+1, toothSteps, 1<<bits-int(v))
				if v != surround && v != ink && n != in*g.step*g.height {
					t.Fatalf("%v: %d pixels of level %d; want %d", s, n, v, in*g.step*g.height)
				}
			}
		}
	}
}

// What the sheet is for: a fault of one level breaks the shape of exactly the teeth that hold it.
func TestSawtoothShowsFaults(t *testing.T) {
	s := Spec{Width: 1280, Height: 1024, Bits: 8}
	flat := func(a [toothSteps]uint16) bool {
		for k := 1; k < toothSteps; k++ {
			if a[k] == a[k-1] {
				return true
			}
		}
		return false
	}
	notched := func(a [toothSteps]uint16) bool {
		for k := 1; k < toothSteps; k++ {
			if a[k] < a[k-1] {
				return true
			}
		}
		return false
	}
	for _, c := range []struct {
		name  string
		fault func(uint16) uint16
		shows func([toothSteps]uint16) bool
		want  int
	}{
		{"none lost", func(v uint16) uint16 { return v }, flat, 0},
		{"none swapped", func(v uint16) uint16 { return v }, notched, 0},
		{"lost: 100 comes out as 99", func(v uint16) uint16 {
			if v == 100 {
				return 99
			}
			return v
		}, flat, 3},
		{"doubled: 7 bits of 8", func(v uint16) uint16 { return v &^ 1 }, flat, 253},
		{"swapped: 60 and 61", func(v uint16) uint16 {
			switch v {
			case 60:
				return 61
			case 61:
				return 60
			}
			return v
		}, notched, 3},
	} {
		p, g := sawOf(t, s)
		for i, v := range p.Pix {
			p.Pix[i] = c.fault(v)
		}
		n := 0
		for _, tooth := range teeth(p, g) {
			if c.shows(tooth) {
				n++
			}
		}
		if n != c.want {
			t.Errorf("%s: %d broken teeth; want %d", c.name, n, c.want)
		}
	}
}

func TestEndsHaveTheLastLevels(t *testing.T) {
	for _, sc := range screens {
		s := Spec{Width: sc.width, Height: sc.height, Bits: sc.bits}
		dark, bright := draw(t, "dark-end", s), draw(t, "bright-end", s)
		c := canvas{Plane: dark, short: min(s.Width, s.Height)}
		text := c.face(c.labelSize()).height
		flights := 1
		if sc.bits > 8 {
			flights = 2
		}
		for f := range flights {
			r := endFlight(s.Width, s.Height, f, flights, text)
			unit := 1
			if f == 1 {
				unit = 1 << (sc.bits - 8)
			}
			got := map[uint16]int{}
			for y := r.Min.Y; y < r.Max.Y; y++ {
				for x := r.Min.X; x < r.Max.X; x++ {
					v := dark.Level(x, y)
					got[v]++
					if v+bright.Level(x, y) != dark.Max() {
						t.Fatalf("%v: the bright end is not the negative of the dark one at %d, %d", s, x, y)
					}
				}
			}
			if len(got) != endSteps+1 {
				t.Errorf("%v, flight %d: %d levels; want %d", s, f, len(got), endSteps+1)
			}
			for k := 1; k <= endSteps; k++ {
				tread := r.Dx()*k/endSteps - r.Dx()*(k-1)/endSteps
				if n, want := got[uint16(k*unit)], tread*(r.Dy()*k/endSteps); n != want {
					t.Errorf("%v, flight %d: %d pixels of level %d; want %d", s, f, n, k*unit, want)
				}
			}
		}
	}
}
