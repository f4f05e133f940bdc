package criteria

// Quantity is something that a scheme limits and that readings can answer.
type Quantity string

// The judged quantities. The list is closed: a scheme file that names another is refused.
const (
	LuminanceMax      Quantity = "luminance_max"       // L'max, cd/m2
	LuminanceMin      Quantity = "luminance_min"       // L'min, cd/m2
	LuminanceRatio    Quantity = "luminance_ratio"     // L'max/L'min, a floor
	LuminanceRatioAim Quantity = "luminance_ratio_aim" // L'max/L'min, to be near: what a site agrees on
	ContrastDeviation Quantity = "contrast_deviation"  // greatest deviation of contrast per JND, fraction
	Uniformity        Quantity = "uniformity"          // over places of one screen, fraction, by a named formula
	PairMatch         Quantity = "pair_match"          // L'max of two screens, fraction of a named denominator
	ColourUniformity  Quantity = "colour_uniformity"   // greatest u'v' distance over places of one screen
	ColourMatch       Quantity = "colour_match"        // u'v' distance between two screens
	AmbientRatio      Quantity = "ambient_ratio"       // Lamb/Lmin
	RoomIlluminance   Quantity = "room_illuminance"    // on the screen or in the room, lx
)

// Confidence says how a limit is known.
type Confidence string

// The confidences, best first.
const (
	Read       Confidence = "read"        // the scheme's own text was read
	SecondHand Confidence = "second-hand" // another text restates it
	Weak       Confidence = "weak"        // one unsigned or one company's restatement
	FromMemory Confidence = "from memory" // widely quoted, document not read
	Unsure     Confidence = "unsure"      // quoted in more than one way, document not read
	Site       Confidence = "site"        // the site's own limit, in place of the scheme's
)

// Basis says which luminance a limit speaks of.
type Basis string

// The bases of a luminance or a ratio.
const (
	WithAmbient Basis = "with ambient" // L' = L + Lamb
	Emitted     Basis = "emitted"      // L alone
	Open        Basis = "open"         // the sources do not say or disagree: judged with ambient, the other value shown
)

// Limit is one limit of a scheme, as judged.
type Limit struct {
	Quantity   Quantity   `json:"quantity" toml:"quantity"`
	Comparison string     `json:"comparison" toml:"comparison"` // ">=", ">", "<=", "<", "about", "within"
	Limit      float64    `json:"limit" toml:"limit"`           // low end for "about" and "within"
	LimitHigh  *float64   `json:"limit_high,omitempty" toml:"limit_high"`
	Aim        *float64   `json:"aim,omitempty" toml:"aim"` // the middle of "about"
	Unit       string     `json:"unit" toml:"unit"`
	Formula    string     `json:"formula" toml:"formula"` // name of the formula or denominator, "" where there is only one
	Basis      Basis      `json:"basis,omitempty" toml:"basis"`
	Section    string     `json:"section" toml:"section"` // of the scheme's document
	Source     string     `json:"source" toml:"source"`   // what was read
	Confidence Confidence `json:"confidence" toml:"confidence"`
	Advisory   string     `json:"advisory,omitempty" toml:"advisory"` // why it never decides, though known
	Note       string     `json:"note,omitempty" toml:"note"`

	Confirmed *Confirmation `json:"confirmed,omitempty" toml:"-"`
	Override  *Override     `json:"override,omitempty" toml:"-"`

	classes []string
}

// Confirmation is a site's word that a limit stands in the scheme's document as given here.
type Confirmation struct {
	Document string `json:"document"` // title and edition of what was read
	Page     string `json:"page"`
	Person   string `json:"person"` // id or name, as the site keeps it
	Date     string `json:"date"`   // ISO 8601
}

// Override is a site's own limit in place of a scheme's.
type Override struct {
	Limit      float64 `json:"scheme_limit"`      // what it replaces
	Comparison string  `json:"scheme_comparison"` // the scheme's sign
	Reason     string  `json:"reason"`
	Name       string  `json:"name"`
	Date       string  `json:"date"` // ISO 8601
}

// Class is a use of a monitor for which a scheme has limits.
type Class struct {
	ID   string `toml:"id"`
	Name string `toml:"name"`
}

// Scheme is a published set of limits, one edition.
type Scheme struct {
	ID      string
	Name    string
	Edition string
	Note    string
	Classes []Class
	limits  []Limit
}

// Used is what a visit was judged by, as a record keeps it.
type Used struct {
	ID      string  `json:"id"`
	Name    string  `json:"name"`
	Edition string  `json:"edition"`
	Class   string  `json:"class"`
	Limits  []Limit `json:"limits"`
	Site    *SiteID `json:"site,omitempty"`
}

// SiteID names the site file that changed or confirmed limits.
type SiteID struct {
	Site   string `json:"site"`
	File   string `json:"file"`
	SHA256 string `json:"sha256"`
}
