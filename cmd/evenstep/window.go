package main

import (
	"bufio"
	"bytes"
	"crypto/rand"
	"errors"
	"fmt"
	"image"
	"image/color"
	"image/png"
	"io"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"
	"golang.org/x/image/tiff"

	"evenstep/luts"
	"evenstep/luts/dicom"
)

// mappingFlags say how stored values become output levels.
type mappingFlags struct {
	storedBits, outBits      int
	signed, inverse, replace bool
	slope, intercept         float64
	center, width            float64
	function, through, out   string
	set                      func(string) bool
}

func (m *mappingFlags) add(c *cobra.Command) {
	f := c.Flags()
	f.IntVar(&m.storedBits, "stored-bits", 12, "depth of a stored value, `N` from 1 to 16")
	f.BoolVar(&m.signed, "signed", false, "stored values are two's complement")
	f.Float64Var(&m.slope, "slope", 1, "rescale slope, `M`")
	f.Float64Var(&m.intercept, "intercept", 0, "rescale intercept, `B`")
	f.Float64Var(&m.center, "center", 0, "window center, `C`, in the unit of the rescaled values")
	f.Float64Var(&m.width, "width", 0, "window width, `W`")
	f.StringVar(&m.function, "function", "linear", "linear, linear-exact or sigmoid (DICOM PS3.3 C.11.2), `NAME`")
	f.BoolVar(&m.inverse, "inverse", false, "the lowest value is shown brightest")
	f.IntVar(&m.outBits, "out-bits", 8, "depth of the output, `N` from 8 to 16")
	f.StringVar(&m.through, "through", "", "calibration `TABLE` to go through, .json or .csv")
	f.StringVarP(&m.out, "output", "o", "", "`FILE` to write")
	f.BoolVar(&m.replace, "replace", false, "write over a file that is there")
	m.set = f.Changed
}

// chain is the mapping of the flags; what they do not say is left to base.
func (m *mappingFlags) chain(base luts.Chain) (luts.Chain, error) {
	if m.set("stored-bits") {
		base.Stored.Bits = m.storedBits
	}
	if m.set("signed") {
		base.Stored.Signed = m.signed
	}
	if m.set("slope") || m.set("intercept") {
		base.Modality = luts.Rescale{Slope: m.slope, Intercept: m.intercept}
	}
	if m.set("center") != m.set("width") {
		return base, errors.New("only one of --center and --width was given; expected both; add the other")
	}
	f, err := luts.ParseFunction(m.function)
	if err != nil {
		return base, err
	}
	switch w, windowed := base.VOI.(luts.Windowing); {
	case m.set("center"):
		base.VOI = luts.Windowing{Function: f, Center: m.center, Width: m.width}
	case m.set("function") && windowed:
		w.Function = f
		base.VOI = w
	case m.set("function"):
		return base, errors.New("--function was given without a window; expected --center and --width; add them")
	}
	if m.set("inverse") {
		base.Presentation = luts.Identity
		if m.inverse {
			base.Presentation = luts.Inverse
		}
	}
	base.OutBits = m.outBits
	if m.through != "" {
		t, err := openTable(m.through)
		if err != nil {
			return base, err
		}
		base.Calibration = &t
		if !m.set("out-bits") {
			base.OutBits = 0
		}
	}
	return base, nil
}

func openTable(path string) (luts.Table, error) {
	f, err := open(path, "table")
	if err != nil {
		return luts.Table{}, err
	}
	defer f.Close()
	read := luts.ReadJSON
	if strings.EqualFold(filepath.Ext(path), ".csv") {
		read = luts.ReadCSV
	}
	t, _, err := read(path, f)
	return t, err
}

func (p program) windowCommand() *cobra.Command {
	var m mappingFlags
	var forImage string
	c := &cobra.Command{
		Use:   "window",
		Short: "Make the table of a window: stored values to output levels",
		Long: `Make the one table that modality, window and presentation come to (DICOM PS3.3 C.11), over every stored
value. Output levels are rounded half away from zero. -o names the file: .json, .csv, .raw (one or two
bytes an entry, low byte first), or .dcm for a presentation state.

A presentation state belongs to one image: --for IMAGE names it. It never holds a calibration table,
which belongs to a monitor. It carries no patient; an archive matches it by the image's identifiers.`,
		Args: cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error { return p.window(&m, forImage) },
	}
	m.add(c)
	c.Flags().StringVar(&forImage, "for", "", "`IMAGE` that a presentation state is for")
	return c
}

func (p program) window(m *mappingFlags, forImage string) error {
	kind := strings.ToLower(filepath.Ext(m.out))
	switch {
	case kind == ".dcm" && forImage == "":
		return errors.New("a presentation state names its image; expected --for IMAGE; add it")
	case kind == ".dcm" && m.through != "":
		return errors.New("a presentation state cannot hold a calibration table, which belongs to a monitor; expected no --through; leave it away")
	case kind != ".dcm" && forImage != "":
		return fmt.Errorf("--for was given but -o is %q; expected a file ending in .dcm; name one", m.out)
	case kind != ".json" && kind != ".csv" && kind != ".raw" && kind != ".dcm":
		return fmt.Errorf("-o is %q; expected a file ending in .json, .csv, .raw or .dcm; name it", m.out)
	}
	o := outputs{csv: m.out, replace: m.replace}
	if err := o.checkPaths("", m.through, forImage); err != nil {
		return err
	}
	base := luts.Chain{Stored: luts.Stored{Bits: m.storedBits, Signed: m.signed}}
	var b bytes.Buffer
	if kind == ".dcm" {
		img, closeImage, err := openDICOM(forImage)
		if err != nil {
			return err
		}
		defer closeImage()
		if err := p.presentationState(&b, m, img); err != nil {
			return err
		}
		return writeFile(m.out, b.Bytes(), m.replace)
	}
	chain, err := m.chain(base)
	if err != nil {
		return err
	}
	mapping, err := chain.Compose()
	if err != nil {
		return err
	}
	t := mapping.Table()
	origin := luts.Provenance{"program": "evenstep " + version()}
	switch kind {
	case ".csv":
		err = luts.WriteCSV(&b, t, origin)
	case ".raw":
		bits := 8
		if t.OutBits > 8 {
			bits = 16
		}
		err = luts.WriteRaw(&b, t, bits)
	default:
		err = luts.WriteJSON(&b, t, origin)
	}
	if err != nil {
		return system(fmt.Errorf("%s: %w", m.out, err))
	}
	return writeFile(m.out, b.Bytes(), m.replace)
}

// presentationState writes the window of the flags for an image.
func (p program) presentationState(w io.Writer, m *mappingFlags, img *dicom.Image) error {
	if !m.set("center") || !m.set("width") {
		return errors.New("a presentation state needs a window; expected --center and --width; add them")
	}
	for _, flag := range []string{"stored-bits", "signed", "slope", "intercept", "out-bits"} {
		if m.set(flag) {
			return fmt.Errorf("--%s was given, but a presentation state takes that from its image; expected it to be left out; leave it away", flag)
		}
	}
	stages, err := img.Stages(0)
	if err != nil {
		return err
	}
	f, err := luts.ParseFunction(m.function)
	if err != nil {
		return err
	}
	ref, err := img.Reference()
	if err != nil {
		return err
	}
	s := dicom.State{
		Image: ref, Label: "WINDOW", Description: "window made by evenstep", Software: "evenstep " + version(),
		Slope: stages.Slope, Intercept: stages.Intercept, ModalityLUT: stages.ModalityLUT,
		Window: &dicom.Window{Center: m.center, Width: m.width}, Function: string(f), Inverse: img.Inverse != m.inverse,
	}
	return dicom.WritePresentationState(w, s, rand.Reader, p.now())
}

// openDICOM opens an image; the file stays open until the function that is returned is called.
func openDICOM(path string) (*dicom.Image, func(), error) {
	f, err := open(path, "DICOM")
	if err != nil {
		return nil, nil, err
	}
	info, err := f.Stat()
	if err != nil {
		f.Close()
		return nil, nil, system(fmt.Errorf("%s: %w", path, err))
	}
	img, err := dicom.Read(path, f, info.Size())
	if err != nil {
		f.Close()
		return nil, nil, err
	}
	return img, func() { f.Close() }, nil
}

func (p program) renderCommand() *cobra.Command {
	var m mappingFlags
	var frame int
	c := &cobra.Command{
		Use:   "render IMAGE",
		Short: "Map an image to output levels",
		Long: `Map an image (DICOM, or 8 and 16 bit gray PNG and TIFF) through window and calibration table to a PGM,
PNG or TIFF, by the ending of -o. What the flags do not say comes from the image. Nothing that
identifies a patient is read or written; text that is burned into the picture cannot be seen by a
program.`,
		Args: oneFile("an image"),
		RunE: func(_ *cobra.Command, args []string) error { return p.render(args[0], &m, frame) },
	}
	m.add(c)
	c.Flags().IntVar(&frame, "frame", 1, "frame `N` of a multi-frame image")
	return c
}

// picture is an image to be mapped, with the mapping that it brings.
type picture struct {
	plane luts.Plane[uint16]
	chain luts.Chain
}

func (p program) render(path string, m *mappingFlags, frame int) error {
	kind := strings.ToLower(filepath.Ext(m.out))
	switch kind {
	case ".pgm", ".png", ".tif", ".tiff":
	default:
		return fmt.Errorf("-o is %q; expected a file ending in .pgm, .png or .tif; name it", m.out)
	}
	o := outputs{csv: m.out, replace: m.replace}
	if err := o.checkPaths("", path, m.through); err != nil {
		return err
	}
	in, err := p.openPicture(path, frame)
	if err != nil {
		return err
	}
	chain, err := m.chain(in.chain)
	if err != nil {
		return err
	}
	mapping, err := chain.Compose()
	if err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	t := mapping.Table()
	b, err := renderTo(kind, in.plane, t)
	if err != nil {
		return fmt.Errorf("%s: %w", m.out, err)
	}
	return writeFile(m.out, b, m.replace)
}

// renderTo carries a plane through a table and encodes it.
func renderTo(kind string, src luts.Plane[uint16], t luts.Table) ([]byte, error) {
	var b bytes.Buffer
	rect := image.Rect(0, 0, src.Width, src.Height)
	if t.OutBits <= 8 {
		a, err := luts.NewApplier[uint16, uint8](t)
		if err != nil {
			return nil, err
		}
		dst := luts.NewPlane[uint8](src.Width, src.Height)
		if err := a.Apply(dst, src); err != nil {
			return nil, err
		}
		if kind == ".pgm" {
			fmt.Fprintf(&b, "P5\n%d %d\n%d\n", src.Width, src.Height, 1<<t.OutBits-1)
			b.Write(dst.Pix)
			return b.Bytes(), nil
		}
		return encodeGray(&b, kind, &image.Gray{Pix: dst.Pix, Stride: dst.Stride, Rect: rect})
	}
	a, err := luts.NewApplier[uint16, uint16](t)
	if err != nil {
		return nil, err
	}
	dst := luts.NewPlane[uint16](src.Width, src.Height)
	if err := a.Apply(dst, src); err != nil {
		return nil, err
	}
	shift := 16 - t.OutBits
	if kind == ".pgm" {
		shift = 0 // its head says how deep it is
		fmt.Fprintf(&b, "P5\n%d %d\n%d\n", src.Width, src.Height, 1<<t.OutBits-1)
	}
	pix := make([]byte, 2*len(dst.Pix))
	for i, v := range dst.Pix {
		if shift > 0 { // spread over 16 bits by repeating the high bits, so that white stays white
			v = v<<shift | v>>(t.OutBits-shift)
		}
		pix[2*i], pix[2*i+1] = byte(v>>8), byte(v)
	}
	if kind == ".pgm" {
		b.Write(pix)
		return b.Bytes(), nil
	}
	return encodeGray(&b, kind, &image.Gray16{Pix: pix, Stride: 2 * dst.Stride, Rect: rect})
}

func encodeGray(b *bytes.Buffer, kind string, img image.Image) ([]byte, error) {
	var err error
	if kind == ".png" {
		err = png.Encode(b, img)
	} else {
		err = tiff.Encode(b, img, &tiff.Options{Compression: tiff.Deflate})
	}
	return b.Bytes(), err
}

// openPicture reads a DICOM, PNG or TIFF image.
func (p program) openPicture(path string, frame int) (*picture, error) {
	f, err := open(path, "image")
	if err != nil {
		return nil, err
	}
	defer f.Close()
	head, err := bufio.NewReaderSize(f, 256).Peek(256)
	if err != nil && !errors.Is(err, io.EOF) {
		return nil, system(fmt.Errorf("%s: %w", path, err))
	}
	switch {
	case bytes.HasPrefix(head, []byte("\x89PNG")), bytes.HasPrefix(head, []byte("II*\x00")), bytes.HasPrefix(head, []byte("MM\x00*")):
		if frame != 1 {
			return nil, fmt.Errorf("%s: has one picture but --frame is %d; expected 1; leave it away", path, frame)
		}
		if _, err := f.Seek(0, io.SeekStart); err != nil {
			return nil, system(fmt.Errorf("%s: %w", path, err))
		}
		return openGray(path, f, bytes.HasPrefix(head, []byte("\x89PNG")))
	}
	return p.openDICOMPicture(path, frame)
}

// mostPixels bounds what is decoded, as the DICOM reader does.
const mostPixels = 1 << 27

func openGray(path string, f *os.File, isPNG bool) (*picture, error) {
	config, decode := tiff.DecodeConfig, tiff.Decode
	if isPNG {
		config, decode = png.DecodeConfig, png.Decode
	}
	c, err := config(f)
	if err != nil {
		return nil, fmt.Errorf("%s: %w; expected a gray PNG or TIFF; convert it", path, err)
	}
	bits := 0
	switch c.ColorModel {
	case color.GrayModel:
		bits = 8
	case color.Gray16Model:
		bits = 16
	default:
		return nil, fmt.Errorf("%s: is in colour; expected gray of 8 or 16 bits; convert it", path)
	}
	if c.Width < 1 || c.Height < 1 || c.Width > mostPixels/c.Height {
		return nil, fmt.Errorf("%s: has %d x %d pixels; expected at most %d in all; cut it", path, c.Width, c.Height, mostPixels)
	}
	if _, err := f.Seek(0, io.SeekStart); err != nil {
		return nil, system(fmt.Errorf("%s: %w", path, err))
	}
	img, err := decode(f)
	if err != nil {
		return nil, fmt.Errorf("%s: %w; expected a whole gray PNG or TIFF; fetch it anew", path, err)
	}
	out := &picture{plane: luts.NewPlane[uint16](c.Width, c.Height), chain: luts.Chain{Stored: luts.Stored{Bits: bits}}}
	at := img.Bounds().Min
	for y := range c.Height {
		for x := range c.Width {
			v := color.Gray16Model.Convert(img.At(at.X+x, at.Y+y)).(color.Gray16).Y
			out.plane.Pix[y*out.plane.Stride+x] = v >> (16 - bits)
		}
	}
	return out, nil
}

func (p program) openDICOMPicture(path string, frame int) (*picture, error) {
	img, done, err := openDICOM(path)
	if err != nil {
		return nil, err
	}
	defer done()
	if frame < 1 || frame > img.Frames {
		return nil, fmt.Errorf("%s: has %d frames but --frame is %d; expected 1 to %d; choose one", path, img.Frames, frame, img.Frames)
	}
	cells, err := img.Frame(frame - 1)
	if err != nil {
		return nil, err
	}
	stages, err := img.Stages(frame - 1)
	if err != nil {
		return nil, err
	}
	for _, n := range stages.Notices {
		fmt.Fprintf(p.err, "evenstep: notice: %s: %s\n", path, n)
	}
	out := &picture{plane: luts.Plane[uint16]{Pix: cells, Width: img.Columns, Height: img.Rows, Stride: img.Columns}}
	out.chain.Stored = luts.Stored{Bits: img.BitsStored, Signed: img.Signed}
	out.chain.Presentation = luts.Identity
	if img.Inverse {
		out.chain.Presentation = luts.Inverse
	}
	switch {
	case stages.ModalityLUT != nil:
		out.chain.Modality = luts.Lookup{First: stages.ModalityLUT.First, Bits: stages.ModalityLUT.Bits, Entries: stages.ModalityLUT.Entries}
	case stages.Slope != 0:
		out.chain.Modality = luts.Rescale{Slope: stages.Slope, Intercept: stages.Intercept}
	}
	switch {
	case len(stages.Windows) > 0:
		f, err := luts.ParseFunction(stages.Function)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", path, err)
		}
		out.chain.VOI = luts.Windowing{Function: f, Center: stages.Windows[0].Center, Width: stages.Windows[0].Width}
	case len(stages.VOILUTs) > 0:
		l := stages.VOILUTs[0]
		out.chain.VOI = luts.Lookup{First: l.First, Bits: l.Bits, Entries: l.Entries}
	}
	return out, nil
}
