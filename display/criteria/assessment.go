package criteria

import "evenstep/display/response"

// Interval is a 95 % interval, low end first.
type Interval [2]float64

// Verdict is the outcome of one limit or of a whole assessment.
type Verdict string

// The verdicts, best first. A verdict is taken from the limit and the interval of the figure.
const (
	Meets            Verdict = "meets"
	MeetsUncertainly Verdict = "meets within uncertainty"
	FailsUncertainly Verdict = "fails within uncertainty"
	Fails            Verdict = "fails"
	NotAssessed      Verdict = "not assessed"
)

// Assessment is everything that is said of one visit. Its JSON form is what the assess command
// prints: fractions, not per cent; units in the names; null with a reason beside it where a figure
// cannot be had.
type Assessment struct {
	Scheme  string `json:"scheme"` // "" where none was asked for
	Edition string `json:"edition"`
	Class   string `json:"class"`
	Formula string `json:"formula"` // how the contrast deviation was computed
	Scale   string `json:"scale"`   // "ddl" or "p_value"
	Bits    int    `json:"bits"`

	Ambient       *float64 `json:"ambient_cd_m2"`
	AmbientReason string   `json:"ambient_reason,omitempty"`
	AmbientSource string   `json:"ambient_source"`
	Illuminance   *float64 `json:"illuminance_lx,omitempty"`
	Rd            *float64 `json:"rd_per_lx,omitempty"`
	RdAssumed     bool     `json:"rd_assumed,omitempty"`

	LuminanceMin         float64  `json:"luminance_min_cd_m2"` // L', ambient light in it
	LuminanceMax         float64  `json:"luminance_max_cd_m2"`
	LuminanceRatio       *float64 `json:"luminance_ratio"`
	LuminanceRatioReason string   `json:"luminance_ratio_reason,omitempty"`
	JNDMin               *float64 `json:"jnd_min"`
	JNDMax               *float64 `json:"jnd_max"`
	JNDReason            string   `json:"jnd_reason,omitempty"` // also for steps and what is computed from them

	Steps []StepFigure `json:"steps"` // empty where the GSDF cannot be used

	MaxDeviation          *float64  `json:"max_deviation"` // over all measured steps
	MaxDeviationFromLevel *int      `json:"max_deviation_from_level"`
	MaxDeviationToLevel   *int      `json:"max_deviation_to_level"`
	MaxDeviationInterval  *Interval `json:"max_deviation_interval"`
	MaxDeviationReason    string    `json:"max_deviation_reason,omitempty"`

	JNDStep JNDStep `json:"jnd_step"` // information, never judged
	AnnexC  AnnexC  `json:"annex_c"`  // information, never judged

	// Figures of places and of the pair by every formula: information. What is judged is among the findings.
	Uniformity       []PlacesFigure `json:"uniformity,omitempty"`
	PairMatch        []PlacesFigure `json:"pair_match,omitempty"`
	ColourUniformity *float64       `json:"colour_uniformity,omitempty"` // greatest u'v' distance
	ColourMatch      *float64       `json:"colour_match,omitempty"`      // u'v' distance

	Findings    []Finding        `json:"findings"`
	NotAssessed []Unassessed     `json:"not_assessed"`
	Causes      []response.Cause `json:"causes"`

	IlluminanceRange LuxRange `json:"illuminance_range_lx"`

	RepeatsNeeded       *int     `json:"repeats_needed"` // readings a level, in all, that would settle what is open; 0: nothing is open
	RepeatsNeededReason string   `json:"repeats_needed_reason,omitempty"`
	Drift               *float64 `json:"drift"` // greatest relative change of a drift reading, signed
	DriftReason         string   `json:"drift_reason,omitempty"`

	Noise NoiseFigure `json:"noise"`

	Verdict Verdict `json:"verdict"` // the worst of the findings that decide
}

// StepFigure is one step between neighbouring levels.
type StepFigure struct {
	FromLevel         int      `json:"from_level"`
	ToLevel           int      `json:"to_level"`
	JNDFrom           float64  `json:"jnd_from"`
	JNDTo             float64  `json:"jnd_to"`
	ContrastPerJND    float64  `json:"contrast_per_jnd"`
	Expected          float64  `json:"expected_contrast_per_jnd"`
	Deviation         float64  `json:"deviation"`
	DeviationInterval Interval `json:"deviation_interval"`
}

// JNDStep is the variant of the deviation that counts JNDs a step. It is not the figure that the
// schemes limit.
type JNDStep struct {
	MaxDeviation *float64 `json:"max_deviation"`
	Reason       string   `json:"reason,omitempty"`
}

// AnnexC holds the metrics of PS3.14 Annex C, which have no limits.
type AnnexC struct {
	Intervals []float64 `json:"intervals"` // JNDs per luminance interval
	Mean      *float64  `json:"mean"`
	LUM       *float64  `json:"lum"` // sample standard deviation about the mean
	FitOrder  *int      `json:"fit_order"`
	FitP      *float64  `json:"fit_p"`
	Reason    string    `json:"reason,omitempty"`
}

// Finding is one limit judged.
type Finding struct {
	Quantity          string        `json:"quantity"`
	Value             float64       `json:"value"`
	Interval          Interval      `json:"interval"`
	Comparison        string        `json:"comparison"` // ">=", ">", "<=", "<", "about", "within"
	Limit             float64       `json:"limit"`      // low end for "within"
	LimitHigh         *float64      `json:"limit_high,omitempty"`
	Unit              string        `json:"unit"` // "cd/m2", "1", "lx", "u'v'"; deviations are fractions with unit "1"
	Formula           string        `json:"formula"`
	Levels            int           `json:"levels"` // how many levels (or places) it was computed from
	Source            string        `json:"source"`
	Confidence        string        `json:"confidence"` // "read", "second-hand", "weak", "from memory", "unsure", "site"
	Confirmed         *Confirmation `json:"confirmed,omitempty"`
	Override          *Override     `json:"override,omitempty"`
	Verdict           Verdict       `json:"verdict"` // "not assessed" where the limit may not decide
	Provisional       bool          `json:"provisional"`
	ProvisionalReason string        `json:"provisional_reason,omitempty"`
	Against           Verdict       `json:"against_limit"`  // how value and interval stand to the limit, whether it decides or not
	Note              string        `json:"note,omitempty"` // "limit not confirmed", why it does not decide, and the like
}

// Unassessed is a limit that was not judged, with the reason.
type Unassessed struct {
	Quantity string `json:"quantity"`
	Reason   string `json:"reason"`
}

// PlacesFigure is the figure of one formula over places, or over a pair of screens. A fraction.
type PlacesFigure struct {
	Formula  string   `json:"formula"`
	Level    *int     `json:"level,omitempty"` // of the field, where stated
	Places   int      `json:"places"`
	Value    float64  `json:"value"`
	Interval Interval `json:"interval"`
}

// LuxRange is the room light in which every limit that depends on ambient light holds. A null end
// with no reason is open: nothing binds there.
type LuxRange struct {
	Low       *float64 `json:"low"`
	LowBinds  string   `json:"low_binds"` // quantity, "" where nothing binds
	High      *float64 `json:"high"`
	HighBinds string   `json:"high_binds"`
	// Unconfirmed: the limit that binds decides nothing until the site confirms it.
	LowUnconfirmed  bool     `json:"low_unconfirmed,omitempty"`
	HighUnconfirmed bool     `json:"high_unconfirmed,omitempty"`
	Rd              *float64 `json:"rd_per_lx,omitempty"`
	RdAssumed       bool     `json:"rd_assumed,omitempty"`
	Reason          string   `json:"reason,omitempty"`
}

// NoiseFigure is the noise model that the intervals rest on.
type NoiseFigure struct {
	Repeatability float64 `json:"repeatability"`
	FloorCdM2     float64 `json:"noise_floor_cd_m2"`
	Assumed       bool    `json:"assumed"`
	GainStandard  float64 `json:"gain_standard_uncertainty"` // 0: not stated, not in the intervals
}
