package calibrate

import (
	"slices"
	"strings"
	"testing"

	"evenstep/display/readings"
	"evenstep/display/response"
)

func TestPlanFirst(t *testing.T) {
	for _, bits := range []int{8, 10, 12} {
		l := NewPlan(bits).First()
		if l[0] != 0 || l[len(l)-1] != 1<<bits-1 || len(l) < fewest {
			t.Errorf("%d bits: %v; expected both ends and %d levels or more", bits, l, fewest)
		}
		for i := 1; i < len(l); i++ {
			if l[i] <= l[i-1] {
				t.Errorf("%v does not rise", l)
			}
		}
	}
}

// The plan asks for rising levels with a drift reading, and comes to an end that it gives a reason for.
func TestPlanRun(t *testing.T) {
	for _, c := range []struct {
		name string
		goal float64
		most int
		want string
	}{
		{"goal", 0.06, 40, "was asked for"},
		{"no goal can be met", 0.001, 60, "no longer"},
		{"few readings", 0.001, 18, "18 readings"},
	} {
		t.Run(c.name, func(t *testing.T) {
			rng := source(21)
			p := tuned[1].draw(rng) // an S-curve
			plan := NewPlan(8)
			plan.Goal, plan.Most = c.goal, c.most
			rs := p.read(rng, plan.First(), studyNoise)
			var before []float64
			for range 40 {
				next, err := plan.Next(p.input(rs, studyNoise), before)
				if err != nil {
					t.Fatal(err)
				}
				before = append(before, next.Interval[1])
				if next.Predicted > next.Interval[1] || next.Predicted < next.Interval[0] {
					t.Errorf("%v outside %v", next.Predicted, next.Interval)
				}
				if next.Done {
					if !strings.Contains(next.Reason, c.want) || len(next.Levels) > 0 {
						t.Errorf("done with %q, %v; expected %q", next.Reason, next.Levels, c.want)
					}
					if len(rs) > c.most {
						t.Errorf("%d readings; expected %d at most", len(rs), c.most)
					}
					return
				}
				if !slices.IsSorted(next.Levels) || len(next.Levels) == 0 || len(next.Levels) > plan.Batch || next.Levels[0] < 0 || next.Levels[len(next.Levels)-1] > 255 {
					t.Fatalf("levels %v; expected 1 to %d that rise", next.Levels, plan.Batch)
				}
				if !slices.ContainsFunc(rs[:firstPass], func(r readings.Reading) bool { return r.Level == next.Drift }) {
					t.Errorf("drift level %d was not read in the first pass", next.Drift)
				}
				rs = again(rs, p.read(rng, next.Levels, studyNoise))
			}
			t.Error("the plan never ends")
		})
	}
}

// A level is asked for where a gap was left.
func TestPlanFillsGaps(t *testing.T) {
	p := tuned[1].draw(source(3))
	plan := NewPlan(8)
	plan.Goal = 0.001
	next, err := plan.Next(p.input(p.read(source(4), []int{0, 3, 8, 15, 24, 36, 50, 66, 230, 255}, studyNoise), studyNoise), nil)
	if err != nil {
		t.Fatal(err)
	}
	if !slices.ContainsFunc(next.Levels, func(l int) bool { return l > 80 && l < 215 }) {
		t.Errorf("%v; expected a level between 66 and 230", next.Levels)
	}
}

func TestPlanRefuses(t *testing.T) {
	rs := quiet.read(source(1), dark(20), studyNoise)
	for _, c := range []struct {
		plan Plan
		in   Input
	}{
		{Plan{Bits: 10, OutBits: 10, Batch: 4, Most: 40}, quiet.input(rs, studyNoise)},
		{Plan{Bits: 8, OutBits: 10, Most: 40}, quiet.input(rs, studyNoise)},
		{NewPlan(8), quiet.input(rs[:4], studyNoise)},
		{Plan{Bits: 8, OutBits: 99, Batch: 4, Most: 40}, quiet.input(rs, studyNoise)},
	} {
		if _, err := c.plan.Next(c.in, nil); err == nil {
			t.Errorf("%+v: no error", c.plan)
		}
	}
	// Readings that are taken as they are leave nothing to plan.
	next, err := NewPlan(8).Next(quiet.input(quiet.read(source(1), even(20), response.Noise{}), response.Noise{}), nil)
	if err != nil || !next.Done || next.Reason == "" {
		t.Errorf("%+v, %v; expected it done", next, err)
	}
}
