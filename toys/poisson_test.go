package toys

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"lumireach/stats"
)

// Counts drawn against the Poisson distribution by Pearson's χ² over counts of
// at least 20 expected (Press et al., Numerical Recipes, section 14.3).
func TestPoissonDraws(t *testing.T) {
	const draws = 200000
	for k, mean := range []float64{0, 0.003, 0.7, 3, 29.5, 250, tableMean, tableMean + 0.5, 3000, 1e7, 0.003, 3, rejectionMean - 0.1, rejectionMean, 29.5, 250} {
		p := newPoisson(mean, map[bool]int{true: draws, false: 1}[k < 10])
		s := newStream()
		s.restart(key{seed: 47, luminosity: mean})
		width := math.Max(1, math.Floor(math.Sqrt(mean)/4))
		counts := map[int]int{}
		sum := 0.0
		for range draws {
			n := p.draw(s)
			if n < 0 || n != math.Floor(n) {
				t.Fatalf("mean %v: drew %v", mean, n)
			}
			counts[int(math.Floor((n-math.Floor(mean))/width))]++
			sum += n
		}
		if mean == 0 {
			if sum != 0 {
				t.Error("events are drawn at mean 0")
			}
			continue
		}
		if se := math.Sqrt(mean / draws); math.Abs(sum/draws-mean) > 4.5*se { // 1 seed in 150000
			t.Errorf("mean %v: average is %v, want within %v", mean, sum/draws, 4.5*se)
		}
		chi2, cells := 0.0, 0
		for cell := -40; cell <= 40; cell++ {
			low := math.Floor(mean) + float64(cell)*width
			if low+width <= 0 {
				continue
			}
			expected := draws * (stats.PoissonAtMost(int(low+width)-1, mean) - stats.PoissonAtMost(int(low)-1, mean))
			if expected < 20 {
				continue
			}
			difference := float64(counts[cell]) - expected
			chi2 += difference * difference / expected
			cells++
		}
		if p := (distuv.ChiSquared{K: float64(cells)}).Survival(chi2); cells > 1 && p < 1e-5 { // 1 seed in 100000
			t.Errorf("mean %v: χ² = %.1f of %d cells, p = %v (seed 47)", mean, chi2, cells, p)
		}
	}
}
