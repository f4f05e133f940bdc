package response

// Cause is something that the shape of the deviations points to.
type Cause struct {
	Causes   []string `json:"cause"`    // more than one where the evidence cannot tell them apart
	Evidence string   `json:"evidence"` // in numbers
	Advice   string   `json:"advice"`
}
