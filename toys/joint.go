package toys

import (
	"math"
	"sort"

	"lumireach/stats"
)

// limitToy is one toy of a joint sample for limits.
type limitToy struct {
	q      []float64 // q̃ at each node, NaN where a fit failed
	weight []float64 // under background only, then under each node's μ
}

// jointSample holds toys thrown in equal shares from background only, from
// every node's μ and from deficits of events, each of them weighted to every one
// of the hypotheses.
type jointSample struct {
	nodes  []float64 // signal strengths, rising
	blocks [][]limitToy
	order  [][]place // by node: toys with a good fit in falling order of q̃
	bad    [][]place // by node: toys whose fit failed
}

type place struct{ block, toy int }

func (s *jointSample) at(p place) *limitToy { return &s.blocks[p.block][p.toy] }

// joint throws one sample for limits, so many toys from each point.
func (r *runner) joint(e *stats.Engine, luminosity float64, use purpose, nodes []float64, each int) (*jointSample, error) {
	proposals := []proposal{r.at(e, 0, each)}
	for _, mu := range nodes {
		proposals = append(proposals, r.at(e, mu, each))
	}
	return r.jointFrom(e, luminosity, use, nodes, append(proposals, r.deficits(e, nodes, each)...))
}

// jointFrom throws toys of proposals, the first of which are background only and
// the nodes.
func (r *runner) jointFrom(e *stats.Engine, luminosity float64, use purpose, nodes []float64, proposals []proposal) (*jointSample, error) {
	m, err := r.newMixture(proposals)
	if err != nil {
		return nil, err
	}
	starts := m.blockStarts()
	blocks := len(starts) - 1
	s := &jointSample{nodes: nodes, blocks: make([][]limitToy, blocks)}
	hypotheses := 1 + len(nodes)
	err = r.run(e, len(proposals), blocks, func(w *worker, block int) {
		count := starts[block+1] - starts[block]
		toys := make([]limitToy, count)
		memory := make([]float64, count*(hypotheses+len(nodes)))
		i := 0
		for component := range proposals {
			w.stream.restart(key{r.config.Seed, use, luminosity, component, block})
			for range m.inBlock(component, block, blocks) {
				toy := limitToy{q: memory[:len(nodes):len(nodes)], weight: memory[len(nodes) : len(nodes)+hypotheses]}
				memory = memory[len(nodes)+hypotheses:]
				thrown := m.throw(w, component)
				m.logDensities(w)
				m.balance(w.logs)
				copy(toy.weight, w.logs)
				var free stats.Fit
				if thrown {
					free = w.fit.Free(&w.data, proposals[component].near, math.Inf(1))
				}
				for k, mu := range nodes {
					toy.q[k] = math.NaN()
					if !thrown {
						continue
					}
					if q, status := w.fit.QTilde(&w.data, mu, free); status == stats.Converged {
						toy.q[k] = q
					}
				}
				toys[i] = toy
				i++
			}
		}
		s.blocks[block] = toys
		r.done(count)
	})
	if err != nil {
		return nil, err
	}
	s.order, s.bad = make([][]place, len(nodes)), make([][]place, len(nodes))
	err = r.share(len(nodes), func() func(int) { return s.sort })
	return s, err
}

// sort orders the toys as node k does.
func (s *jointSample) sort(k int) {
	for b, toys := range s.blocks {
		for i := range toys {
			p := place{b, i}
			if math.IsNaN(toys[i].q[k]) {
				s.bad[k] = append(s.bad[k], p)
			} else {
				s.order[k] = append(s.order[k], p)
			}
		}
	}
	sort.SliceStable(s.order[k], func(i, j int) bool {
		return s.at(s.order[k][i]).q[k] > s.at(s.order[k][j]).q[k]
	})
}

// failures counts the toys with any failed fit.
func (s *jointSample) failures() int {
	bad := map[place]bool{}
	for _, list := range s.bad {
		for _, p := range list {
			bad[p] = true
		}
	}
	return len(bad)
}

// size counts the toys.
func (s *jointSample) size() int {
	n := 0
	for _, b := range s.blocks {
		n += len(b)
	}
	return n
}

// once gives every block the weight one.
func (s *jointSample) once() []float64 {
	m := make([]float64, len(s.blocks))
	for b := range m {
		m[b] = 1
	}
	return m
}

// deficits are the most probable data, of background only and of the lowest
// nodes' strengths, that set limits as strong as the lower half of the band does.
// CLs = α at the u-quantile is a tail of αu under the node's strength: without
// toys from there it would hang on a few.
func (r *runner) deficits(e *stats.Engine, nodes []float64, toys int) []proposal {
	at := func(mu, z float64) proposal {
		if r.config.Nuisances == Drawn {
			c := e.DrawnDeficit(mu, z)
			return proposal{drawn: &parameters{mu: mu, theta: c.Theta, gamma: c.Gamma, tilt: c.Tilt}, toys: toys}
		}
		c := e.Deficit(mu, z)
		return proposal{Point: c.Point, spread: c.Spread, toys: toys}
	}
	out := []proposal{at(0, 2.5)}
	for k, mu := range nodes[:min(3, len(nodes))] {
		out = append(out, at(mu, stats.Significance((1-r.config.Confidence)*quantiles[k])))
	}
	return out
}
