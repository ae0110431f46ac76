package physics

import (
	"fmt"
	"math"

	"lumireach/stats"
)

var gaussianKind = kind{
	name: "gaussian",
	quantities: []quantity{
		{
			key:       "mean",
			dimension: 1,
			bounds: func(b binning, _ float64) (lower, upper, step float64) {
				return -b.window(), b.window(), b.window() / 20
			},
		},
		{
			key:      "width",
			relative: true,
			bounds: func(binning, float64) (lower, upper, step float64) {
				return -math.Ln10, math.Ln10, 0.1
			},
		},
	},
	make: func(b binning) stats.Shape {
		s := gaussian{binning: b, at: make([]float64, b.bins+1), stretch: 16, narrow: 1e-3 / b.binWidth()}
		if b.edges != nil {
			s.stretch, s.narrow = 1, 0.03/b.widestBin()
		}
		for i := range s.at {
			s.at[i] = b.edge(i)
		}
		return s
	},
	check: func(b binning, at []float64) (key, what string) {
		if at[1] < 1e-6*b.binWidth() {
			return "width", fmt.Sprintf("width is %v, below a millionth of the bin width of %v", at[1], b.binWidth())
		}
		return "", ""
	},
}

// gaussian is the normal density. Its quantities are the mean, in the unit of
// the window, and the logarithm of the width in that unit.
type gaussian struct {
	binning
	at      []float64 // edges
	stretch int       // edges along which the density may be carried on by a ratio
	narrow  float64   // largest 1/width at which the density itself is integrated
}

// emptyWindow is the largest share of a peak that counts as nothing: below it
// the bins that are left out beyond farthest would begin to matter.
const emptyWindow = 1e-250

// Fill implements stats.Shape. The shape does not exist where the window holds
// less than emptyWindow of the peak.
func (s gaussian) Fill(q, f, d1, d2 []float64) {
	if len(f) != s.bins {
		panic(wrongBins)
	}
	mean, inverse := q[0], math.Exp(-q[1])
	var t1 [2]float64
	var t2 [3]float64
	var total float64
	switch {
	case !(inverse > 0) || math.IsInf(inverse*inverse, 1) || math.IsNaN(mean) || math.IsInf(mean, 0):
	case inverse < s.narrow:
		total = s.fillWide(mean, inverse, f, d1, d2, &t1, &t2)
	default:
		total = s.fillEdges(mean, inverse, f, d1, d2, &t1, &t2)
	}
	if !(total > emptyWindow) {
		undefined(f, d1, d2)
		return
	}
	normalise(f, d1, d2, total, t1[:], t2[:])
}

// fillEdges takes differences over edges of the cumulative function, outwards
// from the mean on either side, so that nothing cancels in the tails.
func (s gaussian) fillEdges(mean, inverse float64, f, d1, d2 []float64, t1 *[2]float64, t2 *[3]float64) (total float64) {
	bins := s.bins
	switch {
	case !(mean > s.low):
		total, _ = s.fillSide(0, 1, mean, inverse, f, d1, d2, t1, t2)
		return total
	case !(mean < s.high):
		total, _ = s.fillSide(bins, -1, mean, inverse, f, d1, d2, t1, t2)
		return total
	}
	i := min(max(int((mean-s.low)/s.binWidth()), 0), bins-1)
	for i > 0 && mean < s.at[i] {
		i--
	}
	for i < bins-1 && mean > s.at[i+1] {
		i++
	}
	below, left := s.fillSide(i, -1, mean, inverse, f, d1, d2, t1, t2)
	above, right := s.fillSide(i+1, 1, mean, inverse, f, d1, d2, t1, t2)
	f[i] = 1 - left.beyond - right.beyond
	if d1 != nil {
		fm, fu := (left.p-right.p)*inverse, -(left.zp + right.zp)
		fmm, fmu, fuu := fu*inverse*inverse, (right.mixed-left.mixed)*inverse, right.second+left.second
		d1[i], d1[bins+i] = fm, fu
		d2[i], d2[bins+i], d2[2*bins+i] = fmm, fmu, fuu
		t1[0] += fm
		t1[1] += fu
		t2[0] += fmm
		t2[1] += fmu
		t2[2] += fuu
	}
	return below + f[i] + above
}

// border holds, at an edge z widths from the mean, the integral of the unit
// normal beyond it, the density p, and zp, (1-z²)p and z(1-z²)p.
type border struct {
	beyond, p, zp, mixed, second float64
}

// fillSide sets the bins from edge first to the end of the window in direction
// dir, away from the mean. It adds their sums to t1 and t2, and returns that of
// the fractions and what holds at the first edge. With the cumulative function
// G = Φ(z), z = (x-mean)/width and u = ln width: G_m = -φ/width, G_u = -zφ,
// G_mm = -zφ/width², G_mu = (1-z²)φ/width, G_uu = z(1-z²)φ.
func (s gaussian) fillSide(first, dir int, mean, inverse float64, f, d1, d2 []float64, t1 *[2]float64, t2 *[3]float64) (total float64, start border) {
	bins := s.bins
	signed := inverse * float64(dir)
	square := inverse * inverse
	step := s.binWidth() * inverse
	shrink := math.Exp(-step * step)

	var fm, fu, fmm, fmu, fuu []float64
	if d1 != nil {
		fm, fu = d1[:bins], d1[bins:][:bins]
		fmm, fmu, fuu = d2[:bins], d2[bins:][:bins], d2[2*bins:][:bins]
	}

	z := (s.at[first] - mean) * signed
	bin, end := first, bins
	if dir < 0 {
		bin, end = first-1, -1
	}
	// What holds at the last edge, in scalars that stay in registers.
	var beyond, p, zp, mixed, second float64
	if z <= farthest {
		p = normalDensity(z)
		start = newBorder(z, p)
		beyond, zp, mixed, second = start.beyond, start.zp, start.mixed, start.second

		// Along equal steps the density shrinks by a factor that itself shrinks
		// by exp(-step²); it starts anew before rounding accumulates, and at every
		// edge where steps differ.
		ratio := math.Exp(-step * (z + 0.5*step))
		for fresh := 1; bin != end; fresh++ {
			edge := bin
			if dir > 0 {
				edge++
			}
			z = (s.at[edge] - mean) * signed
			if z > farthest {
				break
			}
			next := p * ratio
			ratio *= shrink
			if fresh == s.stretch {
				fresh = 0
				next = normalDensity(z)
				ratio = math.Exp(-step * (z + 0.5*step))
			}
			nextBeyond := next * mills(z*millsSteps)
			v := beyond - nextBeyond
			f[bin] = v
			total += v
			if d1 != nil {
				nextZp := z * next
				nextMixed := next - z*nextZp
				nextSecond := z * nextMixed
				u := zp - nextZp
				fm[bin] = (p - next) * signed
				fu[bin] = u
				fmm[bin] = u * square
				fmu[bin] = (nextMixed - mixed) * signed
				fuu[bin] = nextSecond - second
				zp, mixed, second = nextZp, nextMixed, nextSecond
			}
			beyond, p = nextBeyond, next
			bin += dir
		}
	}
	if bin != end { // the bin that reaches into nothing, then empty ones
		f[bin] = beyond
		total += beyond
		if d1 != nil {
			fm[bin] = p * signed
			fu[bin] = zp
			fmm[bin] = zp * square
			fmu[bin] = -mixed * signed
			fuu[bin] = -second
		}
		p, zp, mixed, second = 0, 0, 0, 0
		for bin += dir; bin != end; bin += dir {
			f[bin] = 0
			if d1 != nil {
				fm[bin], fu[bin], fmm[bin], fmu[bin], fuu[bin] = 0, 0, 0, 0, 0
			}
		}
	}
	t1[0] += (start.p - p) * signed
	t1[1] += start.zp - zp
	t2[0] += (start.zp - zp) * square
	t2[1] += (mixed - start.mixed) * signed
	t2[2] += second - start.second
	return total, start
}

func newBorder(z, p float64) border {
	zp := z * p
	mixed := p - z*zp
	return border{beyond: p * mills(z*millsSteps), p: p, zp: zp, mixed: mixed, second: z * mixed}
}

// fillWide integrates the density itself where bins are so narrow against the
// width that differences of its integral would lose digits. Over 1e-3 widths
// three Gauss-Legendre points are exact to rounding. A common factor keeps the
// largest density of the window near 1.
func (s gaussian) fillWide(mean, inverse float64, f, d1, d2 []float64, t1 *[2]float64, t2 *[3]float64) (total float64) {
	bins := len(f)
	lowest, highest := (s.low-mean)*inverse, (s.high-mean)*inverse
	nearest := math.Max(lowest, math.Min(highest, 0))
	if 0.5*nearest*nearest > -math.Log(emptyWindow) {
		return 0
	}
	weights, scale := [3]float64{5. / 18, 8. / 18, 5. / 18}, 1/s.binWidth()
	for i := range f {
		centre := (0.5*(s.at[i]+s.at[i+1]) - mean) * inverse
		width := s.at[i+1] - s.at[i]
		offset, part := math.Sqrt(0.15)*width*inverse, width*scale
		var sum [5]float64 // ∫ z^n φ
		for k, weight := range weights {
			z := centre + float64(k-1)*offset
			v := part * weight * math.Exp(-0.5*(z-nearest)*(z+nearest))
			for n := range sum {
				sum[n] += v
				v *= z
			}
		}
		f[i] = sum[0]
		total += sum[0]
		if d1 == nil {
			continue
		}
		// Derivatives of φ(z)/width at a fixed place, over that density:
		// z/width, z²-1, (z²-1)/width², (z³-3z)/width, z⁴-4z²+1.
		fm, fu := sum[1]*inverse, sum[2]-sum[0]
		fmm, fmu := (sum[2]-sum[0])*inverse*inverse, (sum[3]-3*sum[1])*inverse
		fuu := sum[4] - 4*sum[2] + sum[0]
		d1[i], d1[bins+i] = fm, fu
		d2[i], d2[bins+i], d2[2*bins+i] = fmm, fmu, fuu
		t1[0] += fm
		t1[1] += fu
		t2[0] += fmm
		t2[1] += fmu
		t2[2] += fuu
	}
	return total
}
