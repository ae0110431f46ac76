package toys

import (
	"math"
	"slices"

	"lumireach/stats"
)

// proposal is a point to throw experiments from.
type proposal struct {
	stats.Point
	spread []float64 // standard deviations of the auxiliary measurements; nil for 1
	near   float64   // signal strength that its data look like, where fits begin
	drawn  *parameters
	toys   int
}

// means are the means of all Poisson counts: of bins, then of the simulation.
func (p *proposal) means() []float64 { return slices.Concat(p.Lambda, p.M) }

// mixture throws experiments from several proposals and knows the probability
// of each experiment under every one of them.
type mixture struct {
	proposals []proposal
	counts    [][]poisson // by proposal, of bins and then of simulation factors
	logRatio  [][]float64 // ln(λ/λ_reference), likewise
	offset    []float64   // what the logarithm of the density has besides
	total     int         // toys
}

// newMixture prepares proposals for one model. The reference of their densities
// is the mean of their expectations, which is zero only where all of them are.
func (r *runner) newMixture(proposals []proposal) (*mixture, error) {
	m := &mixture{
		proposals: proposals,
		counts:    make([][]poisson, len(proposals)),
		logRatio:  make([][]float64, len(proposals)),
		offset:    make([]float64, len(proposals)),
	}
	reference := make([]float64, len(proposals[0].means()))
	for _, p := range proposals {
		m.total += p.toys
		for i, l := range p.means() {
			reference[i] += l / float64(len(proposals))
		}
	}
	if proposals[0].drawn != nil {
		m.prepareDrawn()
		return m, nil
	}
	err := r.share(len(proposals), func() func(int) {
		return func(k int) { m.prepare(k, reference) }
	})
	return m, err
}

func (m *mixture) prepare(k int, reference []float64) {
	p := &m.proposals[k]
	counts := make([]poisson, len(reference))
	ratio := make([]float64, len(reference))
	for i, l := range p.means() {
		counts[i] = newPoisson(l, p.toys)
		if reference[i] > 0 {
			ratio[i] = math.Log(l / reference[i])
		}
		m.offset[k] -= l - reference[i]
	}
	for _, s := range p.spread {
		m.offset[k] -= math.Log(s)
	}
	m.counts[k], m.logRatio[k] = counts, ratio
}

// throw fills w.data with an experiment from proposal k: Poisson counts, normal
// auxiliary measurements. It is false where parameters were drawn with which there
// is none.
func (m *mixture) throw(w *worker, k int) bool {
	if w.drawn != nil {
		return m.throwDrawn(w, k)
	}
	d, s, counts := &w.data, w.stream, m.counts[k]
	for bin := range d.N {
		d.N[bin] = counts[bin].draw(s)
	}
	for i := range d.M {
		d.M[i] = counts[len(d.N)+i].draw(s)
	}
	p := &m.proposals[k]
	for j, a := range p.A {
		z := s.NormFloat64()
		if p.spread != nil {
			z *= p.spread[j]
		}
		d.A[j] = a + z
	}
	return true
}

// logDensities sets w.logs[k] to the logarithm of the probability density of
// w's experiment under proposal k, up to a term that is the same for all.
func (m *mixture) logDensities(w *worker) {
	if w.drawn != nil {
		m.logDrawn(w)
		return
	}
	d := &w.data
	for k, ratio := range m.logRatio {
		p := &m.proposals[k]
		sum := m.offset[k]
		for bin, n := range d.N {
			if n > 0 { // 0 × ln 0 is 0 here
				sum += n * ratio[bin]
			}
		}
		for i, m := range d.M {
			if m > 0 {
				sum += m * ratio[len(d.N)+i]
			}
		}
		for j, a := range p.A {
			z := d.A[j] - a
			if p.spread != nil {
				z /= p.spread[j]
			}
			sum -= z * z / 2
		}
		w.logs[k] = sum
	}
}

// balance replaces the log densities of one experiment by the weights
// p_k/Σ c_l p_l of the balance heuristic, c_l being the share of toys from
// proposal l: Veach & Guibas, SIGGRAPH 95; Owen & Zhou, J. Am. Stat. Assoc. 95 (2000) 135.
func (m *mixture) balance(logs []float64) {
	largest := math.Inf(-1)
	for _, l := range logs {
		largest = math.Max(largest, l)
	}
	sum := 0.0
	for k, l := range logs {
		logs[k] = math.Exp(l - largest)
		sum += logs[k] * float64(m.proposals[k].toys)
	}
	scale := float64(m.total) / sum
	for k := range logs {
		logs[k] *= scale
	}
}

// inBlock is how many toys of proposal k fall to one of so many blocks: all
// blocks hold all proposals in the same proportion, to one toy.
func (m *mixture) inBlock(k, block, blocks int) int {
	toys := m.proposals[k].toys
	return toys*(block+1)/blocks - toys*block/blocks
}

// blockStarts is where each block's toys begin when all stand in one row.
func (m *mixture) blockStarts() []int {
	largest := 0
	for _, p := range m.proposals {
		largest = max(largest, p.toys)
	}
	blocks := max(fewestBlocks, (largest+blockToys-1)/blockToys)
	starts := make([]int, blocks+1)
	for b := range blocks {
		starts[b+1] = starts[b]
		for k := range m.proposals {
			starts[b+1] += m.inBlock(k, b, blocks)
		}
	}
	return starts
}
