package toys

import (
	"math"
	"testing"

	"lumireach/stats"
)

// For a count with many events the toys follow the asymptotic distributions of
// Cowan, Cranmer, Gross, Vitells, Eur. Phys. J. C71 (2011) 1554, section 3.5:
// q0 is zero half of the time and half a χ² of one degree of freedom, and Z is
// normal with unit width about its median.
func TestDiscoveryAsymptotic(t *testing.T) {
	const k = 4.5 // standard errors; right code fails for 1 seed in 150000 per check
	const toys = 20000
	r := testRunner(t, Config{Toys: toys, Seed: 3})
	e := engine(t, onOff(3000, 1e6, 1), 1) // Z = 2.12
	null, err := r.throw(e, 1, nullToys, []proposal{{Point: e.Point(0, nil), toys: toys}})
	if err != nil {
		t.Fatal(err)
	}
	tail := newTail(null)
	for _, z := range []float64{1e-2, 1, 2} {
		got := tail.p(z * z).p
		want := stats.PValue(z)
		if se := math.Sqrt(want * (1 - want) / toys); math.Abs(got-want) > k*se {
			t.Errorf("P(q0 >= %v²) = %v, want %v ± %v (seed 3)", z, got, want, se)
		}
	}

	formula, err := formulas(e, r.config)
	if err != nil {
		t.Fatal(err)
	}
	d, err := r.discover(e, 1, formula.Discovery.Z)
	if err != nil {
		t.Fatal(err)
	}
	got, errs, want := d.Z.list(), d.ZError.list(), formula.Discovery.Z.list()
	for i := range got {
		t.Logf("Z at %+d sigma: %v ± %v, formula %v", i-2, got[i], errs[i], want[i])
		if !(math.Abs(got[i]-want[i]) <= k*errs[i]+1e-3) {
			t.Errorf("Z at %+d sigma = %v ± %v, want %v (seed 3)", i-2, got[i], errs[i], want[i])
		}
	}
	t.Logf("chances %v ± %v, %v ± %v, tail %+v", d.Chance3, d.Chance3Error, d.Chance5, d.Chance5Error, d.Tail)
	median := formula.Discovery.Z.Median
	if want := stats.Phi(median - 3); !(math.Abs(d.Chance3-want) <= k*d.Chance3Error) {
		t.Errorf("chance of 3σ = %v ± %v, want %v (seed 3)", d.Chance3, d.Chance3Error, want)
	}
}
