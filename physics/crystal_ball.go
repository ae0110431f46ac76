package physics

import (
	"fmt"
	"math"

	"lumireach/stats"
)

// sharpest is the largest power of a tail that a scenario may give: beyond it the
// tail cannot be told from an exponential.
const sharpest = 1e6

var crystalBallKind = kind{
	name: "crystal-ball",
	quantities: []quantity{
		gaussianKind.quantities[0],
		gaussianKind.quantities[1],
		{key: "alpha_low", partner: "n_low", relative: true, bounds: boundsOfJoint},
		{key: "n_low", partner: "alpha_low", relative: true, bounds: boundsOfPower},
		{key: "alpha_high", partner: "n_high", relative: true, bounds: boundsOfJoint},
		{key: "n_high", partner: "alpha_high", relative: true, bounds: boundsOfPower},
	},
	makeFrom: func(b binning, form Form) stats.Shape {
		return newCrystalBall(b, form.has("alpha_low"), form.has("alpha_high"))
	},
	check: func(b binning, at []float64) (key, what string) {
		if key, what := gaussianKind.check(b, at[:2]); what != "" {
			return key, what
		}
		for i, side := range []string{"low", "high"} {
			alpha, n := at[2+2*i], at[3+2*i]
			switch {
			case math.IsNaN(alpha): // no tail on this side
			case !(alpha >= 1e-6):
				return "alpha_" + side, fmt.Sprintf("alpha_%v is %v, must be at least 1e-06: the core would have no %v side", side, alpha, side)
			case !(alpha <= farthest):
				return "alpha_" + side, fmt.Sprintf("alpha_%v is %v: beyond %v widths a tail holds nothing, leave alpha_%v and n_%v out", side, alpha, farthest, side, side)
			case !(n > 1):
				return "n_" + side, fmt.Sprintf("n_%v is %v, must be above 1: a tail with a smaller power has no finite area", side, n)
			case !(n <= sharpest):
				return "n_" + side, fmt.Sprintf("n_%v is %v, must not be above %v: the tail is an exponential long before", side, n, sharpest)
			}
		}
		return "", ""
	},
}

func boundsOfJoint(_ binning, alpha float64) (lower, upper, step float64) {
	return -math.Ln10, max(0, min(math.Ln10, math.Log(farthest/alpha))), 0.1
}

// boundsOfPower stays above a power of 1, as scenarios do.
func boundsOfPower(_ binning, n float64) (lower, upper, step float64) {
	return math.Log1p(1e-3*(n-1)) - math.Log(n), 2 * math.Ln10, 0.1
}

// crystalBall is a normal core that goes over, at a distance of alpha widths from
// the mean, into a tail that falls as a power n of the distance from some point,
// with equal value and slope: Oreglia, SLAC-R-236 (1980), appendix D; Gaiser,
// SLAC-R-255 (1982), appendix F (both from memory), with a tail on either side or
// on none. Its quantities are the mean and the logarithms of the width, and of
// alpha and n of each tail that there is, low before high.
type crystalBall struct {
	binning
	at     []float64 // edges
	first  [2]int    // quantity of the low and high alpha, 0 for no such tail
	number int       // of quantities
}

func newCrystalBall(b binning, low, high bool) crystalBall {
	s := crystalBall{binning: b, at: make([]float64, b.bins+1), number: 2}
	for i := range s.at {
		s.at[i] = b.edge(i)
	}
	for side, present := range [2]bool{low, high} {
		if present {
			s.first[side] = s.number
			s.number += 2
		}
	}
	return s
}

// finest is the step in widths below which a bin is integrated by quadrature:
// differences over its edges would lose digits. Four points are exact to rounding
// there.
const finest = 0.01

// Fill implements stats.Shape. Over a window powers of 1 and below are like others: an
// uncertainty may lead there. The shape does not exist where the window holds less
// than emptyWindow of the peak.
func (s crystalBall) Fill(q, f, d1, d2 []float64) {
	if len(f) != s.bins {
		panic(wrongBins)
	}
	mean, inverse := q[0], math.Exp(-q[1])
	low, high := noTail, noTail
	exists := inverse > 0 && !math.IsInf(inverse*inverse, 1) && !math.IsNaN(mean) && !math.IsInf(mean, 0)
	if k := s.first[0]; k != 0 {
		low = newPowerTail(q[k], q[k+1])
		exists = exists && low.exists()
	}
	if k := s.first[1]; k != 0 {
		high = newPowerTail(q[k], q[k+1])
		exists = exists && high.exists()
	}
	if !exists {
		undefined(f, d1, d2)
		return
	}
	c := curve{tails: [2]powerTail{low, high}, inverse: inverse, derivatives: d1 != nil}

	total := 0.0
	z1 := (s.at[0] - mean) * inverse
	var p1, p2 point // at the edges, where derivatives need them
	if c.derivatives {
		p1 = c.point(z1)
	}
	for i := range f {
		z2 := (s.at[i+1] - mean) * inverse
		if c.derivatives {
			p2 = c.point(z2)
		}
		c.cell = cell{}
		if width := (s.at[i+1] - s.at[i]) * inverse; width < finest {
			c.quadrature(z1, z2, width)
		} else {
			c.closed(z1, z2, width, &p1, &p2)
		}
		f[i] = c.f
		total += c.f
		if c.derivatives {
			s.store(&c.cell, i, d1, d2)
		}
		z1, p1 = z2, p2
	}
	if !(total > emptyWindow) {
		undefined(f, d1, d2)
		return
	}
	var t1 [6]float64
	var t2 [21]float64
	pairs := s.number * (s.number + 1) / 2
	if c.derivatives {
		for a := range s.number {
			t1[a] = sum(d1[a*s.bins:][:s.bins])
		}
		for p := range pairs {
			t2[p] = sum(d2[p*s.bins:][:s.bins])
		}
	}
	normalise(f, d1, d2, total, t1[:s.number], t2[:pairs])
}

func sum(list []float64) (total float64) {
	for _, v := range list {
		total += v
	}
	return total
}

// store puts the derivatives of bin i in the places that stats.Shape asks for.
func (s crystalBall) store(c *cell, i int, d1, d2 []float64) {
	n, bins := s.number, s.bins
	d1[i], d1[bins+i] = c.m, c.u
	d2[i], d2[bins+i], d2[n*bins+i] = c.mm, c.mu, c.uu
	for side, k := range s.first {
		if k == 0 {
			continue
		}
		t := &c.tail[side]
		d1[k*bins+i], d1[(k+1)*bins+i] = t.a, t.n
		d2[k*bins+i], d2[(k+1)*bins+i] = t.ma, t.mn
		d2[pair(n, 1, k)*bins+i], d2[pair(n, 1, k+1)*bins+i] = t.ua, t.un
		d2[pair(n, k, k)*bins+i], d2[pair(n, k, k+1)*bins+i], d2[pair(n, k+1, k+1)*bins+i] = t.aa, t.an, t.nn
	}
	if low, high := s.first[0], s.first[1]; low != 0 && high != 0 {
		for a := low; a < low+2; a++ {
			for b := high; b < high+2; b++ {
				d2[pair(n, a, b)*bins+i] = 0
			}
		}
	}
}

// powerTail is one tail, with its distances counted outwards from the mean in
// widths: g(y) = exp(-α²/2) (1 + α(y-α)/n)^-n for y > α.
type powerTail struct {
	alpha, n  float64
	excess    float64 // n-1, of either sign
	slope     float64 // α/n
	logarithm float64 // of the value at the joint
}

var noTail = powerTail{alpha: math.Inf(1)}

// newPowerTail takes the logarithms of alpha and n.
func newPowerTail(a, n float64) powerTail {
	t := powerTail{alpha: math.Exp(a), n: math.Exp(n), excess: math.Expm1(n)}
	t.slope = t.alpha / t.n
	t.logarithm = -0.5 * t.alpha * t.alpha
	return t
}

func (t powerTail) exists() bool {
	return t.n > 0 && t.slope > 0 && !math.IsInf(t.n/t.slope, 1) && !math.IsInf(t.logarithm, -1)
}

// cell is the integral over a bin of the curve g(z), z = (x-mean)/width, and its
// derivatives by m, the mean, and u, a and n, the logarithms of the width, alpha
// and the power.
type cell struct {
	f, m, u, mm, mu, uu float64
	tail                [2]tailCell
}

type tailCell struct {
	a, n, ma, mn, ua, un, aa, an, nn float64
}

// point is the curve at one place, with derivatives by z; in a tail also by its
// logarithms a and n.
type point struct {
	g, z, zz                 float64
	side                     int // of the tail, -1 for the core
	a, n, za, zn, aa, an, nn float64
}

// curve is the shape at given quantities, its value at the mean being 1. Value and
// slope are continuous at the joints, and so are all first derivatives, so that
// second derivatives of an integral have no terms from there.
type curve struct {
	tails       [2]powerTail
	inverse     float64 // 1/width
	derivatives bool
	cell
}

func (c *curve) point(z float64) point {
	switch {
	case z < -c.tails[0].alpha:
		p := c.tails[0].point(-z, c.derivatives)
		p.z, p.za, p.zn = -p.z, -p.za, -p.zn
		return p
	case z > c.tails[1].alpha:
		p := c.tails[1].point(z, c.derivatives)
		p.side = 1
		return p
	}
	g := math.Exp(-0.5 * z * z)
	return point{g: g, z: -z * g, zz: (z*z - 1) * g, side: -1}
}

func (t *powerTail) point(y float64, derivatives bool) (p point) {
	s := t.slope * (y - t.alpha)
	l := math.Log1p(s)
	p.g = math.Exp(t.logarithm - t.n*l)
	if !derivatives {
		return p
	}
	e := 1 / (1 + s)
	k := t.logDerivatives(l, s*e, e)
	p.z = -t.alpha * e * p.g
	p.zz = t.alpha * t.slope * (t.n + 1) * e * e * p.g
	p.a, p.n = p.g*k.a, p.g*k.n
	// ∂/∂y of s/(1+s) is slope·e², that of ln(1+s) is slope·e.
	p.za = p.z*k.a - p.g*(t.alpha*t.alpha+t.n)*t.slope*e*e
	p.zn = p.z*k.n - p.g*t.alpha*e*s*e
	p.aa, p.an, p.nn = p.g*(k.a*k.a+k.aa), p.g*(k.a*k.n+k.an), p.g*(k.n*k.n+k.nn)
	return p
}

// logDerivatives are the derivatives of ln g by a and n at a fixed distance y.
type logDerivatives struct{ a, n, aa, an, nn float64 }

// logDerivatives takes s = α(y-α)/n as l = ln(1+s), p = s/(1+s) and e = 1/(1+s).
// From s_a = s - α²/n and s_n = -s follow p_a = pe - α²/n e², p_n = -pe,
// l_a = p - α²/n e and l_n = -p.
func (t *powerTail) logDerivatives(l, p, e float64) logDerivatives {
	square := t.alpha * t.alpha
	steep := square + t.n
	return logDerivatives{
		a:  -steep * p,
		n:  t.n * (p - l),
		aa: -2*square*p - steep*e*(p-t.alpha*t.slope*e),
		an: -t.n*p + steep*p*e,
		nn: t.n * (p - l + p*p),
	}
}

// parts cuts a bin at the joints, into a low tail, core and high tail, each with its
// beginning and length. The width of the bin is given beside its edges, which may be
// so far out that their difference has lost digits.
func (c *curve) parts(z1, z2, width float64) (from, length [3]float64) {
	low, high := -c.tails[0].alpha, c.tails[1].alpha
	from = [3]float64{z1, max(z1, low), max(z1, high)}
	switch {
	case z2 <= low:
		length[0] = width
	case z1 >= high:
		length[2] = width
	default:
		length[0], length[2] = max(0, low-z1), max(0, z2-high)
		length[1] = width - length[0] - length[2]
	}
	return from, length
}

// quadrature integrates the curve over a bin that is narrow against the width.
func (c *curve) quadrature(z1, z2, width float64) {
	from, lengths := c.parts(z1, z2, width)
	for i, length := range lengths {
		if !(length > 0) {
			continue
		}
		for k, x := range fourPoints.at {
			z := from[i] + x*length
			p := c.point(z)
			c.addPoint(z, length*fourPoints.weight[k], &p)
		}
	}
}

// addPoint adds a point of a quadrature. With F = ∫g dz, edges moving by
// z_m = -1/width and z_u = -z, a derivative is an integral along z: F_m = -∫g'/width,
// F_u = -∫(zg)', F_uu = ∫(z(zg)')', and so on.
func (c *curve) addPoint(z, weight float64, p *point) {
	c.f += weight * p.g
	if !c.derivatives {
		return
	}
	weightM := weight * c.inverse
	c.m -= weightM * p.z
	c.u -= weight * (p.g + z*p.z)
	c.mm += weightM * c.inverse * p.zz
	c.mu += weightM * (z*p.zz + 2*p.z)
	c.uu += weight * (z*z*p.zz + 3*z*p.z + p.g)
	if p.side < 0 {
		return
	}
	t := &c.tail[p.side]
	t.a += weight * p.a
	t.n += weight * p.n
	t.ma -= weightM * p.za
	t.mn -= weightM * p.zn
	t.ua -= weight * (p.a + z*p.za)
	t.un -= weight * (p.n + z*p.zn)
	t.aa += weight * p.aa
	t.an += weight * p.an
	t.nn += weight * p.nn
}

// closed integrates the curve over a bin by its integral, and takes derivatives
// by mean and width from the bin's two edges.
func (c *curve) closed(z1, z2, width float64, p1, p2 *point) {
	from, length := c.parts(z1, z2, width)
	if length[0] > 0 {
		c.addTail(0, -from[0]-length[0], length[0])
	}
	if length[1] > 0 {
		c.f += core(from[1], min(z2, c.tails[1].alpha))
	}
	if length[2] > 0 {
		c.addTail(1, from[2], length[2])
	}
	if c.derivatives {
		c.addEdge(z1, -1, p1)
		c.addEdge(z2, 1, p2)
	}
}

func (c *curve) addEdge(z, sign float64, p *point) {
	signM := sign * c.inverse
	c.m -= signM * p.g
	c.u -= sign * z * p.g
	c.mm += signM * c.inverse * p.z
	c.mu += signM * (z*p.z + p.g)
	c.uu += sign * z * (z*p.z + p.g)
	if p.side < 0 {
		return
	}
	t := &c.tail[p.side]
	t.ma -= signM * p.a
	t.mn -= signM * p.n
	t.ua -= sign * z * p.a
	t.un -= sign * z * p.n
}

// core is ∫ exp(-z²/2) dz, as a difference of the smaller tails.
func core(z1, z2 float64) float64 {
	switch {
	case z1 >= 0:
		return beyond(z1) - beyond(z2)
	case z2 <= 0:
		return beyond(-z2) - beyond(-z1)
	}
	return math.Sqrt(2*math.Pi) - beyond(z2) - beyond(-z1)
}

// beyond is the integral of exp(-z²/2) from z >= 0 on.
func beyond(z float64) float64 {
	if z > farthest {
		return 0
	}
	return math.Exp(-0.5*z*z) * mills(z*millsSteps)
}

// addTail adds the tail that begins at a distance from the mean, over a length. In l
// = ln(1+s), s = α(y-α)/n, it is an exponential that begins at l1 and is long by r,
//
//	ln F = -α²/2 + ln(n/α) - (n-1)·l1 + ln ∫exp(-(n-1)l) dl from 0 to r,
//
// which has no singular power. Derivatives are those of ln F by the chain rule, with
// the moments of l, and l_a, l_n and their derivatives as in logDerivatives. They are
// at a fixed place, as if a joint did not move: it changes F in third order only.
func (c *curve) addTail(side int, distance, length float64) {
	t := &c.tails[side]
	s := t.slope * (distance - t.alpha)
	e1 := 1 / (1 + s)
	l := math.Log1p(s)
	step := t.slope * length * e1
	r := math.Log1p(step)
	decays := t.excess * r
	f := math.Exp(t.logarithm-t.excess*l) / t.slope * r * decay(decays)
	c.f += f
	if !c.derivatives || f == 0 {
		return
	}
	mean, variance := decayMoments(decays)
	last := 1 - decays*mean // r times the density of l at its end
	square := t.alpha * t.alpha
	x := t.alpha * t.slope // α²/n
	p := s * e1
	e2 := e1 / (1 + step)
	la := p - x*e1
	laa, lan, lnn := e1*((1+x)*la-2*x), e1*(x-(1+x)*p), e1*p
	// Derivatives of r, over r.
	q := step * e2 / r
	ra, rn := (1+x)*q, -q
	raa, ran, rnn := q*((1+x)*(1+x)*(e1+e2)-(1-x)), q*(1-(1+x)*(e1+e2)), q*(e1+e2-1)

	nr := t.n * r
	both := -last * (decays + last)  // r² ∂²/∂r² of the logarithm of the integral
	mixed := -last * (1 - mean) * nr // n·r ∂²/∂r∂n
	k := logDerivatives{
		a:  -square - 1 - t.excess*la + last*ra,
		n:  1 - t.n*l + t.excess*p - nr*mean + last*rn,
		aa: -2*square - t.excess*laa + last*raa + both*ra*ra,
		an: -t.excess*lan - t.n*la + last*ran + both*ra*rn + mixed*ra,
		nn: -t.excess*lnn + t.n*(2*p-l) - nr*mean + nr*nr*variance + last*rnn + 2*mixed*rn + both*rn*rn,
	}
	sums := &c.tail[side]
	sums.a += f * k.a
	sums.n += f * k.n
	sums.aa += f * (k.a*k.a + k.aa)
	sums.an += f * (k.a*k.n + k.an)
	sums.nn += f * (k.n*k.n + k.nn)
}
