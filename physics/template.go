package physics

var templateKind = kind{name: "template", fromFile: true}

// movesTemplate is what an effect says that moves the shape of a template.
const movesTemplate = "template"

// template has fixed fractions of events. It has no quantities.
type template struct{ fractions []float64 }

// Fill implements stats.Shape.
func (s template) Fill(_, f, _, _ []float64) {
	if len(f) != len(s.fractions) {
		panic(wrongBins)
	}
	copy(f, s.fractions)
}
