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
	// weidemanTerms, a multiple of 4, gives 1e-14 over the upper half plane.
	weidemanTerms = 44
	// dawsonTerms of a Taylor series over nearAxis leave 1e-17.
	dawsonTerms = 16
)

// faddeeva holds w(z) = exp(-z²) erfc(-iz), DLMF 7.2.3, and two derivatives.
type faddeeva struct{ w, d1, d2 complex128 }

// newFaddeeva is at z = x+iy with y >= 0.
func newFaddeeva(x, y float64) (v faddeeva) {
	if x < 0 { // DLMF 7.4.3: w(-x+iy) is the conjugate of w(x+iy)
		v = newFaddeeva(-x, y)
		return faddeeva{
			complex(real(v.w), -imag(v.w)),
			complex(-real(v.d1), imag(v.d1)),
			complex(real(v.d2), -imag(v.d2)),
		}
	}
	square := x*x + y*y
	if square >= asymptotic {
		v = expanded(x, y, square)
		if y < nearAxis && x < 28 {
			v.add(x, y, normalPart(x, y))
		}
		return v
	}
	if y < nearAxis {
		d := dawson(x, y)
		v.w = complex(-2*inverseRootPi*imag(d), 2*inverseRootPi*real(d)) + normalPart(x, y)
	} else {
		v.w = weideman(x, y)
	}
	// DLMF 7.10.2 and its derivative.
	z := complex(x, y)
	v.d1 = -2*z*v.w + complex(0, 2*inverseRootPi)
	v.d2 = -2 * (v.w + z*v.d1)
	return v
}

// normalPart is exp(-z²), all there is of the real part on the real axis.
func normalPart(x, y float64) complex128 {
	size := math.Exp((y - x) * (y + x))
	sin, cos := math.Sincos(2 * x * y)
	return complex(size*cos, -size*sin)
}

// add adds c = exp(-z²).
func (v *faddeeva) add(x, y float64, c complex128) {
	z := complex(x, y)
	v.w += c
	v.d1 += -2 * z * c
	v.d2 += (4*z*z - 2) * c
}

// expanded is the expansion w = i/(√π z) Σ (2k-1)!!/(2z²)^k, DLMF 7.12.1, as a
// nest of brackets 1 + (2k-1)/(2z²)·(…). The two innermost but one give the
// derivatives, without the cancellation in -2zw + 2i/√π.
func expanded(x, y, square float64) faddeeva {
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
	for k := terms; k >= 3; k-- {
		third = 1 + complex(float64(2*k-1), 0)*half*third
	}
	second := 1 + 3*half*third
	first := 1 + half*second
	front := complex(0, inverseRootPi) * inverse
	return faddeeva{
		w:  front * first,
		d1: complex(0, -inverseRootPi) * s * second,
		d2: front * s * (3*third - second),
	}
}

// dawson is Dawson's integral at z near the real axis, w = exp(-z²) + 2i/√π D(z)
// (DLMF 7.5.1), by its Taylor series from the axis. Its derivatives follow from
// D' = 1 - 2zD: D⁽ᵏ⁺¹⁾ = -2zD⁽ᵏ⁾ - 2kD⁽ᵏ⁻¹⁾. No term of the imaginary part
// stems from a difference with the real part.
func dawson(x, y float64) complex128 {
	before := imag(weideman(x, 0)) / (2 * inverseRootPi)
	derivative := 1 - 2*x*before
	re, im := before, 0.0
	power := y // y^k/k!, with the sign of i^k
	for k := 1; k < dawsonTerms; k += 2 {
		im += power * derivative
		power *= -y / float64(k+1)
		before, derivative = derivative, -2*(x*derivative+float64(k)*before)
		re += power * derivative
		power *= y / float64(k+2)
		before, derivative = derivative, -2*(x*derivative+float64(k+1)*before)
	}
	return complex(re, im)
}

var weidemanLength = math.Sqrt(weidemanTerms / math.Sqrt2)

var weidemanCoefficients = makeWeidemanCoefficients()

// makeWeidemanCoefficients follows Weideman, SIAM J. Numer. Anal. 31 (1994) 1497
// (from memory): the Fourier coefficients of exp(-t²)(L²+t²), t = L tan(θ/2), by
// the trapezoidal rule.
func makeWeidemanCoefficients() (a [weidemanTerms]float64) {
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
	return a
}

// weideman is w = 2p(Z)/(L-iz)² + 1/(√π(L-iz)) with Z = (L+iz)/(L-iz) and p the
// polynomial of the coefficients.
func weideman(x, y float64) complex128 {
	down := weidemanLength + y // L-iz = down - ix
	size := 1 / (down*down + x*x)
	inverse := complex(down*size, x*size)
	mapped := complex(weidemanLength-y, x) * inverse
	// Four sums in steps of Z⁴, none of which waits for another.
	square := mapped * mapped
	fourth := square * square
	var p0, p1, p2, p3 complex128
	for n := weidemanTerms - 4; n >= 0; n -= 4 {
		c := weidemanCoefficients[n : n+4 : n+4]
		p0 = p0*fourth + complex(c[0], 0)
		p1 = p1*fourth + complex(c[1], 0)
		p2 = p2*fourth + complex(c[2], 0)
		p3 = p3*fourth + complex(c[3], 0)
	}
	p := p0 + mapped*p1 + square*(p2+mapped*p3)
	return inverse * (2*p*inverse + inverseRootPi)
}
