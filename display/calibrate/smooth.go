package calibrate

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

// sample is one level of a series as the fit sees it.
type sample struct {
	x        float64 // share of the highest level, 0 to 1
	y        float64 // index of the luminance, in JND
	variance float64 // of y, in JND squared
}

// shape is one guess at how smooth a panel is: a Gaussian process of Matern kind over a warped level
// (Rasmussen and Williams 2006, chapter 4; from memory), laid over a trend.
type shape struct {
	bend   float64 // the warp log(1 + x/bend): the smaller, the more room the dark end gets
	rough  int     // twice the order of the Matern kernel: 3 follows kinks, 5 rounds them
	length float64 // over which the process keeps its value, in warped levels of 0 to 1
	size   float64 // standard deviation of the process, in JND
}

// shapes are the guesses that are laid over a plain trend. Their likelihoods decide between them.
var shapes = grid([]float64{0.03, 0.2, 2}, []int{3, 5}, []float64{0.1, 0.22, 0.5, 1.2}, []float64{1.5, 4, 12, 40, 130})

// footShapes are the guesses laid over a power law with a foot or in pieces: those explain the kinks already.
var footShapes = grid([]float64{0.2}, []int{5}, []float64{0.3, 0.7}, []float64{1.5, 4, 12})

func grid(bends []float64, roughs []int, lengths, sizes []float64) []shape {
	var out []shape
	for _, bend := range bends {
		for _, rough := range roughs {
			for _, length := range lengths {
				for _, size := range sizes {
					out = append(out, shape{bend, rough, length, size})
				}
			}
		}
	}
	return out
}

// warp gives the dark end more room: there a panel bends most.
func (s shape) warp(x float64) float64 { return math.Log1p(x/s.bend) / math.Log1p(1/s.bend) }

// kernel is the covariance of the process over a distance in warped levels.
func (s shape) kernel(d float64) float64 {
	d = math.Abs(d) / s.length
	if s.rough == 3 {
		d *= math.Sqrt(3)
		return s.size * s.size * (1 + d) * math.Exp(-d)
	}
	d *= math.Sqrt(5)
	return s.size * s.size * (1 + d + d*d/3) * math.Exp(-d)
}

// fitted is one shape over one trend, with what the samples say of it.
type fitted struct {
	shape
	trend  trend
	weight float64           // share of the likelihood
	logP   float64           // logarithm of the likelihood, but for a constant
	warped []float64         // places of the samples
	moves  [][]float64       // of the trend at the samples
	root   blas64.Triangular // of the samples' covariance, upper
	alpha  []float64         // covariance of the samples, inverted, times how far they lie above the trend
}

// observe fits a shape to samples that lie rest above the trend, at places where the trend moves by
// moves. It reports false where the numbers do not allow it.
func observe(s shape, t trend, samples []sample, rest []float64, moves [][]float64) (*fitted, bool) {
	n := len(samples)
	f := &fitted{shape: s, trend: t, moves: moves, warped: make([]float64, n)}
	for i, p := range samples {
		f.warped[i] = s.warp(p.x)
	}
	k := blas64.Symmetric{N: n, Stride: n, Data: make([]float64, n*n), Uplo: blas.Upper}
	for i := range n {
		for j := i; j < n; j++ {
			k.Data[i*n+j] = f.kernel(f.warped[i]-f.warped[j]) + dot(moves[i], moves[j])
		}
		k.Data[i*n+i] += samples[i].variance
	}
	var ok bool
	if f.root, ok = lapack64.Potrf(k); !ok {
		return nil, false
	}
	f.alpha = append([]float64(nil), rest...)
	lapack64.Potrs(f.root, blas64.General{Rows: n, Cols: 1, Stride: 1, Data: f.alpha})
	f.logP = -dot(rest, f.alpha) / 2
	for i := range n {
		f.logP -= math.Log(f.root.Data[i*n+i])
	}
	return f, !math.IsNaN(f.logP)
}

// cross is the covariance of the curve at x with each sample.
func (f *fitted) cross(x float64, moves, out []float64) {
	w := f.warp(x)
	for i, u := range f.warped {
		out[i] = f.kernel(w-u) + dot(moves, f.moves[i])
	}
}

// mean is the curve at the places of a trend, in JND.
func (f *fitted) mean(at placed) []float64 {
	out := make([]float64, len(at.xs))
	c := make([]float64, len(f.warped))
	for i, x := range at.xs {
		f.cross(x, at.moves[i], c)
		out[i] = at.values[i] + dot(c, f.alpha)
	}
	return out
}

// half is the part of the covariance that the samples took away, as a root: its rows belong to the places,
// and the products of two rows are what was taken.
func (f *fitted) half(at placed) blas64.General {
	n := len(f.warped)
	c := blas64.General{Rows: len(at.xs), Cols: n, Stride: n, Data: make([]float64, len(at.xs)*n)}
	for j, x := range at.xs {
		f.cross(x, at.moves[j], c.Data[j*n:(j+1)*n])
	}
	blas64.Trsm(blas.Right, blas.NoTrans, 1, f.root, c)
	return c
}

// spread is the variance of the curve at each place, in JND squared.
func (f *fitted) spread(at placed) []float64 {
	half := f.half(at)
	out := make([]float64, len(at.xs))
	for j := range out {
		row := half.Data[j*half.Stride : (j+1)*half.Stride]
		out[j] = max(0, f.size*f.size+dot(at.moves[j], at.moves[j])-dot(row, row))
	}
	return out
}

// covariance of the curve between the places, in JND squared.
func (f *fitted) covariance(at placed) *mat.SymDense {
	n := len(at.xs)
	out := mat.NewSymDense(n, nil)
	half := f.half(at)
	blas64.Syrk(blas.NoTrans, -1, half, 0, out.RawSymmetric())
	for i := range n {
		for j := i; j < n; j++ {
			v := f.kernel(f.warp(at.xs[i])-f.warp(at.xs[j])) + dot(at.moves[i], at.moves[j])
			out.SetSym(i, j, out.At(i, j)+v)
		}
	}
	return out
}

func dot(a, b []float64) float64 {
	s := 0.0
	for i, v := range a {
		s += v * b[i]
	}
	return s
}
