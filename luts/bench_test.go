package luts

import (
	"fmt"
	"math/rand/v2"
	"runtime"
	"sync"
	"testing"
)

// The picture of the figures of speed: 4096 x 3328 pixels of 12 bits with a texture that reaches all levels.
const benchWidth, benchHeight = 4096, 3328

func texture(width, height int) Plane[uint16] {
	p := NewPlane[uint16](width, height)
	r := rand.New(rand.NewPCG(1, 2))
	for y := range height {
		row := p.row(y)
		for x := range row {
			row[x] = uint16((x+y)*3500/(width+height) + r.IntN(500))
		}
	}
	return p
}

func benchTable(b *testing.B, out int) Table {
	b.Helper()
	m, err := Chain{Stored: Stored{Bits: 12}, VOI: Windowing{Center: 2048, Width: 4096}, OutBits: out}.Compose()
	if err != nil {
		b.Fatal(err)
	}
	return m.Table()
}

// manyTextures are sources that together are larger than the caches, as pictures are that were just read.
func manyTextures() [6]Plane[uint16] {
	var planes [6]Plane[uint16]
	planes[0] = texture(benchWidth, benchHeight)
	for i := range planes[1:] {
		planes[i+1] = NewPlane[uint16](benchWidth, benchHeight)
		copy(planes[i+1].Pix, planes[0].Pix)
	}
	return planes
}

// BenchmarkCopy is what BenchmarkApply is measured against: the source plane copied on all processors.
func BenchmarkCopy(b *testing.B) {
	many, dst := manyTextures(), NewPlane[uint16](benchWidth, benchHeight)
	n := runtime.GOMAXPROCS(0)
	for _, planes := range []int{len(many), 1} {
		b.Run(fmt.Sprintf("pictures=%d", planes), func(b *testing.B) {
			b.SetBytes(int64(2 * len(dst.Pix)))
			b.ReportAllocs()
			for k := 0; b.Loop(); k++ {
				src := many[k%planes].Pix
				var wait sync.WaitGroup
				for i := range n {
					from, to := len(src)*i/n, len(src)*(i+1)/n
					wait.Go(func() { copy(dst.Pix[from:to], src[from:to]) })
				}
				wait.Wait()
			}
		})
	}
}

func benchmarkApply[D Sample](b *testing.B, out int) {
	many, dst := manyTextures(), NewPlane[D](benchWidth, benchHeight)
	a, err := NewApplier[uint16, D](benchTable(b, out))
	if err != nil {
		b.Fatal(err)
	}
	for _, planes := range []int{len(many), 1} {
		b.Run(fmt.Sprintf("pictures=%d", planes), func(b *testing.B) {
			b.SetBytes(int64(2 * len(dst.Pix)))
			b.ReportAllocs()
			for k := 0; b.Loop(); k++ {
				if err := a.Apply(dst, many[k%planes]); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkApply16To8(b *testing.B) { benchmarkApply[uint8](b, 8) }

func BenchmarkApply16To16(b *testing.B) { benchmarkApply[uint16](b, 10) }

func benchmarkScale(b *testing.B, how Sampling) {
	src, dst := texture(benchWidth, benchHeight), NewPlane[uint8](1600, 1200)
	a, err := NewApplier[uint16, uint8](benchTable(b, 8))
	if err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	for b.Loop() {
		if err := a.Scale(dst, src, how); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkScaleNearest(b *testing.B) { benchmarkScale(b, Nearest) }

func BenchmarkScaleArea(b *testing.B) { benchmarkScale(b, Area) }

// BenchmarkWindowDrag is what one step of a window that is dragged costs besides the pixels.
func BenchmarkWindowDrag(b *testing.B) {
	a, err := NewApplier[uint16, uint8](benchTable(b, 8))
	if err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	for b.Loop() {
		m, err := Chain{Stored: Stored{Bits: 16, Signed: true}, Modality: Rescale{1, -1024}, VOI: Windowing{Sigmoid, 40, 400}, OutBits: 8}.Compose()
		if err != nil {
			b.Fatal(err)
		}
		if err := a.Load(m.Table()); err != nil {
			b.Fatal(err)
		}
	}
}
