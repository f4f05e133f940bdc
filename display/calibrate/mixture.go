package calibrate

import (
	"math"
	"sort"

	"gonum.org/v1/gonum/mat"
)

// mixture is the fits that explain the samples, each with its share of the likelihood. Taking all of them
// instead of the best one keeps in the band what the samples leave open about the panel's shape.
type mixture []*fitted

const (
	// negligible is the share of the likelihood under which a fit is left out.
	negligible = 0.004
	// kept is the number of fits that are kept at most.
	kept = 32
	// weighedBy is the number of samples that the fits are weighed by; of more, some are taken.
	weighedBy = 48
	// footShare is how likely a foot that ends in one given gap between levels is held to be beforehand, against none.
	footShare = 0.02
	// piecesShare is the same for a table of one given number of pieces in the panel.
	piecesShare = 0.02
	// fewPieces and manyPieces are the numbers of pieces that such a table may have. More are too close
	// together for a few dozen readings to tell apart from a smooth law.
	fewPieces, manyPieces = 6, 36
	// footsEnd is the level, as a share of the highest, up to which a foot may reach.
	footsEnd = 0.3
)

// smoothThrough weighs all shapes by the samples and keeps what counts. Samples are in rising order.
func smoothThrough(samples []sample) mixture {
	weigh := thinned(samples)
	m := explain(weigh).weighed()
	if len(samples) <= weighedBy {
		return m
	}
	var full mixture
	for _, f := range m {
		for _, g := range guesses(f.trend, []shape{f.shape}, samples, 1) {
			g.weight = f.weight
			full = append(full, g)
		}
	}
	return full.normalised()
}

// thinned are at most as many samples as the fits are weighed by.
func thinned(samples []sample) []sample {
	if len(samples) <= weighedBy {
		return samples
	}
	out := make([]sample, weighedBy)
	for i := range out {
		out[i] = samples[i*(len(samples)-1)/(weighedBy-1)]
	}
	return out
}

// explain fits all shapes to the samples.
func explain(weigh []sample) mixture {
	plain := plainLaw(weigh)
	m := guesses(newSlope(weigh), shapes, weigh, 1)
	m = append(m, guesses(plain, shapes, weigh, 1)...)
	for i := 2; i < len(weigh) && weigh[i-1].x < footsEnd; i++ {
		footed := plain.withFoot(weigh[i-1].x, weigh[i].x).settle(weigh)
		m = append(m, guesses(footed, footShapes, weigh, footShare)...)
	}
	for n := fewPieces; n <= manyPieces; n++ {
		m = append(m, guesses(plain.inPieces(n).settle(weigh), footShapes, weigh, piecesShare)...)
	}
	return m
}

// evidence is the logarithm of the likelihood of the samples over all fits, but for a constant.
func (m mixture) evidence() float64 {
	best := math.Inf(-1)
	for _, f := range m {
		best = max(best, f.logP)
	}
	sum := 0.0
	for _, f := range m {
		sum += math.Exp(f.logP - best)
	}
	return best + math.Log(sum)
}

// guesses fits shapes over one trend. The prior is the likelihood given beforehand, against a plain trend.
func guesses(t trend, shapes []shape, samples []sample, prior float64) mixture {
	at := t.place(places(samples))
	rest := make([]float64, len(samples))
	for i, p := range samples {
		rest[i] = p.y - at.values[i]
	}
	var m mixture
	for _, s := range shapes {
		if f, ok := observe(s, t, samples, rest, at.moves); ok {
			f.logP += math.Log(prior)
			m = append(m, f)
		}
	}
	return m
}

func (m mixture) weighed() mixture {
	best := math.Inf(-1)
	for _, f := range m {
		best = max(best, f.logP)
	}
	for _, f := range m {
		f.weight = math.Exp(f.logP - best)
	}
	sort.SliceStable(m, func(i, k int) bool { return m[i].weight > m[k].weight })
	m = m[:min(len(m), kept)].normalised()
	n := len(m)
	for n > 1 && m[n-1].weight < negligible {
		n--
	}
	return append(mixture(nil), m[:n]...).normalised()
}

func (m mixture) normalised() mixture {
	sum := 0.0
	for _, f := range m {
		sum += f.weight
	}
	for _, f := range m {
		f.weight /= sum
	}
	return m
}

// curve is the mean and the variance of the curve at the places xs, in JND and JND squared.
func (m mixture) curve(xs []float64) (mean, variance []float64) {
	mean, variance = make([]float64, len(xs)), make([]float64, len(xs))
	trends := map[trend]placed{}
	for _, f := range m {
		at, ok := trends[f.trend]
		if !ok {
			at = f.trend.place(xs)
			trends[f.trend] = at
		}
		s := f.spread(at)
		for i, v := range f.mean(at) {
			mean[i] += f.weight * v
			variance[i] += f.weight * (s[i] + v*v)
		}
	}
	for i, v := range mean {
		variance[i] = max(0, variance[i]-v*v)
	}
	return mean, variance
}

// covariance of the curve between the places xs, in JND squared: within the fits and between them.
func (m mixture) covariance(xs []float64) *mat.SymDense {
	n := len(xs)
	out := mat.NewSymDense(n, nil)
	mid := make([]float64, n)
	at := make([]placed, len(m))
	means := make([][]float64, len(m))
	for k, f := range m {
		at[k] = f.trend.place(xs)
		means[k] = f.mean(at[k])
		for i, v := range means[k] {
			mid[i] += f.weight * v
		}
	}
	for k, f := range m {
		c := f.covariance(at[k])
		for i := range n {
			for j := i; j < n; j++ {
				off := (means[k][i] - mid[i]) * (means[k][j] - mid[j])
				out.SetSym(i, j, out.At(i, j)+f.weight*(c.At(i, j)+off))
			}
		}
	}
	return out
}
