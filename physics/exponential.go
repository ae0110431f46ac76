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
	make: func(b binning) stats.Shape {
		if b.edges != nil {
			return unequalExponential{b}
		}
		return exponential{b}
	},
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

// unequalExponential is exponential over bins of different widths.
type unequalExponential struct{ binning }

// Fill implements stats.Shape. With t = slope·w, a bin of width w and low edge x
// holds w·exp(slope·x)·expm1(t)/t; the mean and variance of the density inside it
// give the derivatives of its logarithm.
func (s unequalExponential) Fill(q, f, d1, d2 []float64) {
	if len(f) != s.bins {
		panic(wrongBins)
	}
	slope := q[0]
	if math.IsNaN(slope) || math.IsInf(slope, 0) {
		undefined(f, d1, d2)
		return
	}
	// The end where the density is largest counts as 1.
	reference := s.low
	if slope > 0 {
		reference = s.high
	}
	total := 0.0
	for i := range f {
		low, high := s.edges[i], s.edges[i+1]
		t := math.Abs(slope) * (high - low)
		near := low // the edge where the density is larger
		if slope > 0 {
			near = high
		}
		f[i] = (high - low) * math.Exp(slope*(near-reference)) * decay(t)
		total += f[i]
	}
	for i := range f {
		f[i] /= total
	}
	if d1 == nil {
		return
	}
	// ∂f/∂slope = f (m - <x>) and ∂²f/∂slope² = f ((m - <x>)² + v - Var x), m and v
	// being the mean and variance inside the bin. Positions count from low.
	mean := 0.0
	for i, v := range f {
		d1[i], d2[i] = s.inside(i, slope)
		mean += v * d1[i]
	}
	variance := 0.0
	for i, v := range f {
		x := d1[i] - mean
		d2[i] += x * x
		variance += v * d2[i]
		d1[i] = v * x
	}
	for i, v := range f {
		d2[i] = v * (d2[i] - variance)
	}
}

// decay is (1 - exp(-t))/t.
func decay(t float64) float64 {
	if math.Abs(t) < 1e-8 {
		return 1 - t/2
	}
	return -math.Expm1(-t) / t
}

// inside is the mean, from the low end of the window, and the variance of the
// density within bin i.
func (s unequalExponential) inside(i int, slope float64) (mean, variance float64) {
	low, width := s.edges[i], s.edges[i+1]-s.edges[i]
	m, v := decayMoments(math.Abs(slope) * width) // from the edge where the density is larger
	if slope > 0 {
		m = 1 - m
	}
	return low - s.low + m*width, v * width * width
}

// decayMoments are the mean and the variance of y from 0 to 1 with the density
// exp(-t·y). The mean is (1 - t/(exp(t)-1))/t, whose series has the
// Bernoulli numbers (DLMF 24.2.1); the variance is its derivative, reversed.
func decayMoments(t float64) (mean, variance float64) {
	if t < 0 {
		mean, variance = decayMoments(-t)
		return 1 - mean, variance
	}
	if t < 0.2 {
		square := t * t
		mean = 0.5 - t/12*(1-square/60*(1-square/42*(1-square/40*(1-square*5/198))))
		variance = 1./12 - square/240*(1-square*5/126*(1-square*7/200*(1-square*5/154)))
		return mean, variance
	}
	lost := -math.Expm1(-t)
	ratio := (1 - lost) / lost
	return 1/t - ratio, 1/(t*t) - ratio/lost
}
