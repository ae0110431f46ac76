package stats

import (
	"errors"
	"math"
)

// Status says how a fit ended.
type Status int

const (
	// Converged: the gradient, measured in its own metric gᵀH⁻¹g (the Newton
	// decrement) over the variables not held at a bound, is below 1e-8.
	Converged Status = iota
	// Failed: no convergence in the iterations allowed.
	Failed
	// Impossible: no parameters give the data any probability.
	Impossible
)

// Err is nil for a fit that converged.
func (s Status) Err() error {
	switch s {
	case Converged:
		return nil
	case Impossible:
		return errors.New("events stand in a bin that expects none")
	}
	return errors.New("the fit did not converge")
}

// Fit is the best agreement found between model and data.
type Fit struct {
	Deviance float64 // -2 ln of the likelihood ratio to the saturated model, >= 0
	Mu       float64
	Status   Status
}

// Fitter fits one experiment after another. It owns all scratch memory, so
// that a fit allocates nothing, and belongs to one goroutine.
type Fitter struct {
	engine   *Engine
	spaces   []workspace
	rows     []*row
	gradient []float64
	hessian  []float64

	x, trial, best, step, taken []float64
	free                        []int
	held                        []bool
	matrix, right               []float64
	variables                   []int

	begin               []float64 // start of a search
	promises, strengths []float64
}

// Fitter makes a fitter for one worker.
func (e *Engine) Fitter() *Fitter {
	size := 1 + len(e.params)
	f := &Fitter{
		engine:    e,
		gradient:  make([]float64, size),
		hessian:   make([]float64, size*size),
		x:         make([]float64, size),
		trial:     make([]float64, size),
		best:      make([]float64, size),
		step:      make([]float64, size),
		taken:     make([]float64, size),
		free:      make([]int, 0, size),
		held:      make([]bool, size),
		matrix:    make([]float64, size*size),
		right:     make([]float64, size),
		variables: make([]int, 0, size),
		begin:     make([]float64, size),
	}
	for _, s := range e.scans {
		if n := len(s.starts); n > len(f.promises) {
			f.promises, f.strengths = make([]float64, n), make([]float64, n)
		}
	}
	most := 0
	for c := range e.channels {
		w := newWorkspace(&e.channels[c])
		most = max(most, len(w.rows))
		f.spaces = append(f.spaces, w)
	}
	f.rows = make([]*row, 0, most)
	return f
}

// start puts the parameters at their auxiliary values, or nominal where they
// have none.
func (f *Fitter) start(d *Data, mu float64) {
	if len(d.N) != f.engine.bins || len(d.A) != len(f.engine.aux) || len(d.M) != len(f.engine.taus) {
		panic("stats: data do not fit the model")
	}
	f.x[0] = mu
	for j, p := range f.engine.params {
		f.x[1+j] = p.Nominal
	}
	for k, j := range f.engine.aux {
		f.x[1+j] = d.A[k]
	}
}

// Free fits d with 0 <= μ <= maxMu and all nuisance parameters, from the
// auxiliary values and the signal strength near.
func (f *Fitter) Free(d *Data, near, maxMu float64) Fit {
	near = math.Max(0, math.Min(near, maxMu))
	f.start(d, near)
	if near == 0 && math.IsInf(f.value(f.x, d, false), 1) {
		f.x[0] = math.Min(1, maxMu)
	}
	f.variables = append(append(f.variables[:0], 0), f.engine.all...)
	fit := f.minimise(d, 0, maxMu, false)
	if len(f.engine.scans) > 0 {
		fit = f.search(d, fit, 0, maxMu, false, true)
	}
	return fit
}

// At fits the nuisance parameters to d at a fixed mu, starting where the last
// fit ended, or from the auxiliary values where those parameters cannot be.
func (f *Fitter) At(d *Data, mu float64) Fit {
	f.x[0] = mu
	background := mu == 0
	if background {
		// Nothing but its auxiliary measurement pulls a parameter of signals alone.
		for k, j := range f.engine.aux {
			if !f.engine.movesBackground[j] {
				f.x[1+j] = d.A[k]
			}
		}
		f.variables = append(f.variables[:0], f.engine.background...)
	} else {
		f.variables = append(f.variables[:0], f.engine.all...)
	}
	if math.IsInf(f.value(f.x, d, background), 1) {
		f.start(d, mu)
	}
	fit := f.minimise(d, mu, mu, background)
	if len(f.engine.scans) > 0 {
		fit = f.search(d, fit, mu, mu, background, false)
	}
	return fit
}

// AtFresh is At from the auxiliary values, for a first fit of its data.
func (f *Fitter) AtFresh(d *Data, mu float64) Fit {
	f.start(d, mu)
	return f.At(d, mu)
}

// Restart makes a fit of d that was made before the last one, so that At may
// begin there.
func (f *Fitter) Restart(d *Data, fit Fit) { f.start(d, fit.Mu) }
