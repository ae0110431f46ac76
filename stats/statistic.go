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
	if null.Status == Impossible {
		return posInf, Converged
	}
	return f.difference(d, null, free, posInf)
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
	return f.difference(d, f.At(d, mu), free, mu)
}

// unconverged is the negative value of a test statistic, rounding aside, that
// betrays a fit short of its minimum.
const unconverged = -1e-6

// difference is the deviance of the fit at fixed μ just made less that of a fit
// with 0 <= μ <= maxMu, which is made again from there where it sits at a lower
// maximum of the likelihood.
func (f *Fitter) difference(d *Data, fixed, free Fit, maxMu float64) (float64, Status) {
	if fixed.Status != Converged {
		return math.NaN(), fixed.Status
	}
	if fixed.Deviance < free.Deviance {
		f.variables = append(append(f.variables[:0], 0), f.engine.all...)
		if free = f.minimise(d, 0, maxMu, false); free.Status != Converged {
			return math.NaN(), free.Status
		}
	}
	q := fixed.Deviance - free.Deviance
	if q < unconverged {
		return math.NaN(), Failed
	}
	return math.Max(0, q), Converged
}
