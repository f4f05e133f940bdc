package patterns

import (
	"image"
	"testing"
)

func TestSharpnessHasLinesOfOneToFourPixels(t *testing.T) {
	low := Step{Low: 40, High: 44}
	for _, size := range [][2]int{{800, 600}, {600, 800}, {1923, 1081}} {
		p := draw(t, "sharpness", Spec{Width: size[0], Height: size[1], Bits: 8, Steps: []Step{low}})
		for j := range 4 {
			step := Step{Low: 0, High: 255}
			if j >= 2 {
				step = low
			}
			for i := range maxPitch {
				tile, _ := sharpTile(size[0], size[1], i, j)
				for y := tile.Min.Y; y < tile.Max.Y; y++ {
					for x := tile.Min.X; x < tile.Max.X; x++ {
						along := x - tile.Min.X
						if j%2 == 1 {
							along = y - tile.Min.Y
						}
						want := step.Low
						if along/(i+1)%2 == 1 {
							want = step.High
						}
						if got := p.Level(x, y); got != want {
							t.Fatalf("%v: level %d at %d, %d in the tile of %d px; want %d", size, got, x, y, i+1, want)
						}
					}
				}
			}
		}
	}
}

func TestGeometryReachesTheOutermostPixels(t *testing.T) {
	for _, sc := range screens {
		p := draw(t, "geometry", Spec{Width: sc.width, Height: sc.height, Bits: sc.bits})
		line := p.Level(0, 0)
		for x := range p.Width {
			if p.Level(x, 0) != line || p.Level(x, p.Height-1) != line {
				t.Fatalf("%dx%d: no edge line at column %d", sc.width, sc.height, x)
			}
			if tick := p.Level(x, 1) == line; x > 0 && x < p.Width-1 && tick != (x%10 == 0) {
				t.Fatalf("%dx%d: tick at column %d: %v", sc.width, sc.height, x, tick)
			}
		}
		for y := range p.Height {
			if p.Level(0, y) != line || p.Level(p.Width-1, y) != line {
				t.Fatalf("%dx%d: no edge line at row %d", sc.width, sc.height, y)
			}
			if tick := p.Level(p.Width-2, y) == line; y > 0 && y < p.Height-1 && tick != (y%10 == 0) {
				t.Fatalf("%dx%d: tick at row %d: %v", sc.width, sc.height, y, tick)
			}
		}
		if n := counts(p); len(n) != 3 {
			t.Errorf("%dx%d: %d levels; want surround, lines and edge", sc.width, sc.height, len(n))
		}
	}
}

func TestGeometryMeshesAreSquare(t *testing.T) {
	for _, sc := range screens {
		p := newPlane(&Spec{Width: sc.width, Height: sc.height, Bits: sc.bits})
		c := canvas{Plane: p, short: min(p.Width, p.Height)}
		net := squares(&c, c.bounds(), 1)
		gaps := func(length int, at func(int) uint16) []int {
			var g []int
			last := -1
			for i := range length {
				if at(i) == 1 {
					if last >= 0 {
						g = append(g, i-last)
					}
					last = i
				}
			}
			return g
		}
		across := gaps(p.Width, func(x int) uint16 { return p.Level(x, net.Min.Y+1) })
		down := gaps(p.Height, func(y int) uint16 { return p.Level(net.Min.X+1, y) })
		for _, g := range append(across, down...) {
			if g != across[0] {
				t.Fatalf("%dx%d: meshes %v across, %v down", sc.width, sc.height, across, down)
			}
		}
		diagonals(&c, net, 2)
		// One pixel of each diagonal in every column of a lying net, in every row of an upright one; each is the
		// other's mirror image.
		for y := net.Min.Y; y < net.Max.Y; y++ {
			for x := net.Min.X; x < net.Max.X; x++ {
				if p.Level(x, y) == 2 && p.Level(net.Min.X+net.Max.X-1-x, y) != 2 {
					t.Fatalf("%dx%d: diagonal at %d, %d without its mirror image", sc.width, sc.height, x, y)
				}
			}
		}
		for _, at := range []image.Point{
			net.Min, {net.Max.X - 1, net.Min.Y}, {net.Min.X, net.Max.Y - 1}, {net.Max.X - 1, net.Max.Y - 1},
		} {
			if p.Level(at.X, at.Y) != 2 {
				t.Errorf("%dx%d: no diagonal in the corner %v", sc.width, sc.height, at)
			}
		}
	}
}

// All fields of the native sheet are half black, half white: seen as one gray.
func TestNativeFieldsAreHalfAndHalf(t *testing.T) {
	for _, sc := range screens {
		p := draw(t, "native", Spec{Width: sc.width, Height: sc.height, Bits: sc.bits})
		plate := middle(image.Rect(0, 0, p.Width, p.Height), p.Width/2, p.Height/3)
		const side = 16
		for y := 0; y+side <= p.Height; y += side {
			for x := 0; x+side <= p.Width; x += side {
				box := image.Rect(x, y, x+side, y+side)
				if box.Overlaps(plate) {
					continue
				}
				white := 0
				for j := box.Min.Y; j < box.Max.Y; j++ {
					for _, v := range p.Row(j)[box.Min.X:box.Max.X] {
						switch v {
						case 0:
						case p.Max():
							white++
						default:
							t.Fatalf("%dx%d: level %d in a field, %v", sc.width, sc.height, v, box)
						}
					}
				}
				// A border between fields that does not fall on the box leaves a strip of odd width, half of it over.
				if d := white - side*side/2; d < -side || d > side {
					t.Fatalf("%dx%d: %d of %d pixels white in %v", sc.width, sc.height, white, side*side, box)
				}
			}
		}
	}
}

// A limited range swallows blocks. 8 bits: levels 16 to 235 of the output are spread to 0 to 255 by the monitor
// and the rest is cut off (ITU-R BT.601 and BT.709 give 16 and 235 as black and white).
func TestNativeShowsLimitedRange(t *testing.T) {
	p := draw(t, "native", Spec{Width: 1920, Height: 1080, Bits: 8})
	limited := func(v int) int { return min(max((v-16)*255/219, 0), 255) }
	seen := func(through func(int) int) (dark, bright int) {
		n := counts(p)
		for k := 1; k <= 8; k++ {
			v := int(p.frac(k, 64))
			if n[uint16(v)] == 0 || n[255-uint16(v)] == 0 {
				t.Fatalf("no block of level %d or %d", v, 255-v)
			}
			if through(v) != through(0) {
				dark++
			}
			if through(255-v) != through(255) {
				bright++
			}
		}
		return dark, bright
	}
	if dark, bright := seen(func(v int) int { return v }); dark != 8 || bright != 8 {
		t.Errorf("full range: %d dark and %d bright blocks; want 8 and 8", dark, bright)
	}
	// 4, 8, 12, 16 go under; 251, 247, 243, 239 and 235 are all white.
	if dark, bright := seen(limited); dark != 4 || bright != 3 {
		t.Errorf("limited range: %d dark and %d bright blocks; want 4 and 3", dark, bright)
	}
}
