package luts

import (
	"fmt"
	"runtime"
	"sync"
	"sync/atomic"
)

// Applier carries planes of S samples through a table into planes of D samples. It holds the table spread
// over every possible sample, so that dirty high bits and signs cost nothing per pixel. Several goroutines
// may apply at once, but not while Load runs.
type Applier[S, D Sample] struct {
	table [1 << 16]D
	mask  uint16 // the bits of a sample that hold the stored value
	flip  uint16 // its sign bit, where there is one

	idle chan *task[S, D]
}

// NewApplier makes an applier of a table.
func NewApplier[S, D Sample](t Table) (*Applier[S, D], error) {
	a := &Applier[S, D]{idle: make(chan *task[S, D], 4)}
	if err := a.Load(t); err != nil {
		return nil, err
	}
	return a, nil
}

// Load takes another table without allocating. It refuses a table whose entries are deeper than D; then the
// table from before stays.
func (a *Applier[S, D]) Load(t Table) error {
	if err := t.Check(); err != nil {
		return err
	}
	if most := int(^D(0)); top(t.OutBits) > most {
		return fmt.Errorf("table: entries of %d bits; expected at most 8 for samples of one byte; use samples of two bytes", t.OutBits)
	}
	a.mask, a.flip = uint16(top(t.InBits)), 0
	if t.First < 0 {
		a.flip = 1 << (t.InBits - 1)
	}
	period := 1 << t.InBits
	for w := range period {
		a.table[w] = D(t.Entries[w^int(a.flip)])
	}
	for filled := period; filled < len(a.table); filled *= 2 {
		copy(a.table[filled:], a.table[:filled])
	}
	return nil
}

// Apply writes the output level of every pixel of src into dst, which must be of the same size and share no
// memory with it. Large planes are shared out to all processors; nothing is allocated once it has run.
func (a *Applier[S, D]) Apply(dst Plane[D], src Plane[S]) error {
	if err := checkPlanes(dst, src); err != nil {
		return err
	}
	if dst.Width != src.Width || dst.Height != src.Height {
		return fmt.Errorf("plane: %d x %d pixels for a source of %d x %d; expected the same size; scale the plane or correct the size",
			dst.Width, dst.Height, src.Width, src.Height)
	}
	if dst.empty() {
		return nil
	}
	t := a.task(dst, src, samplingNone)
	t.do(workersFor(t.samples()))
	a.release(t)
	return nil
}

func checkPlanes[S, D Sample](dst Plane[D], src Plane[S]) error {
	if err := src.check(); err != nil {
		return fmt.Errorf("source: %w", err)
	}
	if err := dst.check(); err != nil {
		return fmt.Errorf("output: %w", err)
	}
	return nil
}

// A band is what one goroutine takes at a time: small enough to even out what the processors do besides, large
// enough to hide the taking. In samples, of the source or the output, whichever has more.
const bandSamples = 1 << 16

// workersFor is how many goroutines share the work on so many samples.
func workersFor(samples int) int {
	return min(runtime.GOMAXPROCS(0), samples/bandSamples+1)
}

// task is one call at work. Tasks are kept for later calls, so that these allocate nothing.
type task[S, D Sample] struct {
	*Applier[S, D]
	dst Plane[D]
	src Plane[S]

	how      Sampling
	band     int // rows of dst in a band
	nextBand atomic.Int64
	worker   atomic.Int64
	wait     sync.WaitGroup
	work     func() // t.help, bound once

	scaling
}

func (a *Applier[S, D]) task(dst Plane[D], src Plane[S], how Sampling) *task[S, D] {
	var t *task[S, D]
	select {
	case t = <-a.idle:
	default:
		t = &task[S, D]{Applier: a}
		t.work = t.help
	}
	t.dst, t.src, t.how = dst, src, how
	return t
}

// release keeps the task, but not the pictures.
func (a *Applier[S, D]) release(t *task[S, D]) {
	t.dst, t.src = Plane[D]{}, Plane[S]{}
	select {
	case a.idle <- t:
	default:
	}
}

// samples is how much there is to do, at least 1.
func (t *task[S, D]) samples() int {
	if t.how == Nearest {
		return t.dst.Width * t.dst.Height
	}
	return max(t.dst.Width*t.dst.Height, t.src.Width*t.src.Height)
}

func (t *task[S, D]) do(workers int) {
	t.band = max(1, bandSamples*t.dst.Height/t.samples())
	t.nextBand.Store(0)
	t.worker.Store(0)
	t.wait.Add(workers)
	work := t.work // called through a variable, a goroutine needs no closure of its own
	for range workers - 1 {
		go work()
	}
	work()
	t.wait.Wait()
}

// help takes bands until there are none.
func (t *task[S, D]) help() {
	defer t.wait.Done()
	worker := int(t.worker.Add(1)) - 1
	for {
		from := (int(t.nextBand.Add(1)) - 1) * t.band
		if from >= t.dst.Height {
			return
		}
		to := min(from+t.band, t.dst.Height)
		switch t.how {
		case Nearest:
			t.nearestRows(from, to)
		case Area:
			t.areaRows(&t.bench[worker], from, to)
		default:
			t.applyRows(from, to)
		}
	}
}

func (t *task[S, D]) applyRows(from, to int) {
	for y := from; y < to; y++ {
		lookUp(t.dst.row(y), t.src.row(y), &t.table)
	}
}

// lookUp fills dst, which is as long as src.
//
// A loop of one pixel at a time is bound by its loads: of the source, of the table. Samples of two bytes are
// therefore loaded in pairs, which the compiler makes one load of, and the arrays need no check of bounds.
func lookUp[S, D Sample](dst []D, src []S, table *[1 << 16]D) {
	if wide := uint16(^S(0)) > 1<<8-1; wide {
		for len(src) >= 16 && len(dst) >= 16 {
			s, d := (*[16]S)(src), (*[16]D)(dst)
			a := uint32(s[0]) | uint32(s[1])<<16
			d[0], d[1] = table[uint16(a)], table[a>>16]
			b := uint32(s[2]) | uint32(s[3])<<16
			d[2], d[3] = table[uint16(b)], table[b>>16]
			c := uint32(s[4]) | uint32(s[5])<<16
			d[4], d[5] = table[uint16(c)], table[c>>16]
			e := uint32(s[6]) | uint32(s[7])<<16
			d[6], d[7] = table[uint16(e)], table[e>>16]
			f := uint32(s[8]) | uint32(s[9])<<16
			d[8], d[9] = table[uint16(f)], table[f>>16]
			g := uint32(s[10]) | uint32(s[11])<<16
			d[10], d[11] = table[uint16(g)], table[g>>16]
			h := uint32(s[12]) | uint32(s[13])<<16
			d[12], d[13] = table[uint16(h)], table[h>>16]
			i := uint32(s[14]) | uint32(s[15])<<16
			d[14], d[15] = table[uint16(i)], table[i>>16]
			src, dst = src[16:], dst[16:]
		}
	}
	dst = dst[:len(src)]
	for i, s := range src {
		dst[i] = table[uint16(s)]
	}
}
