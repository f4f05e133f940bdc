package patterns

import "fmt"

// Info is what there is to say about a sheet.
type Info struct {
	Name     string
	Purpose  string // what it is for, in a few words
	Serves   string // the published test or requirement that asks for such a look; the layout is ours
	Look     string // what a good monitor shows, and what a bad one shows
	Colour   bool   // three channels: only DrawRGB draws it
	Takes    Takes
	MaxSteps int // the most Steps it can show
}

// sheet is an Info with its drawing function. The channel is 0, 1, 2 for red, green and blue; gray sheets
// are drawn with 0.
type sheet struct {
	Info
	draw func(c *canvas, channel int)
}

// List is every sheet there is, in the order in which a person would go through them.
func List() []Info {
	l := make([]Info, len(sheets))
	for i := range sheets {
		l[i] = sheets[i].Info
	}
	return l
}

func find(name string) (*sheet, error) {
	for i := range sheets {
		if sheets[i].Name == name {
			return &sheets[i], nil
		}
	}
	return nil, fmt.Errorf("pattern %q: no such sheet; expected one of the %d listed; list them (%w)",
		name, len(sheets), ErrSpec)
}

// Draw draws a gray sheet. It refuses, wrapping ErrSpec, a name that is not listed, a colour sheet, a size
// or depth out of range, a level above the depth, and anything in s that the sheet has no use for.
func Draw(name string, s Spec) (*Plane, error) {
	sh, err := find(name)
	if err != nil {
		return nil, err
	}
	if err := sh.gray(&s); err != nil {
		return nil, err
	}
	p := newPlane(&s)
	return p, sh.on(p, &s, 0)
}

// DrawOn draws a gray sheet on a plane that is there already, without allocating another: for sheets that
// move. The plane must have the size and depth of s; refusals are those of Draw.
func DrawOn(p *Plane, name string, s Spec) error {
	sh, err := find(name)
	if err != nil {
		return err
	}
	if err := sh.gray(&s); err != nil {
		return err
	}
	if p.Width != s.Width || p.Height != s.Height || p.Bits != s.Bits || len(p.Pix) != s.Width*s.Height {
		return fmt.Errorf("pattern %s: a plane of %dx%d, %d bits, %d samples; expected %dx%d, %d bits; draw a new one (%w)",
			name, p.Width, p.Height, p.Bits, len(p.Pix), s.Width, s.Height, s.Bits, ErrSpec)
	}
	return sh.on(p, &s, 0)
}

// DrawRGB draws any sheet as three channels. It refuses what Draw refuses, colour sheets excepted.
func DrawRGB(name string, s Spec) (*RGB, error) {
	sh, err := find(name)
	if err != nil {
		return nil, err
	}
	if err := s.check(&sh.Info); err != nil {
		return nil, err
	}
	var planes [3]*Plane
	for i := range planes {
		if i > 0 && !sh.Colour {
			planes[i] = planes[0]
			continue
		}
		planes[i] = newPlane(&s)
		if err := sh.on(planes[i], &s, i); err != nil {
			return nil, err
		}
	}
	return &RGB{planes[0], planes[1], planes[2]}, nil
}

func newPlane(s *Spec) *Plane {
	return &Plane{s.Width, s.Height, s.Bits, make([]uint16, s.Width*s.Height)}
}

// gray checks s and that the sheet has one channel.
func (sh *sheet) gray(s *Spec) error {
	if sh.Colour {
		return fmt.Errorf("pattern %s: one gray plane was asked for; expected three channels; draw it in colour (%w)",
			sh.Name, ErrSpec)
	}
	return s.check(&sh.Info)
}

func (sh *sheet) on(p *Plane, s *Spec, channel int) error {
	c := canvas{Plane: p, spec: s, max: int(p.Max()), short: min(p.Width, p.Height)}
	sh.draw(&c, channel)
	if c.err != nil {
		return fmt.Errorf("pattern %s: %w", sh.Name, c.err)
	}
	return nil
}
