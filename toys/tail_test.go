package toys

import (
	"math"
	"testing"

	"lumireach/stats"
)

// P(q0 >= q) of counts against exact sums over all outcomes. On/off rows
// DER-exact-onoff and DER-exact-known of testdata/reference/published.csv
// (recomputed, from memory); b = 20 with twice the background in the control
// region summed here too, and the same by a simulation in the place of the control region; with a log-normal background by sums over counts of Φ at
// the auxiliary value where q0 crosses q.
func TestTailExact(t *testing.T) {
	const k = 4 // quoted errors; right code fails for 1 seed in 16000 per check
	double := onOff(10, 20, 2)
	exact := func(q float64) float64 {
		p := 0.0
		for _, o := range enumerate(engine(t, double, 1), 1, q0Of) {
			if o.q >= q-tie {
				p += o.null
			}
		}
		return p
	}
	for _, c := range []struct {
		name   string
		search stats.Search
		q      float64
		want   float64
	}{
		{"b = 20, τ = 2", double, 9, exact(9)},
		{"b = 20, τ = 2", double, 16, exact(16)},
		{"b = 20, τ = 2", double, 25, 3.03198e-7},
		{"b = 20 by 40 simulated events", simulated(10, 20, 40), 16, exact(16)},
		{"b = 20 by 40 simulated events", simulated(10, 20, 40), 25, 3.03198e-7},
		{"b = 2, τ = 1", onOff(10, 2, 1), 9, 0.000615889},
		{"b = 2, τ = 1", onOff(10, 2, 1), 16, 1.846958e-07},
		{"b = 2, τ = 1", onOff(10, 2, 1), 25, 8.766176e-14},
		{"b = 5, τ = 1", onOff(10, 5, 1), 9, 0.00224452},
		{"b = 5, τ = 1", onOff(10, 5, 1), 16, 3.744369e-05},
		{"b = 5, τ = 1", onOff(10, 5, 1), 25, 9.472238e-09},
		{"b = 20, τ = 1", onOff(10, 20, 1), 16, 3.603307e-05},
		{"b = 100, τ = 1", onOff(10, 100, 1), 16, 3.252274e-05},
		{"b = 100, τ = 1", onOff(10, 100, 1), 25, 2.985473e-07},
		{"b = 120 ± 20 %", uncertain(10, 120, 0.2), 25, 2.633376e-7},
		{"b = 120 ± 40 %", uncertain(10, 120, 0.4), 25, 2.709506e-7},
		{"b = 0.5 ± 30 %", uncertain(10, 0.5, 0.3), 25, 1.818598e-7},
		{"b = 0.05 ± 50 %", uncertain(10, 0.05, 0.5), 25, 1.264275e-7},
		{"b = 0.5", count(1, 0.5), 9, 0.00175162},
		{"b = 0.5", count(1, 0.5), 25, 6.219691e-08},
		{"b = 1000", count(1, 1000), 25, 2.674934e-07},
	} {
		const toys = 20000
		r := testRunner(t, Config{Toys: toys, Seed: 5})
		null, err := r.null(engine(t, c.search, 1), 1, span{1, 5}, toys, nil)
		if err != nil {
			t.Fatal(err)
		}
		e := null.p(c.q)
		t.Logf("%s: P(q0 >= %v) = %.4g ± %.1f %%, want %.4g, %+.1f errors off", c.name, c.q, e.p, 100*e.err/e.p, c.want, (e.p-c.want)/e.err)
		if !(math.Abs(e.p-c.want) <= k*e.err) {
			t.Errorf("%s: P(q0 >= %v) = %v ± %v, want %v (seed 5)", c.name, c.q, e.p, e.err, c.want)
		}
		if !(e.err < 0.06*e.p) {
			t.Errorf("%s: P(q0 >= %v) is known to %v of itself, want 0.06", c.name, c.q, e.err/e.p)
		}
		if !null.trusts(e) {
			t.Errorf("%s: the tail at %v is not trusted: %+v", c.name, c.q, e)
		}
	}
}
