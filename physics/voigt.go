package physics

import (
	"fmt"
	"math"

	"lumireach/stats"
)

var voigtKind = kind{
	name: "voigt",
	quantities: []quantity{
		gaussianKind.quantities[0],
		gaussianKind.quantities[1],
		{key: "natural_width", relative: true, bounds: gaussianKind.quantities[1].bounds},
	},
	make: func(b binning) stats.Shape {
		s := voigt{b, make([]float64, b.bins+1)}
		for i := range s.at {
			s.at[i] = b.edge(i)
		}
		return s
	},
	check: func(b binning, at []float64) (key, what string) {
		if key, what := gaussianKind.check(b, at[:2]); what != "" {
			return key, what
		}
		const narrowest, widest = 1e-12, 1e6
		switch ratio := at[2] / at[1]; {
		case !(ratio >= narrowest):
			return "natural_width", fmt.Sprintf(`natural_width is %v, less than %v of the width of %v: a "gaussian" is the same`, at[2], narrowest, at[1])
		case !(ratio <= widest):
			return "natural_width", fmt.Sprintf("natural_width is %v, more than %v times the width of %v: write a larger width, it makes no difference", at[2], widest, at[1])
		}
		return "", ""
	},
}

// voigt is the density of a Lorentzian of a natural width, the full width at half
// its maximum, smeared by a normal resolution: Re w(z), z = (x-mean + ½i·natural
// width)/(√2 width), DLMF 7.19.1 to 7.19.3. Its quantities are the mean and the
// logarithms of both widths.
type voigt struct {
	binning
	at []float64 // edges
}

// Fill implements stats.Shape. With z = X+iY and F = ∫Re w dX over a bin, X_m =
// -1/(√2 width), X_u = -X, Y_u = -Y and Y_v = Y. Because w is analytic, ∂w/∂Y = iw',
// every derivative is a difference over the bin's edges: F_m ~ [Re w], F_u =
// -[Re zw], F_v = -Y[Im w], F_mm ~ [Re w'], F_uu = [Re (zw+z²w')], and so on.
func (s voigt) Fill(q, f, d1, d2 []float64) {
	bins := s.bins
	if len(f) != bins {
		panic(wrongBins)
	}
	mean, c := q[0], math.Exp(-q[1])/math.Sqrt2
	y := 0.5 * math.Exp(q[2]) * c
	if !(c > 0) || math.IsInf(c*c, 1) || !(y > 0) || math.IsInf(y*y, 1) || math.IsNaN(mean) || math.IsInf(mean, 0) {
		undefined(f, d1, d2)
		return
	}
	var total float64
	var t1 [3]float64
	var t2 [6]float64
	low := voigtEdge{x: (s.at[0] - mean) * c}
	known := false // what low holds beside its place
	for i := range f {
		high := voigtEdge{x: (s.at[i+1] - mean) * c}
		var v voigtSums
		// The bin's own width: its edges may be so far out that their difference has
		// lost digits.
		if width := (s.at[i+1] - s.at[i]) * c; width < voigtNarrow*max(1, 0.15*(max(0, low.x, -high.x)+y)) {
			v.integrate(low.x, width, y, d1 != nil)
			known = false
		} else {
			if !known {
				low.at(y)
			}
			high.at(y)
			v.difference(&low, &high)
			known = true
		}
		low = high
		f[i] = v.f
		total += v.f
		if d1 == nil {
			continue
		}
		first := [3]float64{-c * real(v.w), -real(v.zw), -y * imag(v.w)}
		second := [6]float64{
			c * c * real(v.d), c * real(v.zd), c * y * imag(v.d),
			real(v.zzd), y * imag(v.zd), -y * (imag(v.w) + y*real(v.d)),
		}
		for a, d := range first {
			d1[a*bins+i] = d
			t1[a] += d
		}
		for p, d := range second {
			d2[p*bins+i] = d
			t2[p] += d
		}
	}
	if !(total > emptyWindow) {
		undefined(f, d1, d2)
		return
	}
	normalise(f, d1, d2, total, t1[:], t2[:])
}

// voigtNarrow is the width of a bin, in √2 widths of the resolution, below which
// differences over its edges would lose more than two digits; it grows with the
// distance where that is large. Three Gauss-Legendre points are good to 1e-12 there.
const voigtNarrow = 0.01

// voigtSums are the integral of Re w over a bin, and what its derivatives need: the
// differences over the bin's edges of w, zw, w', w+zw' and zw+z²w'.
type voigtSums struct {
	f                 float64
	w, zw, d, zd, zzd complex128
}

// voigtEdge holds at an edge what voigtSums are differences of; f is the integral
// outwards.
type voigtEdge struct {
	x float64
	voigtSums
}

func (e *voigtEdge) at(y float64) {
	p, z := newFaddeeva(e.x, y), complex(e.x, y)
	e.f = p.beyond / inverseRootPi
	e.w, e.d = p.w, p.d1
	e.zw = z * p.w
	e.zd = p.w + z*p.d1
	e.zzd = z * e.zd
}

func (v *voigtSums) difference(low, high *voigtEdge) {
	switch {
	case low.x >= 0:
		v.f = low.f - high.f
	case high.x <= 0:
		v.f = high.f - low.f
	default:
		v.f = 1/inverseRootPi - low.f - high.f
	}
	v.w, v.d = high.w-low.w, high.d-low.d
	v.zw, v.zd, v.zzd = high.zw-low.zw, high.zd-low.zd, high.zzd-low.zzd
}

// integrate takes the integrals of the derivatives instead of the differences, by
// Gauss-Legendre quadrature.
func (v *voigtSums) integrate(from, length, y float64, derivatives bool) {
	for k, t := range threePoints.at {
		x := from + t*length
		weight := length * threePoints.weight[k]
		p := newFaddeeva(x, y)
		v.f += weight * real(p.w)
		if !derivatives {
			continue
		}
		c, z := complex(weight, 0), complex(x, y)
		zd1, zd2 := z*p.d1, z*p.d2
		v.w += c * p.d1
		v.zw += c * (p.w + zd1)
		v.d += c * p.d2
		v.zd += c * (2*p.d1 + zd2)
		v.zzd += c * (p.w + 3*zd1 + z*zd2)
	}
}
