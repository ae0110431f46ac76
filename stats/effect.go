package stats

import "math"

// Bend is g(x) = (3x² - x⁴)/2 within ±1 and |x| beyond, with its first and
// second derivative: what a parameter that changes something by unequal factors
// up and down adds to the straight line through both. It is continuous with its
// first derivative.
func Bend(x float64) (value, slope, curvature float64) {
	switch {
	case x >= 1:
		return x, 1, 0
	case x <= -1:
		return -x, -1, 0
	}
	square := x * x
	return square * (3 - square) / 2, x * (3 - 2*square), 3 - 6*square
}

// value is what the effect adds at x.
func (e *Effect) value(x float64) float64 {
	if e.Bend == 0 {
		return e.Lin * x
	}
	g, _, _ := Bend(e.Scale * x)
	return e.Lin*x + e.Bend*g
}

// slope is the derivative of value.
func (e *Effect) slope(x float64) float64 {
	if e.Bend == 0 {
		return e.Lin
	}
	_, slope, _ := Bend(e.Scale * x)
	return e.Lin + e.Bend*e.Scale*slope
}

// curvature is the second derivative of value.
func (e *Effect) curvature(x float64) float64 {
	if e.Bend == 0 {
		return 0
	}
	_, _, curvature := Bend(e.Scale * x)
	return e.Bend * e.Scale * e.Scale * curvature
}

// turns tells whether the effect changes its direction somewhere: two values
// of the parameter then do the same, and a likelihood can have two maxima.
func (e *Effect) turns() bool {
	const steepest = math.Sqrt2 // slope of Bend, at x = √½
	return math.Abs(e.Bend)*e.Scale*steepest > math.Abs(e.Lin)
}
