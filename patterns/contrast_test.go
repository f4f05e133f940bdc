package patterns

import (
	"errors"
	"slices"
	"testing"
)

func TestLowContrastShowsTheStepsGiven(t *testing.T) {
	steps := []Step{
		{Low: 10, High: 11, Label: "0.6 JND"},
		{Low: 300, High: 302, Label: "1.3 JND"},
		{Low: 803, High: 801, Label: "−1.2 JND"},
		{Low: 1020, High: 1023, Label: "2.0 JND"},
		{Low: 512, High: 516},
	}
	for _, size := range [][2]int{{800, 600}, {600, 800}, {2560, 1440}} {
		for seed := range uint64(8) {
			s := Spec{Width: size[0], Height: size[1], Bits: 10, Steps: steps, Seed: seed}
			p := draw(t, "low-contrast", s)
			answers, err := Answers("low-contrast", s)
			if err != nil || len(answers) != len(steps) {
				t.Fatalf("answers %v, %v", answers, err)
			}
			n := counts(p)
			for i, st := range steps {
				left, right, top, bottom := edges(p, st.High)
				w, h := right-left+1, bottom-top+1
				if n[st.High] != w*h {
					t.Errorf("%v: %d pixels of level %d; want a bar of %dx%d", s, n[st.High], st.High, w, h)
				}
				if way := map[bool]string{true: "lying", false: "upright"}[w > h]; way != answers[i] {
					t.Errorf("%v, seed %d: bar %d is %s; the answer says %s", s, seed, i+1, way, answers[i])
				}
				// The bar lies on its tile all round.
				for _, v := range []uint16{
					p.Level(left-1, top), p.Level(right+1, bottom), p.Level(left, top-1), p.Level(right, bottom+1),
				} {
					if v != st.Low {
						t.Errorf("%v: level %d beside bar %d; want %d", s, v, i+1, st.Low)
					}
				}
			}
		}
	}
}

func TestLowContrastHoldsAsManyStepsAsItSays(t *testing.T) {
	steps := make([]Step, maxLowContrast)
	for i := range steps {
		steps[i] = Step{Low: uint16(5 * i), High: uint16(5*i + 1), Label: "a label too long to fit below a tile of this size"}
	}
	for _, size := range [][2]int{{800, 600}, {600, 2400}} {
		n := counts(draw(t, "low-contrast", Spec{Width: size[0], Height: size[1], Bits: 8, Steps: steps}))
		for _, st := range steps {
			if n[st.Low] == 0 || n[st.High] == 0 {
				t.Errorf("%v: step %v is not there", size, st)
			}
		}
	}
}

// Bars and disks come out by chance: every answer comes up about as often as every other.
func TestSeedsPickEvenly(t *testing.T) {
	for _, n := range []int{2, 3} {
		got := make([]int, n)
		const draws = 6000
		for i := range draws {
			got[pick(uint64(i/20), i%20, n)]++
		}
		for _, k := range got {
			// Five standard deviations of a fair draw: sqrt(6000/4) is 39.
			if d := k - draws/n; d < -200 || d > 200 {
				t.Errorf("one of %d: %v", n, got)
			}
		}
	}
}

func TestDisksAreWhereTheAnswersSay(t *testing.T) {
	for _, size := range [][2]int{{800, 600}, {1920, 1080}, {1200, 1920}} {
		for seed := range uint64(6) {
			s := Spec{
				Width: size[0], Height: size[1], Bits: 12, Seed: seed,
				Steps: []Step{
					{Low: 1000, High: 1003, Label: "1 JND"},
					{Low: 1010, High: 1016, Label: "2 JND"},
					{Low: 2000, High: 1990, Label: "−3 JND"},
				},
				Diameters: []int{21, 12, 5, 1},
			}
			p := draw(t, "disks", s)
			answers, err := Answers("disks", s)
			if err != nil || len(answers) != 12 {
				t.Fatalf("answers %v, %v", answers, err)
			}
			n := counts(p)
			for i, st := range s.Steps {
				want := 0
				for j, d := range s.Diameters {
					want += diskPixels(d)
					across, down := placeInCell(p, s, i, j, st.High)
					got := [...]string{"left", "middle", "right"}[across]
					if !disksAcross(&s) {
						got = [...]string{"top", "middle", "bottom"}[down]
					}
					if got != answers[j*3+i] {
						t.Errorf("%v, seed %d: disk of %d in column %d is %s; the answer says %s",
							s, seed, d, i, got, answers[j*3+i])
					}
				}
				if n[st.High] != want {
					t.Errorf("%v: %d pixels of level %d; want %d", s, n[st.High], st.High, want)
				}
			}
		}
	}
}

// diskPixels counts the pixels of a disk point by point.
func diskPixels(d int) int {
	n := 0
	for y := 1 - d; y < d; y += 2 {
		for x := 1 - d; x < d; x += 2 {
			if x*x+y*y <= d*d {
				n++
			}
		}
	}
	return n
}

// placeInCell is in which third of its cell the level v lies, across and down.
func placeInCell(p *Plane, s Spec, i, j int, v uint16) (across, down int) {
	r, cols, rows := diskArea(&s)
	k := cell(r, i, cols, j, rows)
	n, sumX, sumY := 0, 0, 0
	for y := k.Min.Y; y < k.Max.Y; y++ {
		for x := k.Min.X; x < k.Max.X; x++ {
			if p.Level(x, y) == v {
				n, sumX, sumY = n+1, sumX+x-k.Min.X, sumY+y-k.Min.Y
			}
		}
	}
	return 3 * sumX / n / k.Dx(), 3 * sumY / n / k.Dy()
}

func TestOwnStepsOfContrastSheets(t *testing.T) {
	for _, sc := range screens {
		s := Spec{Width: sc.width, Height: sc.height, Bits: sc.bits}
		for sheet, want := range map[string]int{"low-contrast": 12, "disks": ownDiskSteps * ownDiameters} {
			answers, err := Answers(sheet, s)
			if err != nil || len(answers) != want {
				t.Errorf("%s, %v: %d answers, %v; want %d", sheet, s, len(answers), err, want)
			}
			slices.Sort(answers)
			if len(slices.Compact(answers)) < 2 {
				t.Errorf("%s, %v: all answers are alike", sheet, s)
			}
		}
	}
}

func TestAnswersRefuses(t *testing.T) {
	s := Spec{Width: 800, Height: 600, Bits: 8}
	for name, s := range map[string]Spec{"none": s, "uniform": s, "disks": {}} {
		if got, err := Answers(name, s); !errors.Is(err, ErrSpec) || got != nil {
			t.Errorf("%s: %v, %v; want it to refuse", name, got, err)
		}
	}
}

func TestAngleIsTheSameAllOverTheSheet(t *testing.T) {
	for _, size := range [][2]int{{900, 600}, {600, 900}} { // thirds without a rest
		steps := []Step{{Low: 20, High: 24}, {Low: 128, High: 120}, {Low: 240, High: 244}}
		p := draw(t, "angle", Spec{Width: size[0], Height: size[1], Bits: 8, Steps: steps})
		w, h := size[0]/3, size[1]/3
		for y := range p.Height {
			for x, v := range p.Row(y) {
				if want := p.Level(x%w, y%h); v != want {
					t.Fatalf("%v: level %d at %d, %d; %d in the first group", size, v, x, y, want)
				}
			}
		}
		n := counts(p)
		for _, st := range steps {
			if n[st.High] == 0 || n[st.Low] < n[st.High] {
				t.Errorf("%v: step %v: %d and %d pixels", size, st, n[st.Low], n[st.High])
			}
		}
		if len(n) != 7 {
			t.Errorf("%v: %d levels; want three steps and the surround", size, len(n))
		}
	}
}
