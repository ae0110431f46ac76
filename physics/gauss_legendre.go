package physics

import "gonum.org/v1/gonum/integrate/quad"

// rule is a Gauss-Legendre rule on [0, 1].
type rule struct{ at, weight []float64 }

var threePoints, fourPoints = newRule(3), newRule(4)

func newRule(points int) rule {
	r := rule{make([]float64, points), make([]float64, points)}
	quad.Legendre{}.FixedLocations(r.at, r.weight, 0, 1)
	return r
}
