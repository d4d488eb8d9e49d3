package snubber

// Ratings are the least ratings of the parts to buy.
type Ratings struct {
	ResistorW  float64 `json:"resistor_w"`  // W at the part's surroundings: twice the loss, next standard power above
	CapacitorV float64 `json:"capacitor_v"` // V: the highest voltage the capacitor sees
}

// powerRating is the next standard resistor power above twice the loss, W; above the largest, twice the loss
// itself. Common practice; the data sheet's derating line decides.
func powerRating(w float64) float64 {
	for _, p := range []float64{0.0625, 0.1, 0.125, 0.25, 0.5, 1, 2, 3, 5, 7, 10, 15, 25, 50, 100} {
		if p >= 2*w {
			return p
		}
	}
	return 2 * w
}
