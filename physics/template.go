package physics

import "lumireach/stats"

var templateKind = kind{name: "template", fromFile: true}

// template has fixed fractions of events. It has no quantities.
type template struct{ fractions []float64 }

// Fill implements stats.Shape.
func (s template) Fill(_, f, _, _ []float64) {
	if len(f) != len(s.fractions) {
		panic(wrongBins)
	}
	copy(f, s.fractions)
}

// newTemplate takes the events of each bin, >= 0 and not all zero.
func newTemplate(events []float64) stats.Shape {
	// Scaling by the largest keeps the sum finite.
	largest := 0.0
	for _, n := range events {
		largest = max(largest, n)
	}
	s := template{make([]float64, len(events))}
	total := 0.0
	for i, n := range events {
		s.fractions[i] = n / largest
		total += s.fractions[i]
	}
	for i := range s.fractions {
		s.fractions[i] /= total
	}
	return s
}
