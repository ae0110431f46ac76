package stats

import (
	"fmt"
	"math"
)

// Root finds x between a and b with f(x) = 0 to within tol, where f(a) and f(b)
// differ in sign. Either may be zero. It is Chandrupatla's hybrid of bisection
// and inverse quadratic interpolation, Adv. Eng. Software 28 (1997) 145.
func Root(f func(float64) float64, a, b, tol float64) (float64, error) {
	fa, fb := f(a), f(b)
	switch {
	case fa == 0:
		return a, nil
	case fb == 0:
		return b, nil
	case !(fa < 0 && fb > 0 || fa > 0 && fb < 0):
		return math.NaN(), fmt.Errorf("no change of sign between %v and %v: %v and %v", a, b, fa, fb)
	}
	t := 0.5
	for range 200 {
		x := a + t*(b-a)
		fx := f(x)
		if math.IsNaN(fx) {
			return math.NaN(), fmt.Errorf("no value at %v", x)
		}
		// a is the newest point, b the other side of the root, c the one before.
		c, fc := a, fa
		if (fx > 0) != (fa > 0) {
			c, fc, b, fb = b, fb, a, fa
		}
		a, fa = x, fx
		best, fbest := a, fa
		if math.Abs(fb) < math.Abs(fa) {
			best, fbest = b, fb
		}
		limit := (tol/2 + 2*epsilon*math.Abs(best)) / math.Abs(b-a)
		if fbest == 0 || limit >= 0.5 {
			return best, nil
		}
		t = 0.5
		xi := (a - b) / (c - b)
		phi := (fa - fb) / (fc - fb)
		if phi*phi < xi && (1-phi)*(1-phi) < 1-xi {
			t = fa/(fb-fa)*fc/(fb-fc) + (c-a)/(b-a)*fa/(fc-fa)*fb/(fc-fb)
		}
		t = math.Max(limit, math.Min(1-limit, t))
	}
	return math.NaN(), fmt.Errorf("the root between %v and %v is not found in 200 steps", a, b)
}

const epsilon = 0x1p-52
