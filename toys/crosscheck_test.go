package toys

import (
	"math"
	"testing"
)

// Verdicts by toys on counts of which exact sums know the truth: none is good
// where the exact difference is beyond the tolerance, and few are not decided that
// are not within an error of it.
func TestVerdicts(t *testing.T) {
	tolerances := Tolerances{Relative: 0.05, Z: 0.1, Chance: 0.02}
	scenarios, toys, open := 30, 10000, 0.1
	if testing.Short() {
		scenarios, toys, open = 5, 2000, 0.5
	}
	clear, undecided, verdicts := 0, 0, 0
	for k := range scenarios {
		b := 0.05 * math.Pow(1000/0.05, float64(k)/float64(scenarios-1))
		s := 3*math.Sqrt(b) + 3
		r := testRunner(t, Config{Toys: toys, Seed: uint64(k + 1)})
		e := engine(t, count(s, b), 1)
		formula, err := formulas(e, r.config)
		if err != nil {
			t.Fatal(err)
		}
		point, _, err := r.crosscheckPoint(e, 1, formula, true)
		if err != nil {
			t.Fatal(err)
		}
		for _, c := range point.Comparisons {
			if math.IsNaN(c.Exact) || math.IsNaN(c.Toys) {
				continue
			}
			truth := c
			truth.judge(tolerances, toys, true)
			c.judge(tolerances, toys, false)
			verdicts++
			switch {
			case c.Verdict == Good && truth.Verdict == Off:
				t.Errorf("b = %.3g, %s: good, where the exact difference is %.3g of %v", b, c.Quantity, truth.Difference, c.Tolerance)
			case c.Verdict == Off && truth.Verdict == Good:
				t.Errorf("b = %.3g, %s: off, where the exact difference is %.3g of %v", b, c.Quantity, truth.Difference, c.Tolerance)
			}
			if math.Abs(math.Abs(truth.Difference)-c.Tolerance) > c.DError {
				clear++
				if c.Verdict == Undecided {
					undecided++
				}
			}
		}
	}
	t.Logf("%d verdicts, %d clear of the tolerance, %d of them not decided", verdicts, clear, undecided)
	if float64(undecided) > open*float64(clear) {
		t.Errorf("%d of %d verdicts are not decided, want fewer than %v", undecided, clear, open)
	}
}
