package stats

import "math"

// Q0 is the discovery statistic of d, D(0) - min D(μ >= 0), from a free fit
// that starts at the signal strength near. Cowan, Cranmer, Gross, Vitells,
// Eur. Phys. J. C71 (2011) 1554, Eq. (12). It is +Inf where events stand in a
// bin that expects no background.
func (f *Fitter) Q0(d *Data, near float64) (float64, Status) {
	free := f.Free(d, near, posInf)
	if free.Status != Converged {
		return math.NaN(), free.Status
	}
	if free.Mu == 0 {
		return 0, Converged
	}
	null := f.At(d, 0)
	switch {
	case null.Status == Impossible:
		return posInf, Converged
	case null.Status != Converged:
		return math.NaN(), null.Status
	}
	if null.Deviance < free.Deviance {
		// The free fit sits at a lower maximum of the likelihood than μ = 0.
		f.variables = append(append(f.variables[:0], 0), f.engine.all...)
		if free = f.minimise(d, 0, posInf, false); free.Status != Converged {
			return math.NaN(), free.Status
		}
	}
	return difference(null.Deviance, free.Deviance)
}

// unconverged is the negative value of a test statistic, of either sign
// rounding aside, that betrays a fit short of its minimum.
const unconverged = -1e-6

func difference(constrained, free float64) (float64, Status) {
	q := constrained - free
	if q < unconverged {
		return math.NaN(), Failed
	}
	return math.Max(0, q), Converged
}

// QTilde is the upper-limit statistic of d at mu > 0, D(μ) - min D(0 <= μ' <= μ),
// given the free fit of the same data that f has just made. Cowan, Cranmer,
// Gross, Vitells, Eur. Phys. J. C71 (2011) 1554, Eq. (16).
func (f *Fitter) QTilde(d *Data, mu float64, free Fit) (float64, Status) {
	if free.Status != Converged {
		return math.NaN(), free.Status
	}
	if free.Mu >= mu {
		if len(f.engine.scans) == 0 {
			return 0, Converged
		}
		// A shape that moves can give D a second minimum below μ.
		free = f.Free(d, mu, mu)
		if free.Status != Converged {
			return math.NaN(), free.Status
		}
		if free.Mu >= mu {
			return 0, Converged
		}
	}
	at := f.At(d, mu)
	if at.Status != Converged {
		return math.NaN(), at.Status
	}
	if at.Deviance < free.Deviance {
		f.variables = append(append(f.variables[:0], 0), f.engine.all...)
		if free = f.minimise(d, 0, mu, false); free.Status != Converged {
			return math.NaN(), free.Status
		}
	}
	return difference(at.Deviance, free.Deviance)
}
