package calibrate

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"

	"evenstep/display/gsdf"
	"evenstep/display/photometry"
	"evenstep/display/response"
	"evenstep/luts"
)

// judged is the number of equal levels at which schemes judge contrast.
const judged = 18

// Path is what lies between a table and the panel. Each depth is a property of its own: a ramp of 16 bits
// on a link of 8 shows 256 grays. 0 is not stated, and then does not round anything.
type Path struct {
	RampBits int `json:"ramp_bits"` // depth of the entries of the graphics card's ramp
	LinkBits int `json:"link_bits"` // depth of the signal to the panel
}

// Step is one step of a table: from a P-value to the next.
type Step struct {
	FromPValue int     `json:"from_p_value"`
	JNDs       float64 `json:"jnds"`
}

// Deviation is a contrast deviation with its simultaneous 95 % interval, as fractions.
type Deviation struct {
	FromPValue int        `json:"from_p_value"`
	ToPValue   int        `json:"to_p_value"`
	Value      float64    `json:"value"`
	Interval   [2]float64 `json:"interval"`
}

// Depth is what a table would do at one depth of its entries.
type Depth struct {
	OutBits           int     `json:"out_bits"`
	GreatestDeviation float64 `json:"max_deviation"`
	Kept              int     `json:"gray_levels_kept"`
}

// Prediction is what a table will do on the monitor whose curve it was made of, in the same room light.
type Prediction struct {
	Path             Path            `json:"path"`
	InBits           int             `json:"in_bits"`
	OutBits          int             `json:"out_bits"`
	Levels           int             `json:"levels"` // at which contrast is predicted
	LuminanceMin     photometry.CdM2 `json:"luminance_min_cd_m2"`
	LuminanceMax     photometry.CdM2 `json:"luminance_max_cd_m2"`
	JNDMin           gsdf.JND        `json:"jnd_min"`
	JNDMax           gsdf.JND        `json:"jnd_max"`
	Steps            []Step          `json:"steps"` // every P-value but the last
	MeanJNDs         float64         `json:"jnds_per_step_mean"`
	SpreadJNDs       float64         `json:"jnds_per_step_standard_deviation"`
	Deviations       []Deviation     `json:"deviations"` // between equal levels, eighteen in all
	Greatest         float64         `json:"max_deviation"`
	GreatestInterval [2]float64      `json:"max_deviation_interval"`
	Kept             int             `json:"gray_levels_kept"` // different grays that come out
	Lost             int             `json:"gray_levels_lost"` // P-values that share a gray with a lower one
	Depths           []Depth         `json:"by_depth"`         // 8 and 10 bits out, on a path that does not round
	Room             RoomLight       `json:"room_light"`
	outs             []float64       // driving levels that arrive, as shares
	band             []float64       // standard deviation of each of Deviations
	curve            *Curve          // that it was predicted from
}

// Predict says what a table will do. The table must be a calibration table; its luminances must lie in the
// range of the standard function.
func (c *Curve) Predict(t luts.Table, path Path) (*Prediction, error) {
	if err := t.Check(); err != nil {
		return nil, err
	}
	if t.Kind != luts.Calibration || len(t.Entries) < judged {
		return nil, fmt.Errorf("table: kind %q, %d entries; expected a calibration table of %d or more; give the table that was made of the curve", t.Kind, len(t.Entries), judged)
	}
	for _, b := range []int{path.RampBits, path.LinkBits} {
		if b != 0 && (b < 6 || b > 16) {
			return nil, fmt.Errorf("path: %d bits; expected 6 to 16, or 0 where it is not known", b)
		}
	}
	p := &Prediction{Path: path, InBits: t.InBits, OutBits: t.OutBits, curve: c, outs: path.drives(t)}
	js := make([]float64, len(p.outs))
	for i, x := range p.outs {
		l := c.luminance(x)
		j, err := gsdf.Index(photometry.CdM2(l))
		if err != nil {
			return nil, fmt.Errorf("table: P-value %d: %w; state the ambient light, or aim for another range", i, err)
		}
		js[i] = float64(j)
	}
	last := len(js) - 1
	p.JNDMin, p.JNDMax = gsdf.JND(js[0]), gsdf.JND(js[last])
	p.LuminanceMin, p.LuminanceMax = photometry.CdM2(c.luminance(p.outs[0])), photometry.CdM2(c.luminance(p.outs[last]))
	if p.JNDMax-p.JNDMin < 1 {
		return nil, fmt.Errorf("table: its grays span %.2f JND on this curve; expected more than one; make the table of this monitor's curve", p.JNDMax-p.JNDMin)
	}
	p.Steps = make([]Step, last)
	sum, squares := 0., 0.
	for i := range p.Steps {
		d := js[i+1] - js[i]
		p.Steps[i] = Step{FromPValue: i, JNDs: d}
		sum, squares = sum+d, squares+d*d
	}
	p.MeanJNDs = sum / float64(last)
	p.SpreadJNDs = math.Sqrt(max(0, squares/float64(last)-sq(p.MeanJNDs)))
	p.Kept = distinct(p.outs)
	p.Lost = len(p.outs) - p.Kept
	p.contrast()
	p.Room = p.room()
	return p, p.depths(t)
}

// drives are the driving levels that arrive at the panel, as shares of the highest.
func (p Path) drives(t luts.Table) []float64 {
	top := float64(int(1)<<t.OutBits - 1)
	out := make([]float64, len(t.Entries))
	for i, e := range t.Entries {
		x := float64(e) / top
		for _, bits := range []int{p.RampBits, p.LinkBits} {
			if bits > 0 {
				steps := float64(int(1)<<bits - 1)
				x = math.Round(x*steps) / steps
			}
		}
		out[i] = x
	}
	return out
}

func distinct(xs []float64) int {
	n := 1
	for i := 1; i < len(xs); i++ {
		if xs[i] != xs[i-1] {
			n++
		}
	}
	return n
}

// eighteen are the P-values at which contrast is judged: equal steps, rounded where the depth has none.
func (p *Prediction) eighteen() []int {
	out := make([]int, judged)
	for i := range out {
		out[i] = int(math.Round(float64(i) * float64(len(p.outs)-1) / (judged - 1)))
	}
	return out
}

// contrast fills the deviations at eighteen levels, with intervals from what is known of the curve and, where
// Rd is assumed, from what it may be.
func (p *Prediction) contrast() {
	at := p.eighteen()
	xs := make([]float64, len(at))
	lum := make([]float64, len(at))
	for i, v := range at {
		xs[i] = p.outs[v]
		lum[i] = p.curve.luminance(xs[i])
	}
	d := deviations(at, lum)
	p.band = p.curve.deviationSpread(at, xs, lum)
	k := simultaneous(len(d))
	low, high := make([]float64, len(d)), make([]float64, len(d))
	least, most := 0., 0.
	cover := func(d []float64) {
		l, m := 0., 0.
		for i, v := range d {
			u := k * p.band[i]
			low[i], high[i] = min(low[i], v-u), max(high[i], v+u)
			l, m = max(l, math.Abs(v)-u), max(m, math.Abs(v)+u)
		}
		least, most = min(least, l), max(most, m)
	}
	for i, v := range d {
		low[i], high[i] = v, v
		p.Greatest = max(p.Greatest, math.Abs(v))
	}
	least = p.Greatest
	cover(d)
	for _, shift := range p.curve.ambientShifts() {
		moved := make([]float64, len(lum))
		for i, l := range lum {
			moved[i] = l + shift
		}
		if d := deviations(at, moved); d != nil {
			cover(d)
		}
	}
	p.GreatestInterval = [2]float64{least, most}
	p.Levels = len(at)
	for i, v := range d {
		p.Deviations = append(p.Deviations, Deviation{FromPValue: at[i], ToPValue: at[i+1], Value: v, Interval: [2]float64{low[i], high[i]}})
	}
}

// simultaneous is the factor by which a standard deviation is widened so that n intervals hold at once with
// 95 % (Sidak 1967).
func simultaneous(n int) float64 {
	return distuv.UnitNormal.Quantile((1 + math.Pow(0.95, 1/float64(n))) / 2)
}

// ambientShifts are the changes of the ambient luminance to the ends of what an assumed Rd may be, in cd/m2.
func (c *Curve) ambientShifts() []float64 {
	l := c.Light
	if !l.RdAssumed || l.Illuminance == nil || l.Ambient == nil {
		return nil
	}
	return []float64{
		float64(photometry.Reflected(*l.Illuminance, response.RdLow) - *l.Ambient),
		float64(photometry.Reflected(*l.Illuminance, response.RdHigh) - *l.Ambient),
	}
}

// deviations of the contrast between levels that should lie in equal steps of the index over their places:
// relative luminance step over the standard function's, less one (AAPM On-line Report 03 section 4.3.4;
// formula from memory). Nil where the ends are outside the function.
func deviations(places []int, lum []float64) []float64 {
	n := len(lum) - 1
	if !(lum[n] > lum[0]) || lum[0] < domainEnds.low || lum[n] > domainEnds.high {
		return nil
	}
	j1, jn := indexOf(lum[0]), indexOf(lum[n])
	span := float64(places[n] - places[0])
	aim := func(i int) float64 { return luminanceOf(j1 + (jn-j1)*float64(places[i]-places[0])/span) }
	out := make([]float64, n)
	before := lum[0]
	for i := range out {
		next := aim(i + 1)
		out[i] = (lum[i+1]-lum[i])/(lum[i+1]+lum[i])/((next-before)/(next+before)) - 1
		before = next
	}
	return out
}

// deviationSpread is the standard deviation of each deviation, from what is known of the curve.
func (c *Curve) deviationSpread(places []int, xs, lum []float64) []float64 {
	n := len(xs)
	out := make([]float64, n-1)
	if c.Exact {
		return out
	}
	slopes := deviationSlopes(places, lum)
	cov := c.mixture.covariance(xs)
	var half, full mat.Dense
	half.Mul(slopes, cov)
	full.Mul(&half, slopes.T())
	for i := range out {
		out[i] = math.Sqrt(max(0, full.At(i, i)))
	}
	return out
}

// deviationSlopes are the slopes of the deviations over the index of each level, per JND.
func deviationSlopes(places []int, lum []float64) *mat.Dense {
	n := len(lum)
	out := mat.NewDense(n-1, n, nil)
	const h = 1e-3 // JND; the function bends over tens of JND
	for k := range lum {
		shifted := func(by float64) []float64 {
			v := append([]float64(nil), lum...)
			v[k] = luminanceOf(indexOf(v[k]) + by)
			return v
		}
		// At the very ends of the function only one side can be had.
		up, down, width := deviations(places, shifted(h)), deviations(places, shifted(-h)), 2*h
		here := deviations(places, lum)
		if up == nil {
			up, width = here, h
		}
		if down == nil {
			down, width = here, h
		}
		for i := range n - 1 {
			out.Set(i, k, (up[i]-down[i])/width)
		}
	}
	return out
}

// depths predicts 8 and 10 bits out for the same range.
func (p *Prediction) depths(t luts.Table) error {
	min, max := p.LuminanceMin, p.LuminanceMax
	want, err := targets(min, max, len(t.Entries))
	if err != nil {
		return fmt.Errorf("table: %w", err)
	}
	c := p.curve
	for _, bits := range []int{8, 10} {
		entries := nearest(c.levels(bits), want, c.blackestOf(bits))
		q := &Prediction{curve: c, outs: Path{}.drives(luts.Table{OutBits: bits, Entries: entries})}
		at := q.eighteen()
		lum := make([]float64, len(at))
		for i, v := range at {
			lum[i] = c.luminance(q.outs[v])
		}
		d := Depth{OutBits: bits, Kept: distinct(q.outs)}
		for _, v := range deviations(at, lum) {
			d.GreatestDeviation = math.Max(d.GreatestDeviation, math.Abs(v))
		}
		p.Depths = append(p.Depths, d)
	}
	return nil
}
