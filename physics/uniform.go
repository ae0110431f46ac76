package physics

import "lumireach/stats"

var uniformKind = kind{
	name: "uniform",
	make: func(b binning) stats.Shape { return uniform{b} },
}

// uniform is the constant density over the window. It has no quantities.
type uniform struct{ binning }

// Fill implements stats.Shape.
func (s uniform) Fill(_, f, _, _ []float64) {
	if len(f) != s.bins {
		panic(wrongBins)
	}
	fraction := 1 / float64(s.bins)
	for i := range f {
		if s.edges != nil {
			fraction = (s.edges[i+1] - s.edges[i]) / s.window()
		}
		f[i] = fraction
	}
}
