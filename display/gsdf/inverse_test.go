package gsdf

import (
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"evenstep/display/photometry"
)

// roundTrip is what a luminance may lose on the way to its index and back, in JND.
const roundTrip = 1e-9

// points is how many places each round trip visits.
const points = 1_000_000

func TestRoundTripFromIndex(t *testing.T) {
	worst, worstAt, previous := 0.0, First, JND(0)
	for i := range points + 1 {
		j := First + (Last-First)*JND(i)/points
		got := mustIndex(t, mustLuminance(t, j))
		if !(got > previous) {
			t.Fatalf("Index of the luminance of %v is %v, not above %v of the place before", j, got, previous)
		}
		previous = got
		if d := math.Abs(float64(got - j)); !(d <= worst) {
			worst, worstAt = d, j
		}
	}
	t.Logf("%d places, greatest difference %.2g JND at %v", points+1, worst, worstAt)
	if !(worst < roundTrip) {
		t.Errorf("greatest difference %g JND at %v, want below %g", worst, worstAt, roundTrip)
	}
}

func TestRoundTripFromLuminance(t *testing.T) {
	// 1e-9 JND is at least 6.4e-12 of the luminance, the contrast of a JND being 0.00649 at its least.
	const tolerance = 6.4e-12
	from, to := math.Log(float64(MinLuminance())), math.Log(float64(MaxLuminance()))
	worst, worstAt, previous := 0.0, MinLuminance(), JND(0)
	for i := 1; i < points; i++ {
		l := photometry.CdM2(math.Exp(from + (to-from)*float64(i)/points))
		j := mustIndex(t, l)
		if !(j > previous) {
			t.Fatalf("Index(%v) = %v, not above %v of the place before", l, j, previous)
		}
		previous = j
		if d := math.Abs(float64(mustLuminance(t, j)/l - 1)); !(d <= worst) {
			worst, worstAt = d, l
		}
	}
	t.Logf("%d places, greatest relative difference %.2g at %v cd/m2", points-1, worst, worstAt)
	if !(worst < tolerance) {
		t.Errorf("greatest relative difference %g at %v cd/m2, want below %g", worst, worstAt, tolerance)
	}
}

// TestRoundTripAtRandom visits places that no regular grid meets.
func TestRoundTripAtRandom(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 14))
	for range 100_000 {
		j := First + (Last-First)*JND(random.Float64())
		if got := mustIndex(t, mustLuminance(t, j)); !(math.Abs(float64(got-j)) < roundTrip) {
			t.Fatalf("index %v comes back as %v", j, got)
		}
	}
}

// TestIndexAgainstBisection compares with a solver that shares nothing with the tabulated pieces.
func TestIndexAgainstBisection(t *testing.T) {
	random := rand.New(rand.NewPCG(7, 1))
	from, to := math.Log(float64(MinLuminance())), math.Log(float64(MaxLuminance()))
	for range 2000 {
		l := photometry.CdM2(math.Exp(from + (to-from)*random.Float64()))
		low, high := First, Last
		for range 60 {
			if middle := (low + high) / 2; mustLuminance(t, middle) < l {
				low = middle
			} else {
				high = middle
			}
		}
		if got := mustIndex(t, l); !(math.Abs(float64(got-low)) < roundTrip) {
			t.Fatalf("Index(%v) = %.12f, bisection finds %.12f", l, got, low)
		}
	}
}

// TestPiecesMeet looks at the seams, where two polynomials could disagree. The equation itself
// rounds to some 1e-11 JND at the top, so a seam may be 1e-10 wide; a step of 1e-11 of the
// luminance, about 1e-10 JND at the bottom and more above, must lead upwards over it.
func TestPiecesMeet(t *testing.T) {
	inv := newInverse()
	for i := 1; i < len(inv.pieces); i++ {
		seam := math.Float64frombits((inv.first + uint64(i)) << shift)
		below, at := inv.index(math.Nextafter(seam, 0)), inv.index(seam)
		if d := math.Abs(at - below); !(d < 1e-10) {
			t.Errorf("seam at %v cd/m2 is %g JND wide", seam, d)
		}
		if before, after := inv.index(seam*(1-1e-11)), inv.index(seam*(1+1e-11)); !(before < at && at < after) {
			t.Errorf("index does not rise over the seam at %v cd/m2: %.15g, %.15g, %.15g", seam, before, at, after)
		}
	}
}

func TestEndsAreExact(t *testing.T) {
	for _, end := range []JND{First, Last} {
		if got := mustIndex(t, mustLuminance(t, end)); got != end {
			t.Errorf("Index(Luminance(%v)) = %v", end, got)
		}
	}
	if j := mustIndex(t, MinLuminance()); j != First {
		t.Errorf("Index(MinLuminance()) = %v", j)
	}
	if j := mustIndex(t, MaxLuminance()); j != Last {
		t.Errorf("Index(MaxLuminance()) = %v", j)
	}
	// One rounding step inside the range the answer may touch the end but not pass it.
	low := mustIndex(t, photometry.CdM2(math.Nextafter(float64(MinLuminance()), 1)))
	high := mustIndex(t, photometry.CdM2(math.Nextafter(float64(MaxLuminance()), 1)))
	if low < First || low > First+roundTrip || high > Last || high < Last-roundTrip {
		t.Errorf("next to the ends the index is %v and %v", low, high)
	}
}

func TestRefusals(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	justBelow := math.Nextafter(float64(MinLuminance()), 0)
	justAbove := math.Nextafter(float64(MaxLuminance()), inf)
	index := func(l float64) (float64, error) { j, err := Index(photometry.CdM2(l)); return float64(j), err }
	luminance := func(j float64) (float64, error) { l, err := Luminance(JND(j)); return float64(l), err }
	rows := []struct {
		name string
		call func(float64) (float64, error)
		arg  float64
		want error
	}{
		{"luminance of 0", index, 0, ErrBelow},
		{"luminance of minus 0", index, math.Copysign(0, -1), ErrBelow},
		{"negative luminance", index, -130, ErrBelow},
		{"negative luminance near the range", index, -0.05, ErrBelow},
		{"subnormal luminance", index, 5e-324, ErrBelow},
		{"luminance just below", index, justBelow, ErrBelow},
		{"luminance just above", index, justAbove, ErrAbove},
		{"luminance at the top named by the standard", index, 4000, ErrAbove},
		{"greatest luminance", index, math.MaxFloat64, ErrAbove},
		{"infinite luminance", index, inf, ErrAbove},
		{"luminance of minus infinity", index, -inf, ErrBelow},
		{"luminance not a number", index, nan, ErrNaN},
		{"index of 0", luminance, 0, ErrBelow},
		{"negative index", luminance, -1, ErrBelow},
		{"index just below", luminance, math.Nextafter(1, 0), ErrBelow},
		{"index just above", luminance, math.Nextafter(1023, inf), ErrAbove},
		{"infinite index", luminance, inf, ErrAbove},
		{"index of minus infinity", luminance, -inf, ErrBelow},
		{"index not a number", luminance, nan, ErrNaN},
	}
	for _, row := range rows {
		t.Run(row.name, func(t *testing.T) {
			got, err := row.call(row.arg)
			if !errors.Is(err, row.want) {
				t.Fatalf("got %v, error %v, want error %v", got, err, row.want)
			}
			if got != 0 {
				t.Errorf("a refusal came with the value %v", got)
			}
		})
	}
}

func TestIndexDoesNotAllocate(t *testing.T) {
	mustIndex(t, 100)
	if n := testing.AllocsPerRun(1000, func() { _, _ = Index(100) }); n != 0 {
		t.Errorf("Index allocates %v times", n)
	}
}
