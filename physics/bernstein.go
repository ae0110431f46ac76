package physics

import (
	"fmt"
	"math"
	"slices"
	"strconv"

	"lumireach/stats"
)

// mostCoefficients bounds the polynomial to degree 8.
const mostCoefficients = 9

// coefficientsKey is what a background leaves free; no quantity has this name,
// because coefficients are shared out among several.
const coefficientsKey = "coefficients"

var bernsteinKind = kind{
	name:     "bernstein",
	more:     []string{coefficientsKey},
	readMore: readCoefficients,
	makeFrom: func(b binning, form Form) stats.Shape { return newBernstein(b, form.Coefficients) },
}

func readCoefficients(t table, _ binning, form *Form) {
	if !t.has(coefficientsKey) {
		t.missing(coefficientsKey, coefficientsKey+" = [1.0, 0.6, 0.4]")
		return
	}
	c := t.numbers(coefficientsKey, fmt.Sprintf("a list of 1 to %v numbers", mostCoefficients))
	if t.failed() {
		return
	}
	if len(c) < 1 || len(c) > mostCoefficients {
		t.failKey(coefficientsKey, "coefficients is a list of %v, must be 1 to %v numbers", len(c), mostCoefficients)
		return
	}
	for i, v := range c {
		if !(v >= 0) {
			t.fail(joinIndex(join(t.path, coefficientsKey), i), "a coefficient is %v, must be 0 or above: the density could turn negative", v)
			return
		}
		c[i] = math.Abs(v) // not -0
	}
	if slices.Max(c) == 0 {
		t.failKey(coefficientsKey, "all coefficients are 0, at least one must be above")
		return
	}
	form.Coefficients = c
}

// bernstein is the density Σ c_k b_k with Σ c_k = 1 and the Bernstein polynomials
// b_k of degree n-1 over the window, each normalised to one (Lorentz, Bernstein
// Polynomials, 1953). It is never negative.
//
// Its n-1 quantities are shares in [0, 1], one for each coefficient but the
// largest: the coefficients are broken one after the other from a stick of length
// 1, c = share × what is left. All shares together reach every set of coefficients,
// zeros included, and none does what the rate does. The stick is broken from the
// smallest nominal coefficient to the largest, which takes what remains. So what
// remains is, at nominal, never less than the largest coefficient, and thus than
// 1/n: no share loses its effect there, none is above one half, and a coefficient
// of 0 is a share of 0.
type bernstein struct {
	basis   [][]float64 // fraction of b_k in each bin, in the order of breaking
	shares  []int       // quantity of each share, in that order
	nominal []float64   // by quantity
	numbers []int       // coefficient of each quantity, from 1
}

func newBernstein(b binning, coefficients []float64) bernstein {
	n := len(coefficients)
	order := make([]int, n)
	for k := range order {
		order[k] = k
	}
	slices.SortStableFunc(order, func(i, k int) int {
		switch {
		case coefficients[i] < coefficients[k]:
			return -1
		case coefficients[i] > coefficients[k]:
			return 1
		}
		return 0
	})
	s := bernstein{basis: make([][]float64, n), shares: make([]int, n-1), nominal: make([]float64, n-1)}
	basis := bernsteinFractions(b, n)
	last := order[n-1]
	left := 0.0 // in units of the largest coefficient: no sum overflows
	for i := n - 1; i >= 0; i-- {
		k := order[i]
		s.basis[i] = basis[k]
		c := coefficients[k] / coefficients[last]
		left += c
		if k == last {
			continue
		}
		s.shares[i] = k
		if k > last {
			s.shares[i]--
		}
		s.nominal[s.shares[i]] = c / left
	}
	for k := range coefficients {
		if k != last {
			s.numbers = append(s.numbers, k+1)
		}
	}
	return s
}

// bernsteinFractions integrates the n Bernstein polynomials of degree n-1 over
// every bin. Over [x0, x1] the integral of a polynomial is the mean of its
// Bernstein coefficients there, and these are its blossom at n-1-j times x0 and j
// times x1 (Ramshaw, Comput. Aided Geom. Des. 6 (1989) 323). That of b_k is the chance of k
// successes in so many trials with the chances x0 and x1: sums of positive terms
// alone, so that nothing cancels at either end of the window.
func bernsteinFractions(b binning, n int) [][]float64 {
	basis := make([][]float64, n)
	for k := range basis {
		basis[k] = make([]float64, b.bins)
	}
	chances := make([]float64, n)
	for i := range b.bins {
		low, high := b.edge(i), b.edge(i+1)
		width := (high - low) / b.window()
		for j := range n {
			clear(chances)
			chances[0] = 1
			for trial := 1; trial < n; trial++ {
				x := low
				if trial <= j {
					x = high
				}
				success, failure := (x-b.low)/b.window(), (b.high-x)/b.window()
				for k := trial; k > 0; k-- {
					chances[k] = chances[k]*failure + chances[k-1]*success
				}
				chances[0] *= failure
			}
			for k, v := range chances {
				basis[k][i] += width * v
			}
		}
	}
	for _, f := range basis {
		total := 0.0
		for _, v := range f {
			total += v
		}
		for i := range f {
			f[i] /= total
		}
	}
	return basis
}

// Fill implements stats.Shape. With G_i the density of all that is broken from
// share u_i on, G_i = u_i b_i + (1-u_i) G_(i+1): ∂f/∂u_i is b_i - G_(i+1) times
// what is left before u_i, and ∂²f/∂u_h∂u_i, for h < i, less the same without the
// factor 1-u_h. The shape does not exist for shares outside [0, 1].
func (s bernstein) Fill(q, f, d1, d2 []float64) {
	bins, n := len(s.basis[0]), len(s.shares)
	if len(f) != bins {
		panic(wrongBins)
	}
	var share, left [mostCoefficients]float64
	rest := 1.0
	for i, a := range s.shares {
		u := q[a]
		if !(u >= 0 && u <= 1) {
			undefined(f, d1, d2)
			return
		}
		share[i], left[i] = u, rest
		rest *= 1 - u
	}
	left[n] = rest

	copy(f, s.basis[n])
	for i := n - 1; i >= 0; i-- {
		u := share[i]
		basis := s.basis[i][:len(f)]
		if d1 == nil {
			for bin, g := range f {
				f[bin] = u*basis[bin] + (1-u)*g
			}
			continue
		}
		a := s.shares[i]
		difference := d1[a*bins:][:len(f)]
		for bin, g := range f {
			difference[bin] = basis[bin] - g
			f[bin] = u*basis[bin] + (1-u)*g
		}
		clear(d2[pair(n, a, a)*bins:][:bins])
		without := 1.0 // what is left before u_i, without the factor of u_h
		for h := i - 1; h >= 0; h-- {
			scale := -without * left[h]
			without *= 1 - share[h]
			second := d2[pair(n, a, s.shares[h])*bins:][:len(f)]
			for bin, v := range difference {
				second[bin] = scale * v
			}
		}
		for bin := range difference {
			difference[bin] *= left[i]
		}
	}
}

// pair is the place of two of n quantities among the second derivatives.
func pair(n, a, b int) int {
	if a > b {
		a, b = b, a
	}
	return a*n - a*(a-1)/2 + b - a
}

// parameter describes the free share that is a quantity.
func (s bernstein) parameter(process string, quantity int) stats.Param {
	u := s.nominal[quantity]
	return stats.Param{
		Name:  process + " " + coefficientsKey + " " + strconv.Itoa(s.numbers[quantity]),
		Lower: 0 - u, // not -0
		Upper: 1 - u,
		Step:  0.1,
	}
}
