package physics

// binning divides a mass window into bins.
type binning struct {
	low, high float64
	bins      int
	edges     []float64 // of bins that are not equal, else nil
}

// equalBins divides a window into bins of one width.
func equalBins(low, high float64, bins int) binning {
	return binning{low: low, high: high, bins: bins}
}

// unequalBins has two or more rising edges.
func unequalBins(edges []float64) binning {
	last := len(edges) - 1
	return binning{edges[0], edges[last], last, edges}
}

func (b binning) edge(i int) float64 {
	switch {
	case b.edges != nil:
		return b.edges[i]
	case i == b.bins:
		return b.high
	}
	return b.low + (b.high-b.low)*float64(i)/float64(b.bins)
}

func (b binning) window() float64 { return b.high - b.low }

// binWidth is the mean width of a bin.
func (b binning) binWidth() float64 { return (b.high - b.low) / float64(b.bins) }

// widestBin is the width of the widest bin.
func (b binning) widestBin() float64 {
	if b.edges == nil {
		return b.binWidth()
	}
	widest := 0.0
	for i := range b.bins {
		widest = max(widest, b.edges[i+1]-b.edges[i])
	}
	return widest
}
