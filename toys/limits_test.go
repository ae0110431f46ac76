package toys

import (
	"math"
	"testing"
)

// Expected limits of a count with b known exactly, from exact sums over all
// outcomes: rows DER-CLSexp of testdata/reference/published.csv (recomputed, from
// memory) where they have five decimals. At b = 0.18 the +1σ edge lies on an atom,
// P(0) = 0.8353 against 0.8413: both values may be given.
func TestLimitsOfCount(t *testing.T) {
	const k = 4.5 // standard errors; right code fails for 1 seed in 3000 over the 45 checks
	for _, c := range []struct {
		b    float64
		want [5]float64
	}{
		{0, [5]float64{2.99573, 2.99573, 2.99573, 2.99573, 2.99573}},
		{0.18, [5]float64{2.99573, 2.99573, 2.99573, 4.58, 4.58}},
		{0.72, [5]float64{3.00, 3.00, 4.24, 5.63, 7.04}},
		{0.5, [5]float64{2.99573, 2.99573, 2.99573, 4.35809, 5.81561}},
		{1, [5]float64{2.99573, 2.99573, 4.113, 5.41, 6.78238}},
		{5, [5]float64{3.45, 4.66, 6.33, 8.42, 11.99}},
		{10, [5]float64{4.28453, 5.8388, 8.08253, 11.0072, 15.5364}},
		{100, [5]float64{11.6, 15.3, 21.4, 29.8, 39.8}},
		{30, [5]float64{6.88671, 9.2049, 12.5532, 16.986, 23.2794}},
	} {
		r := testRunner(t, Config{Toys: 5000, Seed: 1})
		e := engine(t, count(1, c.b), 1)
		formula, err := formulas(e, r.config)
		if err != nil {
			t.Fatal(err)
		}
		x, err := r.limits(e, 1, formula.Exclusion.MuUp)
		if err != nil {
			t.Fatal(err)
		}
		got, errs, other := x.MuUp.list(), x.MuUpError.list(), x.MuUpOther.list()
		for i, want := range c.want {
			// The last digit of the references: 0.005, and 0.05 of b = 100.
			tolerance := k*errs[i] + 0.005
			if c.b == 100 {
				tolerance += 0.045
			}
			if !(math.Abs(got[i]-want) <= tolerance || math.Abs(other[i]-want) <= tolerance) {
				t.Errorf("b = %v, quantile %d: %v ± %v or %v, want %v (seed 1)", c.b, i, got[i], errs[i], other[i], want)
			}
		}
	}
}
