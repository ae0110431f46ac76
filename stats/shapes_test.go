package stats

import "math"

// peak and slope are shapes of the tests' own: densities at bin centres,
// normalised by their sum, with derivatives written out by hand.

type peak struct{ centres []float64 }

// Fill takes the quantities mean and ln width.
func (s peak) Fill(q, f, d1, d2 []float64) {
	mean, width := q[0], math.Exp(q[1])
	var sum float64
	for i, c := range s.centres {
		z := (c - mean) / width
		f[i] = math.Exp(-z * z / 2)
		sum += f[i]
	}
	for i := range f {
		f[i] /= sum
	}
	if d1 == nil {
		return
	}
	z := func(i int) float64 { return (s.centres[i] - mean) / width }
	// ∂ ln g/∂mean = z/w, ∂ ln g/∂ln w = z²; f = g/Σg.
	l1 := func(i, a int) float64 {
		if a == 0 {
			return z(i) / width
		}
		return z(i) * z(i)
	}
	l2 := func(i, pair int) float64 {
		switch pair {
		case 0:
			return -1 / (width * width)
		case 1:
			return -2 * z(i) / width
		}
		return -2 * z(i) * z(i)
	}
	softmax(f, d1, d2, 2, l1, l2)
}

type slope struct{ centres []float64 }

func (s slope) Fill(q, f, d1, d2 []float64) {
	sum := 0.0
	for i, c := range s.centres {
		f[i] = math.Exp(q[0] * c)
		sum += f[i]
	}
	for i := range f {
		f[i] /= sum
	}
	if d1 == nil {
		return
	}
	softmax(f, d1, d2, 1, func(i, _ int) float64 { return s.centres[i] }, func(int, int) float64 { return 0 })
}

// softmax sets the derivatives of f = exp(l)/Σexp(l) from those of l.
func softmax(f, d1, d2 []float64, quantities int, l1, l2 func(i, index int) float64) {
	bins := len(f)
	var mean [2]float64
	for a := range quantities {
		for i := range f {
			mean[a] += f[i] * l1(i, a)
		}
		for i := range f {
			d1[a*bins+i] = f[i] * (l1(i, a) - mean[a])
		}
	}
	for a := range quantities {
		for b := a; b < quantities; b++ {
			pair := pairIndex(quantities, a, b)
			var second, both float64
			for i := range f {
				second += f[i] * l2(i, pair)
				both += f[i] * l1(i, a) * l1(i, b)
			}
			for i := range f {
				d2[pair*bins+i] = f[i] * ((l1(i, a)-mean[a])*(l1(i, b)-mean[b]) + l2(i, pair) - second - both + mean[a]*mean[b])
			}
		}
	}
}

func centres(low, high float64, bins int) []float64 {
	c := make([]float64, bins)
	for i := range c {
		c[i] = low + (high-low)*(float64(i)+0.5)/float64(bins)
	}
	return c
}

// fixed is a template.
type fixed struct{ fractions []float64 }

func (s fixed) Fill(_, f, _, _ []float64) { copy(f, s.fractions) }
