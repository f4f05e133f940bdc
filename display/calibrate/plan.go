package calibrate

import (
	"fmt"
	"math"
	"sort"

	"gonum.org/v1/gonum/mat"

	"evenstep/display/response"
)

// Plan says which levels to read next, so that a table needs few readings.
type Plan struct {
	Bits    int     // bit depth of the levels
	OutBits int     // of the table that is to be made
	Goal    float64 // greatest contrast deviation to get under, with its interval: a fraction
	Batch   int     // levels read between two looks at the curve
	Most    int     // levels and repeats to read at most, without drift readings
}

// NewPlan is the usual plan for levels of a bit depth: a table of 10 bits out (or the levels' own depth,
// where that is more), a goal of 5 %, batches of four, at most 40 readings.
func NewPlan(bits int) Plan {
	return Plan{Bits: bits, OutBits: max(10, bits), Goal: 0.05, Batch: 4, Most: 40}
}

// firstPass is the number of levels of the first pass: enough to tell panels apart.
const firstPass = 10

// First is the first pass: levels from dark to bright, closer together at the dark end, with both ends.
func (p Plan) First() []int {
	top := float64(int(1)<<p.Bits - 1)
	out := []int{0}
	for i := 1; i < firstPass; i++ {
		l := int(math.Round(top * math.Pow(float64(i)/(firstPass-1), 1.6)))
		if l > out[len(out)-1] {
			out = append(out, l)
		}
	}
	return out
}

// Next is what a plan asks for after some readings.
type Next struct {
	Levels    []int      // to read, rising; a level that was read before is to be repeated. Empty where done.
	Drift     int        // level to read once more after them, as a drift reading
	Predicted float64    // greatest deviation of the table that the readings make so far
	Interval  [2]float64 // 95 % interval of it
	Done      bool
	Reason    string // why the plan is done
}

const (
	// little is the share by which the upper end must fall over two batches for another to be worth its time.
	little = 0.04
	// rounds is the number of batches over which it is looked at.
	rounds = 2
)

// Next looks at the readings so far. before holds the upper ends of the intervals that earlier calls gave, in
// order. It is done when the greatest deviation is under the goal with its interval, when it is under 10 %
// and the last two batches made it fall no further, or when the most readings were taken. It fails where no curve, or no
// table over the panel's range, can be made.
func (p Plan) Next(in Input, before []float64) (Next, error) {
	c, err := NewCurve(in)
	if err != nil {
		return Next{}, err
	}
	return p.after(c, before)
}

func (p Plan) after(c *Curve, before []float64) (Next, error) {
	if p.Batch < 1 || p.Bits != c.Bits {
		return Next{}, fmt.Errorf("plan: batches of %d, levels of %d bits; expected 1 or more, and %d bits as read", p.Batch, p.Bits, c.Bits)
	}
	res, err := c.Table(Aim{}, minInBits, p.OutBits)
	if err != nil {
		return Next{}, err
	}
	pred, err := c.Predict(res.Table, Path{})
	if err != nil {
		return Next{}, err
	}
	n := Next{Predicted: pred.Greatest, Interval: pred.GreatestInterval, Drift: c.driftLevel()}
	taken := 0
	for _, q := range c.Points {
		taken += q.Readings
	}
	high := n.Interval[1]
	switch {
	case c.Exact:
		n.Done, n.Reason = true, "the readings are taken as they are; nothing says where the curve is known least"
	case high <= p.Goal:
		n.Done, n.Reason = true, fmt.Sprintf("the greatest deviation is %.1f %% at most; %.1f %% was asked for", 100*high, 100*p.Goal)
	case taken >= p.Most:
		n.Done, n.Reason = true, fmt.Sprintf("%d readings were taken; the greatest deviation is %.1f %% at most; %.1f %% was asked for", taken, 100*high, 100*p.Goal)
	case len(before) >= rounds && high <= holds && high > before[len(before)-rounds]*(1-little):
		n.Done, n.Reason = true, fmt.Sprintf("further readings no longer help: the greatest deviation stays at %.1f %% at most; %.1f %% was asked for", 100*high, 100*p.Goal)
	}
	if !n.Done {
		n.Levels = c.leastKnown(pred, min(p.Batch, p.Most-taken))
	}
	return n, nil
}

// driftLevel is the level that is read again after each batch: bright, where noise is small beside a drift
// of the backlight, and read in the first pass.
func (c *Curve) driftLevel() int { return c.Points[len(c.Points)-1].Level }

// candidates are the levels that a batch may choose from.
func (c *Curve) candidates() []int {
	const most = 112
	n := min(c.top()+1, most)
	out := []int{}
	for i := range n {
		l := int(math.Round(float64(c.top()) * math.Pow(float64(i)/float64(n-1), 1.5)))
		if len(out) == 0 || l > out[len(out)-1] {
			out = append(out, l)
		}
	}
	return out
}

// leastKnown chooses levels one after the other, each so that the deviations would be known best after it,
// the levels chosen before it counted as read.
func (c *Curve) leastKnown(p *Prediction, batch int) []int {
	at := p.eighteen()
	levels := c.candidates()
	xs := make([]float64, 0, len(at)+len(levels))
	lum := make([]float64, len(at))
	for i, v := range at {
		xs = append(xs, p.outs[v])
		lum[i] = c.luminance(p.outs[v])
	}
	noise := make([]float64, len(levels))
	ambient := 0.
	if c.Light.Source != response.AmbientInside && c.Light.Ambient != nil {
		ambient = float64(*c.Light.Ambient)
	}
	for i, l := range levels {
		x := float64(l) / float64(c.top())
		xs = append(xs, x)
		full := c.luminance(x)
		noise[i] = c.readingVariance(full, max(0, full-ambient))
	}
	// The deviations are linear in the curve at the eighteen levels, so their covariance with a reading is
	// known before the reading is taken.
	slopes := deviationSlopes(at, lum)
	cov := c.mixture.covariance(xs)
	n := len(at)
	var toCandidates mat.Dense
	toCandidates.Mul(slopes, block(cov, 0, n, n, len(xs)))
	var own, half mat.Dense
	half.Mul(slopes, block(cov, 0, n, 0, n))
	own.Mul(&half, slopes.T())
	between := mat.NewSymDense(len(levels), nil)
	for i := range levels {
		for j := i; j < len(levels); j++ {
			between.SetSym(i, j, cov.At(n+i, n+j))
		}
	}
	steps := n - 1
	variance := make([]float64, steps)
	for i := range variance {
		variance[i] = own.At(i, i)
	}
	var out []int
	for range batch {
		best, least := 0, math.Inf(1)
		for k := range levels {
			total := between.At(k, k) + noise[k]
			left := 0.
			for i := range steps {
				left += sq(variance[i] - sq(toCandidates.At(i, k))/total)
			}
			if left < least {
				best, least = k, left
			}
		}
		out = append(out, levels[best])
		total := between.At(best, best) + noise[best]
		column := make([]float64, len(levels))
		for k := range levels {
			column[k] = between.At(best, k)
		}
		for i := range steps {
			g := toCandidates.At(i, best)
			variance[i] -= g * g / total
			for k := range levels {
				toCandidates.Set(i, k, toCandidates.At(i, k)-g*column[k]/total)
			}
		}
		between.SymRankOne(between, -1/total, mat.NewVecDense(len(levels), column))
	}
	sort.Ints(out)
	return out
}

func block(m *mat.SymDense, i, k, j, l int) *mat.Dense {
	out := mat.NewDense(k-i, l-j, nil)
	for a := i; a < k; a++ {
		for b := j; b < l; b++ {
			out.Set(a-i, b-j, m.At(a, b))
		}
	}
	return out
}
