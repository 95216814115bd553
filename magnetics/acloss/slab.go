package acloss

import "math"

// Thickness in skin depths beyond which hyperbolic functions are replaced by
// their exponentials, and below which by their limits: the terms left out,
// exp(-40) and 1e-6^4, are below the rounding of a float64, and nothing can
// overflow or underflow.
const (
	thickSlab = 40
	thinSlab  = 1e-6
)

// Dowell returns Rac/Rdc of the layers of a winding in a field that runs along
// them and grows from zero on one side:
//
//	xi [ (sinh 2xi + sin 2xi)/(cosh 2xi - cos 2xi)
//	   + (2 (m^2-1)/3) (sinh xi - sin xi)/(cosh xi + cos xi) ]
//
// layers is m, the number of layers between zero field and the highest; half
// layers (m = 0.5: field zero in the middle of the layer) are allowed. xi is
// the layer thickness over the skin depth, see Xi.
//
// Source: P. L. Dowell, Proc. IEE 113 (8), 1966, p. 1387.
func Dowell(layers, xi float64) float64 {
	own, proximity := dowellTerms(xi)
	return own + 2*(layers*layers-1)/3*proximity
}

func dowellTerms(xi float64) (own, proximity float64) {
	if xi > thickSlab {
		return xi, xi
	}
	if !(xi > thinSlab) {
		return 1, 0
	}
	sinh, cosh := math.Sinh(xi), math.Cosh(xi)
	sin, cos := math.Sincos(xi)
	// cosh 2x - cos 2x = 2 (sinh^2 x + sin^2 x) and sinh 2x = 2 sinh x cosh x:
	// the same numbers without cancellation in thin layers.
	own = xi * (sinh*cosh + sin*cos) / (sinh*sinh + sin*sin)
	diff := sinh - sin
	if xi < 0.5 {
		// sinh x - sin x = 2 (x^3/3! + x^7/7! + x^11/11! ...)
		x4 := xi * xi * xi * xi
		diff = xi * xi * xi / 3 * (1 + x4/840*(1+x4/7920*(1+x4/32760)))
	}
	proximity = xi * diff / (cosh + cos)
	return own, proximity
}

// Xi returns the thickness of an equivalent full-breadth layer over the skin
// depth: thickness/delta sqrt(porosity), porosity being the part of the breadth
// that is metal.
func Xi(thickness, delta, porosity float64) float64 {
	return thickness / delta * math.Sqrt(porosity)
}

// EquivalentSquare returns the side of the square that has the area of a round
// wire: the layer thickness that stands for round wire in Dowell's formula.
func EquivalentSquare(diameter float64) float64 {
	return diameter * math.Sqrt(math.Pi) / 2
}

// Slab returns the two factors of a slab D = thickness/delta thick, with peak
// tangential fields Ha and Hb at its faces. Per square metre of face it loses
//
//	rho/(2 thickness) 2 [ G1 (Ha^2 + Hb^2)/2 - 2 G2 Ha Hb ]
//
// so that a breadth c with a net current of 1 A has
// Rac/Rdc = c^2 [G1 (Ha^2 + Hb^2) - 4 G2 Ha Hb] with fields per ampere.
//
//	G1 = D (sinh 2D + sin 2D)/(cosh 2D - cos 2D)
//	G2 = D (sinh D cos D + cosh D sin D)/(cosh 2D - cos 2D)
//
// They tend to 1 and 1/2 at DC, and never overflow.
func Slab(d float64) (g1, g2 float64) {
	if !(d > thinSlab) {
		return 1, 0.5
	}
	sin, cos := math.Sincos(d)
	if d > thickSlab {
		return d, d * (cos + sin) * math.Exp(-d)
	}
	sinh, cosh := math.Sinh(d), math.Cosh(d)
	den := sinh*sinh + sin*sin
	return d * (sinh*cosh + sin*cos) / den, d * (sinh*cos + cosh*sin) / (2 * den)
}
