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
	x1 := (s.at[0] - mean) * c
	for i := range f {
		x2 := (s.at[i+1] - mean) * c
		var v voigtSums
		v.add(x1, x2, y, d1 != nil)
		x1 = x2
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

// voigtSums are what the derivatives need of a bin: the differences over its edges
// of w, zw, w', w+zw' and zw+z²w', as integrals of their derivatives, which lose no
// digits in narrow bins.
type voigtSums struct {
	f                 float64 // ∫Re w dX
	w, zw, d, zd, zzd complex128
}

// add integrates from x1 to x2 by Gauss-Legendre, in pieces. Near the centre these
// are no longer than a standard deviation of the resolution, or a quarter of the
// natural width; far from it, than half of the distance.
func (v *voigtSums) add(x1, x2, y float64, derivatives bool) {
	const far = 7 // exp(-49) of the normal part is left
	near := max(math.Sqrt2/2, 0.5*y)
	for x1 < x2 {
		end, longest := x2, near
		switch {
		case x1 < -far: // half of the distance at the piece's end: x1/3 of its beginning
			end = min(end, -far)
			longest = max(near, -x1/3)
		case x1 < far:
			end = min(end, far)
		default:
			longest = max(near, x1/2)
		}
		// Pieces of one length, so that the last is not a crumb.
		end = x1 + (end-x1)/math.Ceil((end-x1)/longest)
		r := &eightPoints
		if share := (end - x1) / longest; share < 0.2 {
			r = &fourPoints
		} else if share < 0.6 {
			r = &sixPoints
		}
		v.addPiece(x1, end-x1, y, r, derivatives)
		x1 = end
	}
}

func (v *voigtSums) addPiece(from, length, y float64, r *rule, derivatives bool) {
	for k, t := range r.at {
		x := from + t*length
		weight := length * r.weight[k]
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
