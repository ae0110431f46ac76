package toys

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mathext"

	"lumireach/stats"
)

// Toys do not redraw the curve of significance against luminosity, which the
// formulas give with its floors and without noise: they correct it. The
// difference of toys and formula is small and smooth, a line in ln L near the
// formula's root.

// lattice is the ratio of neighbouring luminosities at which a correction is
// measured; those within two steps of the formula's root, a factor 1.4, are fitted.
var lattice = math.Pow(1.4, 0.5)

const goalSteps = 2

const (
	farthestRoot = 3   // ratio to the formula's root at which a correction is no correction
	vague        = 0.5 // relative error of a luminosity that is not worth printing
)

// aim is a goal as a root: formula(L) = target for each fraction.
type aim struct {
	formula func(*stats.Engine) (float64, error)
	target  [3]float64
	offset  [3]float64 // what the formula's own value is to be raised by
	measure func(e *stats.Engine, luminosity float64) (measurement, error)
}

// goalToys is how many toys of each hypothesis one luminosity of a goal gets.
func (c Config) goalToys() int { return max(MinToys, c.Toys*2/5) }

// toyGoals solves the goals by toys, starting from the formulas' answers. What
// luminosities are listed plays no part.
func (r *runner) toyGoals(search stats.Search, goals []Goal) error {
	first, last := slices.Min(r.config.Luminosities), slices.Max(r.config.Luminosities)
	for i := range goals {
		g := &goals[i]
		r.stage("goal: " + g.Name)
		answer, err := r.toyGoal(search, g)
		if err != nil {
			return err
		}
		answer.BeyondList = answer.Luminosity < first || answer.Luminosity > last
		g.Toys = answer
	}
	return nil
}

// goalLuminosities are the points of the lattice that the roots given need.
func goalLuminosities(roots [3]float64) []float64 {
	origin := math.NaN()
	var steps []int
	for _, root := range roots {
		if math.IsNaN(root) {
			continue
		}
		if math.IsNaN(origin) {
			origin = root
		}
		centre := int(math.Round(math.Log(root/origin) / math.Log(lattice)))
		for k := centre - goalSteps; k <= centre+goalSteps; k++ {
			steps = append(steps, k)
		}
	}
	slices.Sort(steps)
	var out []float64
	for _, k := range slices.Compact(steps) {
		out = append(out, origin*math.Pow(lattice, float64(k)))
	}
	return out
}

func (a GoalAnswer) roots() [3]float64 {
	return [3]float64{a.Luminosity, a.Luminosity80, a.Luminosity90}
}

// plannedGoals is how many toys the goals take.
func (r *runner) plannedGoals(goals []Goal) int64 {
	n := 0
	for _, g := range goals {
		n += len(goalLuminosities(g.Formula.roots())) * 2 * r.config.goalToys()
	}
	return int64(n)
}

func (r *runner) toyGoal(search stats.Search, g *Goal) (*GoalAnswer, error) {
	n := math.NaN()
	answer := &GoalAnswer{Luminosity: n, Error: n, Luminosity80: n, Error80: n, Luminosity90: n, Error90: n, Plateau: n}
	answer.Why, answer.Why80, answer.Why90 = g.Formula.Why, g.Formula.Why80, g.Formula.Why90
	roots := g.Formula.roots()

	a := r.discoveryAim(g.Z)
	if g.Name == "exclusion" {
		a = r.exclusionAim()
	}
	var measured []measurement
	var formula []float64
	for _, l := range goalLuminosities(roots) {
		e, err := search.Engine(l)
		if err != nil {
			return nil, err
		}
		f, err := a.formula(e)
		if err != nil {
			return nil, err
		}
		m, err := a.measure(e, l)
		if err != nil {
			return nil, err
		}
		measured = append(measured, m)
		formula = append(formula, f)
		answer.Toys += m.toys
		answer.FailedFits += m.failed
	}
	places := [3]struct {
		luminosity, err *float64
		why             *string
	}{
		{&answer.Luminosity, &answer.Error, &answer.Why},
		{&answer.Luminosity80, &answer.Error80, &answer.Why80},
		{&answer.Luminosity90, &answer.Error90, &answer.Why90},
	}
	for k, root := range roots {
		if math.IsNaN(root) {
			continue
		}
		l, err, why := correct(search, a, k, root, measured, formula)
		*places[k].luminosity, *places[k].err, *places[k].why = l, err, why
	}
	return answer, nil
}

// discoveryAim is a significance z for a fraction c of experiments: the formula
// has Z normal about its median with unit width, so its (1-c)-quantile is
// Φ⁻¹(c) below.
func (r *runner) discoveryAim(z float64) aim {
	a := aim{
		formula: func(e *stats.Engine) (float64, error) { return e.MedianZ(r.config.Mu) },
		target:  [3]float64{z, z, z},
		measure: func(e *stats.Engine, l float64) (measurement, error) {
			return r.measureDiscovery(e, l, z, r.config.goalToys())
		},
	}
	for k, fraction := range fractions {
		a.offset[k] = -stats.PhiInverse(fraction)
	}
	return a
}

// exclusionAim is the exclusion of μ = 1 by a fraction of the experiments
// without signal, on the scale of normal quantiles.
func (r *runner) exclusionAim() aim {
	a := aim{
		formula: func(e *stats.Engine) (float64, error) { return e.ExclusionN(r.config.Confidence) },
		measure: func(e *stats.Engine, l float64) (measurement, error) {
			return r.measureExclusion(e, l, 2*r.config.goalToys())
		},
	}
	for k, fraction := range fractions {
		a.target[k] = stats.PhiInverse(fraction)
	}
	return a
}

// correct fits the difference of toys and formula near the formula's root with
// a line in ln L and solves for the luminosity, with the error of the replicas.
func correct(search stats.Search, a aim, k int, root float64, measured []measurement, formula []float64) (luminosity, err float64, why string) {
	var x, d, sigma, steps []float64
	var used []int
	stuck := false // every resampled set has the same discrete outcome
	for i, m := range measured {
		ratio := math.Log(m.luminosity / root)
		if math.Abs(ratio) > (goalSteps+0.6)*math.Log(lattice) || math.IsNaN(m.value[k]) {
			continue
		}
		if math.IsInf(m.value[k], 0) { // all experiments or none
			stuck = true
			continue
		}
		var finite []float64
		for _, v := range m.replicas[k] {
			if !math.IsNaN(v) && !math.IsInf(v, 0) {
				finite = append(finite, v)
			}
		}
		s := deviation(finite)
		if len(finite) < replicas*9/10 || !(s > 0) {
			stuck = stuck || s == 0
			continue
		}
		x = append(x, ratio)
		d = append(d, m.value[k]-formula[i]-a.offset[k])
		sigma = append(sigma, s)
		steps = append(steps, m.step[k])
		used = append(used, i)
	}
	const stepwise = "the toys' answer moves in steps with luminosity: there is no single luminosity for this goal"
	if len(x) < 3 && stuck {
		return math.NaN(), math.NaN(), stepwise
	}
	if len(x) < 3 {
		return math.NaN(), math.NaN(), "too few luminosities near the formula's answer at which the toys give a number"
	}
	slices.Sort(steps)
	if slices.Sort(sigma); steps[len(steps)/2] > 2*sigma[len(sigma)/2] {
		return math.NaN(), math.NaN(), stepwise
	}
	even(sigma)
	intercept, slope := line(x, d, sigma)
	chi2 := 0.0
	for i := range x {
		pull := (d[i] - intercept - slope*x[i]) / sigma[i]
		chi2 += pull * pull
	}
	// Refused at 1 in 1000: nine lines are fitted in one run.
	if p := mathext.GammaIncRegComp(float64(len(x)-2)/2, chi2/2); p < 1e-3 {
		return math.NaN(), math.NaN(), stepwise
	}

	l, solved := search.Luminosity(func(e *stats.Engine) (float64, error) {
		f, err := a.formula(e)
		if err != nil {
			return math.NaN(), err
		}
		return f + a.offset[k] + intercept - a.target[k], nil
	}, root/farthestRoot, farthestRoot*root)
	if solved != nil {
		return math.NaN(), math.NaN(), fmt.Sprintf("the toys' answer lies more than a factor %v from the formula's, %.4g", farthestRoot, root)
	}
	// One step more: the correction at the root found, not at the formula's.
	rate, failure := steepness(search, a, l)
	if failure != nil || !(rate+slope > 0) {
		return math.NaN(), math.NaN(), "the toys' answer does not grow with luminosity"
	}
	shift := slope * math.Log(l/root)
	l *= math.Exp(-shift / (rate + slope))

	at := math.Log(l / root)
	bound := 0.0
	moved := make([]float64, 0, replicas)
	again := make([]float64, len(used))
	for _, m := range used {
		bound = math.Max(bound, measured[m].bound[k]/(rate+slope))
	}
	for b := range replicas {
		ok := true
		for i, m := range used {
			v := measured[m].replicas[k][b]
			ok = ok && !math.IsNaN(v) && !math.IsInf(v, 0)
			again[i] = d[i] + v - measured[m].value[k]
		}
		if !ok {
			continue
		}
		i2, s2 := line(x, again, sigma)
		moved = append(moved, (i2+s2*at)/(rate+slope))
	}
	err = l * (deviation(moved) + bound)
	if !(err < vague*l) {
		return math.NaN(), math.NaN(), fmt.Sprintf("the toys know the luminosity to no better than %.0f %%", 100*err/l)
	}
	return l, err, ""
}

// steepness is the growth of the formula's value with ln L.
func steepness(search stats.Search, a aim, luminosity float64) (float64, error) {
	const h = 0.01
	var f [2]float64
	for i, l := range [2]float64{luminosity * math.Exp(-h), luminosity * math.Exp(h)} {
		e, err := search.Engine(l)
		if err != nil {
			return 0, err
		}
		if f[i], err = a.formula(e); err != nil {
			return 0, err
		}
	}
	return (f[1] - f[0]) / (2 * h), nil
}

// even replaces the errors by one for all, their root mean square. Each comes
// from few blocks and from the same toys as its value: weighting by it would pull
// the line to the values that happen to come with small errors.
func even(sigma []float64) {
	rms := floats.Norm(sigma, 2) / math.Sqrt(float64(len(sigma)))
	for i := range sigma {
		sigma[i] = rms
	}
}

// line is the weighted least-squares straight line through y ± sigma at x.
func line(x, y, sigma []float64) (intercept, slope float64) {
	var s, sx, sy, sxx, sxy float64
	for i := range x {
		w := 1 / (sigma[i] * sigma[i])
		s += w
		sx += w * x[i]
		sy += w * y[i]
		sxx += w * x[i] * x[i]
		sxy += w * x[i] * y[i]
	}
	determinant := s*sxx - sx*sx
	return (sxx*sy - sx*sxy) / determinant, (s*sxy - sx*sy) / determinant
}
