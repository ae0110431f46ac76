package toys

import (
	"math"
	"sort"

	"lumireach/stats"
)

// span is the significances that a tail is asked for.
type span struct{ from, to float64 }

const (
	nullShare = 0.1 // of toys from the null itself, which bounds every weight by 10
	largestZ  = 37  // beyond it a p-value is no double
)

// level is a significance at which centres stand, with its weight.
type level struct{ z, weight float64 }

// levels cover a span at a spacing of no more than one, and go on two beyond
// it, more thinly, for the toys that fluctuate down from there. The conventions
// 3σ and 5σ always have a level near them. A level weighs as its z, for the toys
// that a tail takes to one precision grow with it.
func (s span) levels() []level {
	from, to := math.Max(1, s.from), math.Min(math.Max(1.5, s.to), largestZ-2)
	from = math.Min(from, to-0.5)
	steps := math.Ceil(to - from)
	var out []level
	for k := 0.0; k <= steps; k++ {
		z := from + (to-from)*k/steps
		out = append(out, level{z, z})
	}
	out = append(out, level{to + 1, (to + 1) / 2}, level{to + 2, (to + 2) / 4})
	for _, z := range conventions {
		if z < from-0.5 || z > to+0.5 {
			out = append(out, level{z, z / 2})
		}
	}
	sort.Slice(out, func(i, j int) bool { return out[i].z < out[j].z })
	return out
}

// tailProposals are the null and centres at the most probable background-only
// data of each level (stats.Centre), so many toys of them together. Where a
// parameter of signals alone moves a signal's shape, the peak of a tail's toy
// stands anywhere in its range: the centres are then stratified over it. finer is
// 1, or 2 for half the spacing.
func (r *runner) tailProposals(e *stats.Engine, wanted span, toys, finer int) ([]proposal, error) {
	// Two toys at least, for a variance within each proposal.
	count := func(share float64) int { return max(2, int(math.Round(share*float64(toys)))) }
	out := []proposal{r.at(e, 0, count(nullShare))}
	levels := wanted.levels()
	sum := 0.0
	for _, l := range levels {
		sum += l.weight
	}
	type place struct {
		z    float64
		held []stats.Held
	}
	places := make([]place, 1)
	for _, l := range levels {
		strata := strata(e.Floating(), l.z, finer)
		total := 0.0
		for _, s := range strata {
			total += s.weight
		}
		for _, s := range strata {
			share := (1 - nullShare) * l.weight / sum * s.weight / total
			places = append(places, place{l.z, s.held})
			out = append(out, proposal{toys: count(share)})
		}
	}
	failures := make([]error, len(out))
	err := r.share(len(out)-1, func() func(int) {
		return func(k int) {
			p := places[k+1]
			failures[k+1] = out[k+1].centre(e, r.config.Nuisances, p.z, p.held)
		}
	})
	if err != nil {
		return nil, err
	}
	// Data that are not found get no toys; how far the rest reach is judged by
	// their weights.
	kept := out[:1]
	for k, p := range out[1:] {
		if failures[k+1] == nil {
			kept = append(kept, p)
		}
	}
	return kept, nil
}

// centre puts a proposal at the most probable background-only data of q0 = z².
func (p *proposal) centre(e *stats.Engine, ensemble Nuisances, z float64, held []stats.Held) error {
	if ensemble == Drawn {
		c, err := e.DrawnCentre(z, held...)
		p.near, p.drawn = c.Mu, &parameters{theta: c.Theta, gamma: c.Gamma, tilt: c.Tilt}
		return err
	}
	c, err := e.Centre(z, held...)
	p.Point, p.spread, p.near = c.Point, c.Spread, c.Mu
	return err
}

// stratum holds the floating shape parameters of signals at one place.
type stratum struct {
	held   []stats.Held
	weight float64
}

// strata spreads the floating parameters over √2 of their constraint: the fit of
// a tail's toy stands off from the auxiliary value, which itself fluctuates. One
// parameter gets a grid over ±4 at no more than its posterior width at z without
// its constraint; several get a low-discrepancy set of about as many points as
// such grids would have within one standard deviation.
func strata(floating []stats.Floating, z float64, finer int) []stratum {
	const (
		matters = 0.5 // shifts of a shape, in standard deviations of the data, that one centre covers
		most    = 64
	)
	var used []stats.Floating
	for _, p := range floating {
		if p.Strength*z > matters {
			used = append(used, p)
		}
	}
	switch len(used) {
	case 0:
		return []stratum{{nil, 1}}
	case 1:
		p := used[0]
		const reach = 4
		spacing := math.Min(1, 1/(p.Strength*z)) / float64(finer)
		steps := int(math.Min(most/2, math.Ceil(reach/spacing)))
		var out []stratum
		for k := -steps; k <= steps; k++ {
			x := reach * float64(k) / float64(steps)
			out = append(out, stratum{[]stats.Held{{Param: p.Param, Value: x}}, math.Exp(-x * x / 4)})
		}
		return out
	}
	points := 1.0
	for _, p := range used {
		points *= 1 + math.Ceil(2*p.Strength*z*float64(finer))
	}
	out := make([]stratum, int(math.Min(most*float64(finer), points)))
	for k := range out {
		out[k].weight = 1
		for d, p := range used {
			// A Kronecker sequence; its first point is the nominal place.
			u := math.Mod(0.5+float64(k)*kronecker(d, len(used)), 1)
			out[k].held = append(out[k].held, stats.Held{Param: p.Param, Value: math.Sqrt2 * stats.PhiInverse(u)})
		}
	}
	return out
}

// kronecker is the step in dimension d of n of the Kronecker sequence (Niederreiter,
// Random Number Generation and Quasi-Monte Carlo Methods, 1992, chapter 3) whose
// steps are the negative powers of the root of x^(n+1) = x + 1, which
// generalises the golden ratio.
func kronecker(d, n int) float64 {
	x := 1.5
	for range 60 {
		x = math.Pow(1+x, 1/float64(n+1))
	}
	return math.Pow(x, -float64(d+1))
}
