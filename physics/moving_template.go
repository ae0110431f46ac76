package physics

import (
	"math"

	"lumireach/stats"
)

// movingTemplate is a template that uncertainties move. Quantity a has the
// template up at +1 and down at -1, and fractions follow
//
//	f_i ∝ nominal_i · exp(Σ_a lin_ai·q_a + bend_ai·g(q_a))
//
// with g of stats.Bend, normalised to one. Bins that are empty stay empty.
type movingTemplate struct {
	nominal []float64
	moves   []templateMove
}

// templateMove is ½ ln(up/down) and ½ ln(up·down) of each bin's ratios to
// nominal; 0 where nominal is empty.
type templateMove struct{ lin, bend []float64 }

// moving is a template as one that can be moved.
func moving(shape stats.Shape) movingTemplate {
	switch s := shape.(type) {
	case template:
		return movingTemplate{nominal: s.fractions}
	case movingTemplate:
		return s
	}
	panic("physics: a shape that is no template")
}

// newTemplateMove takes fractions, of which up and down have no empty bin that
// nominal lacks.
func newTemplateMove(nominal, up, down []float64) templateMove {
	m := templateMove{make([]float64, len(nominal)), make([]float64, len(nominal))}
	for i, f := range nominal {
		if f == 0 {
			continue
		}
		u, d := math.Log(up[i]), math.Log(down[i])
		m.lin[i], m.bend[i] = (u-d)/2, (u+d)/2-math.Log(f)
	}
	return m
}

// Fill implements stats.Shape. With h_a = ∂ ln F/∂q_a of the unnormalised F, c_a
// = h_a less its mean over f, and the means over f in angle brackets, ∂f/∂q_a =
// f·c_a and ∂²f/∂q_a∂q_b = f·(c_a·c_b - <c_a·c_b>), to which a pair of one
// quantity adds f·(h_a′ - <h_a′>). Where the curvature of g jumps, it is that of
// the outer side.
func (s movingTemplate) Fill(q, f, d1, d2 []float64) {
	bins := len(s.nominal)
	if len(f) != bins {
		panic(wrongBins)
	}
	for i := range f {
		f[i] = 0
	}
	for a, m := range s.moves {
		x := q[a]
		g, _, _ := stats.Bend(x)
		for i, v := range m.lin {
			f[i] += v*x + m.bend[i]*g
		}
	}
	largest := math.Inf(-1)
	for i, v := range s.nominal {
		if v > 0 {
			largest = math.Max(largest, f[i])
		}
	}
	total := 0.0
	for i, v := range s.nominal {
		if v > 0 {
			v *= math.Exp(f[i] - largest)
		}
		f[i] = v
		total += v
	}
	if !(total > 0) { // a quantity that is not a finite number
		undefined(f, d1, d2)
		return
	}
	for i := range f {
		f[i] /= total
	}
	if d1 == nil {
		return
	}
	for a, m := range s.moves {
		_, slope, _ := stats.Bend(q[a])
		centred := d1[a*bins:][:bins]
		mean := 0.0
		for i, v := range f {
			centred[i] = m.lin[i] + m.bend[i]*slope
			mean += v * centred[i]
		}
		for i := range centred {
			centred[i] -= mean
		}
	}
	pair := 0
	for a, m := range s.moves {
		_, _, curvature := stats.Bend(q[a])
		for b := a; b < len(s.moves); b++ {
			ca, cb, second := d1[a*bins:][:bins], d1[b*bins:][:bins], d2[pair*bins:][:bins]
			mean := 0.0
			for i, v := range f {
				second[i] = ca[i] * cb[i]
				if a == b {
					second[i] += m.bend[i] * curvature
				}
				mean += v * second[i]
			}
			for i, v := range f {
				second[i] = v * (second[i] - mean)
			}
			pair++
		}
	}
	for a := range s.moves {
		first := d1[a*bins:][:bins]
		for i, v := range f {
			first[i] *= v
		}
	}
}
