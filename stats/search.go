package stats

import "math"

const (
	searchRounds = 4
	// better is the fall of a deviance that counts as another maximum of the
	// likelihood.
	better = 1e-7
	// hopeless is how much higher half a deviance may be promised by one Newton
	// step for a fit to begin there.
	hopeless = 3
)

// search looks for a higher maximum of the likelihood than a fit of d found,
// with 0 <= minMu <= μ <= maxMu, from the starts of every scan that promise a
// local maximum, until a round over all scans finds none. fresh tells that the
// fit began at the auxiliary values.
func (f *Fitter) search(d *Data, fit Fit, minMu, maxMu float64, background, fresh bool) Fit {
	s := searching{f, d, fit, minMu, maxMu, background, fresh}
	copy(f.best, f.x)
	if !fresh {
		f.start(d, math.Max(minMu, math.Min(f.best[0], maxMu)))
		s.attempt()
	}
	for range searchRounds {
		before := s.best.Deviance
		for i := range f.engine.scans {
			switch scan := &f.engine.scans[i]; {
			case background && !scan.background:
			case len(scan.turning) > 0:
				s.turn(scan)
			case scan.ofSignal && !background:
				s.signal(scan)
			default:
				s.shift(scan)
			}
		}
		if !(s.best.Deviance < before-better) {
			break
		}
	}
	copy(f.x, f.best)
	return s.best
}

// searching is the state of one search; its best point is in Fitter.best.
type searching struct {
	*Fitter
	data           *Data
	best           Fit
	minMu, maxMu   float64
	backgroundOnly bool
	fresh          bool
}

// vary makes all of the fit's parameters variables again.
func (s *searching) vary() {
	s.variables = s.variables[:0]
	if s.minMu != s.maxMu {
		s.variables = append(s.variables, 0)
	}
	if s.backgroundOnly {
		s.variables = append(s.variables, s.engine.background...)
	} else {
		s.variables = append(s.variables, s.engine.all...)
	}
}

// attempt fits from x and keeps what is better.
func (s *searching) attempt() {
	s.vary()
	next := s.minimise(s.data, s.minMu, s.maxMu, s.backgroundOnly)
	if next.Status == Converged && (s.best.Status != Converged || next.Deviance < s.best.Deviance) {
		s.best = next
		copy(s.Fitter.best, s.x)
	}
}

// signal tries the starts of a direction that moves a signal's shape. In a free
// fit a start's promise is the likelihood without signal and what the score of a
// signal there gains, with the other parameters of the best fit; at a fixed μ it
// is the likelihood.
func (s *searching) signal(scan *scan) {
	for k, length := range scan.starts {
		s.place(scan, length)
		if s.minMu == s.maxMu {
			s.x[0] = s.minMu
			s.promises[k], s.strengths[k] = -s.value(s.x, s.data, false), s.minMu
			continue
		}
		s.promises[k], s.strengths[k] = s.score()
	}
	for k, length := range scan.starts {
		if length == 0 && s.fresh {
			continue // the first fit began there
		}
		if s.peaks(k, len(scan.starts)) {
			s.place(scan, length)
			s.x[0] = s.strengths[k]
			s.attempt()
		}
	}
}

// score is the likelihood at x without signal and what a signal there gains,
// with its strength.
func (s *searching) score() (promise, mu float64) {
	s.x[0] = 0
	if !s.derivatives(s.x, s.data, false, true) {
		return negInf, 0
	}
	information, score := s.hessian[0], -s.gradient[0]
	if !(information > 0) || score <= 0 {
		return negInf, 0
	}
	mu = math.Min(s.maxMu, score/information)
	return score*mu - information*mu*mu/2 - s.valueHere(s.x, s.data), mu
}

// peaks tells whether start k of n promises more than its neighbours.
func (s *searching) peaks(k, n int) bool {
	p := s.promises[k]
	return !math.IsInf(p, -1) && !(k > 0 && s.promises[k-1] > p) && !(k+1 < n && s.promises[k+1] >= p)
}

// move adds so much of the scan's direction to x.
func (s *scan) move(x []float64, length float64) {
	for _, c := range s.along {
		x[c.variable] += length * c.part
	}
}

// shift tries the starts of a direction that moves a background's shape.
func (s *searching) shift(scan *scan) {
	for k, length := range scan.starts {
		s.place(scan, length)
		s.promises[k] = s.newtonPromise()
	}
	for k, length := range scan.starts {
		if s.peaks(k, len(scan.starts)) && s.promises[k] > -s.best.Deviance/2-hopeless {
			s.place(scan, length)
			s.attempt()
		}
	}
}

// place sets x to the best fit with the scan's parameters at a start.
func (s *searching) place(scan *scan, length float64) {
	copy(s.x, s.Fitter.best)
	for _, c := range scan.along {
		s.x[c.variable] = 0
		for k, j := range s.engine.aux {
			if 1+j == c.variable {
				s.x[c.variable] = s.data.A[k]
			}
		}
	}
	scan.move(s.x, length)
}

// newtonPromise is the likelihood that one Newton step from x promises, or that
// of x where the Hessian is not positive.
func (s *searching) newtonPromise() float64 {
	s.vary()
	if !s.derivatives(s.x, s.data, s.backgroundOnly, false) {
		return negInf
	}
	promise := -s.valueHere(s.x, s.data)
	if slope, _, ok := s.newton(s.minMu, s.maxMu); ok {
		promise -= slope / 2
	}
	return promise
}

// turn tries the other values of a parameter that turns, at which one of its
// rates is what it is in the best fit.
func (s *searching) turn(scan *scan) {
	const (
		reach = 4.
		step  = 0.25
	)
	variable := scan.along[0].variable
	for i := range scan.turning {
		effect := &scan.turning[i]
		here := s.Fitter.best[variable]
		same := effect.value(here)
		last := effect.value(-reach) - same
		for x := -reach + step; x <= reach; x += step {
			next := effect.value(x) - same
			if last*next <= 0 && math.Abs(x-here) > 2*step {
				copy(s.x, s.Fitter.best)
				s.x[variable] = x - step/2
				if s.newtonPromise() > -s.best.Deviance/2-hopeless {
					copy(s.x, s.Fitter.best)
					s.x[variable] = x - step/2
					s.attempt()
				}
			}
			last = next
		}
	}
}
