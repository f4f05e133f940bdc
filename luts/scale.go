package luts

import (
	"fmt"
)

// Sampling is the rule by which Scale finds the value of a pixel.
type Sampling int

const (
	// Nearest takes the source pixel in which the middle of the output pixel lies; on a border the right
	// or lower one. Enlarged pixels become blocks.
	Nearest Sampling = iota

	// Area takes the mean of the stored values under the output pixel, each weighted by the area that is
	// covered, rounded to an integer, halves away from zero. The arithmetic is exact at any ratio. The table
	// is looked up after the mean, so a window that clips does not hide what reaches the mean.
	Area

	samplingNone // one source pixel each
)

// scaling is what Scale needs besides the planes, kept from call to call.
type scaling struct {
	nearest []int32 // source column per output column
	edges   []edge  // of the output columns, one more than there are
	bench   []bench // per worker
}

// edge is a border between output pixels along one axis, as a place in the source. With n source pixels over m
// output pixels the unit of length is 1/m of a source pixel: then source pixels are m long, output pixels n,
// and all is integer.
type edge struct {
	pixel int32 // the source pixel it lies in; n for the last edge
	part  int32 // how far into that pixel, 0 to m-1
}

// bench is what one worker computes on: sums of stored values counted from the least one. Sums that grow along
// a row are modulo 2^64; differences of them, which alone are used, are exact.
type bench struct {
	inner  []uint32 // per source column, over the source rows that are covered whole
	before []uint64 // per source column, over all that is covered left of it
	sums   []int64  // per output column, over the area it covers
}

// Scale draws src into dst through the table, stretched or shrunk along both axes to fit. dst must share no
// memory with src. Use [Plane.Sub] for a region. Large work is shared out to all processors; nothing is allocated once
// it has run on planes of that size.
func (a *Applier[S, D]) Scale(dst Plane[D], src Plane[S], how Sampling) error {
	if err := checkPlanes(dst, src); err != nil {
		return err
	}
	if dst.empty() {
		return nil
	}
	if src.empty() {
		return fmt.Errorf("source: %d x %d pixels; expected at least one; choose a larger region", src.Width, src.Height)
	}
	switch how {
	case Nearest:
		t := a.task(dst, src, how)
		t.nearest = grown(t.nearest, dst.Width)
		for x := range t.nearest {
			t.nearest[x] = int32(nearest(x, src.Width, dst.Width))
		}
		t.do(workersFor(t.samples()))
		a.release(t)
	case Area:
		t := a.task(dst, src, how)
		t.edges = grown(t.edges, dst.Width+1)
		for x := range t.edges {
			t.edges[x] = edgeAt(x, src.Width, dst.Width)
		}
		workers := workersFor(t.samples())
		t.bench = grown(t.bench, workers)
		for i := range t.bench {
			t.bench[i].fit(dst.Width, src.Width)
		}
		t.do(workers)
		a.release(t)
	default:
		return fmt.Errorf("sampling: %d; expected Nearest or Area; choose one", how)
	}
	return nil
}

// grown is s at length n, in the memory of s where it is large enough. What is in it stays.
func grown[T any](s []T, n int) []T {
	if n <= cap(s) {
		return s[:n]
	}
	return append(s[:cap(s)], make([]T, n-cap(s))...)
}

// nearest is the source pixel of n that holds the middle of output pixel x of m.
func nearest(x, n, m int) int { return int((2*int64(x) + 1) * int64(n) / (2 * int64(m))) }

// edgeAt is the edge before output pixel x of m, over n source pixels.
func edgeAt(x, n, m int) edge {
	at := int64(x) * int64(n)
	return edge{int32(at / int64(m)), int32(at % int64(m))}
}

func (t *task[S, D]) nearestRows(from, to int) {
	for y := from; y < to; y++ {
		src := t.src.row(nearest(y, t.src.Height, t.dst.Height))
		dst := t.dst.row(y)
		for x, at := range t.nearest[:len(dst)] {
			dst[x] = t.table[uint16(src[at])]
		}
	}
}

func (b *bench) fit(dstWidth, srcWidth int) {
	b.inner = grown(b.inner, srcWidth)
	b.before = grown(b.before, srcWidth+2)
	b.sums = grown(b.sums, dstWidth)
}

func (t *task[S, D]) areaRows(b *bench, from, to int) {
	n, m := t.src.Height, t.dst.Height
	for y := from; y < to; y++ {
		top, bottom := edgeAt(y, n, m), edgeAt(y+1, n, m)
		first, last := int(top.pixel), int(bottom.pixel)
		firstPart, lastPart := m-int(top.part), int(bottom.part)
		if first == last {
			firstPart, lastPart = n, 0
		}
		t.sumWhole(b.inner, first+1, last)
		lastRow := t.src.row(min(last, n-1)) // the bottom edge of all lies below it, with a part of 0
		t.sumBefore(b.before, b.inner, t.src.row(first), lastRow, uint64(firstPart), uint64(lastPart))
		sumBetween(b.sums, b.before, t.edges)
		t.meanRow(t.dst.row(y), b.sums)
	}
}

// sumWhole sums the columns of the source rows before to, which may be none, in twos to spare the sums.
func (t *task[S, D]) sumWhole(sums []uint32, from, to int) {
	mask, flip := t.mask, t.flip
	y := from
	switch {
	case y >= to:
		clear(sums)
	case (to-y)%2 == 1:
		for x, s := range t.src.row(y)[:len(sums)] {
			sums[x] = uint32(uint16(s)&mask ^ flip)
		}
		y++
	default:
		below := t.src.row(y + 1)[:len(sums)]
		for x, s := range t.src.row(y)[:len(sums)] {
			sums[x] = uint32(uint16(s)&mask^flip) + uint32(uint16(below[x])&mask^flip)
		}
		y += 2
	}
	for ; y < to; y += 2 {
		below := t.src.row(y + 1)[:len(sums)]
		for x, s := range t.src.row(y)[:len(sums)] {
			sums[x] += uint32(uint16(s)&mask^flip) + uint32(uint16(below[x])&mask^flip)
		}
	}
}

// sumBefore fills before, two longer than the row, with the sums left of each column. Rows covered whole count
// with the height of a source pixel, the first and the last with the part that is covered.
func (t *task[S, D]) sumBefore(before []uint64, inner []uint32, first, last []S, firstPart, lastPart uint64) {
	mask, flip, whole := t.mask, t.flip, uint64(t.dst.Height)
	n := len(inner)
	first, last, before = first[:n], last[:n], before[:n+2]
	sum := uint64(0)
	for x, s := range inner {
		before[x] = sum
		sum += whole*uint64(s) + firstPart*uint64(uint16(first[x])&mask^flip) + lastPart*uint64(uint16(last[x])&mask^flip)
	}
	// The last edge lies at the start of a pixel that is not there.
	before[n], before[n+1] = sum, sum
}

// sumBetween fills sums with what lies between the edges.
func sumBetween(sums []int64, before []uint64, edges []edge) {
	m := uint64(len(sums))
	left := uint64(0)
	for x, e := range edges[1 : len(sums)+1] {
		start, end := before[e.pixel], before[e.pixel+1]
		right := m*start + uint64(e.part)*(end-start)
		sums[x] = int64(right - left)
		left = right
	}
}

// meanRow turns sums over output pixels into means and looks them up.
func (t *task[S, D]) meanRow(dst []D, sums []int64) {
	area := int64(t.src.Width) * int64(t.src.Height) // of an output pixel, in units of both axes
	perArea := 1 / float64(2*area)
	zero := int64(t.flip) * area // the sum of a mean of 0
	for x, sum := range sums[:len(dst)] {
		twice := 2*sum + area
		if sum < zero {
			twice-- // a half below 0 goes down
		}
		// The estimate is at most one off, as the quotient is below 2^16.
		mean := int64(float64(twice) * perArea)
		if rest := twice - 2*area*mean; rest < 0 {
			mean--
		} else if rest >= 2*area {
			mean++
		}
		dst[x] = t.table[uint16(mean)^t.flip]
	}
}
