package physics

import (
	"fmt"
	"math"
	"slices"
)

// mostLuminosities bounds the list, of which each costs a full set of toys.
const mostLuminosities = 200

// Luminosities returns a list in rising order, without changing it. Each must
// be positive, finite and there once; at least 1 and at most 200 of them.
func Luminosities(values []float64) ([]float64, error) {
	if len(values) < 1 || len(values) > mostLuminosities {
		return nil, fmt.Errorf("there are %v luminosities, must be from 1 to %v", len(values), mostLuminosities)
	}
	for _, v := range values {
		if !positive(v) {
			return nil, fmt.Errorf("luminosity is %v, must be positive and finite", v)
		}
	}
	out := slices.Clone(values)
	slices.Sort(out)
	for i := 1; i < len(out); i++ {
		if out[i] == out[i-1] {
			return nil, fmt.Errorf("luminosity %v is listed twice", out[i])
		}
	}
	return out, nil
}

// Spaced returns points luminosities from one value to another, both included,
// at equal ratios.
func Spaced(from, to float64, points int) ([]float64, error) {
	if !positive(from) {
		return nil, fmt.Errorf("from is %v, must be positive and finite", from)
	}
	if !positive(to) || to <= from {
		return nil, fmt.Errorf("to is %v, must be finite and above from, %v", to, from)
	}
	if points < 2 || points > mostLuminosities {
		return nil, fmt.Errorf("points is %v, must be from 2 to %v", points, mostLuminosities)
	}
	out := make([]float64, points)
	low, high := math.Log(from), math.Log(to)
	for i := range out {
		out[i] = math.Exp(low + (high-low)*float64(i)/float64(points-1))
	}
	out[0], out[points-1] = from, to
	return Luminosities(out)
}

func positive(x float64) bool { return x > 0 && !math.IsInf(x, 1) }

func (s *Scenario) readLuminosity(top table) {
	const example = `[luminosity] with unit = "fb⁻¹" and values = [1, 10, 100]`
	if !top.has("luminosity") {
		top.missing("luminosity", example)
		return
	}
	t := top.table("luminosity", "[luminosity]")
	t.only("unit", "values", "from", "to", "points")
	if !t.has("unit") {
		t.missing("unit", `unit = "fb⁻¹", or any other label`)
		return
	}
	s.Unit = t.text("unit")
	var err error
	if t.has("values") {
		for _, key := range []string{"from", "to", "points"} {
			if t.has(key) {
				t.failKey(key, "values and %s stand together: give either values, or from, to and points", key)
			}
		}
		values := t.numbers("values", "a list of numbers")
		if t.failed() {
			return
		}
		s.Luminosities, err = Luminosities(values)
		if err != nil {
			t.failKey("values", "%v", err)
		}
		return
	}
	spacing := []string{"from", "to", "points"}
	if !slices.ContainsFunc(spacing, t.has) {
		spacing = []string{"values"}
	}
	for _, key := range spacing {
		if !t.has(key) {
			t.missing(key, "values = [1, 10, 100], or from = 1, to = 100, points = 12")
			return
		}
	}
	from, to, points := t.number("from"), t.number("to"), t.whole("points", 2, mostLuminosities)
	if t.failed() {
		return
	}
	if s.Luminosities, err = Spaced(from, to, points); err != nil {
		t.failKey("to", "%v", err)
	}
}
