package toys

import (
	"math"

	"lumireach/stats"
)

// Distribution is a test statistic's, by toys, in bins of its root.
type Distribution struct {
	Statistic   string    // "q0" or "q̃ at μ = …"
	Hypothesis  string    // "background only" or "signal and background"
	Luminosity  float64   // in the scenario's unit
	Edges       []float64 // of the bins, in sqrt(statistic), rising; the first bin holds 0
	Probability []float64 // one fewer, by toys
	Error       []float64
	Formula     []float64 // by the asymptotic formulas
}

// binsOf are edges of sqrt(q) from 0 to at least reach.
func binsOf(reach float64) []float64 {
	const width = 0.25
	edges := []float64{0}
	for edges[len(edges)-1] < reach {
		edges = append(edges, width*float64(len(edges)))
	}
	return edges
}

// histogram fills the bins of edges with weighted toys, of as many as were
// thrown; what lies beyond counts in the last.
func histogram(edges []float64, toys []weighted, thrown int) (p, err []float64) {
	p, err = make([]float64, len(edges)-1), make([]float64, len(edges)-1)
	for _, toy := range toys {
		if math.IsNaN(toy.q) {
			continue
		}
		bin := 0
		for bin+2 < len(edges) && math.Sqrt(toy.q) >= edges[bin+1] {
			bin++
		}
		p[bin] += toy.w
		err[bin] += toy.w * toy.w
	}
	for bin := range p {
		p[bin] /= float64(thrown)
		err[bin] = math.Sqrt(err[bin]) / float64(thrown)
	}
	return p, err
}

// normalBins is the probability, by bin, of a root that is normal about mean with
// unit width and cut at 0: q0 by CCGV section 3.5.
func normalBins(edges []float64, mean float64) []float64 {
	out := make([]float64, len(edges)-1)
	for bin := range out {
		low, high := edges[bin]-mean, edges[bin+1]-mean
		if bin == 0 {
			low = math.Inf(-1)
		}
		if bin+1 == len(out) {
			high = math.Inf(1)
		}
		out[bin] = between(low, high)
	}
	return out
}

// qTildeTail is P(q̃_μ >= q) by the formulas (CCGV Eqs. 65 and 66) where root is
// sqrt(q), and asimov that of the Asimov experiment without signal, for data of
// signal strength μ or without signal.
func qTildeTail(root, asimov float64, signal bool) float64 {
	shift := 0.0
	if !signal {
		shift = asimov
	}
	if root <= 0 {
		return 1
	}
	if root <= asimov {
		return stats.PValue(root - shift)
	}
	return stats.PValue((root*root+asimov*asimov)/(2*asimov) - shift)
}

// qTildeBins is the same by bins.
func qTildeBins(edges []float64, asimov float64, signal bool) []float64 {
	out := make([]float64, len(edges)-1)
	for bin := range out {
		out[bin] = qTildeTail(edges[bin], asimov, signal)
		if bin+1 < len(out) {
			out[bin] -= qTildeTail(edges[bin+1], asimov, signal)
		}
	}
	return out
}
