package physics

import (
	"fmt"
	"math"

	"lumireach/stats"
)

var powerKind = kind{
	name: "power",
	quantities: []quantity{{
		key: "exponent",
		bounds: func(b binning, exponent float64) (lower, upper, step float64) {
			least, most := exponents(b)
			return least - exponent, most - exponent, 1 / b.window()
		},
	}},
	more:        []string{"origin"},
	readMore:    readOrigin,
	coordinates: logarithms,
	make:        func(b binning) stats.Shape { return power{unequalExponential{b}} },
	check: func(b binning, at []float64) (key, what string) {
		least, most := exponents(b)
		if at[0] > least && at[0] < most {
			return "", ""
		}
		return "exponent", fmt.Sprintf("exponent is %v, too steep for a window whose ends lie %.4g to 1 from the origin: must stay between %.4g and %.4g",
			at[0], math.Exp(b.window()), least, most)
	},
}

// exponents bounds the exponent as steepest does a slope.
func exponents(b binning) (least, most float64) {
	limit := steepest / b.window()
	return -limit - 1, limit - 1
}

// readOrigin reads where the density's argument is 0. Very near to the window
// the first bin would hold all or nothing; very far the density is flat, or an
// exponential.
func readOrigin(t table, b binning, form *Form) {
	if t.has("origin") {
		form.Origin = t.number("origin")
	}
	const nearest, farthest = 1e-12, 1e9 // windows
	switch below := b.low - form.Origin; {
	case t.failed():
	case !(below > 0) && !t.has("origin"):
		t.fail(t.path, "the window begins at %v, where a power of x is not defined: write an origin below %v", b.low, b.low)
	case !(below > 0):
		t.failKey("origin", "origin is %v, must lie below the window, which begins at %v", form.Origin, b.low)
	case !(below > nearest*b.window()):
		t.failKey("origin", "origin is %v, too near to the window, which begins at %v", form.Origin, b.low)
	case !(below < farthest*b.window()):
		t.fail(t.path, `the origin is %v, more than %v windows below the window: an "exponential" is the same there`, form.Origin, farthest)
	}
}

// logarithms divides the window in t = ln((x-origin)/(low-origin)).
func logarithms(b binning, form Form) binning {
	below := b.low - form.Origin
	edges := make([]float64, b.bins+1)
	for i := range edges {
		edges[i] = math.Log1p((b.edge(i) - b.low) / below)
	}
	return unequalBins(edges)
}

// power is the density (x-origin)^exponent, over bins in the logarithm t of
// x-origin. There it is exp((exponent+1)·t): an exponential of which every power,
// -1 included, is an ordinary slope. Its one quantity is the exponent.
type power struct{ inLogarithm unequalExponential }

// Fill implements stats.Shape.
func (s power) Fill(q, f, d1, d2 []float64) {
	s.inLogarithm.Fill([]float64{q[0] + 1}, f, d1, d2)
}
