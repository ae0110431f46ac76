package stats

import (
	"errors"
	"math"
)

// Search gives the model of a search at a luminosity.
type Search func(luminosity float64) (Model, error)

// Engine prepares the model at a luminosity.
func (s Search) Engine(luminosity float64) (*Engine, error) {
	m, err := s(luminosity)
	if err != nil {
		return nil, err
	}
	return Prepare(m)
}

// A goal can lie outside the luminosities searched.
var (
	ErrNotReached = errors.New("not reached")
	ErrReached    = errors.New("reached before the first luminosity searched")
)

// Luminosity is the root in [low, high] of a quantity that grows with
// luminosity, to a relative 1e-10. The search goes by whole decades, so that the
// bounds decide whether there is an answer and never what it is.
func (s Search) Luminosity(quantity func(*Engine) (float64, error), low, high float64) (float64, error) {
	var failure error
	at := func(logL float64) float64 {
		e, err := s.Engine(math.Exp(logL))
		if err == nil {
			var v float64
			if v, err = quantity(e); err == nil {
				return v
			}
		}
		failure = err
		return math.NaN()
	}
	decade := math.Floor(math.Log10(low))
	below := at(decade * math.Ln10)
	for failure == nil && below <= 0 {
		if decade >= math.Log10(high) {
			return math.NaN(), ErrNotReached
		}
		decade++
		above := at(decade * math.Ln10)
		if above <= 0 {
			below = above
			continue
		}
		if failure != nil {
			break
		}
		logL, err := Root(at, (decade-1)*math.Ln10, decade*math.Ln10, 1e-10)
		if failure != nil {
			break
		}
		l := math.Exp(logL)
		switch {
		case err != nil:
			return math.NaN(), err
		case l > high:
			return math.NaN(), ErrNotReached
		case l < low:
			return math.NaN(), ErrReached
		}
		return l, nil
	}
	if failure != nil {
		return math.NaN(), failure
	}
	return math.NaN(), ErrReached
}

// Plateau is the limit of a quantity at infinite luminosity, where systematic
// uncertainties alone decide, or NaN where it has none and goes on changing.
// The weight of the counts against the constraints is raised until the quantity
// moves by less than 1e-6 of itself: the constrained minimum without the
// statistical term, by the method of quadratic penalties (Nocedal & Wright,
// Numerical Optimization, section 17.1).
func (s Search) Plateau(quantity func(*Engine) (float64, error), luminosity float64) (float64, error) {
	last := math.NaN()
	for factor := 1e2; factor <= 1e12; factor *= 1e2 {
		e, err := s.Engine(luminosity * factor)
		if err != nil {
			return math.NaN(), err
		}
		v, err := quantity(e)
		if err != nil {
			return math.NaN(), err
		}
		if math.Abs(v-last) < 1e-6*math.Abs(v) {
			return v, nil
		}
		last = v
	}
	return math.NaN(), nil
}
