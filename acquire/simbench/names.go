package simbench

// Names lists the instruments of the bench.
func Names() []string { return []string{"scope", "supply", "counter", "fixture"} }
