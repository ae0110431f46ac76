package stats

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// The data of a centre have q0 = z² by the fits, not only by the equations it is
// solved from, and their background-only fit is the truth.
func TestCentre(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 12))
	models := map[string]Model{"count": count(10, 20), "on/off": onOff(10, 20, 2), "window": window(50, 2000, 0.3)}
	models["uncertain"], _ = uncertain(20, 120, 0.4)(1)
	for k := range 6 {
		models[fmt.Sprintf("random %d", k)] = several(r, 1+k%3, 3+k)
		models[fmt.Sprintf("simulated %d", k)] = simulatedModel(r, several(r, 1+k%3, 3+k))
	}
	seconds := 0
	for name, m := range models {
		e := prepare(t, m)
		f := e.Fitter()
		nominal := e.nominal()
		for z := 1.0; z <= 6; z++ {
			c, err := e.Centre(z)
			if err != nil {
				t.Errorf("%s: %v", name, err)
				continue
			}
			d := c.Asimov()
			null := f.AtFresh(d, 0)
			// Bent rates may offer a second explanation of the data.
			second := null.Deviance < 2*f.value(nominal, d, true)-1e-6
			for _, v := range e.background {
				if !second && math.Abs(f.x[v]-nominal[v]) > 1e-4*e.params[v-1].Step {
					t.Errorf("%s, z = %v: background-only fit has %v = %v, truth %v", name, z, e.params[v-1].Name, f.x[v], nominal[v])
				}
			}
			tolerance := 1e-5
			if second {
				seconds++
				tolerance = 0.01
			}
			free := f.Free(d, c.Mu, math.Inf(1))
			near(t, fmt.Sprintf("%s, z = %v: sqrt(q0)", name, z), math.Sqrt(null.Deviance-free.Deviance), z, tolerance)
		}
	}
	if seconds > 6 {
		t.Errorf("%d centres have a second explanation, want a few", seconds)
	}
}

// A control region of the background's own size cannot be emptied further than
// to nothing: there is an interior solution for z² < 4 b ln 2 alone. Beyond it
// the data have the q0 asked for and are less probable than exp(-z²/2).
func TestCentreAtBoundary(t *testing.T) {
	for _, b := range []float64{0.5, 2, 5} {
		e := prepare(t, onOff(10, b, 1))
		f := e.Fitter()
		for z := 2.0; z <= 7; z++ {
			c, err := e.Centre(z)
			if err != nil {
				t.Errorf("b = %v: %v", b, err)
				continue
			}
			q, status := f.Q0(c.Asimov(), c.Mu)
			if status != Converged {
				t.Errorf("b = %v, z = %v: %v", b, z, status.Err())
			}
			near(t, fmt.Sprintf("b = %v: sqrt(q0)", b), math.Sqrt(q), z, 1e-5)
			rate := deviance(c.Lambda[0], b) + deviance(c.Lambda[1], b)
			if z*z > 4*b*math.Ln2 && !(2*rate > z*z) {
				t.Errorf("b = %v, z = %v: twice the rate is %v, want above %v", b, z, 2*rate, z*z)
			}
		}
	}
}
