package report

import (
	"math"
	"strconv"
	"strings"
)

// Axis is one axis of a chart: its range in data units and where its ticks stand.
type Axis struct {
	Label    string
	Min, Max float64
	Log      bool // the logarithm is what is spaced evenly; Min is above 0
	Ticks    []Tick
}

// Tick is a mark on an axis. One without text is a minor tick.
type Tick struct {
	At   float64
	Text string
}

// place is where a value stands along the axis, 0 at its low end, 1 at its high end.
func (a Axis) place(v float64) float64 {
	if a.Log {
		return (math.Log(v) - math.Log(a.Min)) / (math.Log(a.Max) - math.Log(a.Min))
	}
	return (v - a.Min) / (a.Max - a.Min)
}

// thinned gives the ticks of which at most room stand side by side over the axis: every second, third
// and so on where they are more, zero among them where it is one.
func (a Axis) thinned(room float64) []Tick {
	var named []Tick
	zero, closest := 0, math.Inf(1)
	for _, t := range a.Ticks {
		if t.Text == "" {
			continue
		}
		if n := len(named); n > 0 {
			closest = min(closest, a.place(t.At)-a.place(named[n-1].At))
		}
		if t.At == 0 {
			zero = len(named)
		}
		named = append(named, t)
	}
	every := int(math.Ceil(1 / (closest * max(1, room))))
	if every <= 1 {
		return a.Ticks
	}
	var out []Tick
	for i, t := range named {
		if (i-zero)%every == 0 {
			out = append(out, t)
		}
	}
	return out
}

// linearAxis covers lo to hi with ticks at round values, about want of them.
func linearAxis(label string, lo, hi float64, want int) Axis {
	if hi <= lo {
		lo, hi = lo-1, hi+1
	}
	step := roundStep((hi - lo) / float64(max(1, want)))
	a := Axis{Label: label, Min: lo, Max: hi}
	decimals := max(0, int(math.Ceil(-math.Log10(step)-1e-9)))
	const rounding = 1e-9 // of a step: a tick at the very end of the axis is still on it
	for k := math.Ceil(lo/step - rounding); k*step <= hi+rounding*step; k++ {
		a.Ticks = append(a.Ticks, Tick{k * step, number(k*step, decimals)})
	}
	return a
}

// roundStep is the least of 1, 2, 5 times a power of ten that is not below the wanted step.
func roundStep(wanted float64) float64 {
	power := math.Pow(10, math.Floor(math.Log10(wanted)))
	for _, m := range []float64{1, 2, 5} {
		if m*power >= wanted*(1-1e-9) {
			return m * power
		}
	}
	return 10 * power
}

// logAxis covers lo to hi, both above 0, widened to the next of 1, 2, 5 times a power of ten. Every
// power of ten is named, and 2 and 5 too where there are less than three of them.
func logAxis(label string, lo, hi float64) Axis {
	if hi <= lo {
		lo, hi = lo/2, hi*2
	}
	a := Axis{Label: label, Log: true, Min: roundDown(lo), Max: 1 / roundDown(1/hi)}
	wide := math.Log10(a.Max/a.Min) >= 3
	for e := math.Floor(math.Log10(a.Min) + 1e-9); ; e++ {
		power := math.Pow(10, e)
		for m := 1.0; m < 10; m++ {
			v := m * power
			switch {
			case v < a.Min*(1-1e-9):
				continue
			case v > a.Max*(1+1e-9):
				return a
			}
			t := Tick{At: v}
			if m == 1 || !wide && (m == 2 || m == 5) {
				t.Text = strconv.FormatFloat(v, 'f', max(0, -int(e)), 64)
			}
			a.Ticks = append(a.Ticks, t)
		}
	}
}

// roundDown is the greatest of 1, 2, 5 times a power of ten that is not above v.
func roundDown(v float64) float64 {
	power := math.Pow(10, math.Floor(math.Log10(v)+1e-9))
	for _, m := range []float64{5, 2} {
		if m*power <= v*(1+1e-9) {
			return m * power
		}
	}
	return power
}

// number writes v with so many decimals, a true minus sign, and no sign on a zero.
func number(v float64, decimals int) string {
	s := strconv.FormatFloat(v, 'f', decimals, 64)
	if strings.Trim(s, "-0.") == "" {
		return strings.TrimPrefix(s, "-")
	}
	return strings.Replace(s, "-", "−", 1)
}
