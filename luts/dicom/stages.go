package dicom

import (
	"errors"
	"fmt"
	"maps"
	"math"
	"strings"
)

// Stages are the grayscale stages of a frame as its file states them (PS3.3 C.11.1, C.11.2). The
// presentation stage is Image.Inverse.
type Stages struct {
	// Modality stage: ModalityLUT where it is not nil, else Slope * stored value + Intercept.
	Slope, Intercept float64
	ModalityLUT      *LUT
	Unit             string // Rescale Type or Modality LUT Type: HU, OD, US; "" where not stated

	// VOI stage: alternatives, of which exactly one is applied; none at all means identity.
	Windows  []Window
	Function string // of the windows: LINEAR, LINEAR_EXACT or SIGMOID
	VOILUTs  []LUT

	Notices []string // what was left out or read around, a clause each
}

// Window is a window in units of the modality stage's output.
type Window struct {
	Center, Width float64 // Width is above 0
	Explanation   string
}

// LUT is a table: entry i belongs to the input First + i, inputs outside take the nearest end.
type LUT struct {
	First       int // -32768 to 65535
	Bits        int // of an entry, 8 to 16
	Entries     []uint16
	Explanation string
}

var errNoFrame = errors.New("no such frame")

func (m *Image) checkFrame(i int) error {
	if i < 0 || i >= m.Frames {
		return fmt.Errorf("%s: frame %d; expected 0 to %d; ask for a frame that the image has: %w", m.file, i, m.Frames-1, errNoFrame)
	}
	return nil
}

// Stages reads the stages of frame i, counted from 0. Images with functional groups (PS3.3 C.7.6.16) may
// differ from frame to frame, all others do not.
func (m *Image) Stages(i int) (Stages, error) {
	if err := m.checkFrame(i); err != nil {
		return Stages{}, err
	}
	return m.stages(newParser(m.place, m.r, m.size), i)
}

// readPerFrame remembers where each frame's functional groups are.
func (m *Image) readPerFrame(p *parser) error {
	e, ok := m.elements[tagPerFrame]
	if !ok {
		return nil
	}
	wrong := func(n string) error {
		return p.damaged(e.header, e.tag, "%s than frames; expected %s", n, plural(m.Frames, "item", "items"))
	}
	err := p.sequence(e, func(it item) error {
		if len(m.perFrame) == m.Frames {
			return wrong("more items")
		}
		m.perFrame = append(m.perFrame, it.off)
		return nil
	})
	if err == nil && len(m.perFrame) < m.Frames {
		err = wrong("fewer items")
	}
	return err
}

func isGroup(t tag) bool { return t == tagTransformation || t == tagFrameVOI }

func isModality(t tag) bool {
	switch t {
	case tagIntercept, tagSlope, tagRescaleType, tagModalityLUT:
		return true
	}
	return false
}

func isVOI(t tag) bool {
	switch t {
	case tagWindowCenter, tagWindowWidth, tagWindowText, tagVOIFunction, tagVOILUT:
		return true
	}
	return false
}

// stageElements gives the elements that hold for frame i: those of the data set, over them the shared
// functional groups, over them the frame's own.
func (m *Image) stageElements(p *parser, i int) (dataset, error) {
	d := maps.Clone(m.elements)
	lay := func(groups dataset) error {
		for t, e := range groups {
			stage := isModality
			if t == tagFrameVOI {
				stage = isVOI
			}
			inner, err := p.first(e, stage)
			if err != nil {
				return err
			}
			if inner != nil { // a stage is replaced as a whole
				maps.DeleteFunc(d, func(t tag, _ element) bool { return stage(t) })
				maps.Copy(d, inner)
			}
		}
		return nil
	}
	if e, ok := m.elements[tagShared]; ok {
		groups, err := p.first(e, isGroup)
		if err != nil {
			return nil, err
		}
		if err := lay(groups); err != nil {
			return nil, err
		}
	}
	if m.perFrame == nil {
		return d, nil
	}
	e := m.elements[tagPerFrame]
	if e.vr == "UN" {
		e.syntax = syntax{}
	}
	h, err := p.header(m.perFrame[i]-8, e.end, e.syntax)
	if err != nil {
		return nil, err
	}
	it := item{h.off, e.end, h.length == undefined, e.depth + 1, e.syntax}
	if !it.open {
		it.end = h.off + h.length
	}
	groups, err := p.collect(it, isGroup)
	if err != nil {
		return nil, err
	}
	return d, lay(groups)
}

func (m *Image) stages(p *parser, i int) (Stages, error) {
	d, err := m.stageElements(p, i)
	if err != nil {
		return Stages{}, err
	}
	s := Stages{Slope: 1}
	if err := m.readModality(p, d, &s); err != nil {
		return Stages{}, err
	}
	if err := m.readWindows(p, d, &s); err != nil {
		return Stages{}, err
	}
	err = m.readVOILUTs(p, d, &s)
	return s, err
}

func (s *Stages) notice(format string, args ...any) {
	s.Notices = append(s.Notices, fmt.Sprintf(format, args...))
}

func (m *Image) readModality(p *parser, d dataset, s *Stages) error {
	if e, ok := d[tagModalityLUT]; ok {
		err := p.sequence(e, func(it item) error {
			if s.ModalityLUT != nil {
				return nil
			}
			l, inner, err := m.readLUT(p, it, m.Signed, s)
			if err != nil {
				return err
			}
			s.ModalityLUT = &l
			s.Unit, err = p.word(inner, tagModalityLUTType)
			return err
		})
		if err != nil {
			return err
		}
	}
	_, rescale := d[tagSlope]
	if s.ModalityLUT != nil {
		if rescale {
			s.notice("Rescale Slope and a modality LUT are both stated; the LUT counts")
		}
		return nil
	}
	var err error
	if s.Slope, err = p.decimal(d, tagSlope, 1); err != nil {
		return err
	}
	if s.Slope == 0 {
		return p.damaged(d[tagSlope].header, tagSlope, "0; expected a number other than 0")
	}
	if s.Intercept, err = p.decimal(d, tagIntercept, 0); err != nil {
		return err
	}
	s.Unit, err = p.word(d, tagRescaleType)
	return err
}

func (m *Image) readWindows(p *parser, d dataset, s *Stages) error {
	var err error
	if s.Function, err = p.word(d, tagVOIFunction); err != nil {
		return err
	}
	switch s.Function {
	case "LINEAR", "LINEAR_EXACT", "SIGMOID":
	default:
		if _, ok := d[tagVOIFunction]; ok {
			s.notice("the VOI LUT Function is none of the standard's; LINEAR is taken")
		}
		s.Function = "LINEAR"
	}
	centers, err := p.decimals(d, tagWindowCenter)
	if err != nil {
		return err
	}
	widths, err := p.decimals(d, tagWindowWidth)
	if err != nil {
		return err
	}
	text, err := p.text(d, tagWindowText)
	if err != nil {
		return err
	}
	texts := strings.SplitN(text, `\`, maxWindows+1)
	if len(centers) != len(widths) {
		s.notice("%s and %s of windows; only pairs are kept", plural(len(centers), "center", "centers"), plural(len(widths), "width", "widths"))
	}
	n := min(len(centers), len(widths))
	if n > maxWindows {
		s.notice("more than %d windows; the rest is left out", maxWindows)
		n = maxWindows
	}
	for i := range n {
		w := Window{Center: centers[i], Width: widths[i]}
		if math.IsNaN(w.Center) || !(w.Width > 0) {
			s.notice("window %d has no usable center and width; it is left out", i+1)
			continue
		}
		if i < len(texts) {
			w.Explanation = phrase(texts[i], m.charset)
		}
		s.Windows = append(s.Windows, w)
	}
	return nil
}

func (m *Image) readVOILUTs(p *parser, d dataset, s *Stages) error {
	e, ok := d[tagVOILUT]
	if !ok {
		return nil
	}
	// Where the file does not say whether the first input is signed, the modality stage's output decides
	// (PS3.3 C.11.2.1.1): a LUT gives unsigned values, rescaling may give negative ones.
	low, high := 0.0, float64(int(1)<<m.BitsStored-1)
	if m.Signed {
		low, high = -float64(int(1)<<(m.BitsStored-1)), float64(int(1)<<(m.BitsStored-1)-1)
	}
	signed := s.ModalityLUT == nil && min(s.Slope*low, s.Slope*high)+s.Intercept < 0
	more := false
	err := p.sequence(e, func(it item) error {
		if more = len(s.VOILUTs) == maxWindows; more {
			return nil
		}
		l, _, err := m.readLUT(p, it, signed, s)
		if err == nil {
			s.VOILUTs = append(s.VOILUTs, l)
		}
		return err
	})
	if more {
		s.notice("more than %d VOI LUTs; the rest is left out", maxWindows)
	}
	return err
}

func isLUT(t tag) bool {
	switch t {
	case tagLUTDescriptor, tagLUTText, tagModalityLUTType, tagLUTData:
		return true
	}
	return false
}

// readLUT reads the LUT in an item; signed says how to take its first input where the file does not.
func (m *Image) readLUT(p *parser, it item, signed bool, s *Stages) (LUT, dataset, error) {
	d, err := p.collect(it, isLUT)
	if err != nil {
		return LUT{}, nil, err
	}
	v, err := p.uint16s(d, tagLUTDescriptor)
	if err != nil {
		return LUT{}, nil, err
	}
	e, ok := d[tagLUTData]
	if len(v) != 3 || !ok {
		return LUT{}, nil, p.damaged(it.off, tagLUTDescriptor, "a LUT without three descriptor values and data; expected both")
	}
	l := LUT{First: int(v[1]), Bits: int(v[2])}
	switch d[tagLUTDescriptor].vr {
	case "SS":
		signed = true
	case "US":
		signed = false
	}
	if signed {
		l.First = int(int16(v[1]))
	}
	n := int(v[0])
	if n == 0 {
		n = 1 << 16
	}
	if l.Bits < 8 || l.Bits > 16 {
		return LUT{}, nil, p.damaged(d[tagLUTDescriptor].header, tagLUTDescriptor, "entries of %d bits; expected 8 to 16", l.Bits)
	}
	if l.Entries, err = p.lutData(e, n, l.Bits); err != nil {
		return LUT{}, nil, err
	}
	over := false
	for i, x := range l.Entries {
		if int(x) >= 1<<l.Bits {
			l.Entries[i], over = uint16(1<<l.Bits-1), true
		}
	}
	if over {
		s.notice("a LUT has entries above its %d bits; they are taken for the largest", l.Bits)
	}
	text, err := p.text(d, tagLUTText)
	l.Explanation = phrase(text, m.charset)
	return l, d, err
}

// lutData reads n entries. Entries of 8 bits lie one to a word, or packed two to a word (PS3.3
// C.11.2.1.1): the length of the value tells.
func (p *parser) lutData(e element, n, bits int) ([]uint16, error) {
	packed := bits == 8 && e.length == int64(n+n%2) && n > 1
	need := 2 * n
	if packed {
		need = n + n%2
	}
	if e.length == undefined || e.length < int64(need) {
		return nil, p.damaged(e.header, e.tag, "too short a value; expected %d bytes for %s", need, plural(n, "entry", "entries"))
	}
	entries := make([]uint16, n)
	for done := 0; done < need; {
		b, err := p.bytes(e.off+int64(done), min(need-done, window))
		if err != nil {
			return nil, err
		}
		words := b
		for i := 0; i+1 < len(words); i += 2 {
			w, at := e.syntax.order().Uint16(words[i:]), (done+i)/2
			switch {
			case !packed:
				entries[at] = w
			default: // the first of a pair is in the low byte
				entries[2*at] = w & 0xFF
				if 2*at+1 < n {
					entries[2*at+1] = w >> 8
				}
			}
		}
		done += len(b)
	}
	return entries, nil
}
