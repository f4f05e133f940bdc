package gsdf

import (
	"math"
	"testing"

	"evenstep/display/photometry"
)

// spread is a set of luminances over the whole range in an order that jumps, so that neither the
// pieces nor the branches of a benchmark are always the same.
func spread() []photometry.CdM2 {
	const n = 1024
	from, to := math.Log(float64(MinLuminance())), math.Log(float64(MaxLuminance()))
	ls := make([]photometry.CdM2, n)
	for i := range ls {
		ls[i] = photometry.CdM2(math.Exp(from + (to-from)*(float64(i*389%n)+0.5)/n))
	}
	return ls
}

func BenchmarkIndex(b *testing.B) {
	ls := spread()
	_, _ = Index(ls[0])
	b.ReportAllocs()
	var sum JND
	i := 0
	for b.Loop() {
		j, err := Index(ls[i&(len(ls)-1)])
		if err != nil {
			b.Fatal(err)
		}
		sum += j
		i++
	}
	if sum == 0 {
		b.Fatal("no index was found")
	}
}

// BenchmarkPolynomial is the measure for BenchmarkIndex: the inverse printed in PS3.14 section 7.1.
func BenchmarkPolynomial(b *testing.B) {
	ls := spread()
	b.ReportAllocs()
	var sum float64
	i := 0
	for b.Loop() {
		sum += polynomial(float64(ls[i&(len(ls)-1)]))
		i++
	}
	if sum == 0 {
		b.Fatal("no index was found")
	}
}

func BenchmarkLuminance(b *testing.B) {
	var sum photometry.CdM2
	i := 0
	for b.Loop() {
		l, err := Luminance(First + JND(i%1022) + 0.5)
		if err != nil {
			b.Fatal(err)
		}
		sum += l
		i++
	}
	if sum == 0 {
		b.Fatal("no luminance was found")
	}
}

// BenchmarkBuild is what the first call of Index costs more than the others.
func BenchmarkBuild(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		if inv := newInverse(); len(inv.pieces) == 0 {
			b.Fatal("no pieces were built")
		}
	}
}
