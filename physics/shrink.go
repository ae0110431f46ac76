package physics

import "math"

// mostScale caps Scale, so that an uncertainty measured with much data does not
// lose all meaning at the first few events.
const mostScale = 10

// Scale is the factor on the uncertainty's parameter at a luminosity:
//
//	k = sqrt(f² + (1-f²)·MeasuredAt/L), at most 10
//
// with f the Floor. What counts limit falls as 1/√L, what does not limit them
// stays, and the two add in quadrature (common practice, no source). It is 1 at
// MeasuredAt, above 1 below it, and 1 everywhere for an uncertainty that does
// not shrink.
func (u *Uncertainty) Scale(luminosity float64) float64 {
	if u.MeasuredAt == 0 {
		return 1
	}
	square := u.Floor * u.Floor
	return math.Min(mostScale, math.Sqrt(square+(1-square)*u.MeasuredAt/luminosity))
}

// readShrinks reads how an uncertainty falls with luminosity.
func (u *Uncertainty) readShrinks(of table) {
	const example = "{ measured_at = the luminosity at which the sizes hold }"
	if _, isTable := of.values["shrinks"].(map[string]any); !isTable {
		of.failKey("shrinks", "shrinks must be a table, %s, not %s", example, found(of.values["shrinks"]))
		return
	}
	t := of.table("shrinks", "shrinks of "+of.name)
	t.only("measured_at", "floor")
	if !t.has("measured_at") {
		t.missing("measured_at", "measured_at = the luminosity at which the sizes hold")
		return
	}
	u.MeasuredAt = t.number("measured_at")
	if !(u.MeasuredAt > 0) {
		t.failKey("measured_at", "measured_at is %v, must be above 0: the luminosity at which the sizes hold", u.MeasuredAt)
	}
	if t.has("floor") {
		u.Floor = t.number("floor")
		if !(u.Floor >= 0 && u.Floor <= 1) {
			t.failKey("floor", "floor is %v, must be from 0 to 1: the fraction that never shrinks", u.Floor)
		}
	}
}
