package calibrate

import (
	"fmt"

	"evenstep/luts"
)

// The depths that a table may have.
const (
	minInBits, maxInBits   = 8, 12
	minOutBits, maxOutBits = 8, 16
)

// Result is a table with what it was made for.
type Result struct {
	Table    luts.Table
	Range    Range
	Warnings []Warning // of the table alone; those of the readings are the curve's
}

// Table makes the table that gives every P-value of inBits the driving level of outBits whose luminance is
// nearest to the standard function's between the ends of the aim; of two as near, the lower level. Where
// the curve turns back it keeps to the lowest level that reaches a luminance, so that the table never falls.
// inBits is 8 to 12, outBits 8 to 16.
func (c *Curve) Table(a Aim, inBits, outBits int) (Result, error) {
	if inBits < minInBits || inBits > maxInBits {
		return Result{}, fmt.Errorf("table: %d bits in; expected %d to %d", inBits, minInBits, maxInBits)
	}
	if outBits < minOutBits || outBits > maxOutBits {
		return Result{}, fmt.Errorf("table: %d bits out; expected %d to %d", outBits, minOutBits, maxOutBits)
	}
	rng, warnings, err := c.Range(a)
	if err != nil {
		return Result{}, err
	}
	want, err := targets(rng.Min, rng.Max, 1<<inBits)
	if err != nil {
		return Result{}, fmt.Errorf("table: %w", err)
	}
	t := luts.Table{Kind: luts.Calibration, InBits: inBits, OutBits: outBits, Entries: nearest(c.levels(outBits), want, c.blackestOf(outBits))}
	res := Result{Table: t, Range: rng, Warnings: warnings}
	if w, ok := coarse(t); ok {
		res.Warnings = append(res.Warnings, w)
	}
	return res, nil
}

// nearest gives each wanted luminance, in rising order, the level whose luminance is nearest to it; of two
// as near, the lower. Levels below from, and those no brighter than a lower level, do not count.
func nearest(levels, want []float64, from int) []uint16 {
	climb := []int{from}
	for i := from + 1; i < len(levels); i++ {
		if levels[i] > levels[climb[len(climb)-1]] {
			climb = append(climb, i)
		}
	}
	out := make([]uint16, len(want))
	k := 0
	for i, w := range want {
		for k+1 < len(climb) && levels[climb[k+1]] <= w {
			k++
		}
		best := climb[k]
		if k+1 < len(climb) && levels[climb[k+1]]-w < w-levels[best] {
			best = climb[k+1]
		}
		out[i] = uint16(best)
	}
	return out
}

// coarse warns where P-values share a driving level.
func coarse(t luts.Table) (Warning, bool) {
	runs := t.Merged()
	if len(runs) == 0 {
		return Warning{}, false
	}
	longest := runs[0]
	for _, r := range runs {
		if r.To-r.From > longest.To-longest.From {
			longest = r
		}
	}
	return Warning{Concern: Coarse, Text: fmt.Sprintf("%d of %d P-values share a driving level with the one before; most of all %d to %d, on level %d of %d bits; more bits out may keep them apart",
		len(t.Entries)-t.Levels(), len(t.Entries), longest.From, longest.To, longest.Level, t.OutBits)}, true
}
