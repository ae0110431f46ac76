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
// every node's μ and from a deficit of events, each of them weighted to every
// one of the hypotheses.
type jointSample struct {
	nodes  []float64 // signal strengths, rising
	blocks [][]limitToy
	order  [][]place // by node: toys with a good fit in falling order of q̃
	bad    [][]place // by node: toys whose fit failed
}

type place struct{ block, toy int }

func (s *jointSample) at(p place) *limitToy { return &s.blocks[p.block][p.toy] }

// joint throws one sample.
func (r *runner) joint(e *stats.Engine, luminosity float64, use purpose, nodes []float64, each int) (*jointSample, error) {
	proposals := []proposal{r.at(e, 0, each)}
	for _, mu := range nodes {
		proposals = append(proposals, r.at(e, mu, each))
	}
	proposals = append(proposals, r.pulledTo(e, deficit(e, nodes[len(nodes)/2]), each))
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
				m.throw(w, component)
				m.logDensities(w)
				m.balance(w.logs)
				copy(toy.weight, w.logs)
				free := w.fit.Free(&w.data, proposals[component].near, math.Inf(1))
				for k, mu := range nodes {
					q, status := w.fit.QTilde(&w.data, mu, free)
					if status != stats.Converged {
						q = math.NaN()
					}
					toy.q[k] = q
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

// deficit is the background pulled down along the direction in which a signal
// of strength mu would push it up: λ0·(λ0/λ_μ)^κ. κ is where sqrt(q̃_μ) lies two
// above its value for the background's own Asimov data, so that the toys of the
// strongest limits are not rare.
func deficit(e *stats.Engine, mu float64) stats.Point {
	background := e.Point(0, nil)
	signal := e.Point(mu, nil)
	f := e.Fitter()
	at := func(kappa float64) (stats.Point, float64) {
		p := stats.Point{Lambda: make([]float64, len(background.Lambda)), A: make([]float64, len(background.A)), M: background.M}
		for bin, l := range background.Lambda {
			if l > 0 {
				p.Lambda[bin] = l * math.Pow(l/signal.Lambda[bin], kappa)
			}
		}
		d := p.Asimov()
		free := f.Free(d, 0, math.Inf(1))
		q, status := f.QTilde(d, mu, free)
		if status != stats.Converged {
			return p, math.NaN()
		}
		return p, math.Sqrt(q)
	}
	point, z := at(0)
	goal := z + 2
	for kappa := 0.25; kappa <= 8; kappa *= 1.25 {
		next, z := at(kappa)
		if math.IsNaN(z) {
			break
		}
		point = next
		if z >= goal {
			break
		}
	}
	return point
}
