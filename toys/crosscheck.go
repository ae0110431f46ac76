package toys

import (
	"context"
	"errors"
	"fmt"
	"math"

	"lumireach/stats"
)

// CrosscheckResult is the verdict on the asymptotic formulas.
type CrosscheckResult struct {
	Config        Config
	Tolerances    Tolerances
	Points        []CrosscheckPoint
	Goals         []Comparison
	Distributions []Distribution
	// From is, for discovery and for exclusion, the lowest luminosity listed
	// from which on every number of the formulas is good; NaN where there is
	// none, with the reason in FromWhy.
	From     map[Group]float64
	FromWhy  map[Group]string
	Notes    []string
	Cautions []string
}

// CrosscheckPoint is the comparisons at one luminosity.
type CrosscheckPoint struct {
	Luminosity  float64
	Comparisons []Comparison
	Reasons     []string // why formulas can fail here, as far as they apply
}

// Crosscheck compares the asymptotic formulas with toys, and with exact sums where
// outcomes can be enumerated. Cancelling ctx ends it with ctx's error.
func Crosscheck(ctx context.Context, search stats.Search, config Config, t Tolerances) (*CrosscheckResult, error) {
	if err := config.complete(); err != nil {
		return nil, err
	}
	if config.Toys == 0 {
		return nil, errors.New("a cross-check needs toys")
	}
	return crosscheck(newRunner(ctx, config), search, t, true)
}

func crosscheck(r *runner, search stats.Search, t Tolerances, exactToo bool) (*CrosscheckResult, error) {
	c := r.config
	result := &CrosscheckResult{Config: c, Tolerances: t, From: map[Group]float64{}, FromWhy: map[Group]string{}}
	engines := make([]*stats.Engine, len(c.Luminosities))
	formula := make([]Answer, len(c.Luminosities))
	for i, l := range c.Luminosities {
		e, err := search.Engine(l)
		if err != nil {
			return nil, fmt.Errorf("luminosity %v: %w", l, err)
		}
		if formula[i], err = formulas(e, c); err != nil {
			return nil, fmt.Errorf("luminosity %v: %w", l, err)
		}
		engines[i] = e
		r.progress.Total += int64(5*c.Toys) + r.plannedLimits(e, formula[i].Exclusion.MuUp)
	}
	goals, p, err := formulaGoals(search, c)
	if err != nil {
		return nil, err
	}
	r.progress.Total += r.plannedGoals(goals)
	exactToo = exactToo && enumerable(engines[0], c)
	if exactToo {
		if err := r.exactGoals(search, goals); err != nil {
			return nil, err
		}
	}
	for i, l := range c.Luminosities {
		r.stage(fmt.Sprintf("luminosity %.4g", l))
		point, distributions, err := r.crosscheckPoint(engines[i], l, formula[i], exactToo)
		if err != nil {
			return nil, err
		}
		for k := range point.Comparisons {
			point.Comparisons[k].judge(t, c.Toys, exactToo)
		}
		result.Points = append(result.Points, point)
		result.Distributions = append(result.Distributions, distributions...)
	}
	if err := r.toyGoals(search, goals); err != nil {
		return nil, err
	}
	result.Goals = compareGoals(goals)
	for k := range result.Goals {
		result.Goals[k].judge(t, c.Toys, exactToo)
	}
	for _, g := range []Group{Discovering, Excluding} {
		result.From[g], result.FromWhy[g] = goodFrom(result.Points, g)
	}
	result.Cautions = crosscheckCautions(result, engines, p)
	return result, nil
}

// goodFrom is the lowest luminosity from which on all comparisons of a group are
// good.
func goodFrom(points []CrosscheckPoint, g Group) (from float64, why string) {
	from = math.NaN()
	for i := len(points) - 1; i >= 0; i-- {
		for _, c := range points[i].Comparisons {
			if c.Group != g || c.Verdict == Good {
				continue
			}
			if math.IsNaN(from) {
				why = fmt.Sprintf("%s at %.6g: %s", c.Quantity, points[i].Luminosity, c.String())
			}
			return from, why
		}
		from = points[i].Luminosity
	}
	return from, ""
}

// crosscheckPoint makes the comparisons at one luminosity.
func (r *runner) crosscheckPoint(e *stats.Engine, l float64, formula Answer, exactToo bool) (CrosscheckPoint, []Distribution, error) {
	point := CrosscheckPoint{Luminosity: l}
	n := math.NaN()
	exact := ExactAnswer{Answer: Answer{Discovery: noDiscovery("", n), Exclusion: Exclusion{MuUp: noBand()}}}
	if exactToo {
		exact = exactly(e, r.config, formula)
	}
	var distributions []Distribution
	atom := 0.0
	if e.Bare() == 0 {
		comparisons, d, share, err := r.crosscheckDiscovery(e, l, formula.Discovery, exact, exactToo)
		if err != nil {
			return point, nil, err
		}
		point.Comparisons, distributions, atom = comparisons, d, share
	}
	comparisons, d, err := r.crosscheckExclusion(e, l, formula.Exclusion, exact.Exclusion)
	if err != nil {
		return point, nil, err
	}
	point.Comparisons = append(point.Comparisons, comparisons...)
	for k := range point.Comparisons {
		point.Comparisons[k].Luminosity = l
	}
	point.Reasons = reasons(e, r.config.Mu, atom)
	return point, append(distributions, d...), nil
}

// tested are the significances at which tails are compared.
var tested = []float64{1, 2, 3, 4, 5}

func (r *runner) crosscheckDiscovery(e *stats.Engine, l float64, formula Discovery, exact ExactAnswer, exactToo bool) ([]Comparison, []Distribution, float64, error) {
	signal, err := r.signal(e, l, r.config.Toys)
	if err != nil {
		return nil, nil, 0, err
	}
	var needed []float64
	for _, z := range tested {
		needed = append(needed, z*z)
	}
	if len(signal.toys) > 0 {
		needed = append(needed, signal.quantile(0.5))
	}
	last := tested[len(tested)-1]
	null, err := r.null(e, l, span{tested[0], math.Max(last, math.Min(formula.Z.Median+1, largestZ-2))}, 2*r.config.Toys, needed)
	if err != nil {
		return nil, nil, 0, err
	}
	r.check(null)
	d := summarise(signal, null)
	var exactTail *table
	if exactToo {
		if exactTail, err = exactTable(e, r.config.Mu, last); err != nil {
			exactTail = nil
		}
	}

	var out []Comparison
	for _, z := range tested {
		c := Comparison{Quantity: fmt.Sprintf("significance of q0 = %v", z*z), Group: Discovering, Kind: Significances, Formula: z, Exact: math.NaN()}
		var ok bool
		if c.Toys, c.Error, ok = null.z(z * z); !ok {
			c.Toys, c.Error, c.Why = math.NaN(), math.NaN(), "too few toys share that tail"
		}
		if exactTail != nil {
			c.Exact = math.Max(0, stats.Significance(exactTail.atLeast(z, 0, true)))
		}
		out = append(out, c)
	}
	out = append(out,
		Comparison{Quantity: "median Z", Group: Discovering, Kind: Significances,
			Formula: formula.Z.Median, Toys: d.Z.Median, Error: d.ZError.Median, Exact: exact.Discovery.Z.Median, Why: d.Why},
		Comparison{Quantity: "chance of 3σ", Group: Discovering, Kind: Chances,
			Formula: formula.Chance3, Toys: d.Chance3, Error: d.Chance3Error, Exact: exact.Discovery.Chance3, Why: d.ChanceWhy},
		Comparison{Quantity: "chance of 5σ", Group: Discovering, Kind: Chances,
			Formula: formula.Chance5, Toys: d.Chance5, Error: d.Chance5Error, Exact: exact.Discovery.Chance5, Why: d.ChanceWhy})

	edges := binsOf(math.Max(last, formula.Z.Plus2) + 1)
	without := Distribution{Statistic: "q0", Hypothesis: "background only", Luminosity: l, Edges: edges, Formula: normalBins(edges, 0)}
	without.Probability, without.Error = histogram(edges, null.toys, null.total)
	with := Distribution{Statistic: "q0", Hypothesis: "signal and background", Luminosity: l, Edges: edges, Formula: normalBins(edges, formula.Z.Median)}
	with.Probability, with.Error = histogram(edges, signal.toys, len(signal.toys))
	return out, []Distribution{without, with}, medianShare(signal), nil
}

// medianShare is the share of signal toys that tie with the median one.
func medianShare(signal *ranked) float64 {
	if len(signal.toys) == 0 {
		return 0
	}
	q, tied := signal.quantile(0.5), 0
	for _, toy := range signal.toys {
		if math.Abs(toy.q-q) <= tie {
			tied++
		}
	}
	return float64(tied) / float64(len(signal.toys))
}

func (r *runner) crosscheckExclusion(e *stats.Engine, l float64, formula, exact Exclusion) ([]Comparison, []Distribution, error) {
	x, err := r.limits(e, l, formula.MuUp)
	if err != nil {
		return nil, nil, err
	}
	var out []Comparison
	for i, name := range []string{"−2σ limit", "−1σ limit", "median limit", "+1σ limit", "+2σ limit"} {
		c := Comparison{Quantity: name + " on μ", Group: Excluding, Kind: Ratios,
			Formula: formula.MuUp.list()[i], Toys: x.MuUp.list()[i], Error: x.MuUpError.list()[i], Exact: exact.MuUp.list()[i], Why: x.Why}
		if other := x.MuUpOther.list()[i]; !math.IsNaN(other) {
			// On the edge of two outcomes either may be right.
			c.Toys, c.Error = (c.Toys+other)/2, math.Abs(c.Toys-other)/2+c.Error
		}
		out = append(out, c)
	}
	mu := formula.MuUp.Median
	if math.IsNaN(mu) {
		return out, nil, nil
	}
	s, err := r.jointFrom(e, l, crosscheckToys, []float64{mu}, []proposal{r.at(e, 0, r.config.Toys), r.at(e, mu, r.config.Toys)})
	if err != nil {
		return nil, nil, err
	}
	asimov := math.Sqrt(e.AsimovQTilde(mu))
	var distributions []Distribution
	edges := binsOf(asimov + 3)
	for h, name := range []string{"background only", "signal and background"} {
		var toys []weighted
		for b, block := range s.blocks {
			for _, toy := range block {
				toys = append(toys, weighted{q: toy.q[0], w: toy.weight[h], block: b})
			}
		}
		d := Distribution{Statistic: fmt.Sprintf("q̃ at μ = %.4g", mu), Hypothesis: name, Luminosity: l, Edges: edges, Formula: qTildeBins(edges, asimov, h == 1)}
		d.Probability, d.Error = histogram(edges, toys, len(toys))
		distributions = append(distributions, d)

		above, squares := 0.0, 0.0
		for _, toy := range toys {
			if toy.q >= asimov*asimov-tie {
				above += toy.w
				squares += toy.w * toy.w
			}
		}
		total := float64(len(toys))
		c := Comparison{Quantity: "P(q̃ ≥ its median) without signal", Group: Excluding, Kind: Chances,
			Formula: qTildeTail(asimov, asimov, false), Toys: above / total, Error: math.Sqrt(squares) / total, Exact: math.NaN()}
		if h == 1 {
			c.Quantity = "significance of q̃'s median at its μ"
			c.Kind, c.Formula = Significances, asimov
			p, err := c.Toys, c.Error
			c.Toys = stats.Significance(p)
			c.Error = err / density(c.Toys)
		}
		out = append(out, c)
	}
	return out, distributions, nil
}

func compareGoals(goals []Goal) []Comparison {
	n := math.NaN()
	var out []Comparison
	for _, g := range goals {
		group, name := Discovering, fmt.Sprintf("%s, %vσ", g.Name, g.Z)
		if g.Name == "exclusion" {
			group, name = Excluding, "exclusion of μ = 1"
		}
		formula, toys := g.Formula.roots(), g.Toys.roots()
		errs := [3]float64{g.Toys.Error, g.Toys.Error80, g.Toys.Error90}
		whys := [3]string{g.Toys.Why, g.Toys.Why80, g.Toys.Why90}
		for k, fraction := range fractions {
			c := Comparison{
				Quantity: fmt.Sprintf("%s, by %v %% of experiments", name, 100*fraction), Group: group, Luminosity: n, Kind: Ratios,
				Formula: formula[k], Toys: toys[k], Error: errs[k], Exact: n, Why: whys[k],
			}
			if g.Exact != nil {
				// The farther of both luminosities decides.
				c.Exact = g.Exact.First[k]
				if always := g.Exact.AlwaysAfter[k]; math.Abs(always-c.Formula) > math.Abs(c.Exact-c.Formula) {
					c.Exact = always
				}
			}
			out = append(out, c)
		}
	}
	return out
}

// reasons are what makes formulas fail, as far as it is there.
func reasons(e *stats.Engine, mu, atom float64) []string {
	var out list
	const few, visible, moved, thin = 10, 0.01, 0.1, 5
	if n := e.SmallestCount(mu); n < few {
		out.say("few events: the smallest expected count that the signal reaches is %.2g", n)
	}
	if atom > visible {
		out.say("discrete outcomes: the median one alone has a probability of %.2g", atom)
	}
	for _, p := range e.Floating() {
		if p.Strength >= moved {
			out.say("a parameter that exists only under the signal: the position or width of the signal is uncertain")
			break
		}
	}
	if n := e.SmallestControl(); n < thin {
		out.say("a boundary: a region without signal expects %.2g events, and backgrounds cannot fall below 0", n)
	}
	return out
}
