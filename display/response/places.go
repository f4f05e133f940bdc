package response

import (
	"fmt"
	"math"
	"sort"

	"evenstep/display/photometry"
	"evenstep/display/readings"
)

// Formula names a formula of uniformity, or the denominator of a match between two screens.
type Formula string

// The formulas of uniformity over the places of one field: Lhigh and Llow are the extremes, Lc the
// centre, Lmed the median. The four are in use side by side and give different figures for one
// screen, so each figure carries its formula.
const (
	MaximumDeviation Formula = "maximum luminance deviation" // 2 (Lhigh - Llow)/(Lhigh + Llow)
	FromCentre       Formula = "deviation from centre"       // max |Li - Lc|/Lc
	RangeOverCentre  Formula = "range over centre"           // (Lhigh - Llow)/Lc
	FromMedian       Formula = "deviation from median"       // max |Li - Lmed|/Lmed
)

// The denominators of a match: |La - Lb| over one of these.
const (
	OverLower  Formula = "over the lower"
	OverMean   Formula = "over the mean"
	OverHigher Formula = "over the higher"
)

// UniformityFormulas are the four formulas of uniformity.
func UniformityFormulas() []Formula {
	return []Formula{MaximumDeviation, FromCentre, RangeOverCentre, FromMedian}
}

// PairFormulas are the three denominators of a match.
func PairFormulas() []Formula { return []Formula{OverLower, OverMean, OverHigher} }

// comparison is one difference that a figure of uniformity is the greatest of, with its variance.
type comparison struct{ value, variance float64 }

// Uniformity is the figure of one formula over the places of one field, a fraction, with the interval
// in which the true one lies. The luminances are taken as read. It fails where a place is missing or
// reads 0 throughout.
func Uniformity(places []readings.Place, formula Formula, n Noise) (Estimate, error) {
	if len(places) < 2 {
		return Estimate{}, fmt.Errorf("places: %d measured; expected the centre and four corners at least; measure them", len(places))
	}
	l := make([]float64, len(places))
	centre := -1
	for i, p := range places {
		l[i] = float64(p.Luminance)
		if math.IsNaN(l[i]) || math.IsInf(l[i], 0) || l[i] < 0 {
			return Estimate{}, fmt.Errorf("place %q: luminance is %v cd/m2; expected 0 or more; take the reading again", p.Position, l[i])
		}
		if p.Position == readings.Centre {
			centre = i
		}
	}
	if centre < 0 {
		return Estimate{}, fmt.Errorf("places: no centre; expected one; measure the centre of the field")
	}
	order := make([]int, len(l))
	for i := range order {
		order[i] = i
	}
	sort.SliceStable(order, func(a, b int) bool { return l[order[a]] < l[order[b]] })
	low, high := l[order[0]], l[order[len(order)-1]]
	variance := func(i int) float64 {
		res := float64(n.Resolution)
		return n.variance(l[i]) + res*res/12
	}

	var all []comparison
	// add notes one difference; terms that name the same place add their slopes.
	add := func(value float64, terms ...term) {
		slope := make([]float64, len(l))
		for _, t := range terms {
			slope[t.point] += t.slope
		}
		v := 0.0
		for i, s := range slope {
			v += s * s * variance(i)
		}
		all = append(all, comparison{math.Abs(value), v})
	}
	switch formula {
	case MaximumDeviation:
		if low+high <= 0 {
			return Estimate{}, errDarkPlaces
		}
		for i := range l {
			for k := range i {
				v, da, db := relativeStep(l[k], l[i])
				add(v, term{k, da}, term{i, db})
			}
		}
	case FromCentre:
		c := l[centre]
		if c <= 0 {
			return Estimate{}, errDarkPlaces
		}
		for i := range l {
			if i != centre {
				add((l[i]-c)/c, term{i, 1 / c}, term{centre, -l[i] / (c * c)})
			}
		}
	case RangeOverCentre:
		c := l[centre]
		if c <= 0 {
			return Estimate{}, errDarkPlaces
		}
		for i := range l {
			for k := range i {
				d := (l[i] - l[k]) / c
				add(d, term{i, 1 / c}, term{k, -1 / c}, term{centre, -d / c})
			}
		}
	case FromMedian:
		a, b := order[(len(order)-1)/2], order[len(order)/2] // one and the same for an odd number
		med := (l[a] + l[b]) / 2
		if med <= 0 {
			return Estimate{}, errDarkPlaces
		}
		for i := range l {
			half := -l[i] / (med * med) / 2
			add((l[i]-med)/med, term{i, 1 / med}, term{a, half}, term{b, half})
		}
	default:
		return Estimate{}, fmt.Errorf("uniformity formula %q is not known; expected one of %v", formula, UniformityFormulas())
	}

	k := sidak(len(all))
	with := func(repeats int) (lo, hi float64) {
		for _, c := range all {
			u := k * math.Sqrt(c.variance/float64(repeats))
			lo, hi = max(lo, c.value-u), max(hi, c.value+u)
		}
		return lo, hi
	}
	value := 0.0
	for _, c := range all {
		value = max(value, c.value)
	}
	lo, hi := with(1)
	return Estimate{Value: value, Low: lo, High: hi, Levels: len(places), with: with}, nil
}

var errDarkPlaces = fmt.Errorf("places: the field reads 0; expected light; show a brighter field")

// Pair is the difference of the luminances of two screens, each with its ambient light or each
// without, over the denominator that formula names. A fraction.
func Pair(a, b photometry.CdM2, formula Formula, n Noise) (Estimate, error) {
	la, lb := float64(a), float64(b)
	for _, l := range []float64{la, lb} {
		if !(l > 0) || math.IsInf(l, 0) {
			return Estimate{}, fmt.Errorf("pair: a luminance is %v cd/m2; expected more than 0; measure both screens at the highest level", l)
		}
	}
	d := la - lb
	var over, da, db float64 // the denominator and its slopes
	switch formula {
	case OverLower:
		if over = min(la, lb); la < lb {
			da = 1
		} else {
			db = 1
		}
	case OverHigher:
		if over = max(la, lb); la > lb {
			da = 1
		} else {
			db = 1
		}
	case OverMean:
		over, da, db = (la+lb)/2, .5, .5
	default:
		return Estimate{}, fmt.Errorf("pair denominator %q is not known; expected one of %v", formula, PairFormulas())
	}
	v := d / over
	sa, sb := (1-v*da)/over, (-1-v*db)/over
	res := float64(n.Resolution)
	variance := sa*sa*(n.variance(la)+res*res/12) + sb*sb*(n.variance(lb)+res*res/12)
	v = math.Abs(v)
	with := func(repeats int) (lo, hi float64) {
		u := single() * math.Sqrt(variance/float64(repeats))
		return max(0, v-u), v + u
	}
	lo, hi := with(1)
	return Estimate{Value: v, Low: lo, High: hi, Levels: 2, with: with}, nil
}

// ColourSpread is the greatest u'v' distance (CIE 1976) between any two places that have a colour.
// It reports false where fewer than two have one.
func ColourSpread(places []readings.Place) (distance float64, a, b readings.Position, ok bool) {
	for i, p := range places {
		for _, q := range places[:i] {
			if p.Colour == nil || q.Colour == nil {
				continue
			}
			if d := p.Colour.Distance(*q.Colour); !ok || d > distance {
				distance, a, b, ok = d, q.Position, p.Position, true
			}
		}
	}
	return distance, a, b, ok
}
