package calibrate

import (
	"math"
	"slices"
	"testing"

	"evenstep/display/gsdf"
)

func TestMonotone(t *testing.T) {
	for _, c := range []struct{ v, w, want []float64 }{
		{[]float64{1, 2, 3}, nil, []float64{1, 2, 3}},
		{[]float64{3, 1}, nil, []float64{2, 2}},
		{[]float64{1, 4, 2, 3, 5}, nil, []float64{1, 3, 3, 3, 5}},
		{[]float64{3, 1}, []float64{3, 1}, []float64{2.5, 2.5}},
		{nil, nil, []float64{}},
	} {
		if got := monotone(c.v, c.w); !slices.Equal(got, c.want) {
			t.Errorf("%v weighed %v: %v; expected %v", c.v, c.w, got, c.want)
		}
	}
	// No rising sequence is nearer: moving any pool up or down makes the sum of squares no smaller.
	rng := source(2)
	for range 50 {
		v := make([]float64, 30)
		for i := range v {
			v[i] = float64(i)/10 + rng.NormFloat64()
		}
		got := monotone(v, nil)
		if !slices.IsSorted(got) {
			t.Fatal("falls")
		}
		// The rest of a best rising fit is at a right angle to the fit itself (from memory).
		sum := 0.0
		for i := range v {
			sum += got[i] * (v[i] - got[i])
		}
		if math.Abs(sum) > 1e-9 {
			t.Errorf("sum %g; expected 0", sum)
		}
	}
}

// The fit's domain is the standard function, and goes on beyond its ends without a jump.
func TestDomain(t *testing.T) {
	for _, l := range []float64{0.05, 1, 100, 3993} {
		if j := indexOf(l); math.Abs(luminanceOf(j)-l) > 1e-9*l {
			t.Errorf("%v cd/m2 comes back as %v", l, luminanceOf(j))
		}
	}
	before := math.Inf(-1)
	for _, l := range []float64{-0.01, 0, 0.02, 0.0499, 0.04999, 0.06, 3990, 3993.32, 3993.34, 4100} {
		j := indexOf(l)
		if j <= before {
			t.Errorf("the index falls at %v cd/m2", l)
		}
		if math.Abs(luminanceOf(j)-l) > 1e-6 {
			t.Errorf("%v cd/m2 comes back as %v", l, luminanceOf(j))
		}
		before = j
	}
	if j := indexOf(float64(gsdf.MinLuminance())); math.Abs(j-1) > 1e-9 {
		t.Errorf("index %v at the lower end; expected 1", j)
	}
}
