package toys

import (
	"math"
	"os"
	"strconv"
	"testing"

	"lumireach/stats"
)

// Plain toys of the benchmark window against weighted ones at 3σ and 4σ.
// LUMIREACH_PLAIN says how many plain ones; 10⁷ take some minutes.
func TestPlainToys(t *testing.T) {
	toys := 20000
	if text := os.Getenv("LUMIREACH_PLAIN"); text != "" {
		var err error
		if toys, err = strconv.Atoi(text); err != nil {
			t.Fatal(err)
		}
	}
	r := testRunner(t, Config{Seed: 53})
	e := engine(t, scenario(t, "window"), 1)
	thresholds := []float64{1, 4, 9, 16, 25}
	m := mixtureOf(t, []proposal{{Point: e.Point(0, nil), toys: toys}})
	starts := m.blockStarts()
	blocks := len(starts) - 1
	tallies := make([][]int, blocks)
	failed := make([]int, blocks)
	if err := r.run(e, 1, blocks, func(w *worker, block int) {
		w.stream.restart(key{59, signalToys, 1, 0, block})
		tally := make([]int, len(thresholds))
		for range starts[block+1] - starts[block] {
			m.throw(w, 0)
			q, status := w.fit.Q0(&w.data, 0)
			if status != stats.Converged {
				failed[block]++
			}
			for k, threshold := range thresholds {
				if q >= threshold {
					tally[k]++
				}
			}
		}
		tallies[block] = tally
	}); err != nil {
		t.Fatal(err)
	}
	null, err := r.null(e, 1, span{1, 5}, max(20000, toys/100), nil)
	if err != nil {
		t.Fatal(err)
	}
	failures := null.failing
	for _, n := range failed {
		failures += n
	}
	t.Logf("%d failed fits of %d toys", failures, toys+null.total)
	if float64(failures) > 1e-5*float64(toys) {
		t.Errorf("%d failed fits of %d toys, want below 1 in 100000", failures, toys+null.total)
	}
	const k = 4.5 // standard errors; right code fails for 1 seed in 150000 per check
	for i, threshold := range thresholds {
		passing := 0
		for _, tally := range tallies {
			passing += tally[i]
		}
		weighted := null.p(threshold)
		got, n := float64(passing)/float64(toys), float64(toys)
		err := math.Hypot(math.Sqrt(weighted.p*(1-weighted.p)/n), weighted.err)
		t.Logf("P(q0 >= %v): plain %.5g (%d toys), weighted %.5g ± %.1f %%", threshold, got, passing, weighted.p, 100*weighted.err/weighted.p)
		if weighted.p*n > 10 && math.Abs(got-weighted.p) > k*err {
			t.Errorf("P(q0 >= %v): plain %v, weighted %v, want within %v (seed 53)", threshold, got, weighted.p, k*err)
		}
	}
}
