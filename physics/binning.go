package physics

// binning divides a mass window into equal bins.
type binning struct {
	low, high float64
	bins      int
}

func (b binning) edge(i int) float64 {
	if i == b.bins {
		return b.high
	}
	return b.low + (b.high-b.low)*float64(i)/float64(b.bins)
}

func (b binning) window() float64 { return b.high - b.low }

func (b binning) binWidth() float64 { return (b.high - b.low) / float64(b.bins) }
