package toys

import "math"

// poisson draws counts of one mean.
type poisson struct {
	mean float64

	// From a table: the cumulative probabilities from count first on, and for
	// each of len(guide) equal slices of [0, 1) where to begin the search.
	first      int
	cumulative []float64
	guide      []int32

	// Without one: constants of the transformed rejection, for small means only
	// the probability of nothing.
	a, b, vr, inverseAlpha, logMean float64
	nothing                         float64
}

const (
	tableMean     = 500 // largest mean drawn from a table
	rejectionMean = 10  // smallest mean of the transformed rejection
	tableDraws    = 300 // draws from which a table pays
)

// newPoisson prepares so many draws.
func newPoisson(mean float64, draws int) poisson {
	if !(mean >= 0) || math.IsInf(mean, 1) {
		panic("toys: a Poisson mean is negative or not finite") // rejection would never end
	}
	p := poisson{mean: mean}
	switch {
	case mean == 0:
	case mean <= tableMean && draws >= tableDraws:
		p.tabulate()
	case mean < rejectionMean:
		p.nothing = math.Exp(-mean)
	default:
		p.b = 0.931 + 2.53*math.Sqrt(mean)
		p.a = -0.059 + 0.02483*p.b
		p.inverseAlpha = 1.1239 + 1.1328/(p.b-3.4)
		p.vr = 0.9277 - 3.6224/(p.b-2)
		p.logMean = math.Log(mean)
	}
	return p
}

// tabulate prepares the guide-table method of Chen & Asau (1974): Devroye,
// Non-Uniform Random Variate Generation (1986), section III.2.4. Counts of
// probability below 1e-18, out of reach of a 53-bit uniform number, are left out.
func (p *poisson) tabulate() {
	reach := 9.5*math.Sqrt(p.mean) + 25
	p.first = int(math.Max(0, math.Floor(p.mean-reach)))
	last := int(p.mean + reach)
	p.cumulative = make([]float64, 0, last-p.first+1)
	mode := int(p.mean)
	lg, _ := math.Lgamma(float64(mode) + 1)
	top := math.Exp(float64(mode)*math.Log(p.mean) - p.mean - lg)
	probabilities := make([]float64, last-p.first+1)
	probabilities[mode-p.first] = top
	for n := mode - 1; n >= p.first; n-- {
		probabilities[n-p.first] = probabilities[n+1-p.first] * float64(n+1) / p.mean
	}
	for n := mode + 1; n <= last; n++ {
		probabilities[n-p.first] = probabilities[n-1-p.first] * p.mean / float64(n)
	}
	sum := 0.0
	for _, q := range probabilities {
		sum += q
		p.cumulative = append(p.cumulative, sum)
	}
	p.cumulative[len(p.cumulative)-1] = math.Inf(1)
	p.guide = make([]int32, 2*len(p.cumulative))
	k := 0
	for g := range p.guide {
		for p.cumulative[k] < float64(g)/float64(len(p.guide)) {
			k++
		}
		p.guide[g] = int32(k)
	}
}

func (p *poisson) draw(s *stream) float64 {
	switch {
	case p.mean == 0:
		return 0
	case p.guide != nil:
		u := s.Float64()
		k := p.guide[int(u*float64(len(p.guide)))]
		for p.cumulative[k] < u {
			k++
		}
		return float64(p.first + int(k))
	case p.mean < rejectionMean:
		return p.invert(s)
	}
	return p.reject(s)
}

// invert is sequential search: Devroye, section X.3.3.
func (p *poisson) invert(s *stream) float64 {
	u, term, n := s.Float64(), p.nothing, 0.0
	for u > term && term > 0 {
		u -= term
		n++
		term *= p.mean / n
	}
	return n
}

// reject is the transformed rejection PTRS of Hörmann, Insurance: Mathematics
// and Economics 12 (1993) 39.
func (p *poisson) reject(s *stream) float64 {
	for {
		u := s.Float64() - 0.5
		v := s.Float64()
		us := 0.5 - math.Abs(u)
		n := math.Floor((2*p.a/us+p.b)*u + p.mean + 0.43)
		if us >= 0.07 && v <= p.vr {
			return n
		}
		if n < 0 || us < 0.013 && v > us {
			continue
		}
		lg, _ := math.Lgamma(n + 1)
		if math.Log(v*p.inverseAlpha/(p.a/(us*us)+p.b)) <= n*p.logMean-p.mean-lg {
			return n
		}
	}
}
