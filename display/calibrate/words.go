package calibrate

import (
	"fmt"
	"strconv"
)

// Line is one line of what is said of a table: a label and its text.
type Line struct{ Label, Text string }

// Words says in lines what a table goes for and what it will do.
func Words(res Result, p *Prediction) []Line {
	r := res.Range
	out := []Line{
		{"panel", fmt.Sprintf("%s to %s cd/m² with ambient light", short(r.PanelMin), short(r.PanelMax))},
		{"aim", fmt.Sprintf("%s to %s cd/m², ratio %s, %.1f JND", short(r.Min), short(r.Max), short(r.Ratio), r.JNDs)},
	}
	const shown = 0.05 // JND: less would read as 0.0
	if r.JNDsLost > shown {
		out = append(out, Line{"cost", fmt.Sprintf("%.1f JND, %s cd/m² at the bright end, %s cd/m² at the dark end", r.JNDsLost, short(r.WhiteLost), short(r.BlackGain))})
	}
	out = append(out,
		Line{"deviation", fmt.Sprintf("%.1f %% at most is predicted (95 %%: %.1f to %.1f %%), at %d levels", 100*p.Greatest, 100*p.GreatestInterval[0], 100*p.GreatestInterval[1], p.Levels)},
		Line{"steps", fmt.Sprintf("%.2f JND on the mean, standard deviation %.2f", p.MeanJNDs, p.SpreadJNDs)},
		Line{"gray levels", fmt.Sprintf("%d kept, %d lost", p.Kept, p.Lost)},
	)
	for _, d := range p.Depths {
		out = append(out, Line{"", fmt.Sprintf("with %d bits out: deviation %.1f %%, %d gray levels", d.OutBits, 100*d.GreatestDeviation, d.Kept)})
	}
	return append(out, Line{"room light", p.Room.words()})
}

func (r RoomLight) words() string {
	const holding = "the table holds 10 %% "
	switch {
	case r.Reason != "" && r.AmbientLow == nil && r.AmbientHigh == nil:
		return "cannot be said: " + r.Reason
	case r.IlluminanceHigh != nil && r.IlluminanceLow != nil:
		s := fmt.Sprintf(holding+"from %s to %s lx on the screen", short(*r.IlluminanceLow), short(*r.IlluminanceHigh))
		if r.RdAssumed {
			s += " (Rd assumed)"
		}
		return s
	case r.AmbientHigh != nil && r.AmbientLow != nil:
		return fmt.Sprintf(holding+"from %s to %s cd/m² of ambient luminance", short(*r.AmbientLow), short(*r.AmbientHigh))
	case r.AmbientLow != nil:
		return fmt.Sprintf(holding+"from %s cd/m² of ambient luminance", short(*r.AmbientLow))
	}
	return "the table holds 10 % in no room light"
}

func short[T ~float64](v T) string {
	switch {
	case v == 0:
		return "0"
	case v >= 1000:
		return strconv.FormatFloat(float64(v), 'f', 0, 64)
	}
	return strconv.FormatFloat(float64(v), 'g', 4, 64)
}
