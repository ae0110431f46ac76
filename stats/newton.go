package stats

import "math"

const (
	decrementGoal = 1e-8
	mostSteps     = 200
)

// bounds of a variable.
func (f *Fitter) bounds(v int, minMu, maxMu float64) (lower, upper float64) {
	if v == 0 {
		return minMu, maxMu
	}
	p := &f.engine.params[v-1]
	return p.Lower, p.Upper
}

// minimise is Newton's method on half the deviance, in f.variables from f.x:
// analytic derivatives, an active set of bounds, Fisher scoring where the
// Hessian is not positive, step halving (Nocedal & Wright, Numerical
// Optimization, chapters 3 and 16). A full step at whose end the next one is much
// shorter needs no value of the deviance, and so no logarithm.
func (f *Fitter) minimise(d *Data, minMu, maxMu float64, background bool) Fit {
	if !f.derivatives(f.x, d, background, false) {
		return Fit{Deviance: posInf, Mu: f.x[0], Status: Impossible}
	}
	slope, bent, ok := f.newton(minMu, maxMu)
	for range mostSteps {
		positive := ok
		if !ok {
			f.derivatives(f.x, d, background, true)
			if slope, bent, ok = f.newton(minMu, maxMu); !ok {
				slope, bent = f.damped(minMu, maxMu)
			}
			if gain := f.fall(); gain < 0 {
				slope, bent = slope+gain, true
			}
		}
		if -slope < decrementGoal && !bent {
			value := f.valueHere(f.x, d)
			for _, v := range f.variables {
				f.x[v] += f.step[v]
			}
			return Fit{Deviance: math.Max(0, 2*value+slope), Mu: f.x[0], Status: Converged}
		}
		length := f.longest()
		f.move(length, minMu, maxMu)
		if positive && !bent && length == 1 && f.derivatives(f.trial, d, background, false) {
			copy(f.taken, f.step)
			next, nextBent, nextOk := f.newton(minMu, maxMu)
			if nextOk && next >= contraction*slope {
				f.x, f.trial = f.trial, f.x
				slope, bent, ok = next, nextBent, true
				continue
			}
			copy(f.step, f.taken)
		}
		if !f.halve(d, length, slope, minMu, maxMu, background) {
			break
		}
		f.derivatives(f.x, d, background, false)
		slope, bent, ok = f.newton(minMu, maxMu)
	}
	return Fit{Deviance: 2 * f.value(f.x, d, background), Mu: f.x[0], Status: Failed}
}

// fall sends free rates that sink, and are already small, to nothing at once:
// where a bin without events loses its last background, the expected information
// grows without bound and Fisher scoring only creeps there. It returns what that
// adds to the slope along the step.
func (f *Fitter) fall() (gain float64) {
	for _, v := range f.variables {
		if v == 0 {
			continue
		}
		p := &f.engine.params[v-1]
		to := p.Lower - f.x[v]
		if p.Lower == 0 && f.gradient[v] > 0 && -to < p.Step && to < f.step[v] {
			gain += f.gradient[v] * (to - f.step[v])
			f.step[v] = to
		}
	}
	return gain
}

// contraction is how much the Newton decrement must fall for a step to be
// accepted without a look at the deviance.
const contraction = 0.25

// move sets f.trial to f.x plus so much of the step, within the bounds.
func (f *Fitter) move(length, minMu, maxMu float64) {
	copy(f.trial, f.x)
	for _, v := range f.variables {
		lower, upper := f.bounds(v, minMu, maxMu)
		f.trial[v] = math.Max(lower, math.Min(upper, f.x[v]+length*f.step[v]))
	}
}

// halve takes the longest of the step's halves that lowers the deviance as it
// should (Armijo 1966); false where none does.
func (f *Fitter) halve(d *Data, length, slope, minMu, maxMu float64, background bool) bool {
	value := f.value(f.x, d, background)
	for range 40 {
		f.move(length, minMu, maxMu)
		if next := f.value(f.trial, d, background); next <= value+1e-4*length*slope+1e-13*(1+math.Abs(value)) {
			f.x, f.trial = f.trial, f.x
			return true
		}
		length /= 2
	}
	return false
}

// longest keeps a step where the quadratic model can be trusted: no constrained
// or shape parameter moves by more than five of its own steps.
func (f *Fitter) longest() float64 {
	length := 1.0
	for _, v := range f.variables {
		if v == 0 || math.IsInf(f.engine.params[v-1].Upper, 1) && !f.engine.params[v-1].Constrained {
			continue
		}
		if move, most := math.Abs(f.step[v]), 5*f.engine.params[v-1].Step; move*length > most {
			length = most / move
		}
	}
	return length
}

// newton sets f.step to the minimum of the quadratic model within the bounds.
// slope is the derivative along the step, bent tells that the step meets a
// bound, ok that the Hessian was positive.
func (f *Fitter) newton(minMu, maxMu float64) (slope float64, bent, ok bool) {
	size := len(f.x)
	f.free = f.free[:0]
	for _, v := range f.variables {
		lower, upper := f.bounds(v, minMu, maxMu)
		g := f.gradient[v]
		f.step[v] = 0
		f.held[v] = f.x[v] <= lower && g >= 0 || f.x[v] >= upper && g <= 0
		if !f.held[v] {
			f.free = append(f.free, v)
		}
	}
	// A variable that the step carries past a bound is held there and the rest
	// solved again; each round holds at least one more.
	for {
		n := len(f.free)
		for i, v := range f.free {
			row := f.matrix[i*n:]
			for k, u := range f.free[:i+1] {
				row[k] = f.hessian[v*size+u]
			}
			f.right[i] = -f.gradient[v]
			if bent {
				for _, u := range f.variables {
					if f.held[u] && f.step[u] != 0 {
						f.right[i] -= f.hessian[v*size+u] * f.step[u]
					}
				}
			}
		}
		if !solve(f.matrix[:n*n], f.right[:n]) {
			return 0, bent, false
		}
		rest := f.free[:0]
		crossed := false
		for i, v := range f.free {
			lower, upper := f.bounds(v, minMu, maxMu)
			move := f.right[i]
			switch to := f.x[v] + move; {
			case to < lower:
				f.step[v], f.held[v], crossed = lower-f.x[v], true, true
			case to > upper:
				f.step[v], f.held[v], crossed = upper-f.x[v], true, true
			default:
				f.step[v] = move
				rest = append(rest, v)
			}
		}
		if !crossed {
			break
		}
		bent = true
		f.free = rest
	}
	for _, v := range f.variables {
		slope += f.gradient[v] * f.step[v]
	}
	if !(slope <= 0) {
		return slope, bent, false
	}
	return slope, bent, true
}

// damped is newton with a ridge in units of each variable's own step
// (Levenberg 1944), grown until the Hessian is positive.
func (f *Fitter) damped(minMu, maxMu float64) (slope float64, bent bool) {
	size := len(f.x)
	added := 0.0
	for ridge := 1e-6; ; ridge *= 10 {
		for _, v := range f.variables {
			unit := 1.0
			if v > 0 {
				unit = f.engine.params[v-1].Step
			}
			f.hessian[v*size+v] += (ridge - added) / (unit * unit)
		}
		added = ridge
		slope, bent, ok := f.newton(minMu, maxMu)
		if ok || ridge > 1e30 {
			return slope, bent
		}
	}
}

// solve replaces b by A⁻¹b for a symmetric positive matrix A, given as its
// lower triangle by rows, which is replaced by its Cholesky factor. It tells
// whether A is positive definite to rounding.
func solve(a, b []float64) bool {
	n := len(b)
	for i := range n {
		row := a[i*n : i*n+i+1]
		diagonal := row[i]
		for k := range i {
			other := a[k*n : k*n+k+1]
			sum := row[k]
			for m := range k {
				sum -= row[m] * other[m]
			}
			row[k] = sum / other[k]
		}
		rest := diagonal
		for _, v := range row[:i] {
			rest -= v * v
		}
		if !(rest > 1e-14*diagonal) || math.IsInf(rest, 1) {
			return false
		}
		row[i] = math.Sqrt(rest)
	}
	for i := range n {
		sum := b[i]
		for k, v := range a[i*n : i*n+i] {
			sum -= v * b[k]
		}
		b[i] = sum / a[i*n+i]
	}
	for i := n - 1; i >= 0; i-- {
		sum := b[i]
		for k := i + 1; k < n; k++ {
			sum -= a[k*n+i] * b[k]
		}
		b[i] = sum / a[i*n+i]
	}
	return true
}
