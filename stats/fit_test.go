package stats

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/optimize"
)

// expectation and halfDeviance are the likelihood of statistics read straight
// off its definition, without any of the engine: the reference.
func expectation(m Model, mu float64, x []float64) []float64 {
	var all []float64
	for _, c := range m.Channels {
		lambda := make([]float64, c.Bins)
		for _, p := range c.Processes {
			n := p.Yield
			if p.Signal {
				n *= mu
			}
			if p.Factor >= 0 {
				n *= x[p.Factor]
			}
			for _, e := range p.Rate {
				n *= math.Exp(e.Lin*x[e.Param] + e.Bend*unequal(e.Scale*x[e.Param]))
			}
			f := []float64{1}
			if p.Shape != nil {
				q := append([]float64(nil), p.At...)
				for a, move := range p.Move {
					for _, e := range move {
						q[a] += e.Lin * x[e.Param]
					}
				}
				f = make([]float64, c.Bins)
				p.Shape.Fill(q, f, nil, nil)
			}
			for i := range lambda {
				lambda[i] += n * f[i]
			}
		}
		all = append(all, lambda...)
	}
	return all
}

// unequal is what up and down factors that differ add to the line: |θ| beyond
// ±1, and inside the polynomial with its value and slope at the ends.
func unequal(x float64) float64 {
	if math.Abs(x) >= 1 {
		return math.Abs(x)
	}
	return (3*math.Pow(x, 2) - math.Pow(x, 4)) / 2
}

func halfDeviance(m Model, mu float64, x []float64, n, a []float64) float64 {
	sum := 0.0
	for i, l := range expectation(m, mu, x) {
		if l < 0 || l == 0 && n[i] > 0 {
			return math.Inf(1)
		}
		sum += l - n[i]
		if n[i] > 0 {
			sum += n[i] * math.Log(n[i]/l)
		}
	}
	k := 0
	for j, p := range m.Params {
		if p.Constrained {
			sum += (x[j] - a[k]) * (x[j] - a[k]) / 2
			k++
		}
	}
	return sum
}

// reference minimises halfDeviance by gonum's Nelder-Mead and BFGS in turn,
// in the square root of everything that has a lower bound.
func reference(m Model, mu float64, free bool, n, a []float64) (value, muHat float64) {
	at := func(y []float64) (float64, []float64) {
		x := make([]float64, len(m.Params))
		for j, p := range m.Params {
			x[j] = y[j] * p.Step
			if p.Lower == 0 {
				x[j] = y[j] * y[j]
			}
		}
		strength := mu
		if free {
			strength = y[len(m.Params)] * y[len(m.Params)]
		}
		return strength, x
	}
	problem := optimize.Problem{Func: func(y []float64) float64 {
		strength, x := at(y)
		return halfDeviance(m, strength, x, n, a)
	}}
	problem.Grad = func(grad, y []float64) {
		const h = 1e-5
		for j := range y {
			keep := y[j]
			y[j] = keep + h
			up := problem.Func(y)
			y[j] = keep - h
			down := problem.Func(y)
			y[j] = keep
			grad[j] = (up - down) / (2 * h)
		}
	}
	size := len(m.Params)
	if free {
		size++
	}
	y := make([]float64, size)
	k := 0
	for j, p := range m.Params {
		if p.Lower == 0 {
			y[j] = math.Sqrt(p.Nominal)
		}
		if p.Constrained {
			y[j] = a[k]
			k++
		}
	}
	if free {
		y[size-1] = 1
	}
	if size == 0 {
		return halfDeviance(m, mu, nil, n, a), mu
	}
	value = math.Inf(1)
	for range 3 {
		for _, method := range []optimize.Method{&optimize.BFGS{}, &optimize.NelderMead{}} {
			settings := &optimize.Settings{MajorIterations: 4000, FuncEvaluations: 20000}
			if _, simplex := method.(*optimize.NelderMead); simplex && size > 8 {
				continue // a simplex in many dimensions wanders
			}
			result, _ := optimize.Minimize(problem, y, settings, method)
			if result != nil && result.F < value {
				value = result.F
				copy(y, result.X)
			}
		}
	}
	muHat, _ = at(y)
	return value, muHat
}

// auxiliary leads a model's auxiliary measurements to those of its engine.
func auxiliary(m Model, a []float64) []float64 {
	_, basis := reduce(m)
	out := make([]float64, len(basis))
	for k, b := range basis {
		for j, v := range b {
			out[k] += v * a[j]
		}
	}
	return out
}

func prepare(t testing.TB, m Model) *Engine {
	t.Helper()
	e, err := Prepare(m)
	if err != nil {
		t.Fatal(err)
	}
	return e
}

// A general-purpose minimiser on the bare definition of the likelihood agrees
// with the engine, reduction and all.
func TestFitAgainstMinimiser(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	models := map[string]Model{
		"count":  count(10, 20),
		"on/off": onOff(10, 20, 2),
		"window": window(50, 2000, 0.3),
	}
	for k := range 6 {
		models[fmt.Sprintf("random %d", k)] = several(r, 1+k%3, 3+k)
	}
	for name, m := range models {
		t.Run(name, func(t *testing.T) {
			e := prepare(t, m)
			f := e.Fitter()
			constrained := 0
			nominal := make([]float64, len(m.Params))
			for j, p := range m.Params {
				nominal[j] = p.Nominal
				if p.Constrained {
					constrained++
				}
			}
			for _, mu := range []float64{0, 1} {
				d := throw(r, Point{Lambda: expectation(m, mu, nominal), A: make([]float64, constrained)})
				reduced := &Data{N: d.N, A: auxiliary(m, d.A)}
				// What the reduction leaves out stays at its auxiliary value at no cost.
				free := f.Free(reduced, mu, math.Inf(1))
				want, wantMu := reference(m, 0, true, d.N, d.A)
				if free.Status != Converged || math.Abs(free.Deviance/2-want) > 2e-6*(1+want) {
					t.Errorf("free fit of μ = %v toy: %v at μ = %v, status %v, minimiser has %v at μ = %v", mu, free.Deviance/2, free.Mu, free.Status, want, wantMu)
				}
				for _, test := range []float64{0, 0.7, 2} {
					fit := f.At(reduced, test)
					want, _ := reference(m, test, false, d.N, d.A)
					if fit.Status != Converged || math.Abs(fit.Deviance/2-want) > 2e-6*(1+want) {
						t.Errorf("fit at μ = %v of μ = %v toy: %v, status %v, minimiser has %v", test, mu, fit.Deviance/2, fit.Status, want)
					}
				}
			}
		})
	}
}

// Gradient and Hessian against central differences of the value.
func TestDerivatives(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for k := range 20 {
		m := several(r, 1+k%4, 2+k%5)
		if k%2 == 1 {
			m = simulatedModel(r, m)
		}
		e := prepare(t, m)
		f := e.Fitter()
		x := e.nominal()
		d := throw(r, e.Point(1, nil))
		x[0] = 0.3 + r.Float64()
		for j := range e.params {
			x[1+j] += e.params[j].Step * r.NormFloat64() * 0.5
		}
		f.derivatives(x, d, false, false)
		gradient := append([]float64(nil), f.gradient...)
		hessian := append([]float64(nil), f.hessian...)
		size := len(x)
		for i := range x {
			h := 1e-4
			if i > 0 {
				h *= e.params[i-1].Step
			}
			keep := x[i]
			x[i] = keep + h
			up := f.value(x, d, false)
			f.derivatives(x, d, false, false)
			upGradient := append([]float64(nil), f.gradient...)
			x[i] = keep - h
			down := f.value(x, d, false)
			f.derivatives(x, d, false, false)
			x[i] = keep
			if want := (up - down) / (2 * h); math.Abs(gradient[i]-want) > 1e-5*(1+math.Abs(want)) {
				t.Errorf("model %d: gradient[%d] = %v, differences give %v", k, i, gradient[i], want)
			}
			for j := range x {
				want := (upGradient[j] - f.gradient[j]) / (2 * h)
				scale := math.Sqrt(math.Abs(hessian[i*size+i]*hessian[j*size+j])) + 1
				if math.Abs(hessian[i*size+j]-want) > 1e-5*scale {
					t.Errorf("model %d: Hessian[%d,%d] = %v, differences give %v", k, i, j, hessian[i*size+j], want)
				}
			}
		}
	}
}

func TestFitAllocatesNothing(t *testing.T) {
	for name, shift := range map[string]float64{"small shift": 0.3, "large shift": 2} {
		e := prepare(t, window(50, 2000, shift))
		f := e.Fitter()
		d := throw(rand.New(rand.NewPCG(5, 6)), e.Point(1, nil))
		if a := testing.AllocsPerRun(20, func() {
			free := f.Free(d, 1, math.Inf(1))
			f.At(d, 0)
			f.QTilde(d, free.Mu+1, free)
		}); a != 0 {
			t.Errorf("%s: fits allocate %v times per toy, want 0", name, a)
		}
	}
}

func BenchmarkFit(b *testing.B) {
	e := prepare(b, window(50, 2000, 0.3))
	f := e.Fitter()
	r := rand.New(rand.NewPCG(7, 8))
	toys := make([]*Data, 256)
	for i := range toys {
		toys[i] = throw(r, e.Point(0, nil))
	}
	b.ReportAllocs()
	i := 0
	for b.Loop() {
		f.Q0(toys[i%len(toys)], 0)
		i++
	}
}

// A background without events that a bent rate beside it replaces sinks to its
// bound: Fisher scoring alone only creeps there.
func TestSinkingRate(t *testing.T) {
	k := math.Sqrt(0.09 + 0.91*5/2)
	m := Model{
		Params: []Param{{Name: "wall", Nominal: 1, Upper: math.Inf(1), Step: 0.1}, uncertainty("bent"), uncertainty("common")},
		Channels: []Channel{
			{Bins: 1, Processes: []Process{
				{Yield: 1.92, Signal: true, Factor: -1, Rate: []Effect{{Param: 2, Lin: math.Log(1.12)}}},
				{Yield: 0.36, Factor: -1, Rate: []Effect{
					{Param: 1, Lin: k * math.Log(1.35/0.8) / 2, Bend: math.Log(1.35*0.8) / 2, Scale: k},
					{Param: 2, Lin: math.Log(1.12)},
				}},
				{Yield: 0.2, Factor: 0},
			}},
			{Bins: 1, Processes: []Process{{Yield: 1.4, Factor: 0}}},
		},
	}
	f := prepare(t, m).Fitter()
	failed := 0
	for i := range 100 {
		for j := range 20 {
			d := &Data{N: []float64{7, 0}, A: []float64{-2 + 0.04*float64(i), -1 + 0.1*float64(j)}}
			if fit := f.AtFresh(d, 0); fit.Status != Converged {
				failed++
			}
		}
	}
	if failed > 2 {
		t.Errorf("%d of 2000 fits of seven events beside an empty control region failed", failed)
	}
}
