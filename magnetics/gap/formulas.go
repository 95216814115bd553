// Package gap finds the inductance of a gapped core and the gap for a wanted
// inductance.
//
// Three kinds of answer stand beside each other. The plain formula knows no
// fringing. McLyman's factor and the conformal basic block are published closed
// forms, meant as hand checks. The field-based inductance solves the field in
// the winding window (package field) and adds the core's own reluctance; it is
// the one the rating uses. Everything is SI; a permeance is in H per turn
// squared, a reluctance its inverse.
package gap

import (
	"errors"
	"fmt"
	"math"

	"gapwright/corelib/quantity"
	"gapwright/corelib/root"
)

// A Core is what the closed formulas know of a core.
type Core struct {
	Ae      float64 // m2, effective area; of the post where the gap is
	Le      float64 // m, effective length of the closed core
	Mu      float64 // relative permeability of the material
	Breadth float64 // m, of the winding window along the post; only McLyman's factor reads it
	Pieces  int     // number of equal pieces the gap is cut into; 0 counts as 1
}

func (c Core) pieces() float64 { return float64(max(c.Pieces, 1)) }

// Plain returns the inductance of n turns without fringing:
// mu0 n^2 Ae/(g + le/mu). length is the sum of all pieces, m.
func Plain(n, length float64, c Core) float64 {
	return quantity.Mu0 * n * n * c.Ae / (length + c.Le/c.Mu)
}

// PlainLength returns the gap without fringing for inductance L, H:
// mu0 n^2 Ae/L - le/mu. It is negative when the core alone has less than L.
func PlainLength(L, n float64, c Core) float64 {
	return quantity.Mu0*n*n*c.Ae/L - c.Le/c.Mu
}

// Fringing returns McLyman's factor by which the permeance of one gap exceeds
// mu0 A/g:
//
//	F = 1 + (g/sqrt(A)) ln(2 G/g)
//
// with G the breadth of the winding window. Against finite elements it is
// within 1.5 % for one gap at mid breadth in a round post and 2..4 % low for
// split gaps. It means nothing for gaps longer than G; they return 1.
//
// Source: C. W. T. McLyman, Transformer and Inductor Design Handbook (from
// memory).
func Fringing(length, area, breadth float64) float64 {
	if !(length > 0) || length >= breadth {
		return 1
	}
	return 1 + length/math.Sqrt(area)*math.Log(2*breadth/length)
}

// Inductance returns the inductance of n turns with McLyman's fringing. Split
// gaps take it per piece, each with its share of the breadth.
func Inductance(n, length float64, c Core) float64 {
	k := c.pieces()
	effective := length / Fringing(length/k, c.Ae, c.Breadth/k)
	return quantity.Mu0 * n * n * c.Ae / (effective + c.Le/c.Mu)
}

// ErrNoGap says that no gap within reach gives the wanted inductance.
var ErrNoGap = errors.New("no gap gives the wanted inductance")

// Length returns the gap, sum of all pieces, with which n turns on c have
// inductance L with McLyman's fringing. The gap lies between 0 and half of the
// window breadth; outside of that it returns an error that wraps ErrNoGap and
// names the inductances at both ends.
func Length(L, n float64, c Core) (float64, error) {
	if !(L > 0) || !(n > 0) || !(c.Ae > 0) || !(c.Le > 0) || !(c.Mu > 0) || !(c.Breadth > 0) {
		return 0, fmt.Errorf("gap for %g H with %g turns, Ae %g m2, le %g m, mu %g, breadth %g m: all must be positive",
			L, n, c.Ae, c.Le, c.Mu, c.Breadth)
	}
	// 1/L is nearly linear in the gap, so that is what is solved for.
	f := func(g float64) float64 { return L/Inductance(n, g, c) - 1 }
	low, high := 0.0, c.Breadth/2
	if f(low) > 0 || f(high) < 0 {
		return 0, fmt.Errorf("%g H with %g turns: the core has %.4g H without a gap and %.4g H with one of half the window breadth (%.4g m): %w",
			L, n, Inductance(n, low, c), Inductance(n, high, c), high, ErrNoGap)
	}
	r, err := root.Find(f, low, high, 0)
	if err != nil {
		return 0, fmt.Errorf("gap for %g H: %w", L, err)
	}
	return r.X, nil
}

// Sensitivity returns (dL/dg)/L of the formula with McLyman's fringing, 1/m; it
// is negative. Times 1e-5 it is the relative change per 10 um.
func Sensitivity(length float64, c Core) float64 {
	// The logarithm makes the closed derivative long; a central difference of
	// this smooth function is good to 1e-8.
	h := max(1e-3*length, 1e-9)
	low := max(length-h, 0)
	return math.Log(Inductance(1, length+h, c)/Inductance(1, low, c)) / (length + h - low)
}

// AL returns the inductance per turn squared, H.
func AL(L, n float64) float64 { return L / (n * n) }

// BasicBlock returns the permeance per metre of depth, over mu0, of half a pole
// that faces an infinitely permeable plane: half width w/2, side wall height h,
// distance l.
//
//	w/(2 l) + (2/pi) [1 + ln(pi h/(4 l))]
//
// It holds for h well above l (0.6 % low at h = 10 l, exact mapping). In a core
// window it is high, because the winding lowers the potential of the side wall
// towards the yoke.
//
// Source: J. Muehlethaler, J. W. Kolar, A. Ecklebe, A novel approach for 3D air
// gap reluctance calculations, 2011 (from memory), re-derived by a
// Schwarz-Christoffel mapping.
func BasicBlock(w, h, l float64) float64 {
	return w/(2*l) + 2/math.Pi*(1+math.Log(math.Pi*h/(4*l)))
}

// ConformalRound returns the reluctance, 1/H, of one gap between two equal round
// poles whose side walls are h high: mu0 pi r^2/g with the fringing factor of
// the section squared. At g/r near 1/2 it is up to 15 % off in a core window.
func ConformalRound(diameter, h, length float64) float64 {
	sigma := sigma(diameter, h, length)
	return sigma * sigma * length / (quantity.Mu0 * math.Pi / 4 * diameter * diameter)
}

// ConformalRectangle is ConformalRound for a post a x b.
func ConformalRectangle(a, b, h, length float64) float64 {
	return sigma(a, h, length) * sigma(b, h, length) * length / (quantity.Mu0 * a * b)
}

// sigma is the reluctance of a section of width w with its edges over that of
// the bare section. The whole gap equals one basic block at half the distance.
func sigma(w, h, length float64) float64 {
	return w / length / BasicBlock(w, h, length/2)
}
