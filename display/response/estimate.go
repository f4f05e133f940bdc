package response

// Estimate is a figure with its 95 % interval.
type Estimate struct {
	Value     float64
	Low, High float64 // 95 % interval from the readings there are
	Levels    int     // how many levels (or places) the figure was computed from

	// with gives the interval if every reading had been taken repeats times as often.
	with func(repeats int) (low, high float64)
}

// With returns the interval that the figure would have, at the same value, if every level had been
// read repeats times as often: only the part of the uncertainty that comes from reading noise shrinks.
func (e Estimate) With(repeats int) (low, high float64) {
	if e.with == nil {
		return e.Low, e.High
	}
	return e.with(repeats)
}

// Fixed is an estimate whose interval no repeat makes narrower.
func Fixed(value, low, high float64, levels int) Estimate {
	return Estimate{Value: value, Low: low, High: high, Levels: levels}
}
