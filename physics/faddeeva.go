package physics

import "math"

const (
	inverseRootPi = 0.564189583547756286948079451560772586 // 1/√π
	// asymptotic is where |z|² is large enough for the expansion in 1/z²: its
	// smallest term is there some exp(-49).
	asymptotic = 49
	// nearAxis is the imaginary part below which the real part, which shrinks with
	// it, is computed by itself.
	nearAxis = 0.1
	// weidemanTerms, an even number, gives 1e-14 over the upper half plane.
	weidemanTerms = 44
	// axisTerms of a Taylor series over nearAxis leave 1e-17.
	axisTerms = 16
)

// faddeeva holds w(z) = exp(-z²) erfc(-iz), DLMF 7.2.3, with two derivatives, at z =
// x+iy, and the integral of Re w/√π along x from |x| to infinity: the share of a
// Voigt profile (DLMF 7.19.1) beyond that place.
type faddeeva struct {
	w, d1, d2 complex128
	beyond    float64
}

// newFaddeeva is at z = x+iy with y >= 0.
func newFaddeeva(x, y float64) (v faddeeva) {
	if x < 0 { // DLMF 7.4.3: w(-x+iy) is the conjugate of w(x+iy)
		v = newFaddeeva(-x, y)
		v.w = complex(real(v.w), -imag(v.w))
		v.d1 = complex(-real(v.d1), imag(v.d1))
		v.d2 = complex(real(v.d2), -imag(v.d2))
		return v
	}
	square := x*x + y*y
	if square >= asymptotic {
		v.expand(x, y, square)
		if y < nearAxis && x < 28 {
			v.addNormal(x, y)
		}
		return v
	}
	if y < nearAxis {
		v.fromAxis(x, y)
	} else {
		v.weideman(x, y)
	}
	// DLMF 7.10.2 and its derivative.
	z := complex(x, y)
	v.d1 = -2*z*v.w + complex(0, 2*inverseRootPi)
	v.d2 = -2 * (v.w + z*v.d1)
	return v
}

// addNormal adds exp(-z²), all there is of the real part on the real axis. Off the
// axis it matters only where 2xy is small, and the integral is that of exp(-x²).
func (v *faddeeva) addNormal(x, y float64) {
	size := math.Exp((y - x) * (y + x))
	sin, cos := math.Sincos(2 * x * y)
	c, z := complex(size*cos, -size*sin), complex(x, y)
	v.w += c
	v.d1 += -2 * z * c
	v.d2 += (4*z*z - 2) * c
	v.beyond += 0.5 * math.Erfc(x)
}

// expand is the expansion w = i/(√π z) Σ (2k-1)!!/(2z²)^k, DLMF 7.12.1, as a nest of
// brackets 1 + (2k-1)/(2z²)·(…). The two innermost but one give the derivatives,
// without the cancellation in -2zw + 2i/√π. Its integral is i/√π ln z and another
// such series.
func (v *faddeeva) expand(x, y, square float64) {
	terms := 20
	switch {
	case square > 1e4:
		terms = 5
	case square > 400:
		terms = 8
	case square > 100:
		terms = 13
	}
	inverse := complex(x/square, -y/square) // 1/z
	s := inverse * inverse
	half := 0.5 * s
	third := complex(1, 0)
	var integral complex128
	for k := terms; k >= 3; k-- {
		third = 1 + complex(float64(2*k-1), 0)*half*third
		integral = (integral + complex(expansion[k], 0)) * s
	}
	integral = ((integral+complex(expansion[2], 0))*s + complex(expansion[1], 0)) * s
	second := 1 + 3*half*third
	first := 1 + half*second
	front := complex(0, inverseRootPi) * inverse
	v.w = front * first
	v.d1 = complex(0, -inverseRootPi) * s * second
	v.d2 = front * s * (3*third - second)
	v.beyond = (math.Atan2(y, x) - imag(integral)) / math.Pi
}

// expansion holds (2k-1)!!/2^k/(2k), the coefficients of the integral.
var expansion = makeExpansion()

func makeExpansion() (c [21]float64) {
	product := 1.0
	for k := 1; k < len(c); k++ {
		product *= float64(k) - 0.5
		c[k] = product / float64(2*k)
	}
	return c
}

// fromAxis is the Taylor series from the real axis, where w = exp(-x²) + 2i/√π D(x)
// with Dawson's integral D (DLMF 7.5.1). Derivatives follow from w' = -2zw + 2i/√π:
// w⁽ᵏ⁺¹⁾ = -2zw⁽ᵏ⁾ - 2kw⁽ᵏ⁻¹⁾. No term of the real part, nor of its integral, stems
// from a difference with the imaginary part: both keep their digits for any y.
func (v *faddeeva) fromAxis(x, y float64) {
	v.weideman(x, 0)
	before := complex(math.Exp(-x*x), imag(v.w))
	z := complex(x, 0)
	derivative := -2*z*before + complex(0, 2*inverseRootPi)
	w, sum := before, y*imag(before)
	power := y // y^k/k!, with the sign of i^k
	for k := 1; k < axisTerms; k += 2 {
		w += complex(0, power) * derivative
		power *= -y / float64(k+1)
		sum -= power * real(derivative)
		before, derivative = derivative, -2*(z*derivative+complex(float64(k), 0)*before)
		w += complex(power, 0) * derivative
		power *= y / float64(k+2)
		sum += power * imag(derivative)
		before, derivative = derivative, -2*(z*derivative+complex(float64(k+1), 0)*before)
	}
	v.w = w
	v.beyond = 0.5*math.Erfc(x) + inverseRootPi*sum
}

var weidemanLength = math.Sqrt(weidemanTerms / math.Sqrt2)

// weidemanCoefficients are those of w and of its integral.
var weidemanCoefficients, weidemanIntegral = makeWeidemanCoefficients()

// makeWeidemanCoefficients follows Weideman, SIAM J. Numer. Anal. 31 (1994) 1497
// (from memory): the Fourier coefficients of exp(-t²)(L²+t²), t = L tan(θ/2), by
// the trapezoidal rule.
func makeWeidemanCoefficients() (a, integral [weidemanTerms]float64) {
	const points = 4 * weidemanTerms
	length := weidemanLength
	for k := 1 - points/2; k < points/2; k++ {
		theta := 2 * math.Pi * float64(k) / points
		t := length * math.Tan(theta/2)
		v := math.Exp(-t*t) * (length*length + t*t) / points
		for n := range a {
			a[n] += v * math.Cos(float64(n+1)*theta)
		}
	}
	for n, v := range a {
		integral[n] = v / float64(n+1)
	}
	return a, integral
}

// weideman is w = 2p(Z)/(L-iz)² + 1/(√π(L-iz)) with Z = (L+iz)/(L-iz) and p the
// polynomial of the coefficients. Because dZ/dz = 2iL/(L-iz)², its integral is
// -i/L ∫p dZ + i/√π ln(L-iz).
func (v *faddeeva) weideman(x, y float64) {
	down := weidemanLength + y // L-iz = down - ix
	size := 1 / (down*down + x*x)
	inverse := complex(down*size, x*size)
	mapped := complex(weidemanLength-y, x) * inverse
	square := mapped * mapped
	// Sums in steps of Z², of which none waits for another.
	var p0, p1, i0, i1 complex128
	for n := weidemanTerms - 2; n >= 0; n -= 2 {
		c, i := weidemanCoefficients[n:n+2:n+2], weidemanIntegral[n:n+2:n+2]
		p0 = p0*square + complex(c[0], 0)
		p1 = p1*square + complex(c[1], 0)
		i0 = i0*square + complex(i[0], 0)
		i1 = i1*square + complex(i[1], 0)
	}
	p := p0 + mapped*p1
	v.w = inverse * (2*p*inverse + inverseRootPi)
	integral := mapped * (i0 + mapped*i1)
	v.beyond = math.Atan2(down, x)/math.Pi - imag(integral)*inverseRootPi/weidemanLength
}
