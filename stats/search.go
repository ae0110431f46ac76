package stats

import "math"

// searchFree looks for a higher maximum of the likelihood of a free fit: with
// the backgrounds of the best fit it takes the score of a signal at each start, and
// fits from the starts that promise a local maximum.
func (f *Fitter) searchFree(d *Data, fit Fit, maxMu float64) Fit {
	return f.search(d, fit, func(variable int, offset float64) (promise, mu float64) {
		f.x[0] = 0
		f.x[variable] += offset
		if !f.derivatives(f.x, d, false, true) {
			return negInf, 0
		}
		information := f.hessian[0]
		score := -f.gradient[0]
		if !(information > 0) || score <= 0 {
			return negInf, 0
		}
		mu = math.Min(maxMu, score/information)
		return score*mu - information*mu*mu/2 - offset*offset/2, mu
	}, 0, maxMu)
}

// searchAt is searchFree for a fit at a fixed mu: the likelihood at each start
// is its promise.
func (f *Fitter) searchAt(d *Data, fit Fit, mu float64) Fit {
	return f.search(d, fit, func(variable int, offset float64) (float64, float64) {
		f.x[0] = mu
		f.x[variable] += offset
		return -f.value(f.x, d, false), mu
	}, mu, mu)
}

// search fits from the promising starts of every scan and keeps the best fit.
func (f *Fitter) search(d *Data, fit Fit, promise func(variable int, offset float64) (promise, mu float64), minMu, maxMu float64) Fit {
	best := fit
	copy(f.best, f.x)
	start := f.begin
	for _, s := range f.engine.scans {
		copy(start, f.best)
		for k, j := range f.engine.aux {
			if !f.engine.movesBackground[j] {
				start[1+j] = d.A[k]
			}
		}
		for k, offset := range s.offsets {
			copy(f.x, start)
			f.promises[k], f.strengths[k] = promise(s.variable, offset)
		}
		for k, offset := range s.offsets {
			p := f.promises[k]
			if math.IsInf(p, -1) || k > 0 && f.promises[k-1] > p || k+1 < len(s.offsets) && f.promises[k+1] >= p {
				continue
			}
			copy(f.x, start)
			f.x[0] = f.strengths[k]
			f.x[s.variable] += offset
			f.variables = f.variables[:0]
			if minMu != maxMu {
				f.variables = append(f.variables, 0)
			}
			f.variables = append(f.variables, f.engine.all...)
			next := f.minimise(d, minMu, maxMu, false)
			if next.Status == Converged && (best.Status != Converged || next.Deviance < best.Deviance) {
				best = next
				copy(f.best, f.x)
			}
		}
	}
	copy(f.x, f.best)
	return best
}
