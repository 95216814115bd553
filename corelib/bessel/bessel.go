// Package bessel computes what eddy currents in round wires and the field of a
// gap mouth need of the Bessel functions of the first kind: ratios of
// neighbouring integer orders at complex argument, and single functions of
// fractional order at real argument.
//
// Ratios are computed instead of the functions themselves because J_n(z) grows
// as exp|Im z| and leaves the range of float64 for a wire of a few hundred skin
// depths, while the ratios stay near ±i.
package bessel

import (
	"math"
	"math/cmplx"
)

// hankelLimit is the modulus beyond which the asymptotic series of the ratio is
// used. Its smallest term is about exp(-2|z|), and the second exponential that
// it leaves out is exp(-2|Im z|): both below 1e-24 for the wedge that
// asymptotic accepts.
const hankelLimit = 40

// Ratio returns J_{n+1}(z)/J_n(z), n >= 0.
//
// It is meant for the arguments of eddy currents, on and near the diagonals
// |Re z| = |Im z|. On the real axis J_n has zeros, where the ratio is
// infinite. Ratio panics if n is negative or z is not finite.
//
// Near the origin and in the middle range it evaluates the continued fraction
// of the ratio (Abramowitz and Stegun 9.1.73), beyond a modulus of 40 the
// Hankel expansion (9.2.5), where the two series of numerator and denominator
// share their exponential.
func Ratio(n int, z complex128) complex128 {
	if n < 0 {
		panic("bessel: negative order")
	}
	if cmplx.IsNaN(z) || cmplx.IsInf(z) {
		panic("bessel: argument is not finite")
	}
	if z == 0 {
		return 0
	}
	// The Hankel series needs |z| well above the square of the order.
	if a := cmplx.Abs(z); a > hankelLimit+float64(n*n) && math.Abs(imag(z)) > a/2 {
		return asymptoticRatio(n, z)
	}
	return fractionRatio(n, z)
}

// fractionRatio evaluates J_{n+1}/J_n = 1/(b_1 - 1/(b_2 - ...)) with
// b_k = 2(n+k)/z by the modified Lentz method. The fraction converges for every
// z; it takes about |z| terms.
func fractionRatio(n int, z complex128) complex128 {
	const tiny = 1e-280
	inv := 2 / z
	f := complex(tiny, 0)
	c, d := f, complex128(0)
	limit := 100 + int(3*cmplx.Abs(z))
	for k := 1; k <= limit; k++ {
		a := complex128(-1)
		if k == 1 {
			a = 1
		}
		b := complex(float64(n+k), 0) * inv
		if d = b + a*d; d == 0 {
			d = tiny
		}
		if c = b + a/c; c == 0 {
			c = tiny
		}
		d = 1 / d
		step := c * d
		f *= step
		if cmplx.Abs(step-1) < 1e-16 {
			break
		}
	}
	return f
}

// asymptoticRatio uses J_n ~ sqrt(1/(2 pi z)) exp(±i(z - n pi/2 - pi/4)) S_n,
// where S_n = sum (±i)^k a_k(n)/z^k and the sign belongs to the exponential
// that grows: + for Im z < 0.
func asymptoticRatio(n int, z complex128) complex128 {
	i := complex(0, 1)
	if imag(z) > 0 {
		i = -i
	}
	// exp of the phase step -n pi/2 from order n to n+1: -i for the sign +.
	return -i * hankelSeries(float64(n+1), i, z) / hankelSeries(float64(n), i, z)
}

// hankelSeries sums (i/z)^k a_k(nu) down to its smallest term.
func hankelSeries(nu float64, i, z complex128) complex128 {
	sum, term := complex128(1), complex128(1)
	last := 1.0
	for k := 1; k < 200; k++ {
		odd := float64(2*k - 1)
		term *= i / z * complex((4*nu*nu-odd*odd)/(8*float64(k)), 0)
		size := cmplx.Abs(term)
		// Terms may grow at first, while the order is above the square root of z.
		if size < 1e-17 || (size > last && odd > 2*nu) {
			break
		}
		sum += term
		last = size
	}
	return sum
}

// Reflection returns J_{n+1}(z)/J_{n-1}(z), n >= 1: the coefficient with which
// a round conductor answers a transverse field of order n (n = 1: uniform).
func Reflection(n int, z complex128) complex128 {
	if n < 1 {
		panic("bessel: reflection of an order below 1")
	}
	upper := Ratio(n, z)
	// J_n/J_{n-1} = 1/(2n/z - J_{n+1}/J_n); the recurrence is used downwards,
	// where it is stable.
	if z == 0 {
		return 0
	}
	return upper / (complex(float64(2*n), 0)/z - upper)
}

// Reduced returns Gamma(nu+1) (2/x)^nu J_nu(x) for real x >= 0 and nu > -1. It
// is 1 at x = 0; with nu = 1/2 it is sin(x)/x, with nu = 0 it is J_0(x).
// The error is below 1e-10 for |nu| <= 1. It panics on arguments outside of the
// domain.
func Reduced(nu, x float64) float64 {
	if !(nu > -1) || !(x >= 0) || math.IsInf(x, 1) {
		panic("bessel: reduced function outside of its domain")
	}
	if x < 13 {
		q := x * x / 4
		sum, term := 1.0, 1.0
		for k := 1; k < 200; k++ {
			term *= -q / (float64(k) * (float64(k) + nu))
			sum += term
			if math.Abs(term) < 1e-17 {
				break
			}
		}
		return sum
	}
	// J_nu = sqrt(2/(pi x)) Re[ exp(i chi) S ], chi = x - nu pi/2 - pi/4.
	chi := x - (2*nu+1)*math.Pi/4
	s := hankelSeries(nu, 1i, complex(x, 0))
	sin, cos := math.Sincos(chi)
	j := math.Sqrt(2/(math.Pi*x)) * (cos*real(s) - sin*imag(s))
	return math.Gamma(nu+1) * math.Pow(2/x, nu) * j
}
