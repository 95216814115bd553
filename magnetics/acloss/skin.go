// Package acloss computes the loss of windings at one frequency from the
// magnetic field around their conductors.
//
// Fields and currents are peak values; losses are averages over a period. A
// loss that a field of peak H drives into a wire is written P' = rho G |H|^2,
// W per metre, with a shape factor G that depends on diameter over skin depth
// alone. Resistance ratios are for the wire's own net current. Resistivities
// are arguments: whoever knows the temperature supplies them.
//
// Conductors are nonmagnetic. Round wires are exact cylinders, foils are
// infinitely wide slabs with tangential field; what happens at the ends of a
// foil is not in the slab.
package acloss

import (
	"math"

	"gapwright/corelib/bessel"
	"gapwright/corelib/quantity"
)

// SkinDepth returns sqrt(rho/(pi f mu0)), m, at frequency f, Hz, in a metal of
// resistivity rho, ohm m. It is +Inf at f = 0: every wire is thin at DC. It
// panics if f is negative or rho is not positive.
func SkinDepth(f, rho float64) float64 {
	if !(f >= 0) || !(rho > 0) {
		panic("acloss: skin depth needs f >= 0 and rho > 0")
	}
	return math.Sqrt(rho / (math.Pi * f * quantity.Mu0))
}

// RoundSkin returns Rac/Rdc of a single round wire far from all others, whose
// diameter is the given multiple of the skin depth:
//
//	Re[ z J0(z) / (2 J1(z)) ],  z = (1-j) d/(2 delta)
//
// Its limits are 1 + (d/delta)^4/768 and d/(4 delta) + 1/4.
// Source: standard, e.g. J. A. Ferreira, IEEE Trans. Power Electronics 9 (1),
// 1994, p. 127.
func RoundSkin(diameterOverDelta float64) float64 {
	if !(diameterOverDelta > 0) {
		return 1
	}
	z := argument(diameterOverDelta)
	return real(z / (2 * bessel.Ratio(0, z)))
}

// RoundTransverse returns G of an isolated round wire in a uniform transverse
// field: P' = rho G |H|^2 with H the peak field.
//
//	G = 2 pi (d/(2 delta))^2 |Im{ J2(z)/J0(z) }|
//
// Its low-frequency limit is (pi/32)(d/delta)^4. Source: as RoundSkin; checked
// by its authors against the direct integral of the current density.
func RoundTransverse(diameterOverDelta float64) float64 {
	return RoundMultipole(1, diameterOverDelta)
}

// RoundMultipole returns the loss factor of order n: a wire of radius a in the
// local potential e_n r^n cos(n phi) of order n loses rho G_n |e_n a^(n-1)|^2
// per metre; order 1 is the uniform field. G_n = 2 pi n (a/delta)^2 |Im gamma_n|.
func RoundMultipole(n int, diameterOverDelta float64) float64 {
	if !(diameterOverDelta > 0) {
		return 0
	}
	ratio := diameterOverDelta / 2
	return 2 * math.Pi * float64(n) * ratio * ratio * math.Abs(imag(bessel.Reflection(n, argument(diameterOverDelta))))
}

// argument is k a with k = sqrt(-j w mu0 sigma) = (1-j)/delta.
func argument(diameterOverDelta float64) complex128 {
	x := diameterOverDelta / 2
	return complex(x, -x)
}

// StrandFactor returns the resistance ratio that a field adds to one strand:
// h2 is <|H|^2> over the strand's place per squared strand current, 1/m^2,
// both peak. Add it to RoundSkin for the total.
func StrandFactor(diameter, delta, h2 float64) float64 {
	return math.Pi / 2 * diameter * diameter * RoundTransverse(diameter/delta) * h2
}

// BundleOwnField returns <|H|^2> over a round bundle of the given radius, per
// squared peak bundle current, of the field that the bundle makes itself,
// 1/m^2: the current is uniform over the section, so H = r/(2 pi R^2).
func BundleOwnField(radius float64) float64 {
	return 1 / (8 * math.Pi * math.Pi * radius * radius)
}
