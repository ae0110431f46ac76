package physics

import "lumireach/stats"

// newTemplate is the shape of events that a file holds.
func newTemplate(counts []float64) stats.Shape {
	var e events
	e.normalise(counts)
	return template{e.fractions}
}
