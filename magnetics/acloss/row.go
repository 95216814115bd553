package acloss

import (
	"math"
	"math/cmplx"

	"gapwright/corelib/bessel"
)

// rowOrders is the number of multipoles of each parity in a row. Four are
// converged to 0.1 % up to d/p = 0.96.
const rowOrders = 4

// RowFactors are the loss factors of a wire that lies in an infinite straight
// row of equal wires which all see the same field. Peak H along the row, across
// it, and peak own current I lose rho (Along |H|^2 + Across |H|^2 + Own I^2)
// per metre; Own is in 1/m^2 and comes on top of the skin effect.
type RowFactors struct{ Along, Across, Own float64 }

// Row returns the factors of wires of the given diameter at pitch p, m, in a
// metal with skin depth delta. Exact for one row; in a stack of layers with the
// field along them it is up to 4 % low. Across must not be used where the
// field is local (near a gap, at winding ends): there the wires around shield
// the field as a group, and the row overstates it up to twofold.
//
// The multipole coefficients E_k, in units of the radius a, obey
//
//	E_k = ext_k + sgn sum_n 2 C(n+k-1,k) zeta(n+k) (a/p)^(n+k) gamma_n E_n
//
// for orders of one parity: odd for a field (sgn + along, - across,
// ext_1 = a H), even for the own current (sgn +,
// ext_n = I/(2 pi) 2 zeta(n) (a/p)^n / n).
func Row(diameter, p, delta float64) RowFactors {
	if !(diameter > 0) || !(p >= diameter) || !(delta > 0) {
		panic("acloss: row needs 0 < diameter <= pitch and a skin depth")
	}
	if math.IsInf(delta, 1) {
		return RowFactors{}
	}
	a := diameter / 2
	var gamma [2*rowOrders + 1]complex128
	for n := 1; n <= 2*rowOrders; n++ {
		gamma[n] = bessel.Reflection(n, argument(diameter/delta))
	}
	loss := func(first int, sign float64, ext func(n int) float64) float64 {
		const width = rowOrders + 1
		var m [rowOrders * width]complex128
		for i := range rowOrders {
			k := first + 2*i
			for j := range rowOrders {
				n := first + 2*j
				m[i*width+j] = -complex(sign*2*binomial(n+k-1, k)*zeta(n+k)*math.Pow(a/p, float64(n+k)), 0) * gamma[n]
			}
			m[i*width+i]++
			m[i*width+rowOrders] = complex(ext(k), 0)
		}
		if err := eliminate(m[:], rowOrders, width); err != nil {
			panic(err) // a row whose pitch is not below the diameter is regular
		}
		sum := 0.0
		for i := range rowOrders {
			n := first + 2*i
			e := cmplx.Abs(m[i*width+rowOrders])
			sum += 2 * math.Pi * float64(n) / (delta * delta) * math.Abs(imag(gamma[n])) * e * e
		}
		return sum
	}
	field := func(n int) float64 {
		if n == 1 {
			return a
		}
		return 0
	}
	return RowFactors{
		Along:  loss(1, 1, field),
		Across: loss(1, -1, field),
		Own: loss(2, 1, func(n int) float64 {
			return zeta(n) * math.Pow(a/p, float64(n)) / (math.Pi * float64(n))
		}),
	}
}

func binomial(n, k int) float64 {
	v := 1.0
	for i := 1; i <= k; i++ {
		v = v * float64(n-k+i) / float64(i)
	}
	return v
}

// zeta is the Riemann zeta function of an integer from 2 on: the sum to 20 and
// the first terms of the Euler-Maclaurin tail, good to 1e-10.
func zeta(q int) float64 {
	const n = 20.0
	s := float64(q)
	sum := math.Pow(n, 1-s)/(s-1) - math.Pow(n, -s)/2 + s/12*math.Pow(n, -s-1) - s*(s+1)*(s+2)/720*math.Pow(n, -s-3)
	for i := 20; i >= 1; i-- {
		sum += math.Pow(float64(i), -s)
	}
	return sum
}
