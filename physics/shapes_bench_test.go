package physics

import (
	"math"
	"testing"

	"lumireach/stats"
)

func BenchmarkFill(b *testing.B) {
	window := equalBins(100, 160, 60)
	tails, both := tailed{126, 1.6, 1.4, 4, 1.9, 9}.shape(window)
	low, one := tailed{126, 1.6, 1.4, 4, 0, 0}.shape(window)
	for _, bench := range []struct {
		name  string
		shape stats.Shape
		q     []float64
	}{
		{"gaussian", gaussianKind.make(window), []float64{126, math.Log(1.6)}},
		{"exponential", exponentialKind.make(window), []float64{-0.03}},
		{"power", newPower(window, 0), []float64{-5.5}},
		{"bernstein of 4", newBernstein(window, []float64{4, 3, 2, 1}), []float64{0.3, 0.3, 0.1}},
		{"crystal-ball of one tail", low, one},
		{"crystal-ball of two tails", tails, both},
		{"voigt", voigtKind.make(window), []float64{126, math.Log(1.6), math.Log(2.4)}},
	} {
		f := make([]float64, window.bins)
		n := len(bench.q)
		d1 := make([]float64, n*window.bins)
		d2 := make([]float64, n*(n+1)/2*window.bins)
		b.Run(bench.name+"/bins=60/fractions", func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				bench.shape.Fill(bench.q, f, nil, nil)
			}
		})
		b.Run(bench.name+"/bins=60/derivatives", func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				bench.shape.Fill(bench.q, f, d1, d2)
			}
		})
	}
}
