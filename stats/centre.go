package stats

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// Held fixes one parameter of signals alone, by its index among the engine's
// parameters, at a value in the signal of a Centre.
type Held struct {
	Param int
	Value float64
}

// Centre is a point with the signal strength that its data look like.
type Centre struct {
	Point
	Mu float64
	// Spread is the standard deviation that auxiliary measurements are to be
	// thrown with: 1, or more where the tail is wider than that. A parameter
	// that multiplies a rate by much on the way to the centre bends the surface
	// of equal q0 towards that of equal probability, along which the tail then
	// stretches.
	Spread []float64
}

// A parameter bends where it changes the logarithm of a background's rate by
// more than bentRate at the centre.
const (
	bentRate   = 0.3
	bentSpread = 1.8
)

// fewestEvents is what a free background keeps at least in a Centre: below it
// the background-only fit has no interior solution.
const fewestEvents = 0.3

// Centre gives the most probable data without signal whose q0 is z²: the point
// around which toys of a tail are thrown.
//
// Let the data be the Asimov data of some (μ, θ, φ) with auxiliary values at θ,
// such that their background-only fit is the truth. Then the free fit has
// deviance 0, and q0 = 2[Σ(λ* ln(λ*/λ0) - λ* + λ0) + ½|a*|²], twice the
// large-deviation rate of the data. Since q0(x) <= D0(x) <= 2·rate(x) for every x, no
// data with that q0 are more probable. For a given μ the background parameters p
// solve the score equations of the truth,
//
//	Σ_i (λ_i(μ, p)/λ_i0 - 1) ∂λ_i0/∂p + (θ_p where p is constrained) = 0,
//
// and μ is the root of q0 = z². Where a background would have to go below
// fewestEvents (or its nominal, if less) it stays there, and μ rises until q0,
// then by a fit, is z² all the same.
func (e *Engine) Centre(z float64, held ...Held) (Centre, error) {
	c := newCentring(e, 0, held)
	mu, err := toRoot(z, c.q0)
	if err != nil {
		return Centre{}, fmt.Errorf("most probable background-only data at %v standard deviations: %w", z, err)
	}
	return Centre{c.point(), mu, c.spread()}, nil
}

var errUnsolved = errors.New("the score equations did not converge")

// toRoot is the μ at which q0 is z². Its root is nearly proportional to μ: a few
// steps of the secant.
func toRoot(z float64, q0 func(mu float64) (float64, error)) (float64, error) {
	mu, lastMu, lastRoot := 1.0, 0.0, 0.0
	for range 100 {
		q, err := q0(mu)
		if err != nil {
			return math.NaN(), err
		}
		root := math.Sqrt(q)
		if math.Abs(root-z) < 1e-8*z {
			return mu, nil
		}
		next := mu + (z-root)*(mu-lastMu)/(root-lastRoot)
		if !(next > mu/4 && next < 4*mu) {
			next = mu * math.Max(0.25, math.Min(4, z/root))
		}
		mu, lastMu, lastRoot = next, mu, root
	}
	return math.NaN(), errors.New("none are found")
}

// Deficit gives the most probable data of signal strength mu that look like a
// lower one, or a negative one, z standard deviations down: twice their
// large-deviation rate is z², or less where a bin would lose nearly all that is
// expected there. The score equations are those of Centre.
func (e *Engine) Deficit(mu, z float64) Centre {
	c := newCentring(e, mu, nil)
	c.pull(mu, z, func() (float64, bool) {
		if c.solve() != nil {
			return 0, false
		}
		c.expect()
		return c.rate(), c.keeps(c.lambda, c.truth)
	})
	return Centre{Point: c.point(), Spread: c.spread()}
}

// keeps tells whether every bin keeps a part of what is expected.
func (c *centring) keeps(lambda, expected []float64) bool {
	const part = 0.05
	for i, l := range lambda {
		if !(l >= part*expected[i]) {
			return false
		}
	}
	return true
}

// pull takes c.x to the strength below mu at which twice the rate is z², or to the
// last at which the data exist.
func (c *centring) pull(mu, z float64, rate func() (rate float64, ok bool)) {
	good := slices.Clone(c.x)
	// below tells whether the data at a strength exist and are less than z down.
	below := func(down float64) bool {
		copy(c.x, good)
		c.x[0] = mu - down
		r, ok := rate()
		if !ok || !(2*r < z*z) {
			return false
		}
		copy(good, c.x)
		return true
	}
	low, high := 0.0, 1.0
	for below(high) && high < 1e12 {
		low, high = high, 2*high
	}
	for range 40 {
		if middle := (low + high) / 2; below(middle) {
			low = middle
		} else {
			high = middle
		}
	}
	copy(c.x, good)
	c.x[0] = mu - low
	rate() // sets the data
}

// centring is the state of one search for a Centre.
type centring struct {
	engine    *Engine
	fitter    *Fitter
	variables []int       // that the score equations are solved for
	x         []float64   // variables, background parameters solved for
	lambda    []float64   // of the data, by bin
	m         []float64   // of the data, by simulation factor
	moves     []response  // of lambda with what is expected, by bin
	truth     []float64   // nominal
	share     []float64   // of the background in truth, by bin
	slopes    [][]float64 // ∂λ0/∂p of the truth, by background parameter
	floor     []float64   // lowest value of each background parameter
}

func newCentring(e *Engine, mu float64, held []Held) *centring {
	variables := e.background
	if mu > 0 {
		variables = e.all
	}
	c := &centring{
		engine:    e,
		fitter:    e.Fitter(),
		variables: variables,
		x:         e.nominal(),
		lambda:    make([]float64, e.bins),
		m:         make([]float64, len(e.taus)),
		moves:     make([]response, e.bins),
		truth:     e.Point(mu, nil).Lambda,
		share:     e.Point(0, nil).Lambda,
	}
	for i, l := range c.truth {
		if l > 0 {
			c.share[i] /= l
		}
	}
	c.x[0] = mu
	for i := range c.moves {
		c.moves[i] = response{1, 1}
	}
	c.slopes = c.jacobian()
	for _, h := range held {
		c.x[1+h.Param] = h.Value
	}
	for _, v := range c.variables {
		floor := e.params[v-1].Lower
		if floor == 0 {
			smallest := posInf
			for _, ch := range e.channels {
				for _, p := range ch.processes {
					if p.factor == v {
						smallest = math.Min(smallest, p.yield)
					}
				}
			}
			floor = math.Min(e.params[v-1].Nominal, fewestEvents/smallest)
		}
		c.floor = append(c.floor, floor)
	}
	return c
}

// response is ∂λ/∂ of the signal and of the background expected with every
// simulation factor at 1.
type response struct{ signal, background float64 }

// expect sets lambda and m to the data at c.x. A simulation factor follows from
// its own score equation of the truth, n·b0/λ0 + m = b0 + τ, and stays where its
// background keeps fewestEvents.
func (c *centring) expect() (clamped bool) {
	for ci := range c.engine.channels {
		ch := &c.engine.channels[ci]
		c.fitter.expect(ci, c.x, c.lambda, false)
		for bin, at := range ch.simulated {
			if at.tau == 0 {
				continue
			}
			i := ch.first + bin
			b := c.fitter.spaces[ci].background[bin]
			s := c.lambda[i] - b
			nominal := c.truth[i] * c.share[i]
			total := c.share[i]*b + at.tau
			g := (nominal + at.tau - c.share[i]*s) / total
			c.moves[i] = response{at.tau / total, g * at.tau / total}
			if floor := math.Min(1, fewestEvents/nominal); g < floor {
				g, clamped = floor, true
				c.moves[i] = response{1, g}
			}
			c.lambda[i] = s + g*b
			c.m[at.index] = g * at.tau
		}
	}
	for i, l := range c.truth {
		if l == 0 {
			c.lambda[i] = 0 // no data of the truth fall there
		}
	}
	return clamped
}

// jacobian is ∂λ/∂p at c.x for each background parameter, over all bins.
func (c *centring) jacobian() [][]float64 {
	e, f := c.engine, c.fitter
	out := make([][]float64, len(c.variables))
	for k := range out {
		out[k] = make([]float64, e.bins)
	}
	index := make(map[int]int, len(c.variables))
	for k, v := range c.variables {
		index[v] = k
	}
	for ci := range e.channels {
		ch := &e.channels[ci]
		f.expectations(ci, c.x, false, true)
		columns := f.arrange(ci, false)
		rows := f.jacobianRows(ci, c.x, false)
		for u, r := range rows {
			for i, col := range r.cols {
				k, ok := index[ch.variables[col]]
				if !ok {
					continue
				}
				by := r.vals[i] * f.spaces[ci].scale[u]
				for bin, v := range columns[u] {
					move := c.moves[ch.first+bin].background
					if f.spaces[ci].ofSignal[u] {
						move = c.moves[ch.first+bin].signal
					}
					out[k][ch.first+bin] += move * by * v
				}
			}
		}
	}
	return out
}

// q0 solves the score equations at mu, from the last solution, and gives q0 of
// the data.
func (c *centring) q0(mu float64) (float64, error) {
	c.x[0] = mu
	if err := c.solve(); err != nil {
		return math.NaN(), err
	}
	clamped := c.expect()
	for k, v := range c.variables {
		clamped = clamped || c.x[v] <= c.floor[k]
	}
	if !clamped {
		return 2 * c.rate(), nil
	}
	fit := c.fitter.AtFresh(c.point().Asimov(), 0)
	return fit.Deviance, fit.Status.Err()
}

// rate is the large-deviation rate of the data of the last expect.
func (c *centring) rate() float64 {
	rate := 0.0
	for i, l := range c.lambda {
		if l > 0 {
			rate += deviance(l, c.truth[i])
		} else {
			rate += c.truth[i]
		}
	}
	for k, tau := range c.engine.taus {
		rate += deviance(c.m[k], tau)
	}
	for _, v := range c.variables {
		if c.engine.params[v-1].Constrained {
			rate += c.x[v] * c.x[v] / 2
		}
	}
	return rate
}

// solve is Newton's method on the score equations, with the parameters at
// their floor left out.
func (c *centring) solve() error {
	e := c.engine
	n := len(c.variables)
	residual := make([]float64, n)
	for range 100 {
		c.expect()
		jacobian := c.jacobian()
		var solved []int
		for j, v := range c.variables {
			residual[j] = 0
			for i, l := range c.lambda {
				if c.truth[i] > 0 {
					residual[j] += (l/c.truth[i] - 1) * c.slopes[j][i]
				}
			}
			if e.params[v-1].Constrained {
				residual[j] += c.x[v]
			}
			// At the floor the score may ask for even less, not for more.
			if c.x[v] > c.floor[j] || residual[j] < 0 {
				solved = append(solved, j)
			}
		}
		if len(solved) == 0 {
			return nil
		}
		a := mat.NewDense(len(solved), len(solved), nil)
		b := mat.NewVecDense(len(solved), nil)
		for r, j := range solved {
			b.SetVec(r, -residual[j])
			for s, k := range solved {
				sum := 0.0
				for i := range c.lambda {
					if c.truth[i] > 0 {
						sum += jacobian[k][i] * c.slopes[j][i] / c.truth[i]
					}
				}
				if j == k && e.params[c.variables[j]-1].Constrained {
					sum++
				}
				a.Set(r, s, sum)
			}
		}
		var step mat.VecDense
		if err := step.SolveVec(a, b); err != nil {
			return err
		}
		moved := 0.0
		for r, j := range solved {
			moved = math.Max(moved, c.advance(c.x, c.variables[j], step.AtVec(r), c.floor[j]))
		}
		if moved < 1e-11 {
			return nil
		}
	}
	return errUnsolved
}

// advance moves one variable by a step, by no more than five of its own and
// within its bounds, and tells by how many of them.
func (c *centring) advance(x []float64, v int, step, floor float64) float64 {
	p := &c.engine.params[v-1]
	move := math.Max(-5*p.Step, math.Min(5*p.Step, step))
	to := math.Min(p.Upper, math.Max(floor, x[v]+move))
	moved := math.Abs(to-x[v]) / p.Step
	x[v] = to
	return moved
}

// point is the data found: auxiliary values at the solution, those of held
// parameters and of signals alone at nominal.
func (c *centring) point() Point {
	p := Point{Lambda: slices.Clone(c.lambda), A: make([]float64, len(c.engine.aux)), M: slices.Clone(c.m)}
	for k, j := range c.engine.aux {
		if slices.Contains(c.variables, 1+j) {
			p.A[k] = c.x[1+j]
		}
	}
	return p
}

// spread is Centre.Spread of the data found.
func (c *centring) spread() []float64 {
	e := c.engine
	change := make([]float64, len(e.params))
	for _, ch := range e.channels {
		for _, p := range ch.processes {
			if p.signal {
				continue
			}
			for _, effect := range p.rate {
				change[effect.Param-1] = math.Max(change[effect.Param-1], math.Abs(effect.value(c.x[effect.Param])))
			}
		}
	}
	out := make([]float64, len(e.aux))
	for k, j := range e.aux {
		out[k] = 1
		if change[j] > bentRate {
			out[k] = bentSpread
		}
	}
	return out
}
