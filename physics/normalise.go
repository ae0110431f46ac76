package physics

import "math"

const wrongBins = "physics: number of bins does not match the shape"

// normalise turns bin integrals F of a density into fractions f = F/T of its
// integral T over the window, and their derivatives likewise by the quotient
// rule. The layout is that of stats.Shape; t1[a] = ∂T/∂q_a, t2[p] = ∂²T/∂q_a∂q_b.
func normalise(f, d1, d2 []float64, total float64, t1, t2 []float64) {
	bins := len(f)
	inverse := 1 / total
	for i := range f {
		f[i] *= inverse
	}
	if d1 == nil {
		return
	}
	for a, ta := range t1 {
		fa := d1[a*bins:][:bins]
		for i, v := range f {
			fa[i] = (fa[i] - v*ta) * inverse
		}
	}
	pair := 0
	for a, ta := range t1 {
		fa := d1[a*bins:][:bins]
		for b := a; b < len(t1); b++ {
			tb, tab := t1[b], t2[pair]
			fb := d1[b*bins:][:bins]
			fab := d2[pair*bins:][:bins]
			for i, v := range f {
				fab[i] = (fab[i] - fa[i]*tb - fb[i]*ta - v*tab) * inverse
			}
			pair++
		}
	}
}

// undefined marks a shape that does not exist at the quantities asked for.
func undefined(f, d1, d2 []float64) {
	for _, list := range [][]float64{f, d1, d2} {
		for i := range list {
			list[i] = math.NaN()
		}
	}
}
