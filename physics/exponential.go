package physics

import (
	"fmt"
	"math"

	"lumireach/stats"
)

// steepest bounds |slope|·window: at 600 the far end of the window still holds
// a fraction of 1e-260, well above underflow.
const steepest = 600

var exponentialKind = kind{
	name: "exponential",
	quantities: []quantity{{
		key:       "slope",
		dimension: -1,
		bounds: func(b binning, slope float64) (lower, upper, step float64) {
			limit := steepest / b.window()
			return -limit - slope, limit - slope, 1 / b.window()
		},
	}},
	make: func(b binning) stats.Shape { return exponential{b} },
	check: func(b binning, at []float64) (key, what string) {
		limit := steepest / b.window()
		if math.Abs(at[0]) < limit {
			return "", ""
		}
		return "slope", fmt.Sprintf("slope is %v, too steep for a window of %v: its size must stay below %.4g", at[0], b.window(), limit)
	},
}

// exponential is the density exp(slope·x), over equal bins. Its one quantity is
// the slope, per unit of the window.
type exponential struct{ binning }

// Fill implements stats.Shape. The integral over bin i is exp(slope·width·i)
// times a factor common to all bins, so that the fractions are geometric and
// nothing cancels near slope 0. Every sum is over positive terms.
func (s exponential) Fill(q, f, d1, d2 []float64) {
	if len(f) != s.bins {
		panic(wrongBins)
	}
	slope, width := q[0], s.binWidth()
	if math.IsNaN(slope) || math.IsInf(slope, 0) {
		undefined(f, d1, d2)
		return
	}
	// The fullest bin is 1 and the others fall away from it, starting again
	// from an exact exponential before rounding accumulates.
	const stretch = 32
	steps := math.Abs(slope) * width
	ratio := math.Exp(-steps)
	var total, first float64
	for start := 0; start < s.bins; start += stretch {
		end := min(start+stretch, s.bins)
		v := math.Exp(-steps * float64(start))
		for k := start; k < end; k++ {
			f[k] = v
			total += v
			first += float64(k) * v
			v *= ratio
		}
	}
	inverse, mean := 1/total, first/total
	for k := range f {
		f[k] *= inverse
	}
	if slope > 0 {
		mean = float64(s.bins-1) - mean
		for i, k := 0, s.bins-1; i < k; i, k = i+1, k-1 {
			f[i], f[k] = f[k], f[i]
		}
	}
	if d1 == nil {
		return
	}
	// ∂f/∂slope = f (x - <x>) and ∂²f/∂slope² = f ((x - <x>)² - Var x), with x
	// the bins' low edges.
	variance := 0.0
	for i, v := range f {
		x := (float64(i) - mean) * width
		d := v * x
		d1[i] = d
		variance += d * x
	}
	for i, v := range f {
		x := (float64(i) - mean) * width
		d2[i] = v * (x*x - variance)
	}
}
