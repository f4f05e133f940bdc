package response

import (
	"fmt"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"
)

// AnnexC holds the metrics that PS3.14 Annex C offers. The standard sets no limit on them.
type AnnexC struct {
	Intervals []float64 // N: JNDs per luminance interval, scaled to the mean step where steps are unequal
	Mean      float64
	LUM       float64 // sample standard deviation of Intervals about their mean (divisor n-1)
	FitOrder  int     // highest order, 0 to 3, whose coefficient improves the fit by the partial F test at 5 %
	FitP      float64 // p of that test; with order 0, the smallest p of the three
}

// fitLevel is the significance level of FIT. PS3.14 leaves the test open; 5 % and the partial F
// test are the customary choice.
const fitLevel = 0.05

// AnnexC computes FIT and LUM of PS3.14 section C.2. The JNDs of an interval are those of the
// standard function times the contrast of the interval over that of the standard. The reason is not
// empty where there are too few intervals.
func (r *Response) AnnexC() (m AnnexC, reason string) {
	if len(r.Steps) == 0 {
		return m, r.Undefined
	}
	last := len(r.Steps)
	mean := float64(r.Steps[last-1].JNDTo-r.Steps[0].JNDFrom) / float64(last)
	x := make([]float64, last)
	meanLevels := float64(r.Points[last].Level-r.Points[0].Level) / float64(last)
	m.Intervals = make([]float64, last)
	for i, s := range r.Steps {
		m.Intervals[i] = mean * (1 + s.Deviation)
		// The index of the interval where steps are equal; its place on the same scale where not.
		middle := float64(s.FromLevel+s.ToLevel) / 2
		x[i] = (middle-float64(r.Points[0].Level))/meanLevels + 0.5
	}
	return fitAnnexC(x, m.Intervals)
}

// fitAnnexC is FIT and LUM of the intervals n at abscissae x.
func fitAnnexC(x, n []float64) (m AnnexC, reason string) {
	const least = 5 // a cubic leaves one degree of freedom
	m.Intervals = n
	if len(n) < least {
		return m, fmt.Sprintf("%d intervals; expected at least %d to test up to the third order", len(n), least)
	}
	m.Mean, m.LUM = stat.MeanStdDev(n, nil)
	m.FitP = 1
	var rss [4]float64
	for order := range rss {
		rss[order] = residual(x, n, order)
	}
	found := false
	for order := 1; order <= 3; order++ {
		free := float64(len(n) - order - 1)
		p := 1.0
		if rss[order] > 0 {
			f := (rss[order-1] - rss[order]) / (rss[order] / free)
			p = distuv.F{D1: 1, D2: free}.Survival(max(f, 0))
		} else if rss[order-1] > 0 {
			p = 0
		}
		switch {
		case p < fitLevel:
			m.FitOrder, m.FitP, found = order, p, true
		case !found:
			m.FitP = min(m.FitP, p)
		}
	}
	return m, ""
}

// residual is the sum of squares left by the least-squares polynomial of the given order.
func residual(x, y []float64, order int) float64 {
	coef := polyfit(x, y, order)
	lo, hi := x[0], x[len(x)-1]
	sum := 0.0
	for i := range x {
		t, v := scale(x[i], lo, hi), 0.0
		for k := order; k >= 0; k-- {
			v = v*t + coef[k]
		}
		sum += (y[i] - v) * (y[i] - v)
	}
	if total := stat.Variance(y, nil) * float64(len(y)-1); sum < 1e-24*max(total, 1e-12) {
		return 0 // rounding, not a residual
	}
	return sum
}

func scale(x, lo, hi float64) float64 { return (2*x - lo - hi) / (hi - lo) }

// polyfit gives the coefficients in powers of x scaled to [-1, 1], where the normal matrix is well conditioned.
func polyfit(x, y []float64, order int) []float64 {
	lo, hi := x[0], x[len(x)-1]
	a := mat.NewDense(len(x), order+1, nil)
	for i := range x {
		t, v := scale(x[i], lo, hi), 1.0
		for k := 0; k <= order; k++ {
			a.Set(i, k, v)
			v *= t
		}
	}
	var qr mat.QR
	qr.Factorize(a)
	var c mat.VecDense
	if err := qr.SolveVecTo(&c, false, mat.NewVecDense(len(y), y)); err != nil {
		coef := make([]float64, order+1)
		coef[0] = stat.Mean(y, nil) // singular: fewer places than coefficients; the mean is the best that is left
		return coef
	}
	return append([]float64(nil), c.RawVector().Data...)
}
