package snubber

// Estimate is a quantity as the fit or the recommendation knows it. A nil *Estimate is a quantity the
// trials cannot tell; it is null in JSON.
type Estimate struct {
	Value float64 `json:"value"`
	U     float64 `json:"u"`    // standard uncertainty (k = 1), unit of Value
	Low   float64 `json:"low"`  // lower end of the 95 % interval
	High  float64 `json:"high"` // upper end of the 95 % interval
}
