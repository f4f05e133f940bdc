package dicom

import (
	"fmt"
	"reflect"
	"slices"
	"strings"
	"testing"
)

func mustStages(t *testing.T, m *Image, i int) Stages {
	t.Helper()
	s, err := m.Stages(i)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// Windows by PS3.3 C.11.2: alternatives, fractional values, explanations, functions.
func TestStagesWindows(t *testing.T) {
	base, _ := plain()
	many := strings.TrimSuffix(strings.Repeat(`1\`, 300), `\`)
	for _, q := range []struct {
		name    string
		over    parts
		want    []Window
		fn      string
		notices []string
	}{
		{"none", nil, nil, "LINEAR", nil},
		{
			"several, with texts",
			parts{tagWindowCenter: {"DS", `40\ -600.5 `}, tagWindowWidth: {"DS", `400\1.5E3`}, tagWindowText: {"LO", `SOFT\LUNG`}, tagVOIFunction: {"CS", "SIGMOID"}},
			[]Window{{40, 400, "SOFT"}, {-600.5, 1500, "LUNG"}},
			"SIGMOID", nil,
		},
		{
			"fewer texts",
			parts{tagWindowCenter: {"DS", `1\2`}, tagWindowWidth: {"DS", `3\4`}, tagWindowText: {"LO", `A`}, tagVOIFunction: {"CS", "LINEAR_EXACT"}},
			[]Window{{1, 3, "A"}, {2, 4, ""}},
			"LINEAR_EXACT", nil,
		},
		{
			"pairs only",
			parts{tagWindowCenter: {"DS", `1\2`}, tagWindowWidth: {"DS", `3`}},
			[]Window{{1, 3, ""}},
			"LINEAR",
			[]string{"2 centers and 1 width"},
		},
		{
			"unusable",
			parts{tagWindowCenter: {"DS", `1\x\3\1e999\5`}, tagWindowWidth: {"DS", `0\1\-5\7\0x1p4`}},
			nil, "LINEAR",
			[]string{"window 1", "window 2", "window 3", "window 4", "window 5"},
		},
		{
			"function unknown",
			parts{tagWindowCenter: {"DS", `1`}, tagWindowWidth: {"DS", `3`}, tagVOIFunction: {"CS", "CUBIC"}},
			[]Window{{1, 3, ""}},
			"LINEAR",
			[]string{"none of the standard's"},
		},
		{
			"too many",
			parts{tagWindowCenter: {"DS", many}, tagWindowWidth: {"DS", many}},
			slices.Repeat([]Window{{1, 1, ""}}, maxWindows), "LINEAR",
			[]string{"more than 256 windows"},
		},
	} {
		t.Run(q.name, func(t *testing.T) {
			m := mustRead(t, filed(explicitLittleUID, base.with(q.over)))
			s := mustStages(t, m, 0)
			if !reflect.DeepEqual(s.Windows, q.want) || s.Function != q.fn {
				t.Errorf("%v %s; expected %v %s", s.Windows, s.Function, q.want, q.fn)
			}
			if !slices.EqualFunc(s.Notices, q.notices, strings.Contains) || !slices.Equal(m.Notices, s.Notices) {
				t.Errorf("notices %q, %q; expected %q", s.Notices, m.Notices, q.notices)
			}
		})
	}
}

// Texts by PS3.5 6.1.2 and PS3.3 C.12.1.1.2.
func TestStagesTexts(t *testing.T) {
	base, _ := plain()
	for _, q := range []struct{ charset, in, want string }{
		{"", "plain", "plain"},
		{"ISO_IR 100", "gepr\xfcft", "geprüft"},
		{"ISO_IR 192", "geprüft", "geprüft"},
		{"ISO_IR 144", "\xb0\xb1c", "\uFFFD\uFFFDc"},
		{"", "a\x1bb\nc", "a b c"},
		{"", strings.Repeat("long ", 20), strings.Repeat("long ", 12) + "long"},
	} {
		m := mustRead(t, filed(explicitLittleUID, base.with(parts{
			tagCharacterSet: {"CS", q.charset}, tagWindowCenter: {"DS", "1"}, tagWindowWidth: {"DS", "2"}, tagWindowText: {"LO", q.in},
		})))
		if got := mustStages(t, m, 0).Windows[0].Explanation; got != q.want {
			t.Errorf("%q by %s: %q; expected %q", q.in, q.charset, got, q.want)
		}
	}
}

// Tables by PS3.3 C.11.1.1 and C.11.2.1.1. Whether the first input is signed comes from the file where it
// says so, else from Pixel Representation (modality LUT) or from the range of the modality stage's output.
func TestStagesTables(t *testing.T) {
	base, _ := plain()
	table := func(vr string, descriptor, data []uint16, bits ...byte) []parts {
		p := parts{tagLUTDescriptor: {vr, descriptor}, tagLUTData: {"OW", data}}
		if bits != nil {
			p[tagLUTData] = part{"OW", bits}
		}
		return []parts{p}
	}
	signed := parts{tagRepresentation: {"US", []uint16{1}}}
	rescaled := parts{tagSlope: {"DS", "1"}, tagIntercept: {"DS", "-1024"}}
	const implicit, big = "1.2.840.10008.1.2", "1.2.840.10008.1.2.2"
	full := make([]uint16, 1<<16)
	for i := range full {
		full[i] = uint16(i)
	}
	for _, q := range []struct {
		name, uid string
		over      parts
		sequence  tag
		items     []parts
		want      LUT
	}{
		{"explicit unsigned", explicitLittleUID, signed, tagVOILUT, table("US", []uint16{2, 0xFFF0, 16}, []uint16{1, 2}), LUT{0xFFF0, 16, []uint16{1, 2}, ""}},
		{"explicit signed", explicitLittleUID, nil, tagVOILUT, table("SS", []uint16{2, 0xFFF0, 16}, []uint16{1, 2}), LUT{-16, 16, []uint16{1, 2}, ""}},
		{"implicit, unsigned image", implicit, nil, tagVOILUT, table("US", []uint16{2, 0xFFF0, 12}, []uint16{1, 2}), LUT{0xFFF0, 12, []uint16{1, 2}, ""}},
		{"implicit, signed image", implicit, signed, tagVOILUT, table("US", []uint16{2, 0xFFF0, 12}, []uint16{1, 2}), LUT{-16, 12, []uint16{1, 2}, ""}},
		{"implicit, rescaled below 0", implicit, rescaled, tagVOILUT, table("US", []uint16{2, 0xFFF0, 12}, []uint16{1, 2}), LUT{-16, 12, []uint16{1, 2}, ""}},
		{"implicit, behind a modality LUT", implicit, signed.with(parts{tagModalityLUT: {"SQ", table("US", []uint16{1, 0, 16}, []uint16{1})}}), tagVOILUT, table("US", []uint16{2, 0xFFF0, 12}, []uint16{1, 2}), LUT{0xFFF0, 12, []uint16{1, 2}, ""}},
		{"implicit modality, signed image", implicit, signed, tagModalityLUT, table("US", []uint16{2, 0xFFF0, 12}, []uint16{1, 2}), LUT{-16, 12, []uint16{1, 2}, ""}},
		{"implicit modality, unsigned image", implicit, nil, tagModalityLUT, table("US", []uint16{2, 0xFFF0, 12}, []uint16{1, 2}), LUT{0xFFF0, 12, []uint16{1, 2}, ""}},
		{"0 means 65536", explicitLittleUID, nil, tagVOILUT, table("US", []uint16{0, 0, 16}, full), LUT{0, 16, full, ""}},
		{"40000 entries in SS", explicitLittleUID, nil, tagVOILUT, table("SS", []uint16{40000, 0x8000, 16}, full[:40000]), LUT{-32768, 16, full[:40000], ""}},
		{"8 bits, a word each", explicitLittleUID, nil, tagVOILUT, table("US", []uint16{3, 0, 8}, []uint16{7, 8, 9}), LUT{0, 8, []uint16{7, 8, 9}, ""}},
		{"8 bits, packed", explicitLittleUID, nil, tagVOILUT, table("US", []uint16{3, 0, 8}, nil, 7, 8, 9, 0), LUT{0, 8, []uint16{7, 8, 9}, ""}},
		{"8 bits, packed, big endian", big, nil, tagVOILUT, table("US", []uint16{3, 0, 8}, nil, 8, 7, 0, 9), LUT{0, 8, []uint16{7, 8, 9}, ""}},
		{"above its bits", explicitLittleUID, nil, tagVOILUT, table("US", []uint16{2, 0, 10}, []uint16{1023, 1024}), LUT{0, 10, []uint16{1023, 1023}, ""}},
	} {
		t.Run(q.name, func(t *testing.T) {
			p := base.with(q.over).with(parts{q.sequence: {"SQ", q.items}})
			s := mustStages(t, mustRead(t, filed(q.uid, p)), 0)
			var got LUT
			if q.sequence == tagModalityLUT {
				got = *s.ModalityLUT
			} else {
				got = s.VOILUTs[0]
			}
			if !reflect.DeepEqual(got, q.want) {
				t.Errorf("%d %d %v; expected %d %d %v", got.First, got.Bits, got.Entries[:2], q.want.First, q.want.Bits, q.want.Entries[:2])
			}
			if wanted := strings.HasPrefix(q.name, "above"); wanted != (len(s.Notices) == 1) {
				t.Errorf("notices %q", s.Notices)
			}
		})
	}
}

func TestStagesModality(t *testing.T) {
	base, _ := plain()
	lut := part{"SQ", []parts{{
		tagLUTDescriptor: {"US", []uint16{2, 5, 16}}, tagModalityLUTType: {"LO", "OD"}, tagLUTData: {"US", []uint16{9, 8}},
	}, {}}}
	s := mustStages(t, mustRead(t, filed(explicitLittleUID, base.with(parts{tagModalityLUT: lut}))), 0)
	if s.Unit != "OD" || s.ModalityLUT == nil || s.ModalityLUT.First != 5 || len(s.Notices) != 0 {
		t.Errorf("%+v; expected a table in OD from 5", s)
	}
	rescale := parts{tagSlope: {"DS", "0.684"}, tagIntercept: {"DS", "200"}, tagRescaleType: {"LO", "US"}}
	s = mustStages(t, mustRead(t, filed(explicitLittleUID, base.with(rescale))), 0)
	if s.Unit != "US" || s.ModalityLUT != nil || s.Slope != 0.684 || s.Intercept != 200 {
		t.Errorf("%+v; expected 0.684 and 200 in US", s)
	}
	s = mustStages(t, mustRead(t, filed(explicitLittleUID, base.with(rescale).with(parts{tagModalityLUT: lut}))), 0)
	if s.ModalityLUT == nil || len(s.Notices) != 1 || !strings.Contains(s.Notices[0], "the LUT counts") {
		t.Errorf("%+v; expected the table, and a notice", s)
	}
	luts := make([]parts, maxWindows+3)
	for i := range luts {
		luts[i] = parts{tagLUTDescriptor: {"US", []uint16{1, 0, 16}}, tagLUTData: {"US", []uint16{uint16(i)}}}
	}
	s = mustStages(t, mustRead(t, filed(explicitLittleUID, base.with(parts{tagVOILUT: {"SQ", luts}}))), 0)
	if len(s.VOILUTs) != maxWindows || len(s.Notices) != 1 {
		t.Errorf("%d VOI LUTs, notices %q; expected %d and one", len(s.VOILUTs), s.Notices, maxWindows)
	}
}

// Functional groups (PS3.3 C.7.6.16): the frame's own before the shared ones before the data set's, the
// modality and the VOI stage each as a whole.
func TestStagesOfFrames(t *testing.T) {
	base, cells := plain()
	values := func(slope, intercept string) part {
		return part{"SQ", []parts{{tagSlope: {"DS", slope}, tagIntercept: {"DS", intercept}, tagRescaleType: {"LO", "HU"}}}}
	}
	window := func(c int) part {
		return part{"SQ", []parts{{tagWindowCenter: {"DS", fmt.Sprint(c)}, tagWindowWidth: {"DS", "10"}}}}
	}
	image := base.with(parts{
		tagFrames: {"IS", "3"}, tagPixels: {"OW", slices.Repeat(cells, 3)},
		tagWindowCenter: {"DS", "1"}, tagWindowWidth: {"DS", "5"}, tagWindowText: {"LO", "data set"},
		tagShared: {"SQ", []parts{{tagTransformation: values("2", "-1")}}},
		tagPerFrame: {"SQ", []parts{
			{},
			{tagFrameVOI: window(77), tagTransformation: {"SQ", []parts{}}, 0x00209113: {"SQ", []parts{{}}}},
			{tagTransformation: values("3", "0.5"), tagFrameVOI: window(88)},
		}},
	})
	want := []Stages{
		{Slope: 2, Intercept: -1, Unit: "HU", Windows: []Window{{1, 5, "data set"}}, Function: "LINEAR"},
		{Slope: 2, Intercept: -1, Unit: "HU", Windows: []Window{{77, 10, ""}}, Function: "LINEAR"},
		{Slope: 3, Intercept: 0.5, Unit: "HU", Windows: []Window{{88, 10, ""}}, Function: "LINEAR"},
	}
	for _, uid := range []string{explicitLittleUID, "1.2.840.10008.1.2", "1.2.840.10008.1.2.2", "1.2.840.10008.1.2.1.99"} {
		for _, open := range []bool{false, true} {
			m := mustRead(t, file(uid, builder{findTransfer(uid).syntax, open}.bytes(image)))
			for _, i := range []int{2, 0, 1} {
				if got := mustStages(t, m, i); !reflect.DeepEqual(got, want[i]) {
					t.Errorf("%s: frame %d %+v; expected %+v", uid, i, got, want[i])
				}
			}
		}
	}
}

// A sequence of unknown form (UN) is in implicit little endian whatever surrounds it (PS3.5 6.2.2).
func TestStagesUnknownForm(t *testing.T) {
	base, _ := plain()
	item := []parts{{tagLUTDescriptor: {"US", []uint16{2, 7, 16}}, tagLUTData: {"OW", []uint16{5, 6}}}}
	for _, q := range []struct {
		open bool
		uid  string
	}{{false, explicitLittleUID}, {true, explicitLittleUID}, {false, "1.2.840.10008.1.2.2"}} {
		inside := builder{syntax{}, q.open}
		body := inside.element(tagVOILUT, part{"SQ", item})[8:]
		outside := builder{syntax: findTransfer(q.uid).syntax}
		before := outside.bytes(base.with(parts{tagPixels: {}}))
		length := int64(len(body))
		if q.open {
			length = undefined
		}
		voi := append(append(outside.tag(tagVOILUT), "UN\x00\x00"...), outside.long(length)...)
		set := slices.Concat(before, voi, body, outside.bytes(parts{tagPixels: base[tagPixels]}))
		s := mustStages(t, mustRead(t, file(q.uid, set)), 0)
		if len(s.VOILUTs) != 1 || !slices.Equal(s.VOILUTs[0].Entries, []uint16{5, 6}) || s.VOILUTs[0].First != 7 {
			t.Errorf("%s, open %v: %+v; expected entries 5, 6 from 7", q.uid, q.open, s.VOILUTs)
		}
	}
}
