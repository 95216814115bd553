package shape

import (
	"errors"
	"math"
)

// Effective holds the effective parameters of a set as computed from its
// dimensions.
type Effective struct {
	C1   float64 // 1/m, sum of l/A
	C2   float64 // 1/m³, sum of l/A²
	Le   float64 // m
	Ae   float64 // m²
	Amin float64 // m², smallest section
	Ve   float64 // m³
}

// a piece of the magnetic path: its shares of C1 and C2 and the section that
// counts for Amin, which is infinite where the section is no more than a mean.
type piece struct{ c1, c2, area float64 }

func straight(length, area float64) piece {
	return piece{length / area, length / (area * area), area}
}

// corner is a turn of the path with the mean section of its neighbours.
func corner(length, area float64) piece {
	return piece{length / area, length / (area * area), math.Inf(1)}
}

// Computed returns the effective parameters that follow from the mean
// dimensions.
//
// The basic rules are those of IEC 60205, clause 2: mean dimensions, small
// chamfers ignored, a corner is the mean circular path between the centres of
// area of its neighbours with the average of their sections. The formulas of the
// families were written from these rules and not taken from the standard's own
// clauses; how far they lead from published values is part of each row's note and
// of the tests. It fails for dimensions that leave a section without area.
func (s Shape) Computed() (Effective, error) {
	pieces := s.path()
	var e Effective
	e.Amin = math.Inf(1)
	for _, p := range pieces {
		if !(p.area > 0) || !(p.c1 >= 0) || !(p.c2 >= 0) || math.IsInf(p.c1, 0) || math.IsInf(p.c2, 0) {
			return Effective{}, errors.New("shape " + s.Name + ": the dimensions leave a section of the path without area")
		}
		e.C1 += p.c1
		e.C2 += p.c2
		e.Amin = min(e.Amin, p.area)
	}
	e.Le = e.C1 * e.C1 / e.C2
	e.Ae = e.C1 / e.C2
	e.Ve = e.Le * e.Ae
	return e, nil
}

// path cuts the set into pieces: outer legs, back walls, post and the corners
// between them, both halves together.
func (s Shape) path() []piece {
	a, c, d := s.A.Mean(), s.C.Mean(), s.D.Mean()
	e, f, h := s.E.Mean(), s.F.Mean(), s.PlateThickness()
	leg, post := s.legArea(), s.PostArea()
	quarter := math.Pi / 4
	switch s.Family {
	case U:
		// Both legs carry a winding; there is no post.
		back := h * c
		return []piece{straight(4*d, leg), straight(2*e, back), corner(math.Pi/2*(leg/c+h), (leg+back)/2)}

	case E, PlanarE, EFD, ETD, ER:
		p := leg / (2 * c) // width of one outer leg, of equal area where it is curved
		back := 2 * h * c
		return []piece{
			straight(2*d, leg),
			straight(a-2*p-f, back),
			straight(2*d, post),
			corner(quarter*(p+h), (leg+back)/2),
			corner(quarter*(f/2+h), (back+post)/2),
		}

	case PQ, EQ:
		beta := arccos(s.G.Mean() / e)
		alpha := beta
		if s.Family == EQ {
			alpha = math.Pi / 2 // the plate spans the whole post
		}
		inner, outer := 2*alpha*f*h, 2*beta*e*h
		plate := piece{
			c1:   (e - f) * math.Log(outer/inner) / (outer - inner),
			c2:   (e - f) / (inner * outer),
			area: math.Inf(1),
		}
		if math.Abs(outer-inner) < 1e-9*outer {
			plate.c1 = (e - f) / inner
		}
		return []piece{
			straight(2*d, leg), plate, straight(2*d, post),
			corner(quarter*((a-e)/2+h), (leg+outer)/2),
			corner(quarter*((1-math.Sqrt2/2)*f+h), (post+inner)/2),
		}

	case RM, RMLow:
		beta := arccos(s.G.Mean() / e)
		hole := s.H.Mean()
		return []piece{
			straight(2*d, leg), ring(f, e, h, 2*math.Pi), straight(2*d, post),
			corner(quarter*(h+s.R.Mean()/2-e/2), (leg+2*beta*e*h)/2),
			corner(quarter*(f+h-math.Sqrt((f*f+hole*hole)/2)), (post+math.Pi*f*h)/2),
		}

	case P:
		hole := s.H.Mean()
		skirt := math.Sqrt((a*a+e*e)/2) - e
		core := f - math.Sqrt((f*f+hole*hole)/2)
		return []piece{
			straight(2*d, leg), ring(f, e, h, 2*math.Pi), straight(2*d, post),
			corner(quarter*(skirt+h), (leg+math.Pi*e*h)/2),
			corner(quarter*(core+h), (post+math.Pi*f*h)/2),
		}

	case EP:
		theta := math.Pi + 2*arcsin(2*s.G.Mean()/e)
		wall := leg / (theta * e / 2)
		return []piece{
			straight(2*d, leg), ring(f, e, h, theta), straight(2*d, post),
			corner(quarter*(wall+h), (leg+theta*e/2*h)/2),
			corner(quarter*((1-math.Sqrt2/2)*f+h), (post+theta*f/2*h)/2),
		}
	}
	return nil
}

// ring is a back wall through which the flux runs radially from diameter inner
// to outer over an angle theta, both walls in series.
func ring(inner, outer, thickness, theta float64) piece {
	th := theta * thickness
	return piece{
		c1:   2 * math.Log(outer/inner) / th,
		c2:   4 * (1/inner - 1/outer) / (th * th),
		area: th * inner / 2,
	}
}

// legArea is the section of all outer legs together.
func (s Shape) legArea() float64 {
	a, c, e := s.A.Mean(), s.C.Mean(), s.E.Mean()
	switch s.Family {
	case ETD, ER:
		// Legs of thickness c whose inner faces are arcs of the window's circle.
		x := min(c/e, 1)
		return a*c - c/2*e*math.Sqrt(1-x*x) - e*e/2*math.Asin(x)
	case PQ, EQ:
		g := s.G.Mean()
		beta := arccos(g / e)
		return c*(a-g) - (beta*e*e-g*e*math.Sin(beta))/2
	case RM, RMLow:
		beta := arccos(s.G.Mean() / e)
		cut := math.Sqrt2*a - s.R.Mean()
		return a*a/2*(1+math.Tan(beta-math.Pi/4)) - beta*e*e/2 - cut*cut/2
	case P:
		return math.Pi/4*(a*a-e*e) - s.S.Mean()*(a-e)
	case EP:
		return a*c - math.Pi*e*e/8 - e*s.G.Mean()
	case U:
		return (a - e) / 2 * c
	}
	return (a - e) * c
}
