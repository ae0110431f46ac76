package stats

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Split sets signal and background to what each bin expects at μ = 1, with the
// constrained parameters at theta, in the order of Data.A, the simulation factors
// at gamma, in the order of Data.M, and the free parameters at nominal.
func (f *Fitter) Split(theta, gamma, signal, background []float64) {
	e := f.engine
	for j, p := range e.params {
		f.x[1+j] = p.Nominal
	}
	for k, j := range e.aux {
		f.x[1+j] = theta[k]
	}
	f.x[0] = 1
	for c := range e.channels {
		f.expect(c, f.x, background, true)
		f.expect(c, f.x, signal, false)
	}
	for i, b := range background {
		// Backgrounds are summed in the same order, so that nothing is left of
		// them.
		signal[i] -= b
	}
	for c := range e.channels {
		ch := &e.channels[c]
		for bin, at := range ch.simulated {
			if at.tau > 0 {
				background[ch.first+bin] *= gamma[at.index]
			}
		}
	}
}

// Taus are the sizes of the simulation behind each factor, in the order of
// Data.M.
func (e *Engine) Taus() []float64 { return e.taus }

// DrawnCentre is where toys of a tail are thrown from when nuisance parameters
// are drawn anew for every toy and auxiliary measurements stay at nominal.
type DrawnCentre struct {
	Mu    float64   // that the data look like, or that they are thrown with
	Theta []float64 // centres of the constrained parameters, in the order of Data.A
	Gamma []float64 // centres of the simulation factors
	Tilt  []float64 // by bin: factor on what is expected without signal
}

// DrawnCentre gives the most probable parameters and data without signal whose
// q0 is z² when the parameters are drawn (Cousins & Highland, Nucl. Instrum.
// Meth. A320 (1992) 331).
//
// Auxiliary values stay at nominal, so the data are the Asimov data of (μ, θ = 0,
// φ) alone, and the parameters that make them most probable without signal are
// those of their background-only fit. φ is such that this fit has the free
// parameters of the truth.
func (e *Engine) DrawnCentre(z float64, held ...Held) (DrawnCentre, error) {
	c := drawnCentring{centring: newCentring(e, 0, held), null: e.nominal()}
	mu, err := toRoot(z, c.q0)
	if err != nil {
		return DrawnCentre{}, fmt.Errorf("most probable background-only data at %v standard deviations: %w", z, err)
	}
	return c.centre(mu), nil
}

// DrawnDeficit is Deficit where parameters are drawn.
func (e *Engine) DrawnDeficit(mu, z float64) DrawnCentre {
	c := drawnCentring{centring: newCentring(e, mu, nil), null: e.nominal()}
	c.null[0] = mu
	c.pull(mu, z, func() (float64, bool) {
		if c.solve() != nil {
			return 0, false
		}
		d := c.data()
		fit := c.fitter.AtFresh(d, mu)
		return fit.Deviance / 2, fit.Status == Converged && c.keeps(d.N, c.truth)
	})
	return c.centre(mu)
}

type drawnCentring struct {
	*centring
	null []float64 // variables of the background-only fit
}

// data are those of c.x.
func (c *drawnCentring) data() *Data {
	for ci := range c.engine.channels {
		c.fitter.expect(ci, c.x, c.lambda, false)
	}
	return &Data{N: c.lambda, A: make([]float64, len(c.engine.aux)), M: c.engine.taus}
}

// q0 solves the score equations at mu and gives q0 of the data.
func (c *drawnCentring) q0(mu float64) (float64, error) {
	c.x[0] = mu
	if err := c.solve(); err != nil {
		return math.NaN(), err
	}
	q, status := c.fitter.Q0(c.data(), mu)
	return q, status.Err()
}

// residuals are the score equations of the background-only fit, by background
// parameter.
func (c *drawnCentring) residuals(dst []float64) {
	c.fitter.derivatives(c.null, c.data(), c.null[0] == 0, false)
	for j, v := range c.variables {
		dst[j] = c.fitter.gradient[v]
	}
}

// solve finds the constrained parameters of the fit, in c.null, and the free ones
// of the data, in c.x, by Newton's method; a free one at its floor is left out.
func (c *drawnCentring) solve() error {
	const h = 1e-6 // of a parameter's step, for what free parameters do
	e := c.engine
	n := len(c.variables)
	at, up, down := make([]float64, n), make([]float64, n), make([]float64, n)
	for range mostSteps {
		c.residuals(at)
		var solved []int
		for j, v := range c.variables {
			// A floor is left only where the data have too few events.
			if e.params[v-1].Constrained || c.x[v] > c.floor[j] || at[j] > 0 {
				solved = append(solved, j)
			}
		}
		if len(solved) == 0 {
			return nil
		}
		a := mat.NewDense(len(solved), len(solved), nil)
		b := mat.NewVecDense(len(solved), nil)
		size := len(c.x)
		for r, j := range solved {
			b.SetVec(r, -at[j])
			for s, k := range solved {
				a.Set(r, s, c.fitter.hessian[c.variables[j]*size+c.variables[k]])
			}
		}
		for s, k := range solved {
			v := c.variables[k]
			if e.params[v-1].Constrained {
				continue
			}
			keep, step := c.x[v], h*e.params[v-1].Step
			c.x[v] = keep + step
			c.residuals(up)
			c.x[v] = keep - step
			c.residuals(down)
			c.x[v] = keep
			for r, j := range solved {
				a.Set(r, s, (up[j]-down[j])/(2*step))
			}
		}
		var step mat.VecDense
		if err := step.SolveVec(a, b); err != nil {
			return err
		}
		moved := 0.0
		for r, j := range solved {
			v := c.variables[j]
			of, floor := c.x, c.floor[j]
			if e.params[v-1].Constrained {
				of, floor = c.null, negInf
			}
			moved = math.Max(moved, c.advance(of, v, step.AtVec(r), floor))
		}
		if moved < 1e-8 {
			return nil
		}
	}
	return errUnsolved
}

func (c *drawnCentring) centre(mu float64) DrawnCentre {
	e := c.engine
	out := DrawnCentre{
		Mu:    mu,
		Theta: make([]float64, len(e.aux)),
		Gamma: make([]float64, len(e.taus)),
		Tilt:  make([]float64, e.bins),
	}
	d := c.data()
	// At a floor the fit's free parameters are not the truth's: the constrained
	// ones that go with the truth's are what is wanted.
	for k, j := range e.aux {
		out.Theta[k] = c.null[1+j]
	}
	expected := make([]float64, e.bins)
	for ci := range e.channels {
		ch := &e.channels[ci]
		c.fitter.expect(ci, c.null, expected, c.null[0] == 0)
		for bin, at := range ch.simulated {
			if at.tau > 0 {
				i := ch.first + bin
				b := c.fitter.spaces[ci].background[bin]
				s := expected[i] - b
				g := factor(d.N[i], at.tau, s, b, at.tau)
				out.Gamma[at.index] = g
				expected[i] = s + g*b
			}
		}
	}
	for i, l := range expected {
		out.Tilt[i] = 1
		if l > 0 {
			out.Tilt[i] = d.N[i] / l
		}
	}
	return out
}
